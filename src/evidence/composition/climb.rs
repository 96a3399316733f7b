//! Coordinate ascent to one mode over all amounts and emitter shifts.

use super::super::assembly::Latent;
use super::super::density::ln_sum_exp;
use super::super::matching::LANES;
use super::NEGLIGIBLE_LN;
use super::profile::Profile;

/// Before the amounts have settled, only shift nodes this far below are.
const HOPELESS_LN: f64 = -30.0;

/// A better amount met while integrating, in nats, is worth climbing to.
const BETTER_LN: f64 = 0.05;

impl Profile<'_, '_> {
    /// Coordinate ascent to one mode over all amounts and emitter shifts.
    pub fn climb(&mut self) {
        const MOST_SWEEPS: usize = 8;
        self.choose_start();
        self.drop_hopeless();
        for _ in 0..MOST_SWEEPS {
            let mut moved = false;
            for m in 0..self.assembly.members.len() {
                moved |= self.climb_amount(m);
                moved |= self.climb_shifts(m);
            }
            if !moved {
                break;
            }
        }
        self.drop_shifts(NEGLIGIBLE_LN);
    }

    /// Coordinate ascent can stop on a ridge: begins from the best of the present state and
    /// equal amounts throughout.
    pub(super) fn choose_start(&mut self) {
        let count = self.stock.scene.amount.len();
        let all: Vec<usize> = (0..self.values.len()).collect();
        let mut best = (self.ln_weighted(&self.present()), self.latents.clone());
        for quarter in 1..=4 {
            let mut latents = self.latents.clone();
            for latent in &mut latents {
                latent.amount = (count * quarter / 4).saturating_sub(1);
            }
            let slice = self.slice(&latents, &all);
            let value = self.ln_weighted(&slice);
            if value > best.0 {
                best = (value, latents);
            }
        }
        if best.1 != self.latents {
            self.latents = best.1;
            self.settle();
        }
    }

    /// Walks uphill along the amount of one member.
    pub(super) fn climb_amount(&mut self, m: usize) -> bool {
        let count = self.stock.scene.amount.len() as isize;
        let start = self.latents[m].amount;
        let mut best = (self.ln_weighted(&self.present()), start);
        for direction in [1isize, -1] {
            // Two nodes in a row must fall before the walk turns back.
            let mut falls = 0;
            let mut k = start as isize + direction;
            while (0..count).contains(&k) && falls < 2 {
                let point = self.point(m, k as usize);
                let value = self.ln_weighted(&point.slice);
                if value > best.0 {
                    best = (value, k as usize);
                    falls = 0;
                } else {
                    falls += 1;
                }
                k += direction;
            }
        }
        if best.1 == start {
            return false;
        }
        self.latents[m].amount = best.1;
        self.settle();
        true
    }

    pub(super) fn climb_shifts(&mut self, m: usize) -> bool {
        let mut moved = false;
        for e in 0..self.by_emitter[m].len() {
            let count = self.stock.prepared[self.assembly.members[m]].shifts[e].len();
            if count > 1 {
                let touched = self.by_emitter[m][e].clone();
                moved |= self.choose(
                    m,
                    &touched,
                    (0..count).map(|b| move |l: &mut Latent| l.shifts[e] = b),
                );
            }
        }
        moved
    }

    /// Moves one member to the best of several states; says whether it moved.
    pub(super) fn choose<F: Fn(&mut Latent)>(
        &mut self,
        m: usize,
        touched: &[usize],
        options: impl Iterator<Item = F>,
    ) -> bool {
        let mut best = (f64::NEG_INFINITY, self.latents.clone());
        for set in options {
            let mut latents = self.latents.clone();
            set(&mut latents[m]);
            let slice = self.slice(&latents, touched);
            let value = self.ln_weighted(&slice) + self.shift_ln_weight(m, &latents[m]);
            if value > best.0 {
                best = (value, latents);
            }
        }
        if best.1 == self.latents {
            return false;
        }
        self.latents = best.1;
        self.settle();
        true
    }

    /// Leaves out shifts that no amounts could make count.
    pub(super) fn drop_hopeless(&mut self) {
        self.drop_shifts(HOPELESS_LN);
    }

    /// Leaves out shifts that carry nothing at the present state.
    pub(super) fn drop_shifts(&mut self, below_ln: f64) {
        let now = self.present();
        let weights = self.stock.scene.offset.weights();
        let per_shift: Vec<f64> = now
            .iter()
            .zip(&self.shifts)
            .map(|(lanes, d)| {
                let terms: Vec<f64> = (0..LANES)
                    .map(|l| lanes[l] + self.stock.lane_ln_weight[l])
                    .collect();
                ln_sum_exp(&terms) + weights[*d].ln()
            })
            .collect();
        let best = per_shift.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        if !best.is_finite() {
            return;
        }
        let kept: Vec<usize> = self
            .shifts
            .iter()
            .zip(&per_shift)
            .filter(|(_, ln)| **ln - best > below_ln)
            .map(|(d, _)| *d)
            .collect();
        if kept.len() < self.shifts.len() {
            self.shifts = kept;
            self.refresh();
        }
    }

    /// Moves one member to the best of all its amounts, if that is better by more than a trifle.
    pub(super) fn jump(&mut self, m: usize) -> bool {
        let present = self.ln_weighted(&self.present());
        let best = self
            .amounts(m)
            .iter()
            .map(|(k, point)| (self.ln_weighted(&point.slice), *k))
            .fold((present, self.latents[m].amount), |a, b| {
                if b.0 > a.0 { b } else { a }
            });
        if best.0 <= present + BETTER_LN {
            return false;
        }
        self.latents[m].amount = best.1;
        self.settle();
        true
    }
}
