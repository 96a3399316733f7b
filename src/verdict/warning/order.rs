//! Unexplained readings that fit a strong line of the answer read in another order.

use super::Warning;
use crate::verdict::case::Case;
use crate::verdict::lineup::is_grating;
use crate::verdict::readings::{ReadingFinding, Standing};
use crate::verdict::thresholds::{ORDER_MATCH_SIGMA, STRONG_WITHIN_DEX};
use crate::verdict::wording::wavelength_with_uncertainty;

/// One warning per unexplained reading x for which 2x or x/2 meets a strong line of the leading
/// composition. Only gratings have orders.
pub(super) fn mix_ups(case: &Case, readings: &[ReadingFinding]) -> Vec<Warning> {
    if !is_grating(case.setup.instrument()) {
        return Vec::new();
    }
    let unexplained = readings
        .iter()
        .filter(|reading| reading.standing == Standing::Unexplained);
    unexplained
        .filter_map(|reading| mix_up(case, reading))
        .collect()
}

fn mix_up(case: &Case, reading: &ReadingFinding) -> Option<Warning> {
    [2.0, 0.5].into_iter().find_map(|factor| {
        let (substance, line_nm) = strong_line_near(case, reading, factor)?;
        Some(Warning::PossibleOrderMixUp {
            reading: wavelength_with_uncertainty(reading.wavelength_nm, reading.uncertainty_nm),
            rows: reading.rows.clone(),
            substance,
            line_nm,
            doubled: factor > 1.0,
        })
    })
}

/// The nearest strong line of the leading composition to `factor` times the reading. It need not
/// lie in the range of the set-up: what falls in by another order often does not.
fn strong_line_near(case: &Case, reading: &ReadingFinding, factor: f64) -> Option<(String, f64)> {
    let sought_nm = factor * reading.wavelength_nm;
    let reading_u = factor * reading.uncertainty_nm.hypot(case.setup.offset_nm());
    let mut nearest: Option<(String, f64)> = None;
    for &member in case.leader() {
        let Some(weighed) = case.weighed.get(member) else {
            continue;
        };
        let features = &weighed.candidate.features;
        let strongest = features
            .iter()
            .map(|feature| feature.level_dex)
            .fold(f64::NEG_INFINITY, f64::max);
        for feature in features {
            let distance = (sought_nm - feature.wavelength_nm).abs();
            let close = distance <= ORDER_MATCH_SIGMA * reading_u.hypot(feature.uncertainty_nm);
            let strong = feature.level_dex >= strongest - STRONG_WITHIN_DEX;
            let nearer = nearest
                .as_ref()
                .is_none_or(|(_, line_nm)| distance < (sought_nm - line_nm).abs());
            if close && strong && nearer {
                nearest = case
                    .name(member)
                    .map(|name| (name.name, feature.wavelength_nm));
            }
        }
    }
    nearest
}
