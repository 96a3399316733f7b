//! From evidence to what may be said: the decision, the sentence that answers, the standing of
//! every reading, and warnings that each say what to do next.
//!
//! A [`Verdict`] holds names and numbers only, so that a report needs neither library nor model.

mod case;
mod cautions;
mod decision;
mod either_or;
mod identify;
mod lanes;
mod lineup;
mod next_reading;
mod readings;
mod sentence;
pub mod thresholds;
mod warning;
pub mod wording;

pub use decision::Decision;
pub use identify::{Identified, identify_sample};
pub use lanes::{Lane, LaneMark, Mark};
pub use lineup::{Lineup, Origin, Shortlist, ShortlistError, Weighed, line_up, shortlist};
pub use next_reading::NextReading;
pub use readings::{CauseFinding, MissingLine, ReadingFinding, Standing};
pub use warning::{MemoryRow, Warning};

use crate::evidence::{Inference, Posterior};
use crate::library::Library;
use crate::reduction::{ReducedSample, SetAside};
use crate::setup::Setup;
use case::Case;

/// A substance as reports name it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SubstanceName {
    /// Stable identifier.
    pub id: String,
    /// Name in a sentence.
    pub name: String,
    /// Chemical symbol or short mark.
    pub symbol: String,
    /// On nearly every sample of this kind of source.
    pub ubiquitous: bool,
}

/// A composition in the ranking.
#[derive(Debug, Clone, PartialEq)]
pub struct RankedComposition {
    /// Members in the order of the library; empty for "none of the weighed substances".
    pub substances: Vec<SubstanceName>,
    /// The same in words: `strontium, with sodium`.
    pub described: String,
    /// Posterior probability.
    pub posterior: f64,
    /// ln of the evidence against "every reading is clutter", nats; absent where it is zero.
    pub log_evidence: Option<f64>,
}

/// Substances that these readings cannot tell apart.
#[derive(Debug, Clone, PartialEq)]
pub struct EitherOr {
    /// The alternatives, the leading one first.
    pub substances: Vec<SubstanceName>,
}

/// What the readings say of one substance.
#[derive(Debug, Clone, PartialEq)]
pub struct SubstanceFinding {
    /// Which.
    pub substance: SubstanceName,
    /// Chance that it caused at least one reading.
    pub presence: f64,
    /// Chance that it is in the sample, seen or not.
    pub physical_presence: f64,
    /// Chance that it would have shown at all, had it been there.
    pub testable: f64,
    /// Without one single reading its presence would fall below one half.
    pub rests_on_one_line: bool,
}

/// What may be said of one sample.
#[derive(Debug, Clone, PartialEq)]
pub struct Verdict {
    /// Name of the sample.
    pub sample: String,
    /// What lamp or bottle claims to be.
    pub label: Option<String>,
    /// How far the answer can be relied on.
    pub decision: Decision,
    /// The answer in one sentence, with its probability.
    pub sentence: String,
    /// Posterior of the leading composition together with those it cannot be told from.
    pub leading_probability: f64,
    /// A name for the finding as a whole, such as air.
    pub composed: Option<String>,
    /// Compositions by falling posterior.
    pub compositions: Vec<RankedComposition>,
    /// The ranking with ubiquitous substances left out of account; empty if none was weighed.
    pub without_ubiquitous: Vec<RankedComposition>,
    /// Groups within the leading composition that cannot be told apart.
    pub either_or: Vec<EitherOr>,
    /// Bound on the posterior mass of compositions not weighed.
    pub untested_mass_bound: f64,
    /// Every weighed substance by falling presence.
    pub substances: Vec<SubstanceFinding>,
    /// Readings in ascending wavelength.
    pub readings: Vec<ReadingFinding>,
    /// Strong features of the leading composition that were not seen.
    pub missing: Vec<MissingLine>,
    /// One lane per substance that the answer speaks of.
    pub lanes: Vec<Lane>,
    /// Readings that take no part.
    pub set_aside: Vec<SetAside>,
    /// The shift common to all readings, nm.
    pub offset_nm: Posterior,
    /// Root mean square of the residuals in standard uncertainties.
    pub residual_rms_sigma: Option<f64>,
    /// Warnings, the gravest first.
    pub warnings: Vec<Warning>,
    /// Further readings that would settle the most.
    pub next_readings: Vec<NextReading>,
    /// Cautions for the substances named.
    pub cautions: Vec<String>,
}

/// Judges what the evidence on one sample allows to be said.
///
/// `lineup.weighed` is parallel to the candidates given to the model, `inference.readings` to
/// `sample.readings`.
pub fn judge(
    library: &Library,
    setup: &Setup,
    sample: &ReducedSample,
    lineup: &Lineup,
    inference: &Inference,
) -> Verdict {
    let Lineup {
        weighed,
        not_excited,
    } = lineup;
    let case = Case {
        library,
        setup,
        sample,
        weighed,
        not_excited,
        inference,
    };
    let readings = readings::findings(&case);
    let group = either_or::leading_group(&case);
    let next_readings = next_reading::proposals(&case, &group);
    let warnings = warning::collect(&case, &readings, &group, &next_readings);
    let decision = decision::decide(&case, &group, &warnings);
    let composed = sentence::composed_name(&case);
    Verdict {
        sample: sample.name.clone(),
        label: sample.label.clone(),
        decision,
        sentence: sentence::answer(&case, decision, &group, &warnings, composed.as_deref()),
        leading_probability: group.posterior,
        composed,
        compositions: case.ranking(),
        without_ubiquitous: case.ranking_without_ubiquitous(),
        either_or: group.named(&case),
        untested_mass_bound: inference.untested_mass_bound,
        substances: case.substance_findings(),
        missing: readings::missing(&case),
        lanes: lanes::lanes(&case, &readings),
        set_aside: sample.set_aside.clone(),
        offset_nm: inference.offset_nm,
        residual_rms_sigma: inference.residual_rms_sigma,
        warnings,
        next_readings,
        cautions: cautions::cautions(&case),
        readings,
    }
}

#[cfg(test)]
pub(crate) mod fixture;
#[cfg(test)]
mod tests;
