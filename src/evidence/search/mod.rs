//! Best-first search over compositions, with a bound on everything not evaluated.
//!
//! Without blends L(S ∪ s) ≤ L(S)·L(s) for every state of the nuisances, because each joint
//! matching restricts to two. So W(S ∪ s) ≤ W(S)·max BF_s·odds_s, and a composition can be left
//! unevaluated when that is small. What adding s gained elsewhere bounds what it can gain here:
//! the more substances compete for the readings, the less another one adds.

mod learn;
mod node;

use super::assembly::{Latent, Stock};
use super::composition::{Care, Weighed, middle, weigh, weigh_added};
use super::density::ln_sum_exp;
use learn::subset;
use node::{Hope, Node};
use rayon::prelude::*;

/// Compositions that were evaluated, and the bound on the rest.
#[derive(Debug)]
pub struct Found {
    /// (composition, ln of evidence times prior odds), best first.
    pub ranked: Vec<(Weighed, f64)>,
    /// Bound on the mass of everything not evaluated, relative to what was.
    pub bound: f64,
}

/// Nats by which an estimate can be too low where new lines blend: who owns a blend changes with
/// the amounts, which the estimate holds fixed.
const BLEND_ALLOWANCE: f64 = 4.0;
/// Compositions estimated to lie this far below the best, in nats, keep the estimate.
const ROUGH_LN: f64 = -8.0;
/// Compositions this far below the best keep the product of profiles; those in which lines blend
/// only further down, for there the product can be too small by up to three nats.
const PROFILES_LN: f64 = -4.5;
const PROFILES_BLENDED_LN: f64 = -6.0;
/// Compositions estimated to lie this far below the best serve as a base for estimates as they are.
const FAR_BEHIND_LN: f64 = -8.0;
/// Work on the leaders after the search may take the total to this many times its limit.
const AFTERMATH: f64 = 1.5;
/// Compositions evaluated per round, whatever the number of threads.
const BATCH: usize = 8;

/// Searches all compositions of the candidates.
pub fn search(stock: &Stock, ln_odds: &[f64]) -> Found {
    let singles: Vec<Weighed> = (0..stock.prepared.len())
        .into_par_iter()
        .map(|c| weigh(stock, &[c], &[middle(stock, c)], true, true))
        .collect();
    let mut order: Vec<(f64, usize)> = singles
        .iter()
        .enumerate()
        .map(|(c, w)| (best_node(w) + ln_odds[c], c))
        .filter(|(gain, _)| gain.is_finite())
        .collect();
    order.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
    let work = singles.iter().map(|single| single.work).sum();
    Search {
        stock,
        ln_odds,
        singles,
        order,
        nodes: Vec::new(),
        work,
    }
    .run()
}

/// max over shift nodes and lanes of ln E*.
fn best_node(weighed: &Weighed) -> f64 {
    weighed
        .nodes
        .iter()
        .flatten()
        .copied()
        .fold(f64::NEG_INFINITY, f64::max)
}

struct Search<'s, 'a> {
    stock: &'s Stock<'a>,
    ln_odds: &'s [f64],
    singles: Vec<Weighed>,
    /// (bound on ln gain, candidate), best first.
    order: Vec<(f64, usize)>,
    nodes: Vec<Node>,
    /// Work so far.
    work: f64,
}

impl Search<'_, '_> {
    fn run(mut self) -> Found {
        let empty = weigh(self.stock, &[], &[], true, true);
        let first: Vec<f64> = self.order.iter().map(|(gain, _)| *gain).collect();
        self.insert(Vec::new(), empty, first, Hope::Above(0.0));
        let settings = self.stock.scene.settings;
        let mut bound = f64::INFINITY;
        while self.may_go_on() {
            let open = self.open_children();
            // While something better may turn up, care for what has been found would be wasted.
            let settled = open.first().is_none_or(|o| o.0 <= self.best());
            if settled && self.refine() {
                continue;
            }
            bound = self.bound(&open);
            if bound < settings.search_tolerance {
                break;
            }
            self.evaluate(&open);
        }
        // Leaders deserve care even where the search has used up its share.
        while self.work < AFTERMATH * settings.search_work && self.refine() {}
        if !self.may_go_on() {
            bound = self.bound(&self.open_children());
        }
        let mut ranked: Vec<(Weighed, f64)> = self
            .nodes
            .into_iter()
            .map(|n| (n.weighed, n.ln_weight))
            .collect();
        ranked.sort_by(|a, b| {
            b.1.total_cmp(&a.1)
                .then_with(|| a.0.members.cmp(&b.0.members))
        });
        Found {
            ranked,
            bound: if bound.is_finite() { bound } else { 0.0 },
        }
    }

    fn may_go_on(&self) -> bool {
        let settings = self.stock.scene.settings;
        self.nodes.len() < settings.search_limit && self.work < settings.search_work
    }

    /// (bound on ln mass of the child and all below it, node, candidate place), best first.
    fn open_children(&self) -> Vec<(f64, usize, usize)> {
        let mut open = Vec::new();
        for (n, node) in self.nodes.iter().enumerate() {
            let start = node.expected();
            if start == f64::NEG_INFINITY {
                continue;
            }
            let mut below = 0.0;
            let first = node.places.last().map_or(0, |p| p + 1);
            for t in (first..self.order.len()).rev() {
                let gain = node.gain[t];
                if !node.done[t] {
                    open.push((start + gain + below, n, t));
                }
                below += gain.exp().ln_1p().max(if gain > 30.0 { gain } else { 0.0 });
            }
        }
        open.sort_by(|a, b| b.0.total_cmp(&a.0).then((a.1, a.2).cmp(&(b.1, b.2))));
        open
    }

    fn bound(&self, open: &[(f64, usize, usize)]) -> f64 {
        let left: Vec<f64> = open.iter().map(|o| o.0).collect();
        let have: Vec<f64> = self.nodes.iter().map(|n| n.ln_weight).collect();
        (ln_sum_exp(&left) - ln_sum_exp(&have)).exp()
    }

    /// Estimates the best open children; a node that was only estimated is weighed first if it is
    /// not far behind.
    fn evaluate(&mut self, open: &[(f64, usize, usize)]) {
        let batch: Vec<(usize, usize)> =
            open.iter().take(BATCH).map(|(_, n, t)| (*n, *t)).collect();
        let best = self.best();
        let rough: Vec<(usize, Care)> = batch
            .iter()
            .filter(|(n, _)| {
                let node = &self.nodes[*n];
                node.weighed.care == Care::Added
                    && (node.is_hidden() || node.ln_hope > best + FAR_BEHIND_LN)
            })
            .map(|(n, _)| (*n, Care::Profiles))
            .collect();
        if !rough.is_empty() {
            self.weigh_again(rough);
            return;
        }
        let weighed: Vec<Weighed> = batch.par_iter().map(|(n, t)| self.child(*n, *t)).collect();
        for ((n, t), weighed) in batch.into_iter().zip(weighed) {
            self.work += weighed.work;
            let parent = &mut self.nodes[n];
            parent.done[t] = true;
            let mut places = parent.places.clone();
            places.push(t);
            let blends = weighed.chains > parent.weighed.chains;
            let hope = match (weighed.care, blends) {
                (Care::Added, true) if weighed.ln_evidence == f64::NEG_INFINITY => {
                    Hope::AtMost(parent.ln_weight + parent.gain[t])
                }
                (Care::Added, true) => Hope::Above(BLEND_ALLOWANCE),
                _ => Hope::Above(0.0),
            };
            let gain = parent.gain.clone();
            self.insert(places, weighed, gain, hope);
        }
    }

    /// A first estimate of a node's composition with one more candidate.
    fn child(&self, node: usize, place: usize) -> Weighed {
        let base = &self.nodes[node].weighed;
        let newcomer = self.order[place].1;
        if base.members.is_empty() {
            return self.singles[newcomer].clone();
        }
        let (members, start) = self.start(base, newcomer);
        let newest = members.binary_search(&newcomer).unwrap_or(0);
        weigh_added(self.stock, base, &members, &start, newest)
    }

    /// ln weight of the best composition so far.
    fn best(&self) -> f64 {
        self.nodes
            .iter()
            .map(|n| n.ln_weight)
            .fold(f64::NEG_INFINITY, f64::max)
    }

    /// Weighs estimated compositions that matter, best first; says whether there were any.
    fn refine(&mut self) -> bool {
        let best = self.best();
        let wanted = |node: &Node| {
            let profiles_ln = match node.weighed.chains {
                0 => PROFILES_LN,
                _ => PROFILES_BLENDED_LN,
            };
            if node.ln_weight > best + profiles_ln {
                Care::Joint
            } else if node.ln_hope > best + ROUGH_LN {
                Care::Profiles
            } else {
                Care::Added
            }
        };
        let mut due: Vec<(usize, Care)> = self
            .nodes
            .iter()
            .map(wanted)
            .enumerate()
            .filter(|(n, care)| self.nodes[*n].weighed.care < *care)
            .collect();
        due.sort_by(|(a, _), (b, _)| {
            let (x, y) = (self.nodes[*a].ln_hope, self.nodes[*b].ln_hope);
            y.total_cmp(&x).then(a.cmp(b))
        });
        due.truncate(BATCH);
        // Until the leaders are known, profiles will do to find them.
        let any = !due.is_empty();
        self.weigh_again(due);
        any
    }

    fn weigh_again(&mut self, mut which: Vec<(usize, Care)>) {
        which.sort_unstable();
        which.dedup();
        let weighed: Vec<Weighed> = which
            .par_iter()
            .map(|(n, care)| {
                let old = &self.nodes[*n].weighed;
                weigh(
                    self.stock,
                    &old.members,
                    &old.mode,
                    true,
                    *care == Care::Joint,
                )
            })
            .collect();
        for ((n, _), weighed) in which.into_iter().zip(weighed) {
            self.work += weighed.work;
            let ln_weight = self.ln_weight(&self.nodes[n].places, &weighed);
            self.nodes[n].ln_weight = ln_weight;
            self.nodes[n].ln_hope = ln_weight;
            self.nodes[n].weighed = weighed;
            self.learn(n);
        }
    }

    fn ln_weight(&self, places: &[usize], weighed: &Weighed) -> f64 {
        weighed.ln_evidence
            + places
                .iter()
                .map(|p| self.ln_odds[self.order[*p].1])
                .sum::<f64>()
    }

    /// Members in ascending order with the states to begin from: the parent's mode and the
    /// newcomer's own.
    fn start(&self, parent: &Weighed, newcomer: usize) -> (Vec<usize>, Vec<Latent>) {
        let mut pairs: Vec<(usize, Latent)> = parent
            .members
            .iter()
            .copied()
            .zip(parent.mode.iter().cloned())
            .collect();
        let own = self.singles[newcomer].mode.first().cloned();
        pairs.push((
            newcomer,
            own.unwrap_or_else(|| middle(self.stock, newcomer)),
        ));
        pairs.sort_by_key(|(c, _)| *c);
        pairs.into_iter().unzip()
    }

    fn insert(&mut self, places: Vec<usize>, weighed: Weighed, mut gain: Vec<f64>, hope: Hope) {
        let ln_weight = self.ln_weight(&places, &weighed);
        let ln_hope = match hope {
            Hope::Above(nats) => ln_weight + nats,
            Hope::AtMost(ln) => ln,
        };
        // What is known of any evaluated part of this composition holds here too.
        for node in &self.nodes {
            if subset(&node.places, &places) {
                for (mine, theirs) in gain.iter_mut().zip(&node.gain) {
                    *mine = mine.min(*theirs);
                }
            }
        }
        let done = vec![false; self.order.len()];
        self.nodes.push(Node {
            places,
            weighed,
            ln_weight,
            ln_hope,
            gain,
            done,
        });
        self.learn(self.nodes.len() - 1);
    }
}
