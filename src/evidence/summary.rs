//! From the weighed compositions to what is said of substances, readings and lines.

use super::assembly::Stock;
use super::composition::{Weighed, ln_total};
use super::density::ln_sum_exp;
use super::matching::LANES;
use super::prepare::Prepared;
use super::scene::Scene;
use super::search::{Found, search};
use super::settings::Settings;
use super::view::{View, readings};
use super::{
    Candidate, Conditions, Inference, Observation, Posterior, Presence, WeighedComposition,
};
use rayon::prelude::*;
use std::collections::BTreeMap;

/// Compositions below this posterior do not speak about single readings.
const SPEAKS: f64 = 0.02;

/// At most this many compositions speak about single readings.
const SPEAKERS: usize = 6;

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
    // A search that was stopped short says nothing of what is left unexplained.
    let finished = inference.untested_mass_bound < 1.0;
    mean.abs() > limit || inference.offset_nm.mean.abs() > limit || (unexplained >= 2 && finished)
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
