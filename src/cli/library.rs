//! `linstock library`: what is known.

use super::compute;
use super::enrol;
use super::options::LibraryOptions;
use super::{Exit, Failure};
use crate::embedded;
use crate::library::{Library, extend_from, load_folder};
use crate::report::catalogue::{
    Within, catalogue_json, features, lines_csv, lines_text, list_csv, list_text, listed,
    page_text, substance_page,
};
use crate::store::write_whole;
use clap::{Args, Subcommand, ValueEnum};
use std::io::{self, Write};
use std::path::PathBuf;

/// What to do with the library.
#[derive(Debug, Subcommand)]
pub(super) enum LibraryCommand {
    /// List the substances
    List(ListOptions),
    /// Show one substance in full
    Show(ShowOptions),
    /// Print lines and band heads
    Lines(LinesOptions),
    /// Check a folder of tables
    Check(CheckOptions),
    /// Compute strengths that follow from rates and levels by a rule
    Compute(compute::ComputeOptions),
    /// Make a reference of your own from readings of a known sample
    Enrol(Box<enrol::EnrolOptions>),
}

/// Options of `library list`.
#[derive(Debug, Args)]
pub(super) struct ListOptions {
    #[command(flatten)]
    library: LibraryOptions,
    #[command(flatten)]
    output: TableOutput,
}

/// Options of `library show`.
#[derive(Debug, Args)]
pub(super) struct ShowOptions {
    /// Name, symbol or formula of a substance
    substance: String,
    /// Name lines of other substances within this distance, nm
    #[arg(long, value_name = "NM", default_value_t = 1.0, value_parser = distance)]
    within: f64,
    #[command(flatten)]
    library: LibraryOptions,
    #[command(flatten)]
    output: TableOutput,
}

/// Options of `library lines`.
#[derive(Debug, Args)]
pub(super) struct LinesOptions {
    /// Names, symbols or formulas; all substances if none is given
    substances: Vec<String>,
    /// Only lines near this wavelength, nm in air, nearest first
    #[arg(long, value_name = "NM")]
    near: Option<f64>,
    /// How near, nm
    #[arg(long, value_name = "NM", default_value_t = 1.0, value_parser = distance, requires = "near")]
    within: f64,
    #[command(flatten)]
    library: LibraryOptions,
    #[command(flatten)]
    output: TableOutput,
}

/// Options of `library check`.
#[derive(Debug, Args)]
pub(super) struct CheckOptions {
    /// Folder of tables
    folder: PathBuf,
    /// Check it as a library of its own, not as laid over that of the program
    #[arg(long)]
    alone: bool,
}

/// Format of a table.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum TableFormat {
    /// For people, 80 columns wide
    Text,
    /// For spreadsheets
    Csv,
    /// For programs
    Json,
}

/// Where a table goes, as typed.
#[derive(Debug, Args)]
#[command(next_help_heading = "Output")]
struct TableOutput {
    /// Format of the output
    #[arg(long, value_enum, default_value_t = TableFormat::Text, value_name = "FORMAT")]
    format: TableFormat,
    /// Write to this file, whole or not at all
    #[arg(long, short, value_name = "FILE")]
    output: Option<PathBuf>,
}

impl TableOutput {
    fn write(&self, text: &str) -> Result<(), Failure> {
        if let Some(path) = &self.output {
            let plain = anstream::adapter::strip_str(text).to_string();
            return Ok(write_whole(path, plain.as_bytes())?);
        }
        let mut stream = anstream::AutoStream::auto(io::stdout().lock());
        let written = stream
            .write_all(text.as_bytes())
            .and_then(|()| stream.flush());
        written.or_else(|error| match error.kind() {
            // Whoever reads has seen enough.
            io::ErrorKind::BrokenPipe => Ok(()),
            _ => Err(Failure::Print(error)),
        })
    }
}

/// Runs the command.
pub(super) fn run(command: &LibraryCommand) -> Result<Exit, Failure> {
    match command {
        LibraryCommand::List(options) => list(options),
        LibraryCommand::Show(options) => show(options),
        LibraryCommand::Lines(options) => lines(options),
        LibraryCommand::Check(options) => check(options),
        LibraryCommand::Compute(options) => return compute::run(options),
        LibraryCommand::Enrol(options) => enrol::run(options),
    }?;
    Ok(Exit::Decisive)
}

fn list(options: &ListOptions) -> Result<(), Failure> {
    let rows = listed(&options.library.load_for_reading()?);
    options.output.write(&match options.output.format {
        TableFormat::Text => list_text(&rows),
        TableFormat::Csv => list_csv(&rows)?,
        TableFormat::Json => catalogue_json(&rows)?,
    })
}

fn show(options: &ShowOptions) -> Result<(), Failure> {
    let library = options.library.load_for_reading()?;
    let index = find(&library, &options.substance)?;
    let page = substance_page(&library, index, options.within);
    let Some(page) = page else {
        return Err(Failure::Usage("no such substance".to_owned()));
    };
    options.output.write(&match options.output.format {
        TableFormat::Text => page_text(&page),
        TableFormat::Csv => lines_csv(&features(&library, &[index], None))?,
        TableFormat::Json => catalogue_json(&page)?,
    })
}

fn lines(options: &LinesOptions) -> Result<(), Failure> {
    let library = options.library.load_for_reading()?;
    let chosen = options
        .substances
        .iter()
        .map(|name| find(&library, name))
        .collect::<Result<Vec<usize>, Failure>>()?;
    let within = options.near.map(|near_nm| Within {
        near_nm,
        within_nm: options.within,
    });
    let rows = features(&library, &chosen, within);
    options.output.write(&match options.output.format {
        TableFormat::Text => lines_text(&rows),
        TableFormat::Csv => lines_csv(&rows)?,
        TableFormat::Json => catalogue_json(&rows)?,
    })
}

fn check(options: &CheckOptions) -> Result<(), Failure> {
    let library = if options.alone {
        load_folder(&options.folder)?
    } else {
        extend_from(embedded::library()?, &options.folder)?
    };
    let features: usize = library
        .substances
        .iter()
        .flat_map(|substance| &substance.emitters)
        .map(|emitter| emitter.features.len())
        .sum();
    let whole = if options.alone {
        ""
    } else {
        " together with the library of the program"
    };
    let output = TableOutput {
        format: TableFormat::Text,
        output: None,
    };
    output.write(&format!(
        "{}: in order.\n{} substances and {features} lines and bands{whole}.\n",
        options.folder.display(),
        library.substances.len(),
    ))
}

fn find(library: &Library, name: &str) -> Result<usize, Failure> {
    library
        .find(name)
        .map_err(|error| Failure::Usage(error.to_string()))
}

fn distance(text: &str) -> Result<f64, String> {
    text.parse::<f64>()
        .ok()
        .filter(|nm| nm.is_finite() && *nm > 0.0)
        .ok_or_else(|| "expected a number above 0, nm".to_owned())
}
