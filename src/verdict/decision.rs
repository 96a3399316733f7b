//! How far an answer can be relied on.

use super::case::Case;
use super::either_or::LeadingGroup;
use super::thresholds::{DECISIVE_POSTERIOR, UNTESTED_MASS};
use super::warning::Warning;

/// How far an answer can be relied on.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Decision {
    /// The answer can stand.
    Decisive,
    /// The answer is a suggestion.
    Inconclusive,
    /// Nothing in the library explains the readings.
    Unexplained,
}

impl Decision {
    /// The word for it.
    pub fn word(self) -> &'static str {
        match self {
            Self::Decisive => "decisive",
            Self::Inconclusive => "inconclusive",
            Self::Unexplained => "unexplained",
        }
    }
}

/// Decides: `unexplained` if the leading composition is empty and there are readings; `decisive`
/// if the leader or its either/or group is likely enough, no warning caps it and next to nothing
/// was left unweighed; else `inconclusive`.
pub(super) fn decide(case: &Case, group: &LeadingGroup, warnings: &[Warning]) -> Decision {
    if case.leader().is_empty() {
        return if case.sample.readings.is_empty() {
            Decision::Inconclusive
        } else {
            Decision::Unexplained
        };
    }
    let capped = warnings.iter().any(Warning::caps_decision);
    let settled = group.inseparable_posterior >= DECISIVE_POSTERIOR
        && case.inference.untested_mass_bound < UNTESTED_MASS;
    if settled && !capped {
        Decision::Decisive
    } else {
        Decision::Inconclusive
    }
}
