//! What single compositions say about every reading and line.

use super::assembly::{Assembly, Realised, Stock};
use super::composition::{Profile, Weighed, best_place};
use super::{Candidate, Cause, MissingFeature, ReadingEvidence};
use std::collections::BTreeMap;

/// Expected lines below this chance of being recorded are not listed as missing.
const EXPECTED: f64 = 0.2;

/// What one composition says about every reading and line.
pub(super) struct View {
    pub(super) members: Vec<usize>,
    /// P(nothing caused it), by reading.
    pub(super) unexplained: Vec<f64>,
    /// Lines with the probability of having caused each reading.
    pub(super) lines: Vec<(Realised, Vec<(usize, f64)>)>,
}

impl View {
    pub(super) fn of(stock: &Stock, weighed: &Weighed) -> Self {
        let assembly = Assembly::new(stock, &weighed.members);
        let (shift, lane) = best_place(stock, weighed);
        let lines = assembly
            .segments
            .iter()
            .flat_map(|s| assembly.causes(stock, s, &weighed.mode, shift, lane))
            .collect();
        let mut profile = Profile::new(
            stock,
            &assembly,
            weighed.mode.clone(),
            weighed.shifts_in_use(),
            Vec::new(),
        );
        profile.bar_more();
        let unexplained = profile.unexplained(&weighed.nodes);
        Self {
            members: weighed.members.clone(),
            unexplained,
            lines,
        }
    }

    /// Candidate, line index and φ of the part that holds most of a realised line.
    pub(super) fn owner(&self, line: &Realised) -> (usize, usize) {
        (self.members[line.owner.0], line.owner.1)
    }

    /// Number of readings that a candidate most likely caused.
    pub(super) fn readings_of(&self, candidate: usize) -> usize {
        self.lines
            .iter()
            .filter(|(line, _)| self.owner(line).0 == candidate)
            .flat_map(|(_, found)| found)
            .filter(|(_, p)| *p > 0.5)
            .count()
    }

    pub(super) fn missing(&self, stock: &Stock) -> Vec<MissingFeature> {
        let mut list: Vec<MissingFeature> = self
            .lines_of_members()
            .into_iter()
            .filter(|(_, _, detection, matched)| *detection >= EXPECTED && *matched < 0.5)
            .map(|(candidate, line, detection_probability, _)| {
                let shape = &stock.prepared[candidate].lines[line];
                MissingFeature {
                    candidate,
                    emitter: shape.emitter,
                    wavelength_nm: shape.wavelength_nm,
                    feature: shape.feature,
                    detection_probability,
                }
            })
            .collect();
        list.sort_by(|a, b| {
            b.detection_probability
                .total_cmp(&a.detection_probability)
                .then(a.wavelength_nm.total_cmp(&b.wavelength_nm))
        });
        list
    }

    /// (candidate, line, detection probability, probability of having caused any reading).
    fn lines_of_members(&self) -> Vec<(usize, usize, f64, f64)> {
        self.lines
            .iter()
            .map(|(line, found)| {
                let (candidate, i) = self.owner(line);
                (
                    candidate,
                    i,
                    line.detection,
                    found.iter().map(|(_, p)| p).sum(),
                )
            })
            .collect()
    }

    /// Root mean square of (x − λ − δ)/hypot(u, u_i) over matched lines.
    pub(super) fn residual_rms(&self, stock: &Stock, shift_nm: f64) -> Option<f64> {
        let squares: Vec<f64> = self
            .lines
            .iter()
            .flat_map(|(line, found)| found.iter().map(move |f| (line, f)))
            .filter(|(_, (_, p))| *p > 0.5)
            .map(|(line, (j, _))| {
                let o = &stock.scene.observations[*j];
                let z = o.wavelength_nm - line.wavelength_nm - shift_nm;
                z * z / (o.uncertainty_nm.powi(2) + line.uncertainty_nm.powi(2))
            })
            .collect();
        (squares.len() >= 2).then(|| (squares.iter().sum::<f64>() / squares.len() as f64).sqrt())
    }
}

pub(super) fn readings(
    stock: &Stock,
    candidates: &[Candidate],
    speakers: &[(&Weighed, f64)],
    views: &[View],
) -> Vec<ReadingEvidence> {
    let heard: f64 = speakers.iter().map(|(_, p)| p).sum();
    (0..stock.scene.observations.len())
        .map(|j| {
            let mut unexplained = 0.0;
            let mut causes: BTreeMap<(usize, usize), Cause> = BTreeMap::new();
            for ((_, p), view) in speakers.iter().zip(views) {
                let share = p / heard.max(f64::MIN_POSITIVE);
                unexplained += share * view.unexplained[j];
                for (line, found) in &view.lines {
                    for (_, chance) in found.iter().filter(|(reading, _)| *reading == j) {
                        let (candidate, i) = view.owner(line);
                        let cause = cause(stock, candidates, line, (candidate, i), j);
                        causes
                            .entry((candidate, cause.feature))
                            .or_insert(cause)
                            .probability += share * chance;
                    }
                }
            }
            let mut causes: Vec<Cause> = causes
                .into_values()
                .filter(|c| c.probability >= 0.01)
                .collect();
            causes.sort_by(|a, b| {
                b.probability
                    .total_cmp(&a.probability)
                    .then(a.feature_nm.total_cmp(&b.feature_nm))
            });
            ReadingEvidence {
                unexplained: unexplained.clamp(0.0, 1.0),
                causes,
            }
        })
        .collect()
}

/// A cause with probability zero, to be added to.
fn cause(
    stock: &Stock,
    candidates: &[Candidate],
    line: &Realised,
    (candidate, i): (usize, usize),
    reading: usize,
) -> Cause {
    let shape = &stock.prepared[candidate].lines[i];
    let o = &stock.scene.observations[reading];
    let residual_nm = o.wavelength_nm - line.wavelength_nm;
    Cause {
        candidate,
        emitter: candidates[candidate].features[shape.feature].emitter,
        feature_nm: line.wavelength_nm,
        feature: shape.feature,
        probability: 0.0,
        residual_nm,
        residual_sigma: residual_nm / o.uncertainty_nm.hypot(line.uncertainty_nm),
    }
}
