//! From the weighed compositions to what is said of substances, readings and lines.

use super::assembly::{Assembly, Realised, Stock};
use super::composition::{Profile, Weighed, ln_total};
use super::density::ln_sum_exp;
use super::matching::LANES;
use super::prepare::{Prepared, Scene};
use super::search::{Found, search};
use super::settings::Settings;
use super::{
    Candidate, Cause, Conditions, Inference, MissingFeature, Observation, Posterior, Presence,
    ReadingEvidence, WeighedComposition,
};
use rayon::prelude::*;
use std::collections::BTreeMap;

/// Compositions below this posterior do not speak about single readings.
const SPEAKS: f64 = 0.02;
/// At most this many compositions speak about single readings.
const SPEAKERS: usize = 6;
/// Expected lines below this chance of being recorded are not listed as missing.
const EXPECTED: f64 = 0.2;
/// A prior from here on is ubiquitous.
const UBIQUITOUS: f64 = 0.5;
/// Shift nodes are extended when the readings lie this many standard deviations off together.
const SHIFTED: f64 = 2.5;
/// Reach of the extended shift nodes, standard deviations.
const EXTENDED_REACH: f64 = 16.0;

/// Weighs every composition of the candidates against the readings, with the default constants.
pub fn infer(
    observations: &[Observation],
    conditions: &Conditions,
    candidates: &[Candidate],
) -> Inference {
    infer_with(observations, conditions, candidates, &Settings::default())
}

/// [`infer`] with other constants.
pub fn infer_with(
    observations: &[Observation],
    conditions: &Conditions,
    candidates: &[Candidate],
    settings: &Settings,
) -> Inference {
    let first = infer_once(observations, conditions, candidates, settings);
    if settings.offset.is_some()
        || conditions.offset_nm <= 0.0
        || !shift_suspected(&first, conditions)
    {
        return first;
    }
    let wider = Settings {
        offset_reach: EXTENDED_REACH,
        ..settings.clone()
    };
    infer_once(observations, conditions, candidates, &wider)
}

/// Whether the readings may lie further off together than the shift nodes reach.
fn shift_suspected(inference: &Inference, conditions: &Conditions) -> bool {
    let limit = SHIFTED * conditions.offset_nm;
    let unexplained = inference
        .readings
        .iter()
        .filter(|r| r.unexplained > 0.8)
        .count();
    let residuals: Vec<f64> = inference
        .readings
        .iter()
        .filter_map(|r| r.causes.first())
        .map(|c| c.residual_nm)
        .collect();
    let mean = residuals.iter().sum::<f64>() / residuals.len().max(1) as f64;
    mean.abs() > limit || inference.offset_nm.mean.abs() > limit || unexplained >= 2
}

fn infer_once(
    observations: &[Observation],
    conditions: &Conditions,
    candidates: &[Candidate],
    settings: &Settings,
) -> Inference {
    let scene = Scene::new(observations, conditions, settings);
    let prepared: Vec<Prepared> = candidates
        .par_iter()
        .map(|c| Prepared::new(&scene, c))
        .collect();
    let stock = Stock::new(scene, prepared);
    let ln_odds: Vec<f64> = candidates
        .iter()
        .zip(&stock.prepared)
        .map(|(c, p)| {
            let chance = c.prior * c.shows * p.detectability;
            (chance / (1.0 - chance)).ln()
        })
        .collect();
    let found = search(&stock, &ln_odds);
    summarise(&stock, candidates, &found)
}

fn summarise(stock: &Stock, candidates: &[Candidate], found: &Found) -> Inference {
    let posterior = normalised(found, 0.0);
    let detected: Vec<f64> = (0..candidates.len())
        .map(|c| {
            let holds = found
                .ranked
                .iter()
                .zip(&posterior)
                .filter(|((w, _), _)| w.members.contains(&c));
            holds.map(|(_, p)| p).sum::<f64>().min(1.0)
        })
        .collect();
    let speakers: Vec<(&Weighed, f64)> = found
        .ranked
        .iter()
        .zip(&posterior)
        .filter(|(_, p)| **p >= SPEAKS)
        .take(SPEAKERS)
        .map(|((w, _), p)| (w, *p))
        .collect();
    let views: Vec<View> = speakers
        .par_iter()
        .map(|(w, _)| View::of(stock, w))
        .collect();
    let readings = readings(stock, candidates, &speakers, &views);
    let leader_view = views.first();
    let on_one_line =
        |c: usize| leader_view.is_some_and(|v| v.members.contains(&c) && v.readings_of(c) == 1);
    let presence = candidates
        .iter()
        .enumerate()
        .map(|(c, candidate)| presence(candidate, &stock.prepared[c], detected[c], on_one_line(c)))
        .collect();
    let leader = &found.ranked[0].0;
    Inference {
        compositions: found
            .ranked
            .iter()
            .zip(&posterior)
            .map(|((w, _), p)| WeighedComposition {
                members: w.members.clone(),
                posterior: *p,
                log_evidence: w.ln_evidence.is_finite().then_some(w.ln_evidence),
            })
            .collect(),
        untested_mass_bound: found.bound,
        presence,
        missing: leader_view.map(|v| v.missing(stock)).unwrap_or_default(),
        offset_nm: offset_posterior(stock, leader),
        residual_rms_sigma: leader_view
            .and_then(|v| v.residual_rms(stock, offset_posterior(stock, leader).mean)),
        readings,
        leader_with_priors_halved: leader_at(found, -std::f64::consts::LN_2),
        leader_with_priors_doubled: leader_at(found, std::f64::consts::LN_2),
        without_ubiquitous: without_ubiquitous(candidates, found, &posterior),
    }
}

/// Posterior of the ranked compositions, with ln of every member's prior odds raised by `lift`.
fn normalised(found: &Found, lift: f64) -> Vec<f64> {
    let ln: Vec<f64> = found
        .ranked
        .iter()
        .map(|(w, ln)| ln + lift * w.members.len() as f64)
        .collect();
    let total = ln_sum_exp(&ln);
    ln.iter().map(|x| (x - total).exp()).collect()
}

fn leader_at(found: &Found, lift: f64) -> Vec<usize> {
    let posterior = normalised(found, lift);
    let best = posterior
        .iter()
        .enumerate()
        .max_by(|a, b| a.1.total_cmp(b.1).then(b.0.cmp(&a.0)))
        .map_or(0, |(i, _)| i);
    found.ranked[best].0.members.clone()
}

/// P(in the sample) = P_det + (1 − P_det) π (1 − vZ)/(1 − πvZ).
fn presence(
    candidate: &Candidate,
    prepared: &Prepared,
    detected: f64,
    rests_on_one_line: bool,
) -> Presence {
    let testable = candidate.shows * prepared.detectability;
    let hidden = candidate.prior * (1.0 - testable) / (1.0 - candidate.prior * testable);
    Presence {
        detectability: prepared.detectability,
        testable,
        detected,
        physical: detected + (1.0 - detected) * hidden,
        rests_on_one_line,
    }
}

fn without_ubiquitous(
    candidates: &[Candidate],
    found: &Found,
    posterior: &[f64],
) -> Vec<(Vec<usize>, f64)> {
    let mut sums: BTreeMap<Vec<usize>, f64> = BTreeMap::new();
    for ((weighed, _), p) in found.ranked.iter().zip(posterior) {
        let rest = weighed
            .members
            .iter()
            .copied()
            .filter(|c| candidates[*c].prior < UBIQUITOUS)
            .collect();
        *sums.entry(rest).or_default() += p;
    }
    let mut list: Vec<(Vec<usize>, f64)> = sums.into_iter().collect();
    list.sort_by(|a, b| b.1.total_cmp(&a.1).then_with(|| a.0.cmp(&b.0)));
    list
}

fn offset_posterior(stock: &Stock, weighed: &Weighed) -> Posterior {
    let total = ln_total(stock, &weighed.nodes);
    let offset = &stock.scene.offset;
    let (mut mean, mut square) = (0.0, 0.0);
    for ((node, x), w) in weighed
        .nodes
        .iter()
        .zip(offset.nodes())
        .zip(offset.weights())
    {
        let share: f64 = (0..LANES)
            .map(|l| (node[l] + w.ln() + stock.lane_ln_weight[l] - total).exp())
            .sum();
        mean += share * x;
        square += share * x * x;
    }
    Posterior {
        mean,
        sd: (square - mean * mean).max(0.0).sqrt(),
    }
}

/// The shift node and lane that carry most of a composition's evidence.
fn best_place(stock: &Stock, weighed: &Weighed) -> (usize, usize) {
    let mut best = (f64::NEG_INFINITY, 0, 0);
    for (d, (node, w)) in weighed
        .nodes
        .iter()
        .zip(stock.scene.offset.weights())
        .enumerate()
    {
        for l in 0..LANES {
            let value = node[l] + w.ln() + stock.lane_ln_weight[l];
            if value > best.0 {
                best = (value, d, l);
            }
        }
    }
    (best.1, best.2)
}

/// What one composition says about every reading and line.
struct View {
    members: Vec<usize>,
    /// P(nothing caused it), by reading.
    unexplained: Vec<f64>,
    /// Lines with the probability of having caused each reading.
    lines: Vec<(Realised, Vec<(usize, f64)>)>,
}

impl View {
    fn of(stock: &Stock, weighed: &Weighed) -> Self {
        let assembly = Assembly::new(stock, &weighed.members);
        let (shift, lane) = best_place(stock, weighed);
        let lines = assembly
            .segments
            .iter()
            .flat_map(|s| assembly.causes(stock, s, &weighed.mode, shift, lane))
            .collect();
        let mut profile = Profile::new(stock, &assembly, weighed.mode.clone(), true);
        let unexplained = profile.unexplained(&weighed.nodes);
        Self {
            members: weighed.members.clone(),
            unexplained,
            lines,
        }
    }

    /// Candidate, line index and φ of the part that holds most of a realised line.
    fn owner(&self, line: &Realised) -> (usize, usize) {
        (self.members[line.owner.0], line.owner.1)
    }

    /// Number of readings that a candidate most likely caused.
    fn readings_of(&self, candidate: usize) -> usize {
        self.lines
            .iter()
            .filter(|(line, _)| self.owner(line).0 == candidate)
            .flat_map(|(_, found)| found)
            .filter(|(_, p)| *p > 0.5)
            .count()
    }

    fn missing(&self, stock: &Stock) -> Vec<MissingFeature> {
        let mut list: Vec<MissingFeature> = self
            .lines_with_bare(stock)
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
    fn lines_with_bare(&self, stock: &Stock) -> Vec<(usize, usize, f64, f64)> {
        let _ = stock;
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
    fn residual_rms(&self, stock: &Stock, shift_nm: f64) -> Option<f64> {
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

fn readings(
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
