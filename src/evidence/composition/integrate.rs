//! Amounts and emitter shifts integrated out.

use super::super::assembly::{Latent, Stock};
use super::super::density::ln_sum_exp;
use super::super::matching::{LANES, Lanes};
use super::super::prepare::Prepared;
use super::super::quadrature::Quadrature;
use super::NEGLIGIBLE_LN;
use super::profile::{Point, Profile, value_in};
use super::slice::{Slice, add, peak};
use std::collections::BTreeSet;

/// Amounts of several members together this far below the best are left out.
const JOINT_LN: f64 = -7.0;

/// Amount nodes this far below the best take the integral over emitter shifts from their neighbours.
const MINOR_LN: f64 = -3.5;

/// Without strengths the integral over emitter shifts changes slowly with the amounts, and is
/// taken at every so many nodes. A strength fixes the sum of amount and shift.
const FACTOR_STEP: usize = 3;

impl Profile<'_, '_> {
    /// The integrand for the amounts of one member, outwards from the present one until it has
    /// fallen too far to count.
    pub(super) fn amounts(&mut self, m: usize) -> Vec<(usize, Point)> {
        let count = self.stock.scene.amount.len();
        let centre = self.latents[m].amount;
        let mut points = vec![(centre, self.point(m, centre))];
        let mut best = self.ln_weighted(&points[0].1.slice);
        let down: Vec<usize> = (0..centre).rev().collect();
        let up: Vec<usize> = (centre + 1..count).collect();
        for direction in [down, up] {
            for k in direction {
                let point = self.point(m, k);
                let value = self.ln_weighted(&point.slice);
                points.push((k, point));
                best = best.max(value);
                if value < best + NEGLIGIBLE_LN {
                    break;
                }
            }
        }
        points.sort_by_key(|(k, _)| *k);
        points
    }

    /// ln of the profile of one member: Σ_α w/Z · L*(α)/L*(mode) · Π_e Σ_β w · L*(α, β_e)/L*(α).
    pub(super) fn member_profile(&mut self, m: usize, mode: &Slice) -> Slice {
        let points = self
            .amounts(m)
            .into_iter()
            .map(|(k, point)| (vec![k], point))
            .collect();
        self.integral(&[m], points, 1, mode)
    }

    /// ln Σ over amounts of Π w/Z · L*(amounts)/L*(mode), the emitter shifts of `members`
    /// integrated. Points are given at every `step`-th amount node, counted from the mode.
    pub(super) fn integral(
        &mut self,
        members: &[usize],
        points: Vec<(Vec<usize>, Point)>,
        step: usize,
        mode: &Slice,
    ) -> Slice {
        let ln_z: f64 = members
            .iter()
            .map(|m| self.stock.prepared[self.assembly.members[*m]].detectability)
            .map(|z| z.max(f64::MIN_POSITIVE).ln())
            .sum();
        let best = points
            .iter()
            .map(|(_, p)| peak(&p.slice))
            .fold(f64::NEG_INFINITY, f64::max);
        let centre: Vec<usize> = members.iter().map(|m| self.latents[*m].amount).collect();
        let with_strengths =
            (self.stock.scene.observations.iter()).any(|o| o.strength_dex.is_some());
        let factor_step = if with_strengths { 1 } else { FACTOR_STEP };
        let factors: Vec<Option<Slice>> = points
            .iter()
            .map(|(amounts, p)| {
                let sampled =
                    on_grid(amounts, &centre, factor_step) && peak(&p.slice) > best + MINOR_LN;
                sampled.then(|| self.shift_factor(members, p))
            })
            .collect();
        let weights: Vec<Vec<f64>> = (centre.iter())
            .map(|c| thinned(self.stock.scene.amount.weights(), *c, step))
            .collect();
        let mut sums = vec![[0.0; LANES]; mode.len()];
        for (amounts, point) in &points {
            let Some(factor) = nearest(&points, &factors, amounts) else {
                continue;
            };
            let weight: f64 = amounts.iter().zip(&weights).map(|(k, w)| w[*k]).product();
            for (d, sum) in sums.iter_mut().enumerate() {
                for l in 0..LANES {
                    sum[l] += weight * (point.slice[d][l] + factor[d][l] - mode[d][l]).exp();
                }
            }
        }
        sums.into_iter()
            .map(|sum| sum.map(|x| x.ln() - ln_z))
            .collect()
    }

    /// ln Π_e Σ_β w · L*(β_e)/L* over the emitters of the given members, at one point.
    pub(super) fn shift_factor(&mut self, members: &[usize], point: &Point) -> Slice {
        let mut factor = vec![[0.0; LANES]; point.slice.len()];
        for m in members {
            for e in 0..self.by_emitter[*m].len() {
                let candidate = self.assembly.members[*m];
                let shift = self.stock.prepared[candidate].shifts[e].clone();
                if shift.len() == 1 {
                    continue;
                }
                let mean = self.shift_mean(*m, e, &shift, point);
                for (to, mean) in factor.iter_mut().zip(mean) {
                    for l in 0..LANES {
                        if mean[l].is_finite() && mean[l] > 0.0 {
                            to[l] += mean[l].ln();
                        }
                    }
                }
            }
        }
        factor
    }

    /// Σ_β w · L*(β)/L* over the shift of one emitter, at one point.
    pub(super) fn shift_mean(
        &mut self,
        m: usize,
        e: usize,
        shift: &Quadrature,
        point: &Point,
    ) -> Slice {
        let touched = self.by_emitter[m][e].clone();
        let mut mean = vec![[0.0; LANES]; point.slice.len()];
        for (b, weight) in shift.weights().iter().enumerate() {
            let mut other = point.latents.clone();
            other[m].shifts[e] = b;
            let own = self.replace(&other, &touched, None);
            let totals = self.with_replaced(&point.totals, &own, |s| {
                value_in(&point.changed, s).unwrap_or(&self.values[s])
            });
            let option = self.finish(&other, &totals);
            for (sum, (o, at)) in mean.iter_mut().zip(option.iter().zip(&point.slice)) {
                for l in 0..LANES {
                    sum[l] += weight * (o[l] - at[l]).exp();
                }
            }
        }
        mean
    }

    /// The product approximation; moves to a better mode where integrating meets one.
    pub(super) fn product_at_best(&mut self, joint: bool) -> Vec<Lanes> {
        const MOST_MOVES: usize = 3;
        for _ in 0..MOST_MOVES {
            let moves: Vec<bool> = (0..self.assembly.members.len())
                .map(|m| self.jump(m))
                .collect();
            if !moves.contains(&true) {
                break;
            }
            self.climb();
        }
        self.product(joint)
    }

    /// The product approximation L*(mode) · Π_s P_s on all shift nodes; where `joint` asks for it
    /// and the amounts are few enough, the amounts are integrated jointly instead.
    pub(super) fn product(&mut self, joint: bool) -> Vec<Lanes> {
        let mode = self.present();
        let mut total = mode.clone();
        // The profile of one member is joint already; of many whose lines stand apart it is exact.
        let entangled = match self.assembly.members.len() {
            0 | 1 => false,
            2 => true,
            _ => self.assembly.chains > 0,
        };
        let points = (joint && entangled).then(|| self.joint_points()).flatten();
        if let Some(points) = points {
            let members: Vec<usize> = (0..self.assembly.members.len()).collect();
            let step = joint_step(members.len());
            add(&mut total, &self.integral(&members, points, step, &mode));
        } else {
            for m in 0..self.assembly.members.len() {
                add(&mut total, &self.member_profile(m, &mode));
            }
        }
        self.spread(total)
    }

    /// The combinations of amounts that count: outwards from the mode, as far as the integrand
    /// has not fallen too far. None where they are too many, or too dear where readings crowd.
    pub(super) fn joint_points(&mut self) -> Option<Vec<(Vec<usize>, Point)>> {
        const MOST_POINTS: usize = 1024;
        const MOST_WORK: f64 = 1e7;
        let dearest = self.work_done + MOST_WORK;
        let count = self.stock.scene.amount.len();
        let mode: Vec<usize> = self.latents.iter().map(|l| l.amount).collect();
        let step = joint_step(mode.len());
        let mut met: BTreeSet<Vec<usize>> = BTreeSet::from([mode.clone()]);
        let mut open = vec![mode];
        let mut points = Vec::new();
        let mut best = f64::NEG_INFINITY;
        while let Some(amounts) = open.pop() {
            let changed: Vec<(usize, usize)> = amounts.iter().copied().enumerate().collect();
            let point = self.point_at(&changed);
            let value = self.ln_weighted(&point.slice);
            best = best.max(value);
            if value > best + JOINT_LN {
                open.extend(neighbours(&amounts, step, count).filter(|n| met.insert(n.clone())));
            }
            points.push((amounts, point));
            if points.len() > MOST_POINTS || self.work_done > dearest {
                return None;
            }
        }
        points.sort_by(|a, b| a.0.cmp(&b.0));
        Some(points)
    }

    /// The full joint grid, on all shift nodes.
    pub(super) fn joint(&mut self, barring: bool) -> Vec<Lanes> {
        if barring {
            self.doubtful = (0..self.assembly.members.len()).collect();
            self.place_bars();
            self.refresh();
        }
        let all: Vec<usize> = (0..self.assembly.segments.len()).collect();
        let mut states: Vec<(Vec<Latent>, f64)> = vec![(Vec::new(), 0.0)];
        for candidate in &self.assembly.members {
            let prepared = &self.stock.prepared[*candidate];
            let own = grid(self.stock, prepared);
            states = states
                .iter()
                .flat_map(|(before, ln)| {
                    own.iter().map(move |(latent, w)| {
                        let mut next = before.clone();
                        next.push(latent.clone());
                        (next, ln + w)
                    })
                })
                .collect();
        }
        let mut terms: Vec<Vec<f64>> = vec![Vec::new(); self.shifts.len() * LANES];
        for (latents, ln_weight) in &states {
            let slice = self.slice(latents, &all);
            for (d, lanes) in slice.iter().enumerate() {
                for l in 0..LANES {
                    terms[d * LANES + l].push(lanes[l] + ln_weight);
                }
            }
        }
        let total = (0..self.shifts.len())
            .map(|d| std::array::from_fn(|l| ln_sum_exp(&terms[d * LANES + l])))
            .collect();
        self.spread(total)
    }
}

/// Every latent state of one substance with ln of its weight over Z.
fn grid(stock: &Stock, prepared: &Prepared) -> Vec<(Latent, f64)> {
    let ln_z = prepared.detectability.max(f64::MIN_POSITIVE).ln();
    let mut states: Vec<(Latent, f64)> = stock
        .scene
        .amount
        .weights()
        .iter()
        .enumerate()
        .map(|(amount, w)| {
            (
                Latent {
                    amount,
                    shifts: Vec::new(),
                },
                w.ln() - ln_z,
            )
        })
        .collect();
    for shift in &prepared.shifts {
        states = states
            .iter()
            .flat_map(|(latent, ln)| {
                shift.weights().iter().enumerate().map(move |(b, w)| {
                    let mut next = latent.clone();
                    next.shifts.push(b);
                    (next, ln + w.ln())
                })
            })
            .collect();
    }
    states
}

/// Whether amounts lie a multiple of `step` from the mode.
fn on_grid(amounts: &[usize], centre: &[usize], step: usize) -> bool {
    (amounts.iter().zip(centre)).all(|(a, c)| a.abs_diff(*c).is_multiple_of(step))
}

/// The factor of the nearest point that has one.
fn nearest<'f>(
    points: &[(Vec<usize>, Point)],
    factors: &'f [Option<Slice>],
    amounts: &[usize],
) -> Option<&'f Slice> {
    let distance =
        |other: &[usize]| -> usize { other.iter().zip(amounts).map(|(a, b)| a.abs_diff(*b)).sum() };
    points
        .iter()
        .zip(factors)
        .filter_map(|((other, _), factor)| factor.as_ref().map(|f| (distance(other), f)))
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, factor)| factor)
}

/// Of three members and more, every second amount node is taken: the nodes stand closer than the
/// scatter of strengths.
fn joint_step(members: usize) -> usize {
    if members < 3 { 1 } else { 2 }
}

/// Weights of the nodes a multiple of `step` from `centre`, with those of the nodes nearest to
/// them; nodes halfway between two are shared.
fn thinned(weights: &[f64], centre: usize, step: usize) -> Vec<f64> {
    let kept: Vec<usize> = (centre % step..weights.len()).step_by(step).collect();
    let mut out = vec![0.0; weights.len()];
    for (k, weight) in weights.iter().enumerate() {
        let near = kept.iter().map(|c| c.abs_diff(k)).min().unwrap_or(0);
        let owners: Vec<usize> = kept
            .iter()
            .copied()
            .filter(|c| c.abs_diff(k) == near)
            .collect();
        for owner in &owners {
            out[*owner] += weight / owners.len() as f64;
        }
    }
    out
}

/// Amount nodes `step` away in one member.
fn neighbours(amounts: &[usize], step: usize, count: usize) -> impl Iterator<Item = Vec<usize>> {
    let step = step as isize;
    (0..amounts.len())
        .flat_map(move |m| [(m, -step), (m, step)])
        .filter_map(move |(m, step)| {
            let next = amounts[m].checked_add_signed(step).filter(|k| *k < count)?;
            let mut amounts = amounts.to_vec();
            amounts[m] = next;
            Some(amounts)
        })
}
