//! `linstock library compute`: strengths that follow from other columns of their row.

use super::{Exit, Failure};
use crate::library::{Computation, LibraryError, compute, load_folder, read_tables};
use crate::report::catalogue::computation_text;
use crate::report::plain;
use crate::store::write_tables;
use clap::Args;
use std::io::{self, Write};
use std::path::PathBuf;

/// Options of `library compute`.
#[derive(Debug, Args)]
pub(super) struct ComputeOptions {
    /// Folder of tables
    folder: PathBuf,
    /// Put the computed values into the tables
    #[arg(long)]
    write: bool,
}

/// Runs the command. Without `--write` a strength that does not follow counts as bad data.
pub(super) fn run(options: &ComputeOptions) -> Result<Exit, Failure> {
    let name = options.folder.display().to_string();
    if !options.folder.is_dir() {
        // A folder that is not there would pass as one without tables.
        load_folder(&options.folder)?;
    }
    let tables = read_tables(&options.folder)?;
    let found = compute(&tables).map_err(|faults| LibraryError::Faulty {
        name: name.clone(),
        faults,
    })?;
    if options.write {
        write_tables(&options.folder, &found.tables)?;
    }
    anstream::AutoStream::auto(io::stdout().lock())
        .write_all(computation_text(&plain(&name), &found, options.write).as_bytes())
        .map_err(Failure::Print)?;
    Ok(status(&found, options.write))
}

fn status(found: &Computation, written: bool) -> Exit {
    match found.differ.is_empty() || written {
        true => Exit::Decisive,
        false => Exit::BadData,
    }
}
