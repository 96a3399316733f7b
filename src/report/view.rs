//! What a report of `identify` holds, with the keys of its JSON.
//!
//! Keys are stable: within a major version they are only ever added. A unit stands in the key; a
//! value that is unknown is null.

use crate::setup::SetupView;
use serde::Serialize;

/// The report of one run of `identify`.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct IdentifyView {
    /// Name and version of this layout.
    pub schema: &'static str,
    /// Version of the program.
    pub version: String,
    /// Inputs in the order of the command line.
    pub inputs: Vec<InputView>,
    /// The library that was used.
    pub library: LibraryView,
    /// The set-up that was used.
    pub setup: SetupView,
    /// The same in words, for the text report.
    #[serde(skip)]
    pub setup_described: Vec<(String, String)>,
    /// Samples in the order of the inputs.
    pub samples: Vec<SampleView>,
    /// Everything that was refused.
    pub refused: Vec<RefusalView>,
}

/// An input file.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct InputView {
    /// As named on the command line, `-` for standard input.
    pub path: String,
    /// SHA-256 of its bytes.
    pub sha256: String,
    /// Encoding that was read.
    pub encoding: String,
    /// Separator of its columns; null for a single column.
    pub separator: Option<char>,
    /// Decimal sign.
    pub decimal_sign: char,
    /// Comment lines without the mark.
    pub comments: Vec<String>,
    /// Warnings about the table as a whole.
    pub warnings: Vec<WarningView>,
}

/// The reference library.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct LibraryView {
    /// SHA-256 over all its tables.
    pub sha256: String,
    /// Number of substances.
    pub substances: usize,
}

/// What may be said of one sample.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SampleView {
    /// Name.
    pub sample: String,
    /// Input it comes from.
    pub input: String,
    /// What lamp or bottle claims to be.
    pub label: Option<String>,
    /// `decisive`, `inconclusive` or `unexplained`.
    pub decision: &'static str,
    /// The answer in one sentence.
    pub sentence: String,
    /// Posterior of the leader together with what it cannot be told from.
    pub leading_probability: Option<f64>,
    /// A name for the finding as a whole.
    pub composed_name: Option<String>,
    /// Ranked compositions.
    pub compositions: Vec<CompositionView>,
    /// The ranking with ubiquitous substances left out of account.
    pub compositions_without_ubiquitous: Vec<CompositionView>,
    /// Ids of substances that cannot be told apart here, group by group.
    pub either_or: Vec<Vec<String>>,
    /// Bound on the probability of compositions not weighed.
    pub untested_mass_bound: Option<f64>,
    /// Every weighed substance by falling presence.
    pub substances: Vec<SubstanceView>,
    /// Readings in ascending wavelength.
    pub readings: Vec<ReadingView>,
    /// Features of the leading composition that were expected and not seen.
    pub missing_lines: Vec<MissingLineView>,
    /// Lanes of the picture.
    pub picture: Vec<LaneView>,
    /// Readings that take no part.
    pub set_aside: Vec<SetAsideView>,
    /// The shift common to all readings under the leading composition.
    pub offset_nm: PosteriorView,
    /// Root mean square of the residuals in standard uncertainties.
    pub residual_rms_sigma: Option<f64>,
    /// Warnings, the gravest first.
    pub warnings: Vec<WarningView>,
    /// Further readings that would tell most.
    pub next_readings: Vec<NextReadingView>,
    /// Cautions for the substances named.
    pub cautions: Vec<String>,
}

/// A composition.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CompositionView {
    /// Place in the ranking, from 1.
    pub rank: usize,
    /// Ids of its members; empty for none of the weighed substances.
    pub substances: Vec<String>,
    /// The same in words.
    pub described: String,
    /// Posterior probability.
    pub posterior: Option<f64>,
    /// ln of the evidence, nats; null where it is zero or does not apply.
    pub log_evidence: Option<f64>,
}

/// A substance.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SubstanceView {
    /// Id.
    pub substance: String,
    /// Name.
    pub name: String,
    /// Symbol.
    pub symbol: String,
    /// Chance that it caused at least one reading.
    pub presence_probability: Option<f64>,
    /// Chance that it is in the sample, seen or not.
    pub physical_presence_probability: Option<f64>,
    /// Chance that it would have shown, had it been there.
    pub testable: Option<f64>,
    /// It stands on a single reading.
    pub rests_on_one_line: bool,
}

/// A reading.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ReadingView {
    /// First row it was pooled from.
    pub row: Option<usize>,
    /// All rows it was pooled from.
    pub rows: Vec<usize>,
    /// Position in air.
    pub wavelength_nm: Option<f64>,
    /// Standard uncertainty.
    pub uncertainty_nm: Option<f64>,
    /// Diffraction order.
    pub order: u32,
    /// `explained`, `doubtful` or `unexplained`.
    pub standing: &'static str,
    /// Best cause; null for an unexplained reading.
    pub cause: Option<CauseView>,
    /// Further possible causes.
    pub other_causes: Vec<CauseView>,
    /// Notes as typed.
    pub notes: Vec<String>,
}

/// A possible cause.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CauseView {
    /// Id of the substance.
    pub substance: String,
    /// Its name.
    pub name: String,
    /// Emitter.
    pub emitter: String,
    /// Position of the feature in air.
    pub feature_nm: Option<f64>,
    /// Standard uncertainty of that position.
    pub feature_uncertainty_nm: Option<f64>,
    /// Diffraction order in which it was seen.
    pub order: u32,
    /// Chance that it caused the reading.
    pub probability: Option<f64>,
    /// Reading less feature.
    pub residual_nm: Option<f64>,
    /// The same in standard uncertainties.
    pub residual_sigma: Option<f64>,
}

/// A feature that was expected and not seen.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct MissingLineView {
    /// Id of the substance.
    pub substance: String,
    /// Its name.
    pub name: String,
    /// Emitter.
    pub emitter: String,
    /// Position in air.
    pub wavelength_nm: Option<f64>,
    /// Standard uncertainty of that position.
    pub uncertainty_nm: Option<f64>,
    /// Chance that it would have been recorded.
    pub detection_probability: Option<f64>,
}

/// A lane of the picture.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LaneView {
    /// Id of the substance.
    pub substance: String,
    /// Its name.
    pub name: String,
    /// Features in ascending wavelength.
    pub marks: Vec<MarkView>,
}

/// A feature in a lane.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct MarkView {
    /// Position in air.
    pub wavelength_nm: f64,
    /// `matched`, `missing` or `listed`.
    pub mark: &'static str,
}

/// A reading that takes no part.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SetAsideView {
    /// Row.
    pub row: usize,
    /// Position in air.
    pub wavelength_nm: Option<f64>,
    /// `out-of-range`, `blind-stretch` or `continuum-maximum`.
    pub reason: &'static str,
}

/// Mean and standard deviation.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct PosteriorView {
    /// Mean.
    pub mean: Option<f64>,
    /// Standard deviation.
    pub standard_deviation: Option<f64>,
}

/// A warning.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct WarningView {
    /// Stable code.
    pub code: &'static str,
    /// What is the matter.
    pub message: String,
    /// What to do next.
    pub next_step: String,
}

/// A further reading that would help.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct NextReadingView {
    /// Where to look, in air.
    pub wavelength_nm: Option<f64>,
    /// What looking there is expected to tell.
    pub information_bits: Option<f64>,
    /// Ids of the substances it tells apart.
    pub separates: Vec<String>,
}

/// Something that was refused.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct RefusalView {
    /// Input.
    pub input: String,
    /// Sample; null for a whole file.
    pub sample: Option<String>,
    /// Row.
    pub row: Option<usize>,
    /// Column as written in the header.
    pub column: Option<String>,
    /// The offending text.
    pub text: Option<String>,
    /// What is wrong and what to try.
    pub message: String,
}
