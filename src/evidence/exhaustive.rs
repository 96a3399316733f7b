//! Every composition weighed, for small candidate lists: what the search must agree with.

use super::assembly::Stock;
use super::composition::{middle, weigh};
use super::density::ln_sum_exp;
use super::prepare::Prepared;
use super::scene::Scene;
use super::settings::{PresenceRule, Settings};
use super::{Candidate, Conditions, Observation};

/// One composition of an exhaustive weighing.
#[derive(Debug, Clone, PartialEq)]
pub struct Entry {
    /// Candidate indices, ascending.
    pub members: Vec<usize>,
    /// ln E'(S): substances that caused nothing count as well.
    pub ln_evidence_any: f64,
    /// ln E*(S): every substance caused at least one reading.
    pub ln_evidence: f64,
    /// Posterior probability.
    pub posterior: f64,
}

/// All compositions of a few candidates.
#[derive(Debug, Clone, PartialEq)]
pub struct Exhaustive {
    /// Z of every candidate.
    pub detectability: Vec<f64>,
    /// In binary counting order of the members.
    pub entries: Vec<Entry>,
}

/// Most candidates that are enumerated.
pub const MOST_CANDIDATES: usize = 12;

/// Weighs all compositions; absent beyond twelve candidates.
pub fn exhaustive(
    observations: &[Observation],
    conditions: &Conditions,
    candidates: &[Candidate],
    settings: &Settings,
) -> Option<Exhaustive> {
    if candidates.len() > MOST_CANDIDATES {
        return None;
    }
    let scene = Scene::new(observations, conditions, settings);
    let prepared: Vec<Prepared> = candidates
        .iter()
        .map(|c| Prepared::new(&scene, c))
        .collect();
    let stock = Stock::new(scene, prepared);
    let detectability: Vec<f64> = stock.prepared.iter().map(|p| p.detectability).collect();
    let members_of = |set: usize| -> Vec<usize> {
        (0..candidates.len())
            .filter(|c| set >> c & 1 == 1)
            .collect()
    };
    let sets = 1usize << candidates.len();
    let weighed = |barring: bool| -> Vec<f64> {
        (0..sets)
            .map(|set| {
                let members = members_of(set);
                let start: Vec<_> = members.iter().map(|c| middle(&stock, *c)).collect();
                weigh(&stock, &members, &start, barring, barring).ln_evidence
            })
            .collect()
    };
    let any = weighed(false);
    let counted = match settings.presence {
        PresenceRule::Inside => weighed(true),
        PresenceRule::Subtract => subtracted(&any, &detectability),
    };
    let ln_weights: Vec<f64> = (0..sets)
        .map(|set| counted[set] + ln_prior(candidates, &detectability, set))
        .collect();
    let total = ln_sum_exp(&ln_weights);
    let entries = (0..sets)
        .map(|set| Entry {
            members: members_of(set),
            ln_evidence_any: any[set],
            ln_evidence: counted[set],
            posterior: (ln_weights[set] - total).exp(),
        })
        .collect();
    Some(Exhaustive {
        detectability,
        entries,
    })
}

/// ln Π π v Z · Π (1 − π v Z).
fn ln_prior(candidates: &[Candidate], detectability: &[f64], set: usize) -> f64 {
    candidates
        .iter()
        .zip(detectability)
        .enumerate()
        .map(|(c, (candidate, z))| {
            let chance = candidate.prior * candidate.shows * z;
            if set >> c & 1 == 1 {
                chance.ln()
            } else {
                (1.0 - chance).ln()
            }
        })
        .sum()
}

/// E*(S) = Σ_{T ⊆ S} (−1)^{|S∖T|} E'(T) Π_{S∖T} m', clamped at zero.
fn subtracted(any: &[f64], detectability: &[f64]) -> Vec<f64> {
    let unseen: Vec<f64> = detectability.iter().map(|z| (1.0 - z) / z).collect();
    (0..any.len())
        .map(|set| {
            let peak = any[set];
            let sum: f64 = (0..any.len())
                .filter(|part| part & !set == 0)
                .map(|part| {
                    let left = set & !part;
                    let sign = if left.count_ones() % 2 == 0 {
                        1.0
                    } else {
                        -1.0
                    };
                    let product: f64 = (0..unseen.len())
                        .filter(|c| left >> c & 1 == 1)
                        .map(|c| unseen[c])
                        .product();
                    sign * (any[part] - peak).exp() * product
                })
                .sum();
            peak + sum.max(0.0).ln()
        })
        .collect()
}
