//! What an evaluated composition tells of those not evaluated.

use super::super::composition::{Care, ln_total};
use super::super::matching::LANES;
use super::{BLEND_ALLOWANCE, Search};

/// Nats allowed for what the bound does not prove: amounts shifting when substances are added.
const AMOUNT_MARGIN: f64 = 0.5;
/// Nats allowed per chain of blending lines, where the bound does not hold.
const CHAIN_MARGIN: f64 = 0.25;
/// Most nats allowed for chains together.
const CHAIN_MARGIN_MOST: f64 = 1.0;
/// Shift nodes further than this below the best do not bound gains.
const RELEVANT_LN: f64 = -8.0;
impl Search<'_, '_> {
    /// What each member gained over an evaluated composition without it bounds what it can gain
    /// over any larger one.
    pub(super) fn learn(&mut self, newest: usize) {
        if self.nodes[newest].is_hidden() {
            return;
        }
        let places = self.nodes[newest].places.clone();
        for x in &places {
            let rest: Vec<usize> = places.iter().copied().filter(|p| p != x).collect();
            let Some(base) = self.nodes.iter().position(|n| n.places == rest) else {
                continue;
            };
            let Some(gained) = self.gained(base, newest) else {
                continue;
            };
            let new = &self.nodes[newest];
            let chains =
                new.weighed.chains - self.nodes[base].weighed.chains.min(new.weighed.chains);
            let blends = match new.weighed.care {
                Care::Added if chains > 0 => BLEND_ALLOWANCE,
                _ => (CHAIN_MARGIN * chains as f64).min(CHAIN_MARGIN_MOST),
            };
            let margin = AMOUNT_MARGIN + blends;
            let limit = gained + self.ln_odds[self.order[*x].1] + margin;
            for node in &mut self.nodes {
                if subset(&rest, &node.places) {
                    node.gain[*x] = node.gain[*x].min(limit);
                }
            }
        }
    }

    /// Largest ln E*(with) − ln E*(base) over the shift nodes and lanes that matter to `base`.
    fn gained(&self, base: usize, with: usize) -> Option<f64> {
        let (base, with) = (&self.nodes[base].weighed, &self.nodes[with].weighed);
        if base.ln_evidence == f64::NEG_INFINITY {
            return None;
        }
        let scene = &self.stock.scene;
        let total = ln_total(self.stock, &base.nodes);
        let mut most = f64::NEG_INFINITY;
        for ((b, w), weight) in base
            .nodes
            .iter()
            .zip(&with.nodes)
            .zip(scene.offset.weights())
        {
            for l in 0..LANES {
                let mass = b[l] + weight.ln() + self.stock.lane_ln_weight[l] - total;
                if mass > RELEVANT_LN {
                    most = most.max(w[l] - b[l]);
                }
            }
        }
        Some(most)
    }
}

/// Whether all of `small` stand in `large`, both ascending.
pub fn subset(small: &[usize], large: &[usize]) -> bool {
    small.iter().all(|x| large.binary_search(x).is_ok())
}
