//! Warnings: one enum, each with a stable code, a message in plain words and what to do next.

mod collect;
mod order;
mod words;

pub(super) use collect::collect;

use crate::reduction::AsideReason;

/// A row of the library that rests on memory or is marked shaky.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct MemoryRow {
    /// Table within the library.
    pub table: String,
    /// Line of that table.
    pub row: usize,
    /// Emitter.
    pub emitter: String,
    /// `position`, `strength` or `position and strength`.
    pub what: &'static str,
    /// Key of the source.
    pub source: String,
}

/// Something the reader must know before relying on the answer. Wavelengths and uncertainties are
/// in nm, rows are lines of the readings table.
#[derive(Debug, Clone, PartialEq)]
pub enum Warning {
    /// Several readings that nothing weighed explains.
    UnlistedSubstanceLikely {
        /// Positions of those readings, as words.
        readings: Vec<String>,
        /// Only part of the library was weighed.
        restricted: bool,
    },
    /// The list was cut by count.
    ListCutShort {
        /// Readings as typed.
        count: usize,
        /// Said by the set-up; otherwise inferred from a round number.
        stated: bool,
    },
    /// Too much was left unweighed.
    UntestedCompositions {
        /// Bound on the probability of what was not weighed.
        bound: f64,
    },
    /// Substances of the answer that stand on a single reading.
    RestsOnOneLine {
        /// Substance.
        substance: String,
        /// Position of the reading, as words.
        reading: Option<String>,
        /// Where else it should show, nm, if anywhere.
        look_at_nm: Option<f64>,
    },
    /// Substances that cannot be told apart here.
    CannotSeparate {
        /// Names.
        substances: Vec<String>,
        /// The reading that would tell them apart best, nm, if there is one in range.
        look_at_nm: Option<f64>,
    },
    /// The answer changes when ubiquitous substances are left out of account.
    WithAndWithoutUbiquitous {
        /// Leader as it stands: names and probability.
        with: (String, f64),
        /// Leader without the ubiquitous.
        without: (String, f64),
    },
    /// The answer depends on how common the substances are held to be.
    PriorSensitivity {
        /// Leader with the prior odds halved.
        halved: String,
        /// Leader with the prior odds doubled.
        doubled: String,
    },
    /// All readings lie to one side.
    CommonShift {
        /// Mean and standard deviation of the shift, nm.
        shift_nm: (f64, f64),
        /// What the set-up allows, nm.
        stated_nm: f64,
    },
    /// Residuals larger than the stated uncertainties.
    UncertaintiesTooSmall {
        /// Root mean square of the residuals in standard uncertainties.
        rms_sigma: f64,
    },
    /// Residuals smaller than the stated uncertainties.
    UncertaintiesTooLarge {
        /// Root mean square of the residuals in standard uncertainties.
        rms_sigma: f64,
    },
    /// An unexplained reading fits a strong line read in another order.
    PossibleOrderMixUp {
        /// Position of the reading, as words.
        reading: String,
        /// Rows of the reading.
        rows: Vec<usize>,
        /// Substance whose line it may be.
        substance: String,
        /// Position of that line, nm.
        line_nm: f64,
        /// The line is at twice the reading, otherwise at half of it.
        doubled: bool,
    },
    /// A single reading that nothing weighed explains.
    UnexplainedReading {
        /// Its position, as words.
        reading: String,
        /// Its rows.
        rows: Vec<usize>,
    },
    /// Substances whose absence the readings cannot show.
    CannotBeTested {
        /// Name and chance of showing at all.
        substances: Vec<(String, f64)>,
    },
    /// The answer uses rows of the library that are not looked up.
    RestsOnMemory {
        /// Those rows.
        rows: Vec<MemoryRow>,
    },
    /// The set-up reaches fainter features than the library lists.
    LibraryNotDeepEnough {
        /// Emitters concerned.
        emitters: Vec<String>,
    },
    /// Readings without an uncertainty took the set-up's.
    UncertaintyAssumed {
        /// Rows.
        rows: Vec<usize>,
        /// Value taken, nm.
        uncertainty_nm: f64,
    },
    /// The weakest strength stands for the threshold.
    ThresholdFromWeakest,
    /// A strength below `faintest` lowered the threshold.
    ThresholdLowered {
        /// Row.
        row: usize,
    },
    /// Readings that take no part.
    ReadingsSetAside {
        /// Why.
        reason: AsideReason,
        /// Rows.
        rows: Vec<usize>,
    },
    /// Repeats were pooled into one reading.
    RepeatsPooled {
        /// Rows.
        rows: Vec<usize>,
    },
    /// A column that means nothing here.
    UnknownColumn {
        /// Header text.
        column: String,
    },
    /// A column that means something, but not to this command.
    UnusedColumn {
        /// Header text.
        column: String,
    },
}

impl Warning {
    /// The stable code, in kebab-case.
    pub fn code(&self) -> &'static str {
        match self {
            Self::UnlistedSubstanceLikely { .. } => "unlisted-substance-likely",
            Self::ListCutShort { .. } => "list-cut-short",
            Self::UntestedCompositions { .. } => "untested-compositions",
            Self::RestsOnOneLine { .. } => "rests-on-one-line",
            Self::CannotSeparate { .. } => "cannot-separate",
            Self::WithAndWithoutUbiquitous { .. } => "with-and-without-ubiquitous",
            Self::PriorSensitivity { .. } => "prior-sensitivity",
            Self::CommonShift { .. } => "common-shift",
            Self::UncertaintiesTooSmall { .. } => "uncertainties-too-small",
            Self::UncertaintiesTooLarge { .. } => "uncertainties-too-large",
            Self::PossibleOrderMixUp { .. } => "possible-order-mix-up",
            Self::UnexplainedReading { .. } => "unexplained-reading",
            Self::CannotBeTested { .. } => "cannot-be-tested",
            Self::RestsOnMemory { .. } => "rests-on-memory",
            Self::LibraryNotDeepEnough { .. } => "library-not-deep-enough",
            Self::UncertaintyAssumed { .. } => "uncertainty-assumed",
            Self::ThresholdFromWeakest => "threshold-from-weakest",
            Self::ThresholdLowered { .. } => "threshold-lowered",
            Self::ReadingsSetAside {
                reason: AsideReason::OutOfRange,
                ..
            } => "reading-out-of-range",
            Self::ReadingsSetAside {
                reason: AsideReason::BlindStretch,
                ..
            } => "reading-in-blind-stretch",
            Self::ReadingsSetAside {
                reason: AsideReason::ContinuumMaximum,
                ..
            } => "continuum-maximum",
            Self::RepeatsPooled { .. } => "repeats-pooled",
            Self::UnknownColumn { .. } => "unknown-column",
            Self::UnusedColumn { .. } => "unused-column",
        }
    }

    /// No answer is decisive beside this warning.
    pub fn caps_decision(&self) -> bool {
        matches!(
            self,
            Self::UnlistedSubstanceLikely { .. } | Self::ListCutShort { .. }
        )
    }
}
