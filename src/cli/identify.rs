//! `linstock identify`: rank the compositions that explain readings.

use super::inputs::{Inputs, read_inputs};
use super::options::{LibraryOptions, SetupOptions};
use super::output::{Format, OutputOptions};
use super::{Exit, Failure};
use crate::library::Library;
use crate::reading::{Refusal, Sample};
use crate::reduction::ReductionError;
use crate::report::{Detail, IdentifyRun, identify_json, identify_text, identify_view};
use crate::setup::Setup;
use crate::verdict::{Shortlist, Verdict, identify_sample, shortlist};
use clap::Args;
use rayon::prelude::*;

/// Options of `identify` as typed.
#[derive(Debug, Args)]
#[command(after_help = super::exit::HELP)]
pub(super) struct IdentifyOptions {
    /// Tables of readings; - is standard input
    #[arg(required = true, value_name = "FILE")]
    files: Vec<String>,
    #[command(flatten)]
    setup: SetupOptions,
    #[command(flatten)]
    library: LibraryOptions,
    #[command(flatten)]
    output: OutputOptions,
    /// End with 0 also if some sample was not decided or not explained
    #[arg(long, help_heading = "Output")]
    exit_zero: bool,
}

/// Runs the command: set-up, library, readings, verdicts, report.
pub(super) fn run(options: &IdentifyOptions) -> Result<Exit, Failure> {
    let setup = options.setup.resolve(&options.library)?;
    let library = options.library.load(&setup)?;
    let shortlist = shortlist(&library, &setup).map_err(|error| Failure::Shortlist {
        error,
        from_flags: options.setup.names_substances(),
    })?;
    let Inputs {
        tables,
        mut refused,
    } = read_inputs(&options.files)?;

    let samples: Vec<(&str, &Sample)> = tables
        .iter()
        .flat_map(|table| {
            table
                .samples
                .iter()
                .map(|sample| (table.input.as_str(), sample))
        })
        .collect();
    let (verdicts, not_reduced) = identify_all(&library, &setup, &shortlist, &samples);
    refused.extend(not_reduced);

    let view = identify_view(&IdentifyRun {
        library: &library,
        setup: &setup,
        tables: &tables,
        verdicts: &verdicts,
        refused: &refused,
    });
    let detail = if options.output.quiet {
        Detail::Answers
    } else {
        Detail::Full
    };
    options.output.write(&match options.output.format {
        Format::Text => identify_text(&view, detail),
        Format::Json => identify_json(&view)?,
    })?;
    let decided = verdicts
        .iter()
        .map(|(_, verdict)| Exit::of(verdict.decision))
        .max();
    let refusal = (!refused.is_empty()).then_some(Exit::BadData);
    Ok(decided
        .max(refusal)
        .unwrap_or(Exit::BadData)
        .or_zero(options.exit_zero))
}

/// Identifies samples side by side; verdicts come in the order of the samples.
fn identify_all(
    library: &Library,
    setup: &Setup,
    shortlist: &Shortlist,
    samples: &[(&str, &Sample)],
) -> (Vec<(String, Verdict)>, Vec<Refusal>) {
    let outcomes: Vec<Result<(String, Verdict), Box<Refusal>>> = samples
        .par_iter()
        .map(|&(input, sample)| {
            identify_sample(library, setup, shortlist, sample)
                .map(|identified| (input.to_owned(), identified.verdict))
                .map_err(|error| Box::new(refusal(input, sample, &error)))
        })
        .collect();
    let mut verdicts = Vec::new();
    let mut refused = Vec::new();
    for outcome in outcomes {
        match outcome {
            Ok(verdict) => verdicts.push(verdict),
            Err(refusal) => refused.push(*refusal),
        }
    }
    (verdicts, refused)
}

fn refusal(input: &str, sample: &Sample, error: &ReductionError) -> Refusal {
    let (ReductionError::MixedStrengths { row } | ReductionError::Unusable { row, .. }) = *error;
    Refusal {
        input: input.to_owned(),
        sample: Some(sample.name.clone()),
        row: Some(row),
        column: None,
        text: None,
        message: error.to_string(),
    }
}
