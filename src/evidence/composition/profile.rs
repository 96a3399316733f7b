//! The integrand about one latent state, segment by segment.

use super::super::assembly::{Assembly, Latent, Stock, Workspace};
use super::super::density::ln_sum_exp;
use super::super::matching::{LANES, Lanes};
use super::slice::Slice;
use std::collections::HashMap;
use std::rc::Rc;

/// ln sums of one segment, `[local bars][shift]`, and ln missing of its chains.
pub(super) type Value = Rc<(Vec<Lanes>, f64)>;

/// A segment with its value in another state.
pub(super) type Replaced = (usize, Value);

/// The integrand in a state next to the present one.
pub(super) struct Point {
    pub(super) latents: Vec<Latent>,
    pub(super) changed: Vec<Replaced>,
    pub(super) totals: Totals,
    pub(super) slice: Slice,
}

/// The integrand about one latent state.
pub struct Profile<'s, 'a> {
    pub(super) stock: &'s Stock<'a>,
    pub(super) assembly: &'s Assembly,
    /// The state everything is relative to.
    pub latents: Vec<Latent>,
    /// Members barred in turn.
    pub(super) doubtful: Vec<usize>,
    /// Shift nodes in use.
    pub shifts: Vec<usize>,
    /// Per segment: barred members that live there, as positions in `doubtful`.
    pub(super) local_bars: Vec<Vec<usize>>,
    /// Per segment: ln sums `[local bars][shift]` and ln missing of chains, at `latents`.
    pub(super) values: Vec<Value>,
    /// Segments by member, and by (member, emitter).
    pub(super) by_member: Vec<Vec<usize>>,
    pub(super) by_emitter: Vec<Vec<Vec<usize>>>,
    pub(super) work: Workspace,
    /// Values met before, by segment and the states of its emitters.
    pub(super) memo: HashMap<(usize, u64), Value>,
    /// Sums over all segments at `latents`.
    pub(super) totals: Totals,
    /// See [`super::Weighed::work`].
    pub(super) work_done: f64,
}

/// Sums over all segments in one state.
#[derive(Debug, Default, Clone)]
pub(super) struct Totals {
    /// `[set of barred members][shift]`.
    pub(super) ln: Vec<Lanes>,
    /// ln missing of all chains.
    pub(super) missing: f64,
}

impl<'s, 'a> Profile<'s, 'a> {
    /// Evaluates the starting state, at the given shift nodes, with each of `doubtful` barred in
    /// turn beside it.
    pub fn new(
        stock: &'s Stock<'a>,
        assembly: &'s Assembly,
        latents: Vec<Latent>,
        shifts: Vec<usize>,
        doubtful: Vec<usize>,
    ) -> Self {
        let count = assembly.members.len();
        let by_member = (0..count)
            .map(|m| positions(&assembly.segments, |s| s.members.contains(&m)))
            .collect();
        let by_emitter = (0..count)
            .map(|m| {
                let emitters = stock.prepared[assembly.members[m]].shifts.len();
                (0..emitters)
                    .map(|e| positions(&assembly.segments, |s| s.emitters.contains(&(m, e))))
                    .collect()
            })
            .collect();
        let mut profile = Self {
            stock,
            assembly,
            latents,
            doubtful,
            shifts,
            local_bars: vec![Vec::new(); assembly.segments.len()],
            values: Vec::new(),
            by_member,
            by_emitter,
            work: Workspace::default(),
            memo: HashMap::new(),
            totals: Totals::default(),
            work_done: 0.0,
        };
        profile.place_bars();
        profile.refresh();
        profile
    }

    pub(super) fn evaluate(
        &mut self,
        segment: usize,
        latents: &[Latent],
        without: Option<usize>,
    ) -> Value {
        let part = &self.assembly.segments[segment];
        let key = (segment, self.assembly.state_key(self.stock, part, latents));
        if without.is_none()
            && let Some(known) = self.memo.get(&key)
        {
            return Rc::clone(known);
        }
        let barred: Vec<usize> = self.local_bars[segment]
            .iter()
            .map(|i| self.doubtful[*i])
            .collect();
        let mut out = Vec::new();
        let missing = self.assembly.ln_segment(
            self.stock,
            part,
            latents,
            &self.shifts,
            &barred,
            without,
            &mut self.work,
            &mut out,
        );
        self.work_done += (self.work.pairs() * out.len()) as f64;
        let value = Rc::new((out, missing));
        if without.is_none() {
            self.memo.insert(key, Rc::clone(&value));
        }
        value
    }

    /// Evaluates everything anew: after a change of shifts in use or of barred members.
    pub(super) fn refresh(&mut self) {
        self.memo.clear();
        self.settle();
    }

    /// Values and totals at `latents`.
    pub(super) fn settle(&mut self) {
        let latents = self.latents.clone();
        self.values = (0..self.assembly.segments.len())
            .map(|s| self.evaluate(s, &latents, None))
            .collect();
        let sets = 1usize << self.doubtful.len();
        let mut totals = Totals {
            ln: vec![[0.0; LANES]; sets * self.shifts.len()],
            missing: 0.0,
        };
        for s in 0..self.values.len() {
            self.accumulate(&mut totals, s, &self.values[s], 1.0);
        }
        self.totals = totals;
    }

    /// Adds `sign` times one segment to the totals.
    pub(super) fn accumulate(&self, totals: &mut Totals, segment: usize, value: &Value, sign: f64) {
        let count = self.shifts.len();
        totals.missing += sign * value.1;
        for (set, row) in totals.ln.chunks_exact_mut(count).enumerate() {
            let local = self.local_bars[segment]
                .iter()
                .enumerate()
                .fold(0, |acc, (bit, i)| acc | (set >> i & 1) << bit);
            for (to, from) in row.iter_mut().zip(&value.0[local * count..]) {
                for l in 0..LANES {
                    to[l] += sign * from[l];
                }
            }
        }
    }

    /// Totals with some segments replaced; `before` gives their present values.
    pub(super) fn with_replaced<'v>(
        &self,
        totals: &Totals,
        changed: &[Replaced],
        before: impl Fn(usize) -> &'v Value,
    ) -> Totals {
        let mut next = totals.clone();
        for (s, value) in changed {
            let old = before(*s);
            if !Rc::ptr_eq(old, value) {
                self.accumulate(&mut next, *s, old, -1.0);
                self.accumulate(&mut next, *s, value, 1.0);
            }
        }
        next
    }

    pub(super) fn own_missing(&self, latents: &[Latent]) -> f64 {
        latents
            .iter()
            .enumerate()
            .map(|(m, latent)| self.assembly.own_missing(self.stock, m, latent))
            .sum()
    }

    /// ln L* = ln Σ_B (−1)^|B| L(B barred) by shift and lane.
    pub(super) fn finish(&self, latents: &[Latent], totals: &Totals) -> Slice {
        let count = self.shifts.len();
        let missing = self.own_missing(latents) + totals.missing;
        let sets = 1usize << self.doubtful.len();
        (0..count)
            .map(|d| {
                std::array::from_fn(|l| {
                    let whole = totals.ln[d][l];
                    let share: f64 = 1.0
                        + (1..sets)
                            .map(|set| {
                                let sign = if set.count_ones() % 2 == 0 { 1.0 } else { -1.0 };
                                sign * (totals.ln[set * count + d][l] - whole).exp()
                            })
                            .sum::<f64>();
                    missing + whole + share.max(0.0).ln()
                })
            })
            .collect()
    }

    /// ln L at the present state, nothing barred, on all shift nodes.
    pub(super) fn ln_unbarred(&self) -> Vec<Lanes> {
        let missing = self.own_missing(&self.latents) + self.totals.missing;
        let count = self.shifts.len();
        self.spread(
            self.totals.ln[..count]
                .iter()
                .map(|lanes| lanes.map(|x| x + missing))
                .collect(),
        )
    }

    pub(super) fn present(&self) -> Slice {
        self.finish(&self.latents, &self.totals)
    }

    /// The integrand in a state that differs from the present one in the given segments.
    pub(super) fn slice(&mut self, latents: &[Latent], touched: &[usize]) -> Slice {
        let changed = self.replace(latents, touched, None);
        let totals = self.with_replaced(&self.totals, &changed, |s| &self.values[s]);
        self.finish(latents, &totals)
    }

    pub(super) fn replace(
        &mut self,
        latents: &[Latent],
        touched: &[usize],
        without: Option<usize>,
    ) -> Vec<Replaced> {
        touched
            .iter()
            .map(|s| (*s, self.evaluate(*s, latents, without)))
            .collect()
    }

    pub(super) fn ln_weighted(&self, slice: &Slice) -> f64 {
        let weights = self.stock.scene.offset.weights();
        let terms: Vec<f64> = slice
            .iter()
            .zip(&self.shifts)
            .flat_map(|(lanes, d)| {
                let ln = weights[*d].ln();
                (0..LANES).map(move |l| lanes[l] + ln + self.stock.lane_ln_weight[l])
            })
            .collect();
        ln_sum_exp(&terms)
    }

    pub(super) fn shift_ln_weight(&self, m: usize, latent: &Latent) -> f64 {
        let prepared = &self.stock.prepared[self.assembly.members[m]];
        prepared
            .shifts
            .iter()
            .zip(&latent.shifts)
            .map(|(q, b)| q.weights()[*b].ln())
            .sum()
    }

    pub(super) fn point(&mut self, m: usize, amount: usize) -> Point {
        self.point_at(&[(m, amount)])
    }

    /// The integrand with the amounts of some members changed.
    pub(super) fn point_at(&mut self, amounts: &[(usize, usize)]) -> Point {
        let mut latents = self.latents.clone();
        let mut touched: Vec<usize> = Vec::new();
        for (m, amount) in amounts {
            latents[*m].amount = *amount;
            touched.extend(&self.by_member[*m]);
        }
        touched.sort_unstable();
        touched.dedup();
        let changed = self.replace(&latents, &touched, None);
        let totals = self.with_replaced(&self.totals, &changed, |s| &self.values[s]);
        let slice = self.finish(&latents, &totals);
        Point {
            latents,
            changed,
            totals,
            slice,
        }
    }

    /// Puts a slice back on all shift nodes; nodes left out carry nothing.
    pub(super) fn spread(&self, slice: Slice) -> Vec<Lanes> {
        let mut nodes = vec![[f64::NEG_INFINITY; LANES]; self.stock.scene.offset.len()];
        for (d, lanes) in self.shifts.iter().zip(slice) {
            nodes[*d] = lanes.map(|x| if x.is_nan() { f64::NEG_INFINITY } else { x });
        }
        nodes
    }
}

pub(super) fn value_in(changed: &[Replaced], segment: usize) -> Option<&Value> {
    changed.iter().find(|(s, _)| *s == segment).map(|(_, v)| v)
}

pub(super) fn positions<T>(items: &[T], keep: impl Fn(&T) -> bool) -> Vec<usize> {
    items
        .iter()
        .enumerate()
        .filter(|(_, i)| keep(i))
        .map(|(p, _)| p)
        .collect()
}
