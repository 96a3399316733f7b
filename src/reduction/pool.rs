//! Repeats of one feature become one reading.

use super::position::Place;
use super::{ReducedReading, ReducedStrength};
use crate::reading::Reading;
use crate::setup::Setup;
use std::cmp::Ordering;

/// A row ready to be pooled.
#[derive(Debug, Clone, Copy)]
pub(super) struct ForPooling<'a> {
    pub reading: &'a Reading,
    pub place: Place,
    pub strength: Option<ReducedStrength>,
}

/// Pools repeats by complete linkage in ascending order: rows that share a mark are one group
/// whatever their distance; then each group joins the one before it if every row of the one may
/// pool with every row of the other. The result ascends.
pub(super) fn pool(rows: Vec<ForPooling<'_>>, setup: &Setup) -> Vec<ReducedReading> {
    let mut groups: Vec<Vec<ForPooling<'_>>> = Vec::new();
    for next in marked_groups(rows) {
        match groups.last_mut() {
            Some(last) if all_pairs(last, &next, |a, b| may_pool(a, b, setup)) => last.extend(next),
            _ => groups.push(next),
        }
    }
    let mut readings: Vec<ReducedReading> = groups.iter().map(|group| one_reading(group)).collect();
    readings.sort_by(|a, b| {
        a.wavelength_nm
            .total_cmp(&b.wavelength_nm)
            .then_with(|| a.rows.cmp(&b.rows))
    });
    readings
}

/// Groups of rows with one `repeat_of` mark, and every unmarked row by itself, in ascending order
/// of mean position.
fn marked_groups(mut rows: Vec<ForPooling<'_>>) -> Vec<Vec<ForPooling<'_>>> {
    rows.sort_by(|a, b| in_order(a, b));
    let mut groups: Vec<Vec<ForPooling<'_>>> = Vec::new();
    for row in rows {
        let mark = row.reading.repeat_of.as_ref();
        let same = |group: &&mut Vec<ForPooling<'_>>| {
            mark.is_some()
                && group
                    .first()
                    .is_some_and(|first| first.reading.repeat_of.as_ref() == mark)
        };
        match groups.iter_mut().find(same) {
            Some(group) => group.push(row),
            None => groups.push(vec![row]),
        }
    }
    // The sort is stable: groups at one position stay in the order of their first rows.
    groups.sort_by(|a, b| mean_position(a).total_cmp(&mean_position(b)));
    groups
}

/// An order of rows that does not depend on where they stand in the table unless they are alike.
fn in_order(a: &ForPooling<'_>, b: &ForPooling<'_>) -> Ordering {
    let numbers = |row: &ForPooling<'_>| (row.place.wavelength_nm, row.place.uncertainty_nm);
    let ((x_a, u_a), (x_b, u_b)) = (numbers(a), numbers(b));
    x_a.total_cmp(&x_b)
        .then(u_a.total_cmp(&u_b))
        .then_with(|| a.reading.observer.cmp(&b.reading.observer))
        .then_with(|| a.reading.repeat_of.cmp(&b.reading.repeat_of))
        .then(a.reading.row.cmp(&b.reading.row))
}

/// True if a relation holds between every row of one group and every row of another.
fn all_pairs<'a>(
    a: &[ForPooling<'a>],
    b: &[ForPooling<'a>],
    relation: impl Fn(&ForPooling<'a>, &ForPooling<'a>) -> bool,
) -> bool {
    a.iter()
        .all(|one| b.iter().all(|other| relation(one, other)))
}

/// Whether two rows may be readings of one feature.
///
/// Rows with different marks are not pooled. Rows of different observers: |Δ| < 2·hypot(u₁, u₂).
/// Otherwise, one observer or an unknown one: |Δ| < max(division, min(2·hypot(u₁, u₂), w/2)).
fn may_pool(a: &ForPooling<'_>, b: &ForPooling<'_>, setup: &Setup) -> bool {
    let (mark_a, mark_b) = (&a.reading.repeat_of, &b.reading.repeat_of);
    if mark_a.is_some() && mark_b.is_some() {
        return mark_a == mark_b;
    }
    let apart = (a.place.wavelength_nm - b.place.wavelength_nm).abs();
    let two_sigma = 2.0 * a.place.uncertainty_nm.hypot(b.place.uncertainty_nm);
    let different_observers = match (&a.reading.observer, &b.reading.observer) {
        (Some(one), Some(other)) => one != other,
        _ => false,
    };
    if different_observers {
        apart < two_sigma
    } else {
        let close = two_sigma.min(setup.resolution_nm() / 2.0);
        apart < close.max(setup.division_nm().unwrap_or(0.0))
    }
}

/// The smallest u of a group, and the weight (u_min/u)² of each row: u⁻² on a scale that cannot overflow.
fn weights(group: &[ForPooling<'_>]) -> (f64, Vec<f64>) {
    let least = group
        .iter()
        .map(|row| row.place.uncertainty_nm)
        .fold(f64::INFINITY, f64::min);
    (
        least,
        group
            .iter()
            .map(|row| (least / row.place.uncertainty_nm).powi(2))
            .collect(),
    )
}

/// Σ x u⁻² / Σ u⁻².
fn mean_position(group: &[ForPooling<'_>]) -> f64 {
    let (_, weights) = weights(group);
    let sum: f64 = weights
        .iter()
        .zip(group)
        .map(|(w, row)| w * row.place.wavelength_nm)
        .sum();
    sum / weights.iter().sum::<f64>()
}

/// u = max((Σu⁻²)^−½, SD/√k); the common offset is not reduced and stands elsewhere.
///
/// SD/√k is the standard error of the weighted mean from the scatter itself,
/// √(Σ w (x − x̄)² / ((k − 1) Σ w)) with w ∝ u⁻²: with equal u just SD/√k, and with unequal u
/// a poor reading beside a good one does not spoil it.
fn pooled_uncertainty(group: &[ForPooling<'_>], mean: f64) -> f64 {
    let (least, weights) = weights(group);
    let total: f64 = weights.iter().sum();
    let square = |row: &ForPooling<'_>| (row.place.wavelength_nm - mean).powi(2);
    let squares: f64 = weights
        .iter()
        .zip(group)
        .map(|(w, row)| w * square(row))
        .sum();
    let freedom = group.len().saturating_sub(1).max(1) as f64;
    (least / total.sqrt()).max((squares / (freedom * total)).sqrt())
}

/// The mean in decades of the strengths stated, with u = max(√(Σu²)/k, SD/√k).
fn pooled_strength(group: &[ForPooling<'_>]) -> Option<ReducedStrength> {
    let stated: Vec<ReducedStrength> = group.iter().filter_map(|row| row.strength).collect();
    let count = stated.len() as f64;
    if stated.is_empty() {
        return None;
    }
    let mean = stated
        .iter()
        .map(|strength| strength.above_faintest_dex)
        .sum::<f64>()
        / count;
    let variances: f64 = stated
        .iter()
        .map(|strength| strength.uncertainty_dex.powi(2))
        .sum();
    let squares: f64 = stated
        .iter()
        .map(|strength| (strength.above_faintest_dex - mean).powi(2))
        .sum();
    let scatter = (squares / (count * (count - 1.0).max(1.0))).sqrt();
    let uncertainty_dex = (variances.sqrt() / count).max(scatter);
    Some(ReducedStrength {
        above_faintest_dex: mean,
        uncertainty_dex,
    })
}

/// Makes one reading of a group: weighted mean, saturated if any row is, the lowest order, the form
/// all agree on, notes in order of rows.
fn one_reading(group: &[ForPooling<'_>]) -> ReducedReading {
    let mut by_row: Vec<&Reading> = group.iter().map(|row| row.reading).collect();
    by_row.sort_by_key(|reading| reading.row);
    // A row by itself keeps its numbers to the last digit.
    let (wavelength_nm, uncertainty_nm, strength) = match group {
        [only] => (
            only.place.wavelength_nm,
            only.place.uncertainty_nm,
            only.strength,
        ),
        _ => {
            let mean = mean_position(group);
            (
                mean,
                pooled_uncertainty(group, mean),
                pooled_strength(group),
            )
        }
    };
    let mut forms = by_row.iter().filter_map(|reading| reading.form);
    let first_form = forms.next();
    let widths: Vec<f64> = by_row
        .iter()
        .filter_map(|reading| reading.width_nm)
        .collect();
    ReducedReading {
        rows: by_row.iter().map(|reading| reading.row).collect(),
        wavelength_nm,
        uncertainty_nm,
        strength,
        saturated: by_row.iter().any(|reading| reading.saturated),
        form: first_form.filter(|first| forms.all(|form| form == *first)),
        width_nm: (!widths.is_empty()).then(|| widths.iter().sum::<f64>() / widths.len() as f64),
        order: by_row
            .iter()
            .map(|reading| reading.order)
            .min()
            .unwrap_or(1),
        notes: by_row
            .iter()
            .filter_map(|reading| reading.note.clone())
            .collect(),
    }
}
