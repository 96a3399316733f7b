//! Each reading with its causes and its standing, and features that were expected and not seen.

use super::SubstanceName;
use super::case::Case;
use super::thresholds::{EXPLAINED_BELOW, UNEXPLAINED_ABOVE};
use crate::evidence::{Cause, ReadingEvidence};

/// How well the weighed substances account for a reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Standing {
    /// Something weighed very likely caused it.
    Explained,
    /// Neither can be said.
    Doubtful,
    /// Nothing weighed is likely to have caused it.
    Unexplained,
}

impl Standing {
    /// The word for it.
    pub fn word(self) -> &'static str {
        match self {
            Self::Explained => "explained",
            Self::Doubtful => "doubtful",
            Self::Unexplained => "unexplained",
        }
    }

    fn from_unexplained(chance: f64) -> Self {
        if chance < EXPLAINED_BELOW {
            Self::Explained
        } else if chance > UNEXPLAINED_ABOVE {
            Self::Unexplained
        } else {
            Self::Doubtful
        }
    }
}

/// A possible cause of a reading, by name.
#[derive(Debug, Clone, PartialEq)]
pub struct CauseFinding {
    /// Candidate index, for use within the verdict.
    pub candidate: usize,
    /// Index of the feature in the candidate's list.
    pub feature: usize,
    /// Substance.
    pub substance: SubstanceName,
    /// Emitter, such as `He I`.
    pub emitter: String,
    /// Position of the feature, nm, air.
    pub feature_nm: f64,
    /// Standard uncertainty of that position in the library, nm.
    pub feature_uncertainty_nm: f64,
    /// Diffraction order in which the feature would have been read as this wavelength.
    pub order: u32,
    /// Chance that it caused the reading.
    pub probability: f64,
    /// Reading less feature, nm.
    pub residual_nm: f64,
    /// The same in standard uncertainties.
    pub residual_sigma: f64,
}

/// A reading with what may have caused it.
#[derive(Debug, Clone, PartialEq)]
pub struct ReadingFinding {
    /// Rows of the table pooled into it, ascending.
    pub rows: Vec<usize>,
    /// Position in air, nm.
    pub wavelength_nm: f64,
    /// Standard uncertainty, nm.
    pub uncertainty_nm: f64,
    /// Diffraction order it was read in.
    pub order: u32,
    /// How well it is accounted for.
    pub standing: Standing,
    /// Best cause; none for an unexplained reading.
    pub cause: Option<CauseFinding>,
    /// Further causes by falling chance; all of them for an unexplained reading.
    pub other_causes: Vec<CauseFinding>,
    /// Notes of the rows, as typed.
    pub notes: Vec<String>,
}

/// A feature of the leading composition that was expected and not seen.
#[derive(Debug, Clone, PartialEq)]
pub struct MissingLine {
    /// Substance.
    pub substance: SubstanceName,
    /// Emitter.
    pub emitter: String,
    /// Position, nm, air.
    pub wavelength_nm: f64,
    /// Standard uncertainty of that position in the library, nm.
    pub uncertainty_nm: f64,
    /// Chance that it would have been recorded.
    pub detection_probability: f64,
}

/// Findings for all readings, in the order of the sample.
pub(super) fn findings(case: &Case) -> Vec<ReadingFinding> {
    let evidence = &case.inference.readings;
    case.sample
        .readings
        .iter()
        .enumerate()
        .map(|(index, reading)| {
            let (standing, cause, other_causes) = weighed_causes(case, evidence.get(index));
            ReadingFinding {
                rows: reading.rows.clone(),
                wavelength_nm: reading.wavelength_nm,
                uncertainty_nm: reading.uncertainty_nm,
                order: reading.order,
                standing,
                cause,
                other_causes,
                notes: reading.notes.clone(),
            }
        })
        .collect()
}

fn weighed_causes(
    case: &Case,
    evidence: Option<&ReadingEvidence>,
) -> (Standing, Option<CauseFinding>, Vec<CauseFinding>) {
    let Some(evidence) = evidence else {
        return (Standing::Unexplained, None, Vec::new());
    };
    let standing = Standing::from_unexplained(evidence.unexplained);
    let mut causes = evidence
        .causes
        .iter()
        .filter_map(|cause| named_cause(case, cause));
    // To name a cause for an unexplained reading would explain it after all.
    let best = if standing == Standing::Unexplained {
        None
    } else {
        causes.next()
    };
    (standing, best, causes.collect())
}

fn named_cause(case: &Case, cause: &Cause) -> Option<CauseFinding> {
    let (emitter, feature) = case.feature(cause.candidate, cause.feature)?;
    let origin = case
        .weighed
        .get(cause.candidate)?
        .origins
        .get(cause.feature)?;
    Some(CauseFinding {
        candidate: cause.candidate,
        feature: cause.feature,
        substance: case.name(cause.candidate)?,
        emitter: emitter.name.clone(),
        feature_nm: cause.feature_nm,
        feature_uncertainty_nm: feature.uncertainty_nm,
        order: origin.order,
        probability: cause.probability,
        residual_nm: cause.residual_nm,
        residual_sigma: cause.residual_sigma,
    })
}

/// Features of the leading composition that were expected and not seen, the likeliest first.
pub(super) fn missing(case: &Case) -> Vec<MissingLine> {
    let missing = case.inference.missing.iter().filter_map(|missing| {
        let (emitter, feature) = case.feature(missing.candidate, missing.feature)?;
        Some(MissingLine {
            substance: case.name(missing.candidate)?,
            emitter: emitter.name.clone(),
            wavelength_nm: missing.wavelength_nm,
            uncertainty_nm: feature.uncertainty_nm,
            detection_probability: missing.detection_probability,
        })
    });
    missing.collect()
}

#[cfg(test)]
mod tests {
    use super::Standing;

    #[test]
    fn standing_has_two_fences() {
        // evidence.md: explained below .2, unexplained above .8, doubtful between.
        let standing = [0.0, 0.199, 0.2, 0.5, 0.8, 0.801, 1.0].map(Standing::from_unexplained);
        use Standing::{Doubtful, Explained, Unexplained};
        assert_eq!(
            standing,
            [
                Explained,
                Explained,
                Doubtful,
                Doubtful,
                Doubtful,
                Unexplained,
                Unexplained
            ]
        );
        // A chance that is not a number must not pass for an explanation.
        assert_eq!(Standing::from_unexplained(f64::NAN), Doubtful);
    }
}
