//! Groups of substances that the readings cannot tell apart.

use super::case::Case;
use super::thresholds::{COINCIDING_DEX, EITHER_OR_RATIO, EXPLAINS_WHEN_PRESENT, LOOKED_FOR_DEX};
use super::{EitherOr, SubstanceName};

/// The leading composition with the compositions that it cannot be told from.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct LeadingGroup {
    /// Per member of the leader that can be swapped: the member, then its alternatives.
    pub swaps: Vec<Vec<usize>>,
    /// Posterior of all compositions of the group together.
    pub posterior: f64,
    /// The part of it in which all that can be seen coincides: no further reading with this
    /// set-up could part those, so that the group can be an answer.
    pub inseparable_posterior: f64,
}

impl LeadingGroup {
    /// The groups by name.
    pub fn named(&self, case: &Case) -> Vec<EitherOr> {
        self.swaps
            .iter()
            .map(|swap| EitherOr {
                substances: case.names(swap),
            })
            .collect()
    }

    /// A member of the leader with its alternatives, the member first.
    pub fn alternatives(&self, member: usize) -> Option<&[usize]> {
        self.swaps
            .iter()
            .find(|swap| swap.first() == Some(&member))
            .map(Vec::as_slice)
    }

    /// Names of a member and its alternatives, or of the member alone.
    pub fn names(&self, case: &Case, member: usize) -> Vec<SubstanceName> {
        case.names(self.alternatives(member).unwrap_or(&[member]))
    }
}

/// Finds what the leading composition cannot be told from: compositions that differ from it by
/// one substance, explain the same readings, and are within [`EITHER_OR_RATIO`] of its posterior.
pub(super) fn leading_group(case: &Case) -> LeadingGroup {
    let mut compositions = case.inference.compositions.iter();
    let Some(leader) = compositions.next() else {
        return LeadingGroup {
            swaps: Vec::new(),
            posterior: 0.0,
            inseparable_posterior: 0.0,
        };
    };
    let mut group = LeadingGroup {
        swaps: Vec::new(),
        posterior: leader.posterior,
        inseparable_posterior: leader.posterior,
    };
    for other in compositions {
        let comparable =
            other.posterior > 0.0 && leader.posterior <= EITHER_OR_RATIO * other.posterior;
        let Some((member, alternative)) = swapped(&leader.members, &other.members) else {
            continue;
        };
        if !comparable || !explain_the_same(case, member, alternative) {
            continue;
        }
        group.posterior += other.posterior;
        if covers(case, member, alternative) && covers(case, alternative, member) {
            group.inseparable_posterior += other.posterior;
        }
        match group
            .swaps
            .iter_mut()
            .find(|swap| swap.first() == Some(&member))
        {
            Some(swap) => swap.push(alternative),
            None => group.swaps.push(vec![member, alternative]),
        }
    }
    group.posterior = group.posterior.min(1.0);
    group.inseparable_posterior = group.inseparable_posterior.min(1.0);
    group
}

/// The one member of `leader` that `other` replaces, with its replacement; none if they differ
/// in any other way.
fn swapped(leader: &[usize], other: &[usize]) -> Option<(usize, usize)> {
    let only = |of: &[usize], not_in: &[usize]| {
        let mut members = of.iter().copied().filter(|member| !not_in.contains(member));
        members.next().filter(|_| members.next().is_none())
    };
    Some((only(leader, other)?, only(other, leader)?))
}

fn explain_the_same(case: &Case, a: usize, b: usize) -> bool {
    let readings = readings_explained(case, a);
    !readings.is_empty() && readings == readings_explained(case, b)
}

/// Whether every feature of `a` that would be looked for has one of `b` within the resolution.
fn covers(case: &Case, a: usize, b: usize) -> bool {
    let seen = |candidate: usize, within_dex: f64| -> Vec<f64> {
        case.relative_features(candidate)
            .into_iter()
            .filter(|(feature, level)| {
                *level >= -within_dex && case.is_visible(feature.wavelength_nm)
            })
            .map(|(feature, _)| feature.wavelength_nm)
            .collect()
    };
    let others = seen(b, COINCIDING_DEX);
    seen(a, LOOKED_FOR_DEX).iter().all(|x| {
        others
            .iter()
            .any(|y| (x - y).abs() < case.setup.resolution_nm())
    })
}

/// Readings that a candidate causes more often than not when it is present.
fn readings_explained(case: &Case, candidate: usize) -> Vec<usize> {
    let fence = EXPLAINS_WHEN_PRESENT * case.presence_of(candidate);
    let causes_it = |reading: &crate::evidence::ReadingEvidence| {
        let of_candidate = reading
            .causes
            .iter()
            .filter(|cause| cause.candidate == candidate);
        let probability: f64 = of_candidate.map(|cause| cause.probability).sum();
        probability > 0.0 && probability >= fence
    };
    let readings = case.inference.readings.iter().enumerate();
    readings
        .filter(|(_, reading)| causes_it(reading))
        .map(|(index, _)| index)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::swapped;

    #[test]
    fn only_one_swap_counts() {
        assert_eq!(swapped(&[1, 2], &[2, 5]), Some((1, 5)));
        assert_eq!(swapped(&[1], &[2]), Some((1, 2)));
        assert_eq!(swapped(&[1, 2], &[1]), None);
        assert_eq!(swapped(&[1, 2], &[3, 4]), None);
        assert_eq!(swapped(&[1, 2], &[1, 2]), None);
        assert_eq!(swapped(&[], &[1]), None);
    }
}
