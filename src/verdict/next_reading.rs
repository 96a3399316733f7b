//! Where a further reading would tell most between the two leading compositions.

use super::case::Case;
use super::either_or::LeadingGroup;
use super::thresholds::{DECISIVE_POSTERIOR, NEXT_READING_BITS, NEXT_READINGS_KEPT};
use statrs::function::erf::erf;

/// Chance that a feature strong enough is recorded; 1 − ε of the model.
const RECORDED: f64 = 0.95;

/// Chance that something is noted at a place where nothing shows: clutter, hope.
const NOTED_BY_MISTAKE: f64 = 0.01;

/// Nodes over the unknown amount of a substance.
const AMOUNTS: usize = 16;

/// A further reading that would help.
#[derive(Debug, Clone, PartialEq)]
pub struct NextReading {
    /// Where to look, nm, air.
    pub wavelength_nm: f64,
    /// What looking there is expected to tell, bits.
    pub information_bits: f64,
    /// Ids of the substances it tells apart.
    pub separates: Vec<String>,
}

/// The most telling places, best first; none if the answer is settled.
///
/// Each place is weighed as one look that either finds something or not: the information is the
/// mutual information of that look and of which of the two leading compositions is true.
pub(super) fn proposals(case: &Case, group: &LeadingGroup) -> Vec<NextReading> {
    let [first, second, ..] = case.inference.compositions.as_slice() else {
        return Vec::new();
    };
    let settled = first.posterior >= DECISIVE_POSTERIOR && group.swaps.is_empty();
    let total = first.posterior + second.posterior;
    if settled || total.is_nan() || total <= 0.0 {
        return Vec::new();
    }
    let differing: Vec<usize> = symmetric_difference(&first.members, &second.members);
    let separates: Vec<String> = case
        .names(&differing)
        .into_iter()
        .map(|name| name.id)
        .collect();
    let mut places: Vec<NextReading> = differing
        .iter()
        .flat_map(|&candidate| case.relative_features(candidate))
        .map(|(feature, _)| feature.wavelength_nm)
        .filter(|&nm| !is_read_already(case, nm))
        .map(|wavelength_nm| NextReading {
            wavelength_nm,
            information_bits: information_bits(
                first.posterior / total,
                chance_noted(case, &first.members, wavelength_nm),
                chance_noted(case, &second.members, wavelength_nm),
            ),
            separates: separates.clone(),
        })
        .filter(|place| place.information_bits >= NEXT_READING_BITS)
        .collect();
    places.sort_by(|a, b| {
        b.information_bits
            .total_cmp(&a.information_bits)
            .then(a.wavelength_nm.total_cmp(&b.wavelength_nm))
    });
    keep_distinct(places, case.setup.resolution_nm())
}

fn symmetric_difference(a: &[usize], b: &[usize]) -> Vec<usize> {
    let only_a = a.iter().filter(|member| !b.contains(member));
    let only_b = b.iter().filter(|member| !a.contains(member));
    only_a.chain(only_b).copied().collect()
}

/// A place closer to a reading than the resolution has been looked at.
fn is_read_already(case: &Case, wavelength_nm: f64) -> bool {
    let near = case.setup.resolution_nm();
    case.sample.readings.iter().any(|reading| {
        (reading.wavelength_nm - wavelength_nm).abs() < near.max(3.0 * reading.uncertainty_nm)
    })
}

/// Chance that a look at a place notes something, if a composition is true: averaged over amounts
/// α uniform on [0, D], a feature is recorded with (1 − ε) Φ((α + h0)/τ).
fn chance_noted(case: &Case, members: &[usize], wavelength_nm: f64) -> f64 {
    let half_width = case.setup.resolution_nm() / 2.0;
    let range_dex = case.sample.dynamic_range_dex;
    let unseen: f64 = members
        .iter()
        .flat_map(|&member| case.relative_features(member))
        .filter(|(feature, _)| (feature.wavelength_nm - wavelength_nm).abs() <= half_width)
        .map(|(feature, relative_dex)| {
            let recorded = (0..AMOUNTS).map(|node| {
                let amount = range_dex * (node as f64 + 0.5) / AMOUNTS as f64;
                normal_cdf((amount + relative_dex) / feature.scatter_dex.max(f64::MIN_POSITIVE))
            });
            1.0 - RECORDED * recorded.sum::<f64>() / AMOUNTS as f64
        })
        .product();
    1.0 - unseen * (1.0 - NOTED_BY_MISTAKE)
}

fn normal_cdf(z: f64) -> f64 {
    0.5 * (1.0 + erf(z / std::f64::consts::SQRT_2))
}

/// Mutual information, bits, of a look that finds something with chance `a` under the first
/// hypothesis, of weight `weight`, and with chance `b` under the other.
fn information_bits(weight: f64, a: f64, b: f64) -> f64 {
    let mean = weight * a + (1.0 - weight) * b;
    (entropy_bits(mean) - weight * entropy_bits(a) - (1.0 - weight) * entropy_bits(b)).max(0.0)
}

fn entropy_bits(p: f64) -> f64 {
    let term = |p: f64| if p > 0.0 { -p * p.log2() } else { 0.0 };
    term(p) + term(1.0 - p)
}

fn keep_distinct(places: Vec<NextReading>, resolution_nm: f64) -> Vec<NextReading> {
    let mut kept: Vec<NextReading> = Vec::new();
    for place in places {
        let distinct = kept
            .iter()
            .all(|other| (other.wavelength_nm - place.wavelength_nm).abs() >= resolution_nm);
        if distinct && kept.len() < NEXT_READINGS_KEPT {
            kept.push(place);
        }
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn information_of_plain_cases() {
        // A look that settles two equal hypotheses is worth one bit, one that cannot differ none.
        assert!((information_bits(0.5, 1.0, 0.0) - 1.0).abs() < 1e-12);
        assert!(information_bits(0.5, 0.7, 0.7).abs() < 1e-12);
        // Capacity-like check by hand: H(.5) − ½H(.9) − ½H(.1) = 1 − H(.1) = 0.531004 bits.
        assert!((information_bits(0.5, 0.9, 0.1) - 0.531_004).abs() < 1e-6);
    }

    proptest! {
        #[test]
        fn information_is_between_nothing_and_the_doubt(w in 0.0..=1.0f64, a in 0.0..=1.0f64, b in 0.0..=1.0f64) {
            let bits = information_bits(w, a, b);
            prop_assert!((0.0..=entropy_bits(w) + 1e-12).contains(&bits), "{bits}");
        }
    }
}
