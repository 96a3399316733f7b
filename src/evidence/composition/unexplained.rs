//! What a reading would be without the substances weighed.

use super::super::matching::{LANES, Lanes};
use super::ln_total;
use super::profile::{Point, Profile, positions, value_in};
use super::slice::{Slice, subtract};

/// From so many readings on the amounts are known well enough to keep them at the mode.
const MANY: usize = 100;

impl Profile<'_, '_> {
    /// P(nothing caused it) by reading: E*(S; reading barred)/E*(S), amounts about the mode
    /// integrated, emitter shifts kept. `nodes` weigh shifts and lanes.
    pub fn unexplained(&mut self, nodes: &[Lanes]) -> Vec<f64> {
        if self.assembly.members.is_empty() {
            return vec![1.0; self.stock.scene.observations.len()];
        }
        let mode = self.present();
        let many = self.stock.scene.observations.len() > MANY;
        let amounts: Vec<Vec<(usize, Point)>> = (0..self.assembly.members.len())
            .map(|m| if many { Vec::new() } else { self.amounts(m) })
            .collect();
        (0..self.stock.scene.observations.len())
            .map(|j| self.unexplained_reading(j, &mode, &amounts, nodes))
            .collect()
    }

    pub(super) fn unexplained_reading(
        &mut self,
        reading: usize,
        mode: &Slice,
        amounts: &[Vec<(usize, Point)>],
        nodes: &[Lanes],
    ) -> f64 {
        let here = positions(&self.assembly.segments, |s| s.readings.contains(&reading));
        if here.is_empty() {
            return 1.0;
        }
        let latents = self.latents.clone();
        let bare = self.replace(&latents, &here, Some(reading));
        let bare_totals = self.with_replaced(&self.totals, &bare, |s| &self.values[s]);
        let bare_mode = self.finish(&latents, &bare_totals);
        let mut ratio = bare_mode.clone();
        subtract(&mut ratio, mode);
        for (m, points) in amounts.iter().enumerate() {
            if points.is_empty() {
                continue;
            }
            if !here
                .iter()
                .any(|s| self.assembly.segments[*s].members.contains(&m))
            {
                continue;
            }
            let mut sums = vec![[[0.0; LANES]; 2]; mode.len()];
            for (_, point) in points {
                let own = self.replace(&point.latents, &here, Some(reading));
                let totals = self.with_replaced(&point.totals, &own, |s| {
                    value_in(&point.changed, s).unwrap_or(&self.values[s])
                });
                let without = self.finish(&point.latents, &totals);
                for (d, sum) in sums.iter_mut().enumerate() {
                    for l in 0..LANES {
                        sum[0][l] += (without[d][l] - mode[d][l]).exp();
                        sum[1][l] += (point.slice[d][l] - mode[d][l]).exp();
                    }
                }
            }
            for (d, sum) in sums.iter().enumerate() {
                for l in 0..LANES {
                    ratio[d][l] += (sum[0][l] / sum[1][l]).ln() - (bare_mode[d][l] - mode[d][l]);
                }
            }
        }
        self.mean_over_nodes(&ratio, nodes)
    }

    /// Mean of exp(ln) over shifts and lanes, weighted by the evidence in `nodes`.
    pub(super) fn mean_over_nodes(&self, ln: &Slice, nodes: &[Lanes]) -> f64 {
        let weights = self.stock.scene.offset.weights();
        let total = ln_total(self.stock, nodes);
        let mut mean = 0.0;
        for (lanes, d) in ln.iter().zip(&self.shifts) {
            for l in 0..LANES {
                let share =
                    (nodes[*d][l] + weights[*d].ln() + self.stock.lane_ln_weight[l] - total).exp();
                if share > 0.0 && !lanes[l].is_nan() {
                    mean += share * lanes[l].exp().min(1.0);
                }
            }
        }
        mean
    }
}
