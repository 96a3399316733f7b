//! Every threshold between evidence and words, each with its reason.

/// A leader (or its either/or group) from here on may be called decisive: one error in ten at the
/// most is what a class can live with, and it leaves room for a ubiquitous trace that is half seen.
pub const DECISIVE_POSTERIOR: f64 = 0.90;

/// Probability mass of compositions not weighed that a decisive answer may leave open: a tenth of
/// what [`DECISIVE_POSTERIOR`] leaves to everything else.
pub const UNTESTED_MASS: f64 = 0.01;

/// A bound on the mass not weighed above this bounds nothing: it is said so, without a number.
pub const UNTESTED_BOUNDLESS: f64 = 0.5;

/// A reading is explained when the chance that nothing weighed caused it is below this.
/// The chance over-claims when the model is wrong, so only its side of two fences is reported.
pub const EXPLAINED_BELOW: f64 = 0.2;

/// A reading is unexplained above this.
pub const UNEXPLAINED_ABOVE: f64 = 0.8;

/// So many unexplained readings speak of a substance that is not listed. One is often clutter.
pub const UNLISTED_READINGS: usize = 2;

/// Below this chance of showing at least one feature a substance cannot be tested here: its
/// absence from the readings would be no news.
pub const TESTABLE_BELOW: f64 = 0.3;

/// A shift of all readings beyond this many times the stated `offset_nm` is reported. By chance
/// one right set-up in eighty gets there.
pub const SHIFT_TIMES_OFFSET: f64 = 2.5;

/// The shift must also stand this many of its own standard deviations from zero.
pub const SHIFT_TIMES_SD: f64 = 2.0;

/// Root mean square of residuals, in standard uncertainties, above which the stated uncertainties
/// are too small. Two right residuals exceed it in 2 % of cases, more of them less often.
pub const RMS_TOO_SMALL_ABOVE: f64 = 2.0;

/// Root mean square of residuals below which the stated uncertainties are too large.
pub const RMS_TOO_LARGE_BELOW: f64 = 0.3;

/// So many explained readings are needed before uncertainties are called too large: four right
/// residuals fall below [`RMS_TOO_LARGE_BELOW`] in 1.4 % of cases.
pub const RMS_TOO_LARGE_READINGS: usize = 4;

/// Two compositions belong to one either/or group if the data and the priors together prefer one
/// by no more than this factor.
pub const EITHER_OR_RATIO: f64 = 5.0;

/// A substance is taken to explain a reading if it causes it at least this often when present.
pub const EXPLAINS_WHEN_PRESENT: f64 = 0.5;

/// Substances from this presence on count as named in the answer: cautions and lanes.
pub const NAMED_FROM_PRESENCE: f64 = 0.1;

/// Distance, in standard uncertainties, within which another order's line is called close.
pub const ORDER_MATCH_SIGMA: f64 = 3.0;

/// Features within so many decades of the strongest of their substance count as strong.
pub const STRONG_WITHIN_DEX: f64 = 0.7;

/// Features within so many decades of the strongest are drawn in a lane.
pub const DRAWN_WITHIN_DEX: f64 = 1.5;

/// Compositions below this posterior are left out of the reports, after [`COMPOSITIONS_KEPT_MIN`].
pub const COMPOSITION_KEPT_FROM: f64 = 1e-4;

/// So many compositions are reported however small.
pub const COMPOSITIONS_KEPT_MIN: usize = 5;

/// No more compositions than this are reported.
pub const COMPOSITIONS_KEPT_MAX: usize = 50;

/// A further reading must promise at least this much, in bits, to be proposed.
pub const NEXT_READING_BITS: f64 = 0.02;

/// No more further readings than this are proposed.
pub const NEXT_READINGS_KEPT: usize = 5;

/// Features down to this far below the strongest visible one, decades, are looked for when two
/// substances are told apart: a school reading goes about a decade deep.
pub(super) const LOOKED_FOR_DEX: f64 = 1.0;

/// Features of the other substance down to this far below its strongest can stand in for them.
pub(super) const COINCIDING_DEX: f64 = 1.5;
