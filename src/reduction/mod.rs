//! From readings to air wavelengths with uncertainties: unit conversion, defaults,
//! pooling of repeats, strengths in decades above the faintest recordable one.
//!
//! [`reduce`] is the whole story in order; each rule is one function with its text:
//! `position` converts, `pool` joins repeats, `strength` places strengths.

pub mod air;
mod pool;
mod position;
mod strength;

use crate::reading::{ObservedForm, Reading, Sample};
use crate::setup::Setup;
use pool::{ForPooling, pool};
use position::Place;
use strength::Scale;

/// A maximum wider than this is a remark about the continuum, nm.
const WIDEST_FEATURE_NM: f64 = 15.0;

/// The strength of a reduced reading.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ReducedStrength {
    /// log10(intensity / faintest recordable intensity); y in the model.
    pub above_faintest_dex: f64,
    /// Its standard uncertainty, decades.
    pub uncertainty_dex: f64,
}

/// A reading ready for the evidence: one feature as seen, repeats pooled.
#[derive(Debug, Clone, PartialEq)]
pub struct ReducedReading {
    /// Rows of the table that were pooled, ascending.
    pub rows: Vec<usize>,
    /// Position in air, nm.
    pub wavelength_nm: f64,
    /// Standard uncertainty, nm, without the common offset.
    pub uncertainty_nm: f64,
    /// Strength, if stated.
    pub strength: Option<ReducedStrength>,
    /// The strength is a lower bound.
    pub saturated: bool,
    /// Form as seen, if the pooled rows that state one agree.
    pub form: Option<ObservedForm>,
    /// Observed width, nm; the mean of pooled rows that state one.
    pub width_nm: Option<f64>,
    /// Diffraction order it was read in, the lowest of pooled rows. The wavelength is as typed, not
    /// multiplied or divided by it: the order only says which other orders can overlap here.
    pub order: u32,
    /// Notes of the pooled rows.
    pub notes: Vec<String>,
}

/// Why a reading takes no part.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum AsideReason {
    /// Outside the range of the set-up.
    OutOfRange,
    /// In a blind stretch.
    BlindStretch,
    /// Wider than 15 nm: a remark about the continuum.
    ContinuumMaximum,
}

/// A reading that takes no part in the evidence.
#[derive(Debug, Clone, PartialEq)]
pub struct SetAside {
    /// Row of the table.
    pub row: usize,
    /// Position in air, nm.
    pub wavelength_nm: f64,
    /// Why.
    pub reason: AsideReason,
}

/// What was assumed or noticed while reducing; the verdict turns these into warnings.
#[derive(Debug, Clone, PartialEq)]
pub enum ReductionRemark {
    /// Rows without an uncertainty took the set-up's.
    UncertaintyAssumed {
        /// Rows concerned.
        rows: Vec<usize>,
        /// The value taken, nm.
        uncertainty_nm: f64,
    },
    /// No `faintest`: the weakest strength given is the threshold. Not said of a list cut by
    /// count, where that goes without saying.
    ThresholdFromWeakest,
    /// A strength below `faintest` lowered the threshold to itself.
    ThresholdLowered {
        /// Row concerned.
        row: usize,
    },
    /// The list was cut by count.
    CutByCount {
        /// Number of readings as typed.
        count: usize,
        /// True if the set-up said so; false if inferred from a round number.
        stated: bool,
    },
    /// Repeats were pooled.
    Pooled {
        /// Rows pooled into one reading.
        rows: Vec<usize>,
    },
}

/// A sample ready for the evidence.
#[derive(Debug, Clone, PartialEq)]
pub struct ReducedSample {
    /// Name.
    pub name: String,
    /// Label, if the rows agree on one.
    pub label: Option<String>,
    /// Readings in ascending wavelength.
    pub readings: Vec<ReducedReading>,
    /// Positions (nm, air) of neighbouring readings further apart than the pooling rule but closer
    /// than w: the observer told them apart, so features are split between them. Ascending.
    pub splits: Vec<(f64, f64)>,
    /// Readings that take no part.
    pub set_aside: Vec<SetAside>,
    /// Dynamic range D after looking at the strengths, decades.
    pub dynamic_range_dex: f64,
    /// The list was cut by count.
    pub cut_by_count: bool,
    /// Assumptions and observations, in a fixed order.
    pub remarks: Vec<ReductionRemark>,
}

/// Why a sample cannot be reduced.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum ReductionError {
    /// Words and numbers in one sample.
    #[error("strengths are words in some rows and numbers in others (use one kind in a sample)")]
    MixedStrengths {
        /// First row of the kind that comes second.
        row: usize,
    },
    /// A number that no table reader would let through.
    #[error("row {row}: {what} {value} cannot be used ({expected})")]
    Unusable {
        /// Row concerned.
        row: usize,
        /// Which number.
        what: &'static str,
        /// The number.
        value: f64,
        /// What would do.
        expected: &'static str,
    },
}

/// Reduces a sample: converts, sets aside what cannot count, places strengths, pools repeats.
///
/// The order of the rows does not matter. Readings set aside take no part: they shift neither the
/// threshold nor the dynamic range. Only the count of a list cut short is taken as typed.
///
/// # Errors
/// Words and numbers for strengths in one sample, and numbers that are not finite or not positive
/// (table reading lets none through).
pub fn reduce(sample: &Sample, setup: &Setup) -> Result<ReducedSample, ReductionError> {
    strength::check_kinds(&sample.readings)?;
    let mut kept: Vec<(&Reading, Place)> = Vec::new();
    let mut set_aside = Vec::new();
    for reading in &sample.readings {
        let place = position::place(reading, setup)?;
        match reason_to_set_aside(reading, place.wavelength_nm, setup) {
            Some(reason) => {
                let wavelength_nm = place.wavelength_nm;
                set_aside.push(SetAside {
                    row: reading.row,
                    wavelength_nm,
                    reason,
                });
            }
            None => kept.push((reading, place)),
        }
    }
    set_aside.sort_by_key(|aside| aside.row);

    let mut remarks: Vec<ReductionRemark> = uncertainty_assumed(&kept, setup).into_iter().collect();
    let rows = kept.iter().map(|(reading, _)| *reading).collect::<Vec<_>>();
    let scale = Scale::of(&sample.readings, &rows, setup, &mut remarks)?;
    let for_pooling = kept
        .iter()
        .map(|(reading, place)| ForPooling {
            reading,
            place: *place,
            strength: scale.place(reading),
        })
        .collect();
    let readings = pool(for_pooling, setup);
    remarks.extend(pooled(&readings));
    Ok(ReducedSample {
        name: sample.name.clone(),
        label: common_label(&sample.readings),
        splits: splits(&readings, setup.resolution_nm()),
        readings,
        set_aside,
        dynamic_range_dex: scale.dynamic_range_dex,
        cut_by_count: scale.cut_by_count,
        remarks,
    })
}

/// A reading outside R or in a blind stretch is set aside; a maximum wider than 15 nm is a remark
/// about the continuum. R is what is left of the stated range for the eye.
fn reason_to_set_aside(reading: &Reading, nm: f64, setup: &Setup) -> Option<AsideReason> {
    let [low, high] = setup.seen_range();
    if !(low..=high).contains(&nm) {
        Some(AsideReason::OutOfRange)
    } else if setup.is_blind(nm) {
        Some(AsideReason::BlindStretch)
    } else if reading
        .width_nm
        .is_some_and(|width| width > WIDEST_FEATURE_NM)
    {
        Some(AsideReason::ContinuumMaximum)
    } else {
        None
    }
}

/// Says which readings took the set-up's uncertainty.
fn uncertainty_assumed(kept: &[(&Reading, Place)], setup: &Setup) -> Option<ReductionRemark> {
    let without = kept
        .iter()
        .filter(|(reading, _)| reading.uncertainty.is_none());
    let mut rows: Vec<usize> = without.map(|(reading, _)| reading.row).collect();
    rows.sort_unstable();
    let uncertainty_nm = setup.uncertainty_nm();
    (!rows.is_empty()).then_some(ReductionRemark::UncertaintyAssumed {
        rows,
        uncertainty_nm,
    })
}

/// Says which rows were pooled, in ascending wavelength.
fn pooled(readings: &[ReducedReading]) -> impl Iterator<Item = ReductionRemark> {
    let several = readings.iter().filter(|reading| reading.rows.len() > 1);
    several.map(|reading| ReductionRemark::Pooled {
        rows: reading.rows.clone(),
    })
}

/// Neighbours closer than w that were not pooled split the features locally; w stays what it is
/// elsewhere. (A sodium doublet read as two lines scored 7.1 nats with w = 0.8 nm, 14.8 with 0.5.)
fn splits(readings: &[ReducedReading], resolution_nm: f64) -> Vec<(f64, f64)> {
    let neighbours = readings.iter().zip(readings.iter().skip(1));
    neighbours
        .map(|(a, b)| (a.wavelength_nm, b.wavelength_nm))
        .filter(|(a, b)| b - a < resolution_nm)
        .collect()
}

/// The label, if all rows that carry one agree.
fn common_label(readings: &[Reading]) -> Option<String> {
    let mut labels = readings.iter().filter_map(|reading| reading.label.as_ref());
    let first = labels.next()?;
    labels.all(|label| label == first).then(|| first.clone())
}

#[cfg(test)]
mod tests;
