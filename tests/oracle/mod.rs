//! A brute force of the evidence model: every amount, every shift, every matching, one by one.
//!
//! Shares nothing with the engine but the plain types at its door. What a substance must do to
//! count as present is asked of each matching by itself; nothing is subtracted.

pub mod cases;

use linstock::evidence::{Candidate, Conditions, FeatureForm, Observation};
use statrs::distribution::{Continuous, ContinuousCDF, Normal};

/// Who is said to have caused a reading that a blend caused.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Attribution {
    /// The member with the largest share; of equal leaders the one with the strongest single
    /// feature, then the shortest wavelength.
    First,
    /// The member with the largest share; equal leaders share it equally.
    Leader,
}

/// Constants of the model.
#[derive(Debug, Clone)]
pub struct Constants {
    pub overlook: f64,
    pub tail_weight: f64,
    pub tail_factor: f64,
    /// Mean of the density of clutter strengths, decades.
    pub clutter_mean: f64,
    /// (κ|R|, weight)
    pub clutter: Vec<(f64, f64)>,
    pub clutter_reference: f64,
    pub amounts: usize,
    /// (δ, weight)
    pub offsets: Vec<(f64, f64)>,
    pub attribution: Attribution,
}

/// What the brute force finds for one composition.
#[derive(Debug, Clone)]
pub struct Weight {
    pub members: Vec<usize>,
    /// ln E'
    pub ln_any: f64,
    /// ln E*
    pub ln_star: f64,
    pub posterior: f64,
}

/// A feature after merging.
#[derive(Debug, Clone)]
struct Spot {
    owner: usize,
    emitter: usize,
    at: f64,
    u: f64,
    h: f64,
    tau: f64,
    edge: f64,
    /// P(recorded as a band)
    band: f64,
}

fn gauss(z: f64, sd: f64) -> f64 {
    Normal::new(0.0, sd).map_or(0.0, |n| n.pdf(z))
}

fn cdf(x: f64, sd: f64) -> f64 {
    match Normal::new(0.0, sd) {
        Ok(n) => n.cdf(x),
        Err(_) => f64::from(u8::from(x > 0.0)),
    }
}

fn middle_of(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let n = values.len();
    if n == 0 {
        0.0
    } else {
        0.5 * (values[(n - 1) / 2] + values[n / 2])
    }
}

/// Everything the oracle needs of one scene.
pub struct Oracle<'a> {
    observations: &'a [Observation],
    conditions: &'a Conditions,
    candidates: &'a [Candidate],
    constants: &'a Constants,
    spots: Vec<Vec<Spot>>,
    /// Shift nodes (β, weight) per candidate and emitter.
    betas: Vec<Vec<Vec<(f64, f64)>>>,
    span: f64,
    u_y: f64,
    u: f64,
}

/// A feature's bit and, by member named the cause, (the member's bit, r).
type Choice = (u32, Vec<(usize, f64)>);
/// (weight, α, β per emitter)
type State = (f64, f64, Vec<f64>);
/// Ways of assigning, by (bitmask of members that caused something, number of matches).
type Tally = Vec<Vec<f64>>;

impl<'a> Oracle<'a> {
    pub fn new(
        observations: &'a [Observation],
        conditions: &'a Conditions,
        candidates: &'a [Candidate],
        constants: &'a Constants,
    ) -> Self {
        let blind: f64 = conditions.blind_nm.iter().map(|b| b[1] - b[0]).sum();
        let mut oracle = Self {
            observations,
            conditions,
            candidates,
            constants,
            spots: Vec::new(),
            betas: Vec::new(),
            span: conditions.range_nm[1] - conditions.range_nm[0] - blind,
            u_y: middle_of(
                observations
                    .iter()
                    .filter_map(|o| o.strength_dex.map(|s| s.1))
                    .collect(),
            ),
            u: middle_of(observations.iter().map(|o| o.uncertainty_nm).collect()),
        };
        for (c, candidate) in candidates.iter().enumerate() {
            let spots = oracle.prepare(c);
            oracle.betas.push(shifts(candidate, &spots));
            oracle.spots.push(spots);
        }
        oracle
    }

    /// The share of the density of a recorded position that lies where the set-up sees.
    fn edge(&self, at: f64, u_i: f64) -> f64 {
        let k = self.constants;
        let cal = self.conditions.offset_nm;
        let v = self.u * self.u + u_i * u_i;
        let narrow = (v + cal * cal).sqrt();
        let wide = (v * k.tail_factor * k.tail_factor + cal * cal).sqrt();
        let mass = |lo: f64, hi: f64| {
            (1.0 - k.tail_weight) * (cdf(hi - at, narrow) - cdf(lo - at, narrow))
                + k.tail_weight * (cdf(hi - at, wide) - cdf(lo - at, wide))
        };
        let mut seen = mass(self.conditions.range_nm[0], self.conditions.range_nm[1]);
        for b in &self.conditions.blind_nm {
            seen -= mass(b[0], b[1]);
        }
        seen.clamp(0.0, 1.0)
    }

    fn prepare(&self, c: usize) -> Vec<Spot> {
        let w = self.conditions.resolution_nm;
        let mut loose: Vec<Spot> = self.candidates[c]
            .features
            .iter()
            .map(|f| Spot {
                owner: c,
                emitter: f.emitter,
                at: f.wavelength_nm,
                u: f.uncertainty_nm,
                h: f.level_dex,
                tau: f.scatter_dex,
                edge: 1.0,
                band: match f.form {
                    FeatureForm::Line => 0.05,
                    FeatureForm::BandHead => 0.7,
                    FeatureForm::BandMax => 0.9,
                },
            })
            .collect();
        loose.sort_by(|a, b| b.h.total_cmp(&a.h).then(a.at.total_cmp(&b.at)));
        let mut merged = Vec::new();
        while !loose.is_empty() {
            let seed = loose.remove(0);
            let (mut near, far): (Vec<Spot>, Vec<Spot>) =
                loose.into_iter().partition(|s| (s.at - seed.at).abs() < w);
            near.insert(0, seed);
            merged.push(unite(&near).0);
            loose = far;
        }
        for s in &mut merged {
            s.edge = self.edge(s.at, s.u);
        }
        let inside: Vec<f64> = merged
            .iter()
            .filter(|s| s.edge >= 0.5)
            .map(|s| s.h)
            .collect();
        let all: Vec<f64> = merged.iter().map(|s| s.h).collect();
        let top = if inside.is_empty() { all } else { inside };
        let top = top.into_iter().fold(f64::NEG_INFINITY, f64::max);
        merged
            .into_iter()
            .map(|mut s| {
                s.h -= top;
                s
            })
            .filter(|s| s.edge * cdf(self.conditions.dynamic_range_dex + s.h, s.tau) >= 0.005)
            .collect()
    }

    fn amounts(&self) -> Vec<f64> {
        let n = self.constants.amounts;
        (0..n)
            .map(|k| self.conditions.dynamic_range_dex * (k as f64 + 0.5) / n as f64)
            .collect()
    }

    /// Every (weight, α, β per emitter) of a candidate.
    fn states(&self, c: usize) -> Vec<State> {
        let amounts = self.amounts();
        let mut out: Vec<State> = amounts
            .iter()
            .map(|a| (1.0 / amounts.len() as f64, *a, Vec::new()))
            .collect();
        for nodes in &self.betas[c] {
            out = out
                .into_iter()
                .flat_map(|(w, a, b)| {
                    nodes.iter().map(move |(x, v)| {
                        let mut more = b.clone();
                        more.push(*x);
                        (w * v, a, more)
                    })
                })
                .collect();
        }
        out
    }

    fn detection(&self, s: &Spot) -> f64 {
        (1.0 - self.constants.overlook) * s.edge * cdf(s.h, s.tau.hypot(self.u_y))
    }

    /// Z of a candidate.
    pub fn detectability(&self, c: usize) -> f64 {
        self.states(c)
            .iter()
            .map(|(w, a, b)| {
                let unseen: f64 = self.spots[c]
                    .iter()
                    .map(|s| 1.0 - self.detection(&lifted(s, *a, b)))
                    .product();
                w * (1.0 - unseen)
            })
            .sum()
    }

    /// r at κ_ref times (1−p), one reading and one feature.
    fn cause(&self, o: &Observation, s: &Spot, delta: f64) -> f64 {
        let k = self.constants;
        let kappa = k.clutter_reference / self.span;
        let v = o.uncertainty_nm * o.uncertainty_nm + s.u * s.u;
        let z = o.wavelength_nm - s.at - delta;
        let f = (1.0 - k.tail_weight) * gauss(z, v.sqrt())
            + k.tail_weight * gauss(z, k.tail_factor * v.sqrt());
        let form = match o.band {
            None => 1.0,
            Some(true) => s.band / 0.4,
            Some(false) => (1.0 - s.band) / 0.6,
        };
        let seen = match o.strength_dex {
            None => cdf(s.h, s.tau.hypot(self.u_y)),
            Some((y, u_y)) if o.saturated => {
                cdf(s.h - y, s.tau.hypot(u_y)) / (-y / k.clutter_mean).exp()
            }
            Some((y, u_y)) => {
                gauss(y - s.h, s.tau.hypot(u_y)) / ((-y / k.clutter_mean).exp() / k.clutter_mean)
            }
        };
        (1.0 - k.overlook) * seen * f / kappa * form
    }

    /// Features as seen together, with the share of each owner.
    fn together(&self, spots: Vec<Spot>) -> Vec<(Spot, Vec<(usize, f64)>)> {
        let w = self.conditions.resolution_nm;
        let mut spots = spots;
        spots.sort_by(|a, b| a.at.total_cmp(&b.at));
        let mut chains: Vec<Vec<Spot>> = Vec::new();
        for s in spots {
            match chains.last_mut() {
                Some(c) if c.last().is_some_and(|l| s.at - l.at < w) => c.push(s),
                _ => chains.push(vec![s]),
            }
        }
        let mut seen = Vec::new();
        for chain in chains {
            if chain.iter().all(|s| s.owner == chain[0].owner) {
                seen.extend(chain.into_iter().map(|s| (s.clone(), vec![(s.owner, 1.0)])));
                continue;
            }
            let mut left = chain;
            while !left.is_empty() {
                let mut top = 0;
                for i in 1..left.len() {
                    if left[i].h > left[top].h {
                        top = i;
                    }
                }
                let centre = left[top].at;
                let (mut near, far): (Vec<Spot>, Vec<Spot>) =
                    left.into_iter().partition(|s| (s.at - centre).abs() < w);
                left = far;
                near.sort_by(|a, b| b.h.total_cmp(&a.h));
                let (whole, shares) = unite(&near);
                let mut owners: Vec<(usize, f64)> = Vec::new();
                for (s, share) in near.iter().zip(shares) {
                    match owners.iter_mut().find(|o| o.0 == s.owner) {
                        Some(o) => o.1 += share,
                        None => owners.push((s.owner, share)),
                    }
                }
                seen.push((whole, owners));
            }
        }
        seen
    }

    /// Most members that share one feature, amounts equal.
    pub fn blends(&self, set: &[usize]) -> usize {
        let loose = set
            .iter()
            .flat_map(|c| self.spots[*c].iter().cloned())
            .collect();
        self.together(loose)
            .iter()
            .map(|(_, owners)| owners.len())
            .max()
            .unwrap_or(0)
    }

    /// Who may be named the cause, with what share of it.
    fn named(&self, owners: &[(usize, f64)]) -> Vec<(usize, f64)> {
        match self.constants.attribution {
            Attribution::First => {
                let mut best = (owners[0].0, 0.0);
                for o in owners {
                    if o.1 > best.1 {
                        best = *o;
                    }
                }
                vec![(best.0, 1.0)]
            }
            Attribution::Leader => {
                let most = owners.iter().map(|o| o.1).fold(0.0, f64::max);
                let first: Vec<usize> = owners
                    .iter()
                    .filter(|o| o.1 > most - 1e-12)
                    .map(|o| o.0)
                    .collect();
                first
                    .iter()
                    .map(|m| (*m, 1.0 / first.len() as f64))
                    .collect()
            }
        }
    }

    /// Sum over all matchings in one state of everything.
    fn tally(&self, set: &[usize], states: &[State], delta: f64) -> Tally {
        let mut loose = Vec::new();
        for (c, (_, a, b)) in set.iter().zip(states) {
            loose.extend(self.spots[*c].iter().map(|s| lifted(s, *a, b)));
        }
        let seen = self.together(loose);
        let all_missing: f64 = seen.iter().map(|(s, _)| 1.0 - self.detection(s)).product();
        // (member bit, r) by reading and feature
        let mut table: Vec<Vec<Choice>> = Vec::new();
        for o in self.observations {
            let mut row = Vec::new();
            for (i, (s, owners)) in seen.iter().enumerate() {
                let r = self.cause(o, s, delta) / (1.0 - self.detection(s));
                let named: Vec<(usize, f64)> = self
                    .named(owners)
                    .iter()
                    .map(|(m, share)| {
                        (
                            1usize << set.iter().position(|c| c == m).expect("a member"),
                            r * share,
                        )
                    })
                    .collect();
                if r > 0.0 && !named.is_empty() {
                    row.push((1u32 << i, named));
                }
            }
            table.push(row);
        }
        let mut tally = vec![vec![0.0; self.observations.len() + 1]; 1 << set.len()];
        assign(&table, 0, 0, 0, all_missing, &mut tally);
        tally
    }

    /// (ln E', ln E*) of a set of candidates. E' is not a number where a substance cannot show.
    pub fn weigh(&self, set: &[usize]) -> (f64, f64) {
        let z: Vec<f64> = set.iter().map(|c| self.detectability(*c)).collect();
        if z.contains(&0.0) {
            // Of a substance that shows nothing at all the evidence is not defined, its presence impossible.
            return (f64::NAN, f64::NEG_INFINITY);
        }
        let mut grid: Vec<(f64, Vec<State>)> = vec![(1.0, Vec::new())];
        for (c, z) in set.iter().zip(&z) {
            let own = self.states(*c);
            grid = grid
                .into_iter()
                .flat_map(|(w, before)| {
                    own.iter().map(move |s| {
                        let mut more = before.clone();
                        more.push(s.clone());
                        (w * s.0 / z, more)
                    })
                })
                .collect();
        }
        let k = self.constants;
        let n = self.observations.len() as i32;
        let (mut any, mut star) = (0.0, 0.0);
        for (w, states) in &grid {
            for (delta, v) in &k.offsets {
                let tally = self.tally(set, states, *delta);
                for (rate, u) in &k.clutter {
                    let common = w
                        * v
                        * u
                        * (rate / k.clutter_reference).powi(n)
                        * (k.clutter_reference - rate).exp();
                    for (caused, by_matches) in tally.iter().enumerate() {
                        let mut sum = 0.0;
                        for (matches, ways) in by_matches.iter().enumerate() {
                            sum += ways * (k.clutter_reference / rate).powi(matches as i32);
                        }
                        any += common * sum;
                        if caused + 1 == tally.len() {
                            star += common * sum;
                        }
                    }
                }
            }
        }
        (any.ln(), star.ln())
    }

    /// All compositions, in binary counting order.
    pub fn all(&self) -> Vec<Weight> {
        let count = self.candidates.len();
        let z: Vec<f64> = (0..count).map(|c| self.detectability(c)).collect();
        let mut out = Vec::new();
        for set in 0..1usize << count {
            let members: Vec<usize> = (0..count).filter(|c| set & (1 << c) != 0).collect();
            let (ln_any, ln_star) = self.weigh(&members);
            let mut prior = 1.0;
            for (c, candidate) in self.candidates.iter().enumerate() {
                let chance = candidate.prior * candidate.shows * z[c];
                prior *= if members.contains(&c) {
                    chance
                } else {
                    1.0 - chance
                };
            }
            out.push(Weight {
                members,
                ln_any,
                ln_star,
                posterior: prior.ln() + ln_star,
            });
        }
        let top = out
            .iter()
            .map(|w| w.posterior)
            .fold(f64::NEG_INFINITY, f64::max);
        let total: f64 = out.iter().map(|w| (w.posterior - top).exp()).sum();
        for w in &mut out {
            w.posterior = (w.posterior - top).exp() / total;
        }
        out
    }
}

/// β nodes per emitter; a substance of which one emitter shows needs none against itself. An
/// emitter excited less surely than the surest may be silent: 12 decades down.
fn shifts(candidate: &Candidate, spots: &[Spot]) -> Vec<Vec<(f64, f64)>> {
    let shown: Vec<bool> = (0..candidate.emitter_spread_dex.len())
        .map(|e| spots.iter().any(|s| s.emitter == e))
        .collect();
    let several = shown.iter().filter(|s| **s).count() > 1;
    candidate
        .emitter_spread_dex
        .iter()
        .zip(&candidate.emitter_shows)
        .zip(shown)
        .map(|((sd, shows), shown)| {
            if !shown {
                return vec![(0.0, 1.0)];
            }
            let far = sd * 3f64.sqrt();
            let mut nodes = if several && *sd > 0.0 {
                vec![(-far, 1.0 / 6.0), (0.0, 2.0 / 3.0), (far, 1.0 / 6.0)]
            } else {
                vec![(0.0, 1.0)]
            };
            let silent = 1.0 - shows / candidate.shows;
            if silent >= 1e-3 {
                nodes.iter_mut().for_each(|(_, w)| *w *= 1.0 - silent);
                nodes.push((-12.0, silent));
            }
            nodes
        })
        .collect()
}

fn lifted(s: &Spot, alpha: f64, beta: &[f64]) -> Spot {
    Spot {
        h: s.h + alpha + beta[s.emitter],
        ..s.clone()
    }
}

/// Several features that look like one, and their shares φ. The first gives owner and emitter.
fn unite(parts: &[Spot]) -> (Spot, Vec<f64>) {
    let power: Vec<f64> = parts.iter().map(|s| 10f64.powf(s.h)).collect();
    let sum: f64 = power.iter().sum();
    let phi: Vec<f64> = power.iter().map(|p| p / sum).collect();
    let mut whole = Spot {
        at: 0.0,
        u: 0.0,
        tau: 0.0,
        edge: 0.0,
        band: 0.0,
        h: sum.log10(),
        ..parts[0].clone()
    };
    for (p, s) in phi.iter().zip(parts) {
        whole.at += p * s.at;
        whole.edge += p * s.edge;
        whole.band += p * s.band;
        whole.tau += (p * s.tau).powi(2);
    }
    for (p, s) in phi.iter().zip(parts) {
        let moved = (s.at - whole.at) * (s.tau * 10f64.ln()).min(1.0);
        whole.u += p * p * (s.u * s.u + moved * moved);
    }
    whole.u = whole.u.sqrt();
    whole.tau = whole.tau.sqrt();
    (whole, phi)
}

/// Reading by reading: clutter, or any feature not used yet.
fn assign(
    table: &[Vec<Choice>],
    used: u32,
    caused: usize,
    matches: usize,
    weight: f64,
    tally: &mut Tally,
) {
    let Some((row, rest)) = table.split_first() else {
        tally[caused][matches] += weight;
        return;
    };
    assign(rest, used, caused, matches, weight, tally);
    for (feature, named) in row {
        if used & feature == 0 {
            for (member, r) in named {
                assign(
                    rest,
                    used | feature,
                    caused | member,
                    matches + 1,
                    weight * r,
                    tally,
                );
            }
        }
    }
}
