//! The one sentence that answers.

use super::case::Case;
use super::decision::Decision;
use super::either_or::LeadingGroup;
use super::warning::Warning;
use super::wording::{alternatives, list, probability, sentence_case};
use crate::reduction::AsideReason;
use crate::setup::Candidates;

/// From here on a leader that is not decisive is called most likely rather than possible.
const MOST_LIKELY_FROM: f64 = 0.5;

/// The sentence that answers, with the probability and whether it is decisive.
pub(super) fn answer(
    case: &Case,
    decision: Decision,
    group: &LeadingGroup,
    warnings: &[Warning],
    composed: Option<&str>,
) -> String {
    let shown = probability(group.posterior);
    if case.sample.readings.is_empty() {
        return without_readings(warnings).to_owned();
    }
    if decision == Decision::Unexplained {
        let weighed = match case.setup.candidates() {
            Candidates::Everything => "in the library",
            _ => "on the candidate list",
        };
        return format!(
            "Nothing {weighed} explains these readings: probability {shown}, unexplained."
        );
    }
    let mut finding = members(case, case.leader(), |member| {
        group
            .names(case, member)
            .into_iter()
            .map(|name| name.name)
            .collect()
    });
    if let Some(name) = composed {
        finding = format!("{finding} (together met as {name})");
    }
    let has = |test: fn(&Warning) -> bool| warnings.iter().any(test);
    if decision == Decision::Decisive {
        format!(
            "{}: probability {shown}, decisive.",
            sentence_case(&finding)
        )
    } else if has(|warning| matches!(warning, Warning::UnlistedSubstanceLikely { .. })) {
        format!(
            "A substance that is not listed is likely; of those weighed, the best fit is {finding}: \
             probability {shown} at most, not decisive."
        )
    } else if has(|warning| matches!(warning, Warning::ListCutShort { .. })) {
        format!(
            "Perhaps {finding}, on a list cut short: probability {shown} at most, not decisive."
        )
    } else {
        let likely = if group.posterior >= MOST_LIKELY_FROM {
            "Most likely"
        } else {
            "Perhaps"
        };
        format!("{likely} {finding}: probability {shown}, not decisive.")
    }
}

/// The answer where no reading is left.
fn without_readings(warnings: &[Warning]) -> &'static str {
    let mut reasons = warnings.iter().filter_map(|warning| match warning {
        Warning::ReadingsSetAside { reason, .. } => Some(*reason),
        _ => None,
    });
    match (reasons.next(), reasons.next()) {
        (Some(AsideReason::ContinuumMaximum), None) => {
            "A continuous spectrum: all that was read is wider than a line, so no substance can be \
             named."
        }
        _ => "No reading could be used, so nothing can be said.",
    }
}

/// A composition in words: `strontium and lithium, with sodium`.
pub(super) fn composition(case: &Case, composition: &[usize]) -> String {
    members(case, composition, |member| {
        case.name(member)
            .into_iter()
            .map(|name| name.name)
            .collect()
    })
}

/// What is on nearly every sample comes last, behind "with": it is seldom what was asked.
fn members(case: &Case, members: &[usize], names: impl Fn(usize) -> Vec<String>) -> String {
    let named = |ubiquitous: bool| -> Vec<String> {
        let mut chosen: Vec<usize> = members
            .iter()
            .copied()
            .filter(|&member| case.is_ubiquitous(member) == ubiquitous)
            .collect();
        chosen.sort_by(|&a, &b| {
            case.presence_of(b)
                .total_cmp(&case.presence_of(a))
                .then(a.cmp(&b))
        });
        chosen
            .into_iter()
            .map(|member| alternatives(&names(member)))
            .collect()
    };
    match (named(false).as_slice(), named(true).as_slice()) {
        ([], []) => "none of the weighed substances".to_owned(),
        ([], only) | (only, []) => list(only),
        (sought, with) => format!("{}, with {}", list(sought), list(with)),
    }
}

/// The name of a finding made of several substances, such as air: its parts are exactly the
/// leading composition, with or without the ubiquitous.
pub(super) fn composed_name(case: &Case) -> Option<String> {
    let ids = |keep: &dyn Fn(usize) -> bool| -> Vec<&str> {
        let kept = case.leader().iter().copied().filter(|&member| keep(member));
        let mut ids: Vec<&str> = kept
            .filter_map(|member| case.substance(member))
            .map(|substance| substance.id.as_str())
            .collect();
        ids.sort_unstable();
        ids
    };
    let (all, sought) = (ids(&|_| true), ids(&|member| !case.is_ubiquitous(member)));
    let found = case.library.composed.iter().find(|composed| {
        let mut parts: Vec<&str> = composed.parts.iter().map(String::as_str).collect();
        parts.sort_unstable();
        parts.len() > 1 && (parts == all || parts == sought)
    });
    found.map(|composed| composed.name.clone())
}
