//! What the picture shows: one lane of features per substance that the answer speaks of.

use super::SubstanceName;
use super::case::Case;
use super::readings::ReadingFinding;
use super::thresholds::DRAWN_WITHIN_DEX;

/// What a mark in a lane stands for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Mark {
    /// A feature that is the best cause of a reading.
    Matched,
    /// A feature that was expected and not seen.
    Missing,
    /// Another feature of the substance.
    Listed,
}

/// A feature in a lane.
#[derive(Debug, Clone, PartialEq)]
pub struct LaneMark {
    /// Position, nm, air.
    pub wavelength_nm: f64,
    /// What it stands for.
    pub mark: Mark,
}

/// The features of one substance within the range of the set-up.
#[derive(Debug, Clone, PartialEq)]
pub struct Lane {
    /// Substance.
    pub substance: SubstanceName,
    /// Features in ascending wavelength.
    pub marks: Vec<LaneMark>,
}

/// Lanes in the order in which the answer names the substances.
pub(super) fn lanes(case: &Case, readings: &[ReadingFinding]) -> Vec<Lane> {
    let spoken_of = case.spoken_of().into_iter();
    spoken_of
        .filter_map(|candidate| {
            Some(Lane {
                substance: case.name(candidate)?,
                marks: marks(case, readings, candidate),
            })
        })
        .collect()
}

fn marks(case: &Case, readings: &[ReadingFinding], candidate: usize) -> Vec<LaneMark> {
    let causes = readings.iter().filter_map(|reading| reading.cause.as_ref());
    let matched = causes.filter(|cause| cause.candidate == candidate);
    let mut marks: Vec<LaneMark> = matched
        .map(|cause| LaneMark {
            wavelength_nm: cause.feature_nm,
            mark: Mark::Matched,
        })
        .collect();
    let missing = case
        .inference
        .missing
        .iter()
        .filter(|missing| missing.candidate == candidate);
    marks.extend(missing.map(|missing| LaneMark {
        wavelength_nm: missing.wavelength_nm,
        mark: Mark::Missing,
    }));
    // Features that merge into a marked one at this resolution are part of it.
    let taken: Vec<f64> = marks.iter().map(|mark| mark.wavelength_nm).collect();
    let resolution_nm = case.setup.resolution_nm();
    let free = |nm: f64| {
        taken
            .iter()
            .all(|taken| (taken - nm).abs() >= resolution_nm)
    };
    let strong = case
        .relative_features(candidate)
        .into_iter()
        .filter(|(_, dex)| *dex >= -DRAWN_WITHIN_DEX);
    marks.extend(
        strong
            .map(|(feature, _)| feature.wavelength_nm)
            .filter(|&nm| free(nm))
            .map(|wavelength_nm| LaneMark {
                wavelength_nm,
                mark: Mark::Listed,
            }),
    );
    marks.sort_by(|a, b| a.wavelength_nm.total_cmp(&b.wavelength_nm));
    marks
}
