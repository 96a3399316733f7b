//! The evidence of one composition: amounts, emitter shifts, common shift and clutter rate
//! integrated out, counting only what was seen.

use super::assembly::{Assembly, Latent, Stock, Workspace};
use super::density::ln_sum_exp;
use super::matching::{LANES, Lanes};
use super::quadrature::Quadrature;
use super::settings::MixtureRule;
use std::collections::{BTreeSet, HashMap};
use std::rc::Rc;

/// A composition with its evidence.
#[derive(Debug, Clone)]
pub struct Weighed {
    /// Candidate indices, ascending.
    pub members: Vec<usize>,
    /// ln E*(S).
    pub ln_evidence: f64,
    /// ln of the integrand by shift node and clutter lane, without their weights.
    pub nodes: Vec<Lanes>,
    /// The latent state with the largest weighted integrand.
    pub mode: Vec<Latent>,
    /// ln L at the mode by shift node and lane, nothing barred; −∞ where left out.
    pub mode_ln: Vec<Lanes>,
    /// Lines of different members that blend.
    pub chains: usize,
    /// How closely the amounts were integrated.
    pub care: Care,
}

/// How closely the amounts of a composition were integrated.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Care {
    /// The newest member was added without moving the others.
    Added,
    /// Product of profiles about the mode.
    Profiles,
    /// Amounts integrated jointly, where they are few enough.
    Joint,
}

/// Members whose absence would matter less than this are not barred in turn.
const CERTAIN: f64 = 1e-7;
/// Most members barred in turn: 2^6 sets.
const MOST_BARRED: usize = 6;
/// Shift and amount nodes this far below the best, in ln, are left out.
const NEGLIGIBLE_LN: f64 = -9.0;
/// Amounts of several members together this far below the best are left out.
const JOINT_LN: f64 = -7.0;
/// Before the amounts have settled, only shift nodes this far below are.
const HOPELESS_LN: f64 = -30.0;
/// Amount nodes this far below the best take the integral over emitter shifts from their neighbours.
const MINOR_LN: f64 = -3.5;
/// A better amount met while integrating, in nats, is worth climbing to.
const BETTER_LN: f64 = 0.05;

/// ln Σ w over shift nodes and lanes.
pub fn ln_total(stock: &Stock, nodes: &[Lanes]) -> f64 {
    let mut terms = Vec::with_capacity(nodes.len() * LANES);
    for (node, weight) in nodes.iter().zip(stock.scene.offset.weights()) {
        for l in 0..LANES {
            terms.push(node[l] + weight.ln() + stock.lane_ln_weight[l]);
        }
    }
    ln_sum_exp(&terms)
}

/// Weighs a composition. `start` gives an amount node for each member to begin from.
pub fn weigh(
    stock: &Stock,
    members: &[usize],
    start: &[Latent],
    barring: bool,
    joint: bool,
) -> Weighed {
    let hopeless = barring && members.iter().any(|m| stock.prepared[*m].pairs.is_empty());
    if hopeless {
        let nodes = vec![[f64::NEG_INFINITY; LANES]; stock.scene.offset.len()];
        return Weighed {
            members: members.to_vec(),
            ln_evidence: f64::NEG_INFINITY,
            mode_ln: nodes.clone(),
            nodes,
            mode: start.to_vec(),
            chains: 0,
            care: Care::Joint,
        };
    }
    if members.is_empty() {
        let nodes = vec![[0.0; LANES]; stock.scene.offset.len()];
        let ln_evidence = ln_total(stock, &nodes);
        return Weighed {
            members: Vec::new(),
            ln_evidence,
            mode_ln: nodes.clone(),
            nodes,
            mode: Vec::new(),
            chains: 0,
            care: Care::Joint,
        };
    }
    let assembly = Assembly::new(stock, members);
    let mut profile = Profile::new(stock, &assembly, start.to_vec(), barring);
    let nodes = match stock.scene.settings.mixture {
        MixtureRule::Product => {
            profile.climb();
            // Away from the start other members may be in doubt.
            if barring && profile.bar_more() {
                profile.climb();
            }
            profile.product_at_best(joint)
        }
        MixtureRule::Joint => profile.joint(barring),
    };
    Weighed {
        members: members.to_vec(),
        ln_evidence: ln_total(stock, &nodes),
        nodes,
        mode_ln: profile.ln_unbarred(),
        mode: profile.latents.clone(),
        chains: assembly.chains,
        care: if joint || members.len() == 1 {
            Care::Joint
        } else {
            Care::Profiles
        },
    }
}

/// Adds one member to a composition without moving the others from their mode: a first, cheap
/// estimate of E*(S ∪ x) = E*(S) · Σ_α w/Z (L(S ∪ x) − L(S ∪ x; x barred))/L(S) at the mode of S.
///
/// `members` and `start` are of the whole composition, `newest` the place of the added one.
pub fn weigh_added(
    stock: &Stock,
    base: &Weighed,
    members: &[usize],
    start: &[Latent],
    newest: usize,
) -> Weighed {
    let assembly = Assembly::new(stock, members);
    let mut profile = Profile::new(stock, &assembly, start.to_vec(), false);
    profile.shifts = (0..base.nodes.len())
        .filter(|d| base.mode_ln[*d][0].is_finite())
        .collect();
    profile.doubtful = vec![newest];
    profile.place_bars();
    profile.refresh();
    profile.jump(newest);
    let mode: Slice = profile.shifts.iter().map(|d| base.mode_ln[*d]).collect();
    let mut added = profile.member_profile(newest, &mode);
    for (lanes, d) in added.iter_mut().zip(&profile.shifts) {
        for l in 0..LANES {
            lanes[l] += base.nodes[*d][l];
        }
    }
    let nodes = profile.spread(added);
    Weighed {
        members: members.to_vec(),
        ln_evidence: ln_total(stock, &nodes),
        nodes,
        mode_ln: profile.ln_unbarred(),
        mode: profile.latents.clone(),
        chains: assembly.chains,
        care: Care::Added,
    }
}

/// A middling state to begin from.
pub fn middle(stock: &Stock, candidate: usize) -> Latent {
    Latent {
        amount: stock.scene.amount.len() / 2,
        shifts: stock.prepared[candidate]
            .shifts
            .iter()
            .map(|q| q.len() / 2)
            .collect(),
    }
}

/// ln of every term of the integrand by (shift in use, lane).
type Slice = Vec<Lanes>;
/// ln sums of one segment, `[local bars][shift]`, and ln missing of its chains.
type Value = Rc<(Vec<Lanes>, f64)>;
/// A segment with its value in another state.
type Replaced = (usize, Value);

/// The integrand in a state next to the present one.
struct Point {
    latents: Vec<Latent>,
    changed: Vec<Replaced>,
    totals: Totals,
    slice: Slice,
}

/// The integrand about one latent state.
pub struct Profile<'s, 'a> {
    stock: &'s Stock<'a>,
    assembly: &'s Assembly,
    /// The state everything is relative to.
    pub latents: Vec<Latent>,
    /// Members barred in turn.
    doubtful: Vec<usize>,
    /// Shift nodes in use.
    pub shifts: Vec<usize>,
    /// Per segment: barred members that live there, as positions in `doubtful`.
    local_bars: Vec<Vec<usize>>,
    /// Per segment: ln sums `[local bars][shift]` and ln missing of chains, at `latents`.
    values: Vec<Value>,
    /// Segments by member, and by (member, emitter).
    by_member: Vec<Vec<usize>>,
    by_emitter: Vec<Vec<Vec<usize>>>,
    work: Workspace,
    /// Values met before, by segment and the states of its emitters.
    memo: HashMap<(usize, u64), Value>,
    /// Sums over all segments at `latents`.
    totals: Totals,
}

/// Sums over all segments in one state.
#[derive(Debug, Default, Clone)]
struct Totals {
    /// `[set of barred members][shift]`.
    ln: Vec<Lanes>,
    /// ln missing of all chains.
    missing: f64,
}

impl<'s, 'a> Profile<'s, 'a> {
    /// Evaluates the starting state; decides which members have to be barred in turn.
    pub fn new(
        stock: &'s Stock<'a>,
        assembly: &'s Assembly,
        latents: Vec<Latent>,
        barring: bool,
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
            doubtful: Vec::new(),
            shifts: (0..stock.scene.offset.len()).collect(),
            local_bars: vec![Vec::new(); assembly.segments.len()],
            values: Vec::new(),
            by_member,
            by_emitter,
            work: Workspace::default(),
            memo: HashMap::new(),
            totals: Totals::default(),
        };
        if barring {
            profile.doubtful = profile.find_doubtful();
            profile.place_bars();
        }
        profile.refresh();
        profile
    }

    /// Bars members that became doubtful at the present state; says whether there were any.
    fn bar_more(&mut self) -> bool {
        let mut all = self.find_doubtful();
        all.retain(|m| !self.doubtful.contains(m));
        all.truncate(MOST_BARRED.saturating_sub(self.doubtful.len()));
        if all.is_empty() {
            return false;
        }
        self.doubtful.extend(all);
        self.doubtful.sort_unstable();
        self.place_bars();
        self.refresh();
        true
    }

    fn place_bars(&mut self) {
        for (bars, segment) in self.local_bars.iter_mut().zip(&self.assembly.segments) {
            *bars = positions(&self.doubtful, |m| segment.members.contains(m));
        }
    }

    /// Members that might have caused nothing: exp(ln L barred − ln L) above a threshold anywhere.
    fn find_doubtful(&mut self) -> Vec<usize> {
        let count = self.assembly.members.len();
        if count == 1 {
            return vec![0];
        }
        let mut ratio = vec![vec![[0.0; LANES]; self.shifts.len()]; count];
        for segment in &self.assembly.segments {
            for m in &segment.members {
                let mut out = Vec::new();
                self.assembly.ln_segment(
                    self.stock,
                    segment,
                    &self.latents,
                    &self.shifts,
                    &[*m],
                    None,
                    &mut self.work,
                    &mut out,
                );
                let half = self.shifts.len();
                for d in 0..half {
                    for l in 0..LANES {
                        ratio[*m][d][l] += out[half + d][l] - out[d][l];
                    }
                }
            }
        }
        let mut worst: Vec<(f64, usize)> = ratio
            .iter()
            .enumerate()
            .map(|(m, nodes)| {
                (
                    nodes
                        .iter()
                        .flatten()
                        .copied()
                        .fold(f64::NEG_INFINITY, f64::max),
                    m,
                )
            })
            .filter(|(ln, _)| *ln > CERTAIN.ln())
            .collect();
        worst.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
        worst.truncate(MOST_BARRED);
        let mut doubtful: Vec<usize> = worst.into_iter().map(|(_, m)| m).collect();
        doubtful.sort_unstable();
        doubtful
    }

    fn evaluate(&mut self, segment: usize, latents: &[Latent], without: Option<usize>) -> Value {
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
        let value = Rc::new((out, missing));
        if without.is_none() {
            self.memo.insert(key, Rc::clone(&value));
        }
        value
    }

    /// Evaluates everything anew: after a change of shifts in use or of barred members.
    fn refresh(&mut self) {
        self.memo.clear();
        self.settle();
    }

    /// Values and totals at `latents`.
    fn settle(&mut self) {
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
    fn accumulate(&self, totals: &mut Totals, segment: usize, value: &Value, sign: f64) {
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
    fn with_replaced<'v>(
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

    fn own_missing(&self, latents: &[Latent]) -> f64 {
        latents
            .iter()
            .enumerate()
            .map(|(m, latent)| self.assembly.own_missing(self.stock, m, latent))
            .sum()
    }

    /// ln L* = ln Σ_B (−1)^|B| L(B barred) by shift and lane.
    fn finish(&self, latents: &[Latent], totals: &Totals) -> Slice {
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
    fn ln_unbarred(&self) -> Vec<Lanes> {
        let missing = self.own_missing(&self.latents) + self.totals.missing;
        let count = self.shifts.len();
        self.spread(
            self.totals.ln[..count]
                .iter()
                .map(|lanes| lanes.map(|x| x + missing))
                .collect(),
        )
    }

    fn present(&self) -> Slice {
        self.finish(&self.latents, &self.totals)
    }

    /// The integrand in a state that differs from the present one in the given segments.
    fn slice(&mut self, latents: &[Latent], touched: &[usize]) -> Slice {
        let changed = self.replace(latents, touched, None);
        let totals = self.with_replaced(&self.totals, &changed, |s| &self.values[s]);
        self.finish(latents, &totals)
    }

    fn replace(
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

    fn ln_weighted(&self, slice: &Slice) -> f64 {
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

    fn shift_ln_weight(&self, m: usize, latent: &Latent) -> f64 {
        let prepared = &self.stock.prepared[self.assembly.members[m]];
        prepared
            .shifts
            .iter()
            .zip(&latent.shifts)
            .map(|(q, b)| q.weights()[*b].ln())
            .sum()
    }

    /// Coordinate ascent to one mode over all amounts and emitter shifts.
    pub fn climb(&mut self) {
        const MOST_SWEEPS: usize = 8;
        self.choose_start();
        self.drop_shifts(HOPELESS_LN);
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
    fn choose_start(&mut self) {
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
    fn climb_amount(&mut self, m: usize) -> bool {
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

    /// The integrand for the amounts of one member, outwards from the present one until it has
    /// fallen too far to count.
    fn amounts(&mut self, m: usize) -> Vec<(usize, Point)> {
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

    fn point(&mut self, m: usize, amount: usize) -> Point {
        self.point_at(&[(m, amount)])
    }

    /// The integrand with the amounts of some members changed.
    fn point_at(&mut self, amounts: &[(usize, usize)]) -> Point {
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

    fn climb_shifts(&mut self, m: usize) -> bool {
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
    fn choose<F: Fn(&mut Latent)>(
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

    /// Leaves out shifts that carry nothing at the present state.
    fn drop_shifts(&mut self, below_ln: f64) {
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

    /// ln of the profile of one member: Σ_α w/Z · L*(α)/L*(mode) · Π_e Σ_β w · L*(α, β_e)/L*(α).
    fn member_profile(&mut self, m: usize, mode: &Slice) -> Slice {
        let points = self
            .amounts(m)
            .into_iter()
            .map(|(k, point)| (vec![k], point))
            .collect();
        self.integral(&[m], points, mode)
    }

    /// ln Σ over amounts of Π w/Z · L*(amounts)/L*(mode), the emitter shifts of `members`
    /// integrated.
    fn integral(
        &mut self,
        members: &[usize],
        points: Vec<(Vec<usize>, Point)>,
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
        let factors: Vec<Option<Slice>> = points
            .iter()
            .map(|(_, p)| (peak(&p.slice) > best + MINOR_LN).then(|| self.shift_factor(members, p)))
            .collect();
        let weights = self.stock.scene.amount.weights();
        let mut sums = vec![[0.0; LANES]; mode.len()];
        for (amounts, point) in &points {
            let Some(factor) = nearest(&points, &factors, amounts) else {
                continue;
            };
            let weight: f64 = amounts.iter().map(|k| weights[*k]).product();
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
    fn shift_factor(&mut self, members: &[usize], point: &Point) -> Slice {
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
    fn shift_mean(&mut self, m: usize, e: usize, shift: &Quadrature, point: &Point) -> Slice {
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
    fn product_at_best(&mut self, joint: bool) -> Vec<Lanes> {
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

    /// Moves one member to the best of all its amounts, if that is better by more than a trifle.
    fn jump(&mut self, m: usize) -> bool {
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

    /// The product approximation L*(mode) · Π_s P_s on all shift nodes; where `joint` asks for it
    /// and the amounts are few enough, the amounts are integrated jointly instead.
    fn product(&mut self, joint: bool) -> Vec<Lanes> {
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
            add(&mut total, &self.integral(&members, points, &mode));
        } else {
            for m in 0..self.assembly.members.len() {
                add(&mut total, &self.member_profile(m, &mode));
            }
        }
        self.spread(total)
    }

    /// The combinations of amounts that count: outwards from the mode, as far as the integrand
    /// has not fallen too far. None where they are too many.
    fn joint_points(&mut self) -> Option<Vec<(Vec<usize>, Point)>> {
        const MOST_POINTS: usize = 1024;
        let count = self.stock.scene.amount.len();
        let mode: Vec<usize> = self.latents.iter().map(|l| l.amount).collect();
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
                open.extend(neighbours(&amounts, count).filter(|n| met.insert(n.clone())));
            }
            points.push((amounts, point));
            if points.len() > MOST_POINTS {
                return None;
            }
        }
        points.sort_by(|a, b| a.0.cmp(&b.0));
        Some(points)
    }

    /// The full joint grid, on all shift nodes.
    fn joint(&mut self, barring: bool) -> Vec<Lanes> {
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

    /// P(nothing caused it) by reading: E*(S; reading barred)/E*(S), amounts about the mode
    /// integrated, emitter shifts kept. `nodes` weigh shifts and lanes.
    pub fn unexplained(&mut self, nodes: &[Lanes]) -> Vec<f64> {
        if self.assembly.members.is_empty() {
            return vec![1.0; self.stock.scene.observations.len()];
        }
        let mode = self.present();
        let amounts: Vec<Vec<(usize, Point)>> = (0..self.assembly.members.len())
            .map(|m| self.amounts(m))
            .collect();
        (0..self.stock.scene.observations.len())
            .map(|j| self.unexplained_reading(j, &mode, &amounts, nodes))
            .collect()
    }

    fn unexplained_reading(
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
    fn mean_over_nodes(&self, ln: &Slice, nodes: &[Lanes]) -> f64 {
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

    /// Puts a slice back on all shift nodes; nodes left out carry nothing.
    fn spread(&self, slice: Slice) -> Vec<Lanes> {
        let mut nodes = vec![[f64::NEG_INFINITY; LANES]; self.stock.scene.offset.len()];
        for (d, lanes) in self.shifts.iter().zip(slice) {
            nodes[*d] = lanes.map(|x| if x.is_nan() { f64::NEG_INFINITY } else { x });
        }
        nodes
    }
}

/// Every latent state of one substance with ln of its weight over Z.
fn grid(stock: &Stock, prepared: &super::prepare::Prepared) -> Vec<(Latent, f64)> {
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

/// Amount nodes one step away in one member.
fn neighbours(amounts: &[usize], count: usize) -> impl Iterator<Item = Vec<usize>> {
    (0..amounts.len())
        .flat_map(|m| [(m, -1isize), (m, 1)])
        .filter_map(move |(m, step)| {
            let next = amounts[m].checked_add_signed(step).filter(|k| *k < count)?;
            let mut amounts = amounts.to_vec();
            amounts[m] = next;
            Some(amounts)
        })
}

fn value_in(changed: &[Replaced], segment: usize) -> Option<&Value> {
    changed.iter().find(|(s, _)| *s == segment).map(|(_, v)| v)
}

fn positions<T>(items: &[T], keep: impl Fn(&T) -> bool) -> Vec<usize> {
    items
        .iter()
        .enumerate()
        .filter(|(_, i)| keep(i))
        .map(|(p, _)| p)
        .collect()
}

fn peak(slice: &Slice) -> f64 {
    slice
        .iter()
        .flatten()
        .copied()
        .fold(f64::NEG_INFINITY, f64::max)
}

fn add(to: &mut Slice, from: &Slice) {
    combine(to, from, |a, b| a + b);
}

fn subtract(from: &mut Slice, what: &Slice) {
    combine(from, what, |a, b| a - b);
}

fn combine(to: &mut Slice, with: &Slice, op: impl Fn(f64, f64) -> f64) {
    for (a, b) in to.iter_mut().zip(with) {
        for l in 0..LANES {
            a[l] = op(a[l], b[l]);
        }
    }
}
