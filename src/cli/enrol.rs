//! `linstock library enrol`: a reference of one's own from readings of a known sample.

use super::Failure;
use super::inputs::{Inputs, read_inputs};
use super::options::{LibraryOptions, SetupOptions};
use crate::enrolment::{Enrolment, enrol, identifier};
use crate::library::{Library, SourceKind, extend_with, read_tables};
use crate::reading::{Sample, Table};
use crate::reduction::reduce;
use crate::report::catalogue::cautions_text;
use crate::report::plain;
use crate::store::write_tables;
use clap::Args;
use std::collections::BTreeSet;
use std::io::{self, Write};
use std::path::PathBuf;

/// Options of `library enrol`.
#[derive(Debug, Args)]
pub(super) struct EnrolOptions {
    /// Table of readings of the known sample; - is standard input
    #[arg(value_name = "FILE")]
    readings: String,
    /// What the sample is called
    #[arg(long, value_name = "NAME")]
    name: String,
    /// Folder of tables it goes to (made where it is missing); use it with --library
    #[arg(long, value_name = "DIR")]
    into: PathBuf,
    /// Short mark for pictures and tables
    #[arg(long, value_name = "MARK", default_value = "")]
    symbol: String,
    /// What it is known to contain, parted by commas: their cautions go with it
    #[arg(long, value_name = "NAMES", value_delimiter = ',')]
    contains: Vec<String>,
    /// Which sample of the table, if it holds several
    #[arg(long, value_name = "NAME")]
    sample: Option<String>,
    /// Take the place of an earlier enrolment of the same name
    #[arg(long)]
    replace: bool,
    #[command(flatten)]
    setup: SetupOptions,
    #[command(flatten)]
    library: LibraryOptions,
}

/// Cautions of a source whatever the sample.
fn of_source(source: SourceKind) -> &'static [&'static str] {
    match source {
        SourceKind::Flame => &["flame-open"],
        SourceKind::Discharge => &["discharge-high-voltage", "discharge-ultraviolet"],
        SourceKind::Absorption => &[],
    }
}

/// Runs the command: cautions, readings, tables, and only then the folder.
pub(super) fn run(options: &EnrolOptions) -> Result<(), Failure> {
    let setup = options.setup.resolve(&options.library)?;
    let library = options.library.load(&setup)?;
    let keys = cautions(&library, setup.source(), options)?;
    let Inputs { tables, .. } = read_inputs(std::slice::from_ref(&options.readings))?;
    let table = tables.first().ok_or_else(|| none(options))?;
    let sample = chosen(table, options)?;
    let reduced = reduce(sample, &setup).map_err(|e| Failure::Readings(e.to_string()))?;
    let what = Enrolment {
        name: options.name.clone(),
        symbol: options.symbol.clone(),
        source: setup.source(),
        cautions: keys.clone(),
        offset_nm: setup.offset_nm(),
        depth_dex: -reduced.dynamic_range_dex,
        digest: table.sha256.clone(),
        replace: options.replace,
    };
    let known = identifier(&options.name).is_some_and(|id| {
        library
            .substances
            .iter()
            .any(|substance| substance.id == id)
    });
    if known && !options.replace {
        return Err(Failure::Usage(format!(
            "--name: {:?} is a substance of the library and would take its place (choose another \
             name, or add --replace)",
            options.name
        )));
    }
    let mut folder = read_tables(&options.into)?;
    let added = enrol(&reduced, &what, &folder)?;
    folder.extend(added.clone());
    // A folder that could not be loaded afterwards is not written.
    extend_with(library.clone(), &options.into, &folder)?;
    let texts: Vec<&str> = keys.iter().filter_map(|key| library.caution(key)).collect();
    tell(&cautions_text(&texts))?;
    write_tables(&options.into, &added)?;
    tell(&format!(
        "Enrolled {} with {} lines and bands.\nUse it with --library {}\n",
        plain(&options.name),
        reduced.readings.len(),
        plain(&options.into.display().to_string()),
    ))
}

fn cautions(
    library: &Library,
    source: SourceKind,
    options: &EnrolOptions,
) -> Result<Vec<String>, Failure> {
    let mut keys: BTreeSet<String> = of_source(source)
        .iter()
        .filter(|key| library.caution(key).is_some())
        .map(|key| (*key).to_owned())
        .collect();
    for name in &options.contains {
        let index = library
            .find(name)
            .map_err(|e| Failure::Usage(format!("--contains: {e}")))?;
        keys.extend(library.substances[index].cautions.iter().cloned());
    }
    Ok(keys.into_iter().collect())
}

fn chosen<'t>(table: &'t Table, options: &EnrolOptions) -> Result<&'t Sample, Failure> {
    if let Some(refusal) = table.refused.first() {
        return Err(Failure::Readings(refusal.to_string()));
    }
    let names: Vec<&str> = table.samples.iter().map(|s| s.name.as_str()).collect();
    match (&options.sample, table.samples.as_slice()) {
        (None, [only]) => Ok(only),
        (None, []) => Err(none(options)),
        (None, _) => Err(Failure::Usage(format!(
            "the table holds several samples (choose one with --sample: {})",
            names.join(", ")
        ))),
        (Some(name), samples) => samples.iter().find(|s| s.name == *name).ok_or_else(|| {
            Failure::Usage(format!(
                "--sample: {name:?} is not in the table (it holds {})",
                names.join(", ")
            ))
        }),
    }
}

fn none(options: &EnrolOptions) -> Failure {
    Failure::Readings(format!("{}: no readings", options.readings))
}

fn tell(text: &str) -> Result<(), Failure> {
    anstream::AutoStream::auto(io::stdout().lock())
        .write_all(text.as_bytes())
        .map_err(Failure::Print)
}
