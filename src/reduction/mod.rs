//! From readings to air wavelengths with uncertainties: unit conversion, defaults,
//! pooling of repeats, strengths in decades above the faintest recordable one.

pub mod air;
mod pool;

use crate::reading::{ObservedForm, Sample};
use crate::setup::Setup;

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
    /// Form as seen.
    pub form: Option<ObservedForm>,
    /// Observed width, nm.
    pub width_nm: Option<f64>,
    /// Diffraction order.
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
    /// No `faintest`: the weakest strength given is the threshold.
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
}
