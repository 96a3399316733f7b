//! When each warning is due.

use super::{MemoryRow, Warning, order};
use crate::library::{PriorClass, Source, Standing as SourceStanding};
use crate::reduction::{AsideReason, ReductionRemark};
use crate::setup::Candidates;
use crate::verdict::case::Case;
use crate::verdict::either_or::LeadingGroup;
use crate::verdict::next_reading::NextReading;
use crate::verdict::readings::{ReadingFinding, Standing};
use crate::verdict::sentence;
use crate::verdict::thresholds::{
    RMS_TOO_LARGE_BELOW, RMS_TOO_LARGE_READINGS, RMS_TOO_SMALL_ABOVE, SHIFT_TIMES_OFFSET,
    SHIFT_TIMES_SD, TESTABLE_BELOW, UNLISTED_READINGS, UNTESTED_MASS,
};
use crate::verdict::wording::wavelength_with_uncertainty;

/// All warnings that are due, the gravest first.
pub(in crate::verdict) fn collect(
    case: &Case,
    readings: &[ReadingFinding],
    group: &LeadingGroup,
    next_readings: &[NextReading],
) -> Vec<Warning> {
    let mut warnings = Vec::new();
    warnings.extend(unlisted(case, readings));
    warnings.extend(cut_short(case));
    warnings.extend(untested(case));
    warnings.extend(order::mix_ups(case, readings));
    warnings.extend(single_unexplained(readings));
    warnings.extend(one_line(case, readings));
    warnings.extend(cannot_separate(case, group, next_readings));
    warnings.extend(ubiquitous(case));
    warnings.extend(prior_sensitivity(case));
    warnings.extend(common_shift(case));
    warnings.extend(uncertainties(case, readings));
    warnings.extend(cannot_be_tested(case));
    warnings.extend(memory(case, readings));
    warnings.extend(not_deep_enough(case, readings));
    warnings.extend(set_aside(case));
    warnings.extend(case.sample.remarks.iter().filter_map(remark));
    warnings
}

fn position(reading: &ReadingFinding) -> String {
    wavelength_with_uncertainty(reading.wavelength_nm, reading.uncertainty_nm)
}

fn unexplained(readings: &[ReadingFinding]) -> Vec<&ReadingFinding> {
    readings
        .iter()
        .filter(|reading| reading.standing == Standing::Unexplained)
        .collect()
}

fn unlisted(case: &Case, readings: &[ReadingFinding]) -> Option<Warning> {
    let unexplained = unexplained(readings);
    (unexplained.len() >= UNLISTED_READINGS).then(|| Warning::UnlistedSubstanceLikely {
        readings: unexplained.into_iter().map(position).collect(),
        restricted: *case.setup.candidates() != Candidates::Everything,
    })
}

fn single_unexplained(readings: &[ReadingFinding]) -> Option<Warning> {
    let unexplained = unexplained(readings);
    let reading = unexplained
        .first()
        .filter(|_| unexplained.len() < UNLISTED_READINGS)?;
    Some(Warning::UnexplainedReading {
        reading: position(reading),
        rows: reading.rows.clone(),
    })
}

/// The reduction decides whether a list was cut; its remark says how it knows.
fn cut_short(case: &Case) -> Option<Warning> {
    let said = case.sample.remarks.iter().find_map(|remark| match *remark {
        ReductionRemark::CutByCount { count, stated } => {
            Some(Warning::ListCutShort { count, stated })
        }
        _ => None,
    });
    let count = case.sample.readings.len();
    said.or_else(|| {
        case.sample.cut_by_count.then_some(Warning::ListCutShort {
            count,
            stated: false,
        })
    })
}

fn untested(case: &Case) -> Option<Warning> {
    let bound = case.inference.untested_mass_bound;
    // Written so that a bound that is not a number warns.
    let small = bound < UNTESTED_MASS;
    (!small).then_some(Warning::UntestedCompositions { bound })
}

fn one_line(case: &Case, readings: &[ReadingFinding]) -> Vec<Warning> {
    let resting = case.leader().iter().copied().filter(|&member| {
        case.presence(member)
            .is_some_and(|presence| presence.rests_on_one_line)
    });
    resting
        .filter_map(|member| {
            let chance = |reading: &&ReadingFinding| {
                reading
                    .cause
                    .as_ref()
                    .filter(|cause| cause.candidate == member)
                    .map(|cause| cause.probability)
            };
            let caused = readings.iter().filter(|reading| chance(reading).is_some());
            let reading = caused.max_by(|a, b| {
                chance(a)
                    .unwrap_or(0.0)
                    .total_cmp(&chance(b).unwrap_or(0.0))
            });
            let missing = case
                .inference
                .missing
                .iter()
                .find(|missing| missing.candidate == member);
            Some(Warning::RestsOnOneLine {
                substance: case.name(member)?.name,
                reading: reading.map(position),
                look_at_nm: missing.map(|missing| missing.wavelength_nm),
            })
        })
        .collect()
}

fn cannot_separate(
    case: &Case,
    group: &LeadingGroup,
    next_readings: &[NextReading],
) -> Vec<Warning> {
    let warning = |swap: &Vec<usize>| {
        let names = case.names(swap);
        let tells = next_readings.iter().find(|next| {
            names
                .iter()
                .filter(|name| next.separates.contains(&name.id))
                .count()
                >= 2
        });
        Warning::CannotSeparate {
            substances: names.into_iter().map(|name| name.name).collect(),
            look_at_nm: tells.map(|next| next.wavelength_nm),
        }
    };
    group.swaps.iter().map(warning).collect()
}

/// Due when the leader without the ubiquitous is another one than the leader's other members.
fn ubiquitous(case: &Case) -> Option<Warning> {
    let (without, without_posterior) = case.inference.without_ubiquitous.first()?;
    let leader = case.inference.compositions.first()?;
    if !(0..case.weighed.len()).any(|candidate| case.is_ubiquitous(candidate)) {
        return None;
    }
    let others = |members: &[usize]| -> Vec<usize> {
        members
            .iter()
            .copied()
            .filter(|&member| !case.is_ubiquitous(member))
            .collect()
    };
    (others(&leader.members) != others(without)).then(|| Warning::WithAndWithoutUbiquitous {
        with: (
            sentence::composition(case, &leader.members),
            leader.posterior,
        ),
        without: (sentence::composition(case, without), *without_posterior),
    })
}

fn prior_sensitivity(case: &Case) -> Option<Warning> {
    let leader = case.leader();
    let halved = &case.inference.leader_with_priors_halved;
    let doubled = &case.inference.leader_with_priors_doubled;
    (halved != leader || doubled != leader).then(|| Warning::PriorSensitivity {
        halved: sentence::composition(case, halved),
        doubled: sentence::composition(case, doubled),
    })
}

fn common_shift(case: &Case) -> Option<Warning> {
    let shift = case.inference.offset_nm;
    let stated_nm = case.setup.offset_nm();
    let far = shift.mean.abs() > SHIFT_TIMES_OFFSET * stated_nm
        && shift.mean.abs() > SHIFT_TIMES_SD * shift.sd;
    (far && !case.leader().is_empty()).then_some(Warning::CommonShift {
        shift_nm: (shift.mean, shift.sd),
        stated_nm,
    })
}

fn uncertainties(case: &Case, readings: &[ReadingFinding]) -> Option<Warning> {
    let rms_sigma = case.inference.residual_rms_sigma?;
    let explained = readings
        .iter()
        .filter(|reading| reading.standing == Standing::Explained)
        .count();
    if rms_sigma > RMS_TOO_SMALL_ABOVE {
        Some(Warning::UncertaintiesTooSmall { rms_sigma })
    } else if rms_sigma < RMS_TOO_LARGE_BELOW && explained >= RMS_TOO_LARGE_READINGS {
        Some(Warning::UncertaintiesTooLarge { rms_sigma })
    } else {
        None
    }
}

/// Substances that the user has asked about, or that are commonly met, and that cannot show here.
fn cannot_be_tested(case: &Case) -> Option<Warning> {
    let kind = case.setup.source().index();
    let relevant = |candidate: usize| {
        let asked = case
            .weighed
            .get(candidate)
            .is_some_and(|weighed| weighed.asked_for);
        let met = case
            .substance(candidate)
            .and_then(|substance| substance.prior.get(kind));
        asked || matches!(met, Some(PriorClass::Ubiquitous | PriorClass::Usual))
    };
    let mut substances: Vec<(String, f64)> = (0..case.weighed.len())
        .filter(|&candidate| relevant(candidate) && !case.leader().contains(&candidate))
        .filter_map(|candidate| {
            Some((
                case.name(candidate)?.name,
                case.presence(candidate)?.testable,
            ))
        })
        .filter(|&(_, testable)| testable < TESTABLE_BELOW)
        .collect();
    let not_excited = case
        .not_excited
        .iter()
        .filter_map(|&index| case.library.substances.get(index));
    substances.extend(not_excited.map(|substance| (substance.name.clone(), 0.0)));
    substances.sort_by(|a, b| a.0.cmp(&b.0));
    (!substances.is_empty()).then_some(Warning::CannotBeTested { substances })
}

/// Rows of the library behind the readings that the leading composition explains.
fn memory(case: &Case, readings: &[ReadingFinding]) -> Option<Warning> {
    let mut rows: Vec<MemoryRow> = Vec::new();
    let causes = readings.iter().filter_map(|reading| reading.cause.as_ref());
    for cause in causes.filter(|cause| case.leader().contains(&cause.candidate)) {
        let Some((emitter, feature)) = case.feature(cause.candidate, cause.feature) else {
            continue;
        };
        let (position, strength) = (
            recalled(case, &feature.source_position),
            recalled(case, &feature.source_strength),
        );
        let Some(source) = position.or(strength) else {
            continue;
        };
        let what = match (position, strength) {
            (Some(_), Some(_)) => "position and strength",
            (Some(_), None) => "position",
            _ => "strength",
        };
        let row = MemoryRow {
            table: format!("features/{}.csv", cause.substance.id),
            row: feature.row,
            emitter: emitter.name.clone(),
            what,
            source: source.key.clone(),
        };
        if !rows.contains(&row) {
            rows.push(row);
        }
    }
    (!rows.is_empty()).then_some(Warning::RestsOnMemory { rows })
}

/// The first source among these that was recalled or must not decide anything.
fn recalled<'a>(case: &Case<'a>, sources: &[usize]) -> Option<&'a Source> {
    let mut sources = sources
        .iter()
        .filter_map(|&source| case.library.sources.get(source));
    sources.find(|source| {
        matches!(
            source.standing,
            SourceStanding::Memory | SourceStanding::Shaky
        )
    })
}

/// Emitters of the leading composition whose list of features ends above the threshold, if there
/// is a reading that a feature left out could explain.
fn not_deep_enough(case: &Case, readings: &[ReadingFinding]) -> Option<Warning> {
    if readings
        .iter()
        .all(|reading| reading.standing == Standing::Explained)
    {
        return None;
    }
    let kind = case.setup.source().index();
    let substances = case
        .leader()
        .iter()
        .filter_map(|&member| case.substance(member));
    let emitters: Vec<String> = substances
        .flat_map(|substance| &substance.emitters)
        .filter(|emitter| {
            let excitation = emitter.excitation.get(kind).and_then(Option::as_ref);
            excitation.is_some_and(|excitation| {
                excitation.level_dex + excitation.complete_to_dex > -case.sample.dynamic_range_dex
            })
        })
        .map(|emitter| emitter.name.clone())
        .collect();
    (!emitters.is_empty()).then_some(Warning::LibraryNotDeepEnough { emitters })
}

fn set_aside(case: &Case) -> Vec<Warning> {
    let reasons = [
        AsideReason::OutOfRange,
        AsideReason::BlindStretch,
        AsideReason::ContinuumMaximum,
    ];
    let rows = |reason: AsideReason| -> Vec<usize> {
        let aside = case
            .sample
            .set_aside
            .iter()
            .filter(|aside| aside.reason == reason);
        aside.map(|aside| aside.row).collect()
    };
    let warnings = reasons.map(|reason| Warning::ReadingsSetAside {
        reason,
        rows: rows(reason),
    });
    let due = |warning: &Warning| !matches!(warning, Warning::ReadingsSetAside { rows, .. } if rows.is_empty());
    warnings.into_iter().filter(due).collect()
}

fn remark(remark: &ReductionRemark) -> Option<Warning> {
    match remark {
        ReductionRemark::UncertaintyAssumed {
            rows,
            uncertainty_nm,
        } => Some(Warning::UncertaintyAssumed {
            rows: rows.clone(),
            uncertainty_nm: *uncertainty_nm,
        }),
        ReductionRemark::ThresholdFromWeakest => Some(Warning::ThresholdFromWeakest),
        ReductionRemark::ThresholdLowered { row } => Some(Warning::ThresholdLowered { row: *row }),
        ReductionRemark::Pooled { rows } => Some(Warning::RepeatsPooled { rows: rows.clone() }),
        // Said among the gravest already.
        ReductionRemark::CutByCount { .. } => None,
    }
}
