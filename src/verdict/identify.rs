//! The whole way of one sample: reduction, evidence, verdict. No input or output.

use super::lineup::{Lineup, Shortlist, line_up};
use super::{Verdict, judge};
use crate::evidence::{Candidate, Conditions, Inference, Observation, infer};
use crate::library::Library;
use crate::reading::{ObservedForm, Sample};
use crate::reduction::{ReducedReading, ReducedSample, ReductionError, reduce};
use crate::setup::Setup;

/// A sample that was identified, with everything that led there.
#[derive(Debug, Clone, PartialEq)]
pub struct Identified {
    /// The readings as the model saw them.
    pub sample: ReducedSample,
    /// What was weighed.
    pub lineup: Lineup,
    /// What the model says.
    pub inference: Inference,
    /// What may be said.
    pub verdict: Verdict,
}

/// Identifies one sample.
///
/// # Errors
/// If its readings cannot be reduced.
pub fn identify_sample(
    library: &Library,
    setup: &Setup,
    shortlist: &Shortlist,
    sample: &Sample,
) -> Result<Identified, ReductionError> {
    let sample = reduce(sample, setup)?;
    let lineup = line_up(library, setup, shortlist, usual_order(&sample));
    let observations: Vec<Observation> = sample.readings.iter().map(observation).collect();
    let candidates: Vec<Candidate> = lineup
        .weighed
        .iter()
        .map(|weighed| weighed.candidate.clone())
        .collect();
    let inference = infer(&observations, &conditions(setup, &sample), &candidates);
    let verdict = judge(library, setup, &sample, &lineup, &inference);
    Ok(Identified {
        sample,
        lineup,
        inference,
        verdict,
    })
}

/// The order most readings were taken in, the lowest of several; 1 without readings.
fn usual_order(sample: &ReducedSample) -> u32 {
    let count = |order: u32| {
        sample
            .readings
            .iter()
            .filter(|reading| reading.order == order)
            .count()
    };
    let orders = sample.readings.iter().map(|reading| reading.order);
    orders
        .max_by_key(|&order| (count(order), std::cmp::Reverse(order)))
        .unwrap_or(1)
}

fn observation(reading: &ReducedReading) -> Observation {
    Observation {
        wavelength_nm: reading.wavelength_nm,
        uncertainty_nm: reading.uncertainty_nm,
        strength_dex: reading
            .strength
            .map(|strength| (strength.above_faintest_dex, strength.uncertainty_dex)),
        saturated: reading.saturated,
        band: reading.form.map(|form| form == ObservedForm::Band),
    }
}

fn conditions(setup: &Setup, sample: &ReducedSample) -> Conditions {
    Conditions {
        range_nm: setup.seen_range(),
        blind_nm: setup.blind_stretches(),
        resolution_nm: setup.resolution_nm(),
        dynamic_range_dex: sample.dynamic_range_dex,
        offset_nm: setup.common_shift_nm(),
        scale_relative: setup.scale_relative(),
        splits_nm: sample
            .splits
            .iter()
            .map(|&(left, right)| [left, right])
            .collect(),
    }
}
