//! Strengths as decades above the faintest that would have been recorded.

use super::{ReducedStrength, ReductionError, ReductionRemark};
use crate::reading::{Reading, Strength, StrengthWord};
use crate::setup::Setup;

/// Standard uncertainty of a strength given as a word, decades.
const WORD_UNCERTAINTY_DEX: f64 = 0.35;
/// The strongest reading is taken to lie at least this far below the top of the range, decades.
const HEADROOM_DEX: f64 = 0.3;
/// People who cut a list stop at these counts.
const ROUND_COUNTS: [usize; 5] = [10, 12, 15, 20, 25];

/// The scale on which the strengths of a sample are placed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Scale {
    /// The faintest recordable number; absent if no strength is a number.
    threshold: Option<f64>,
    /// D after looking at the strengths, decades.
    pub dynamic_range_dex: f64,
    /// The list was cut by count.
    pub cut_by_count: bool,
    strength_uncertainty_dex: f64,
}

impl Scale {
    /// Finds threshold and D from the rows that count; whether the list was cut, from all as typed.
    pub(super) fn of(
        typed: &[Reading],
        kept: &[&Reading],
        setup: &Setup,
        remarks: &mut Vec<ReductionRemark>,
    ) -> Result<Self, ReductionError> {
        for reading in typed {
            check_numbers(reading)?;
        }
        let numbers: Vec<(usize, f64)> = kept
            .iter()
            .filter_map(|reading| Some((reading.row, number(reading)?)))
            .collect();
        let cut = cut_by_count(typed, setup);
        let threshold = match weakest(&numbers) {
            None => None,
            Some((_, weakest)) if cut.is_some() => Some(weakest),
            Some(weakest) => Some(threshold(weakest, setup.faintest(), remarks)),
        };
        remarks.extend(cut.clone());
        let dynamic_range_dex = match threshold {
            Some(threshold) => widened(setup.dynamic_range_dex(), &numbers, threshold),
            None if cut.is_some() => setup.dynamic_range_dex() / 2.0,
            None => setup.dynamic_range_dex(),
        };
        let strength_uncertainty_dex = setup.strength_uncertainty_dex();
        Ok(Self {
            threshold,
            dynamic_range_dex,
            cut_by_count: cut.is_some(),
            strength_uncertainty_dex,
        })
    }

    /// The strength of one row: y = log10(strength/threshold) for numbers with u_y from the row or the
    /// set-up; words at .15 / .4 / .7 / .95 of D with u_y from the row or .35.
    pub(super) fn place(&self, reading: &Reading) -> Option<ReducedStrength> {
        let (above_faintest_dex, usual) = match reading.strength? {
            Strength::Number(number) => (
                above(number, self.threshold?),
                self.strength_uncertainty_dex,
            ),
            Strength::Word(word) => (share(word) * self.dynamic_range_dex, WORD_UNCERTAINTY_DEX),
        };
        let uncertainty_dex = reading.strength_uncertainty_dex.unwrap_or(usual);
        Some(ReducedStrength {
            above_faintest_dex,
            uncertainty_dex,
        })
    }
}

/// Words and numbers in one sample are refused. The row named is the first of the kind that comes
/// second, in order of rows.
pub(super) fn check_kinds(readings: &[Reading]) -> Result<(), ReductionError> {
    let first_row = |word: bool| {
        let of_kind = readings.iter().filter(|reading| match reading.strength {
            Some(Strength::Word(_)) => word,
            Some(Strength::Number(_)) => !word,
            None => false,
        });
        of_kind.map(|reading| reading.row).min()
    };
    match (first_row(true), first_row(false)) {
        (Some(word), Some(number)) => Err(ReductionError::MixedStrengths {
            row: word.max(number),
        }),
        _ => Ok(()),
    }
}

/// Strengths and their uncertainties must be finite and above zero.
fn check_numbers(reading: &Reading) -> Result<(), ReductionError> {
    let numbers = [
        ("strength", number(reading)),
        ("strength uncertainty", reading.strength_uncertainty_dex),
    ];
    for (what, value) in numbers {
        if let Some(value) = value.filter(|value| !(value.is_finite() && *value > 0.0)) {
            let expected = "above zero";
            return Err(ReductionError::Unusable {
                row: reading.row,
                what,
                value,
                expected,
            });
        }
    }
    Ok(())
}

/// The strength of a row, if it is a number.
fn number(reading: &Reading) -> Option<f64> {
    match reading.strength {
        Some(Strength::Number(number)) => Some(number),
        _ => None,
    }
}

/// The weakest strength and its row; of equal ones the first row.
fn weakest(numbers: &[(usize, f64)]) -> Option<(usize, f64)> {
    numbers
        .iter()
        .copied()
        .min_by(|a, b| a.1.total_cmp(&b.1).then(a.0.cmp(&b.0)))
}

/// A strength below `faintest` lowers the threshold to itself with a warning. Without `faintest` the
/// weakest strength given is the threshold, and a warning says so.
fn threshold(
    (row, weakest): (usize, f64),
    faintest: Option<f64>,
    remarks: &mut Vec<ReductionRemark>,
) -> f64 {
    match faintest {
        Some(faintest) if weakest >= faintest => faintest,
        Some(_) => {
            remarks.push(ReductionRemark::ThresholdLowered { row });
            weakest
        }
        None => {
            remarks.push(ReductionRemark::ThresholdFromWeakest);
            weakest
        }
    }
}

/// A list is cut by count if `listed_at_most = N` and n = N, or if n as typed is 10, 12, 15, 20 or
/// 25, all with numeric strengths and no `faintest`. A list longer than it is said to be at most
/// (repeats are typed too) counts as cut.
fn cut_by_count(typed: &[Reading], setup: &Setup) -> Option<ReductionRemark> {
    let count = typed.len();
    if setup.listed_at_most().is_some_and(|most| count >= most) {
        return Some(ReductionRemark::CutByCount {
            count,
            stated: true,
        });
    }
    let all_numbers = typed.iter().all(|reading| number(reading).is_some());
    let round = ROUND_COUNTS.contains(&count) && all_numbers && setup.faintest().is_none();
    (round && setup.listed_at_most().is_none()).then_some(ReductionRemark::CutByCount {
        count,
        stated: false,
    })
}

/// y = log10(strength/threshold).
fn above(strength: f64, threshold: f64) -> f64 {
    strength.log10() - threshold.log10()
}

/// D = max(D, max y + .3).
fn widened(dynamic_range_dex: f64, numbers: &[(usize, f64)], threshold: f64) -> f64 {
    let heights = numbers
        .iter()
        .map(|(_, number)| above(*number, threshold) + HEADROOM_DEX);
    heights.fold(dynamic_range_dex, f64::max)
}

/// Words sit on \[0, D\] and never redefine the threshold.
fn share(word: StrengthWord) -> f64 {
    match word {
        StrengthWord::Faint => 0.15,
        StrengthWord::Medium => 0.4,
        StrengthWord::Strong => 0.7,
        StrengthWord::Dominant => 0.95,
    }
}
