//! A substance made ready for a set-up: features merged to what the instrument resolves, their
//! visibility, and every factor that does not depend on the other substances.

use super::blend::{Part, blend};
use super::density::{median, normal, phi};
use super::quadrature::Quadrature;
use super::settings::Settings;
use super::{Candidate, Conditions, FeatureForm, Observation};

/// A feature as this set-up resolves it.
#[derive(Debug, Clone, PartialEq)]
pub struct Line {
    /// λ, nm.
    pub wavelength_nm: f64,
    /// u_i, nm.
    pub uncertainty_nm: f64,
    /// h0: decades relative to the strongest observable feature of the substance.
    pub level_dex: f64,
    /// τ, decades.
    pub scatter_dex: f64,
    /// e: the share of its position density that the set-up can see.
    pub edge: f64,
    /// Emitter within the candidate: of the strongest member.
    pub emitter: usize,
    /// Strongest member, an index into the candidate's features.
    pub feature: usize,
    /// Chance that it is recorded as a band rather than a line, if it is recorded.
    pub band_chance: f64,
}

/// A line and a reading that it may have caused.
#[derive(Debug, Clone)]
pub struct Pair {
    /// Index into [`Prepared::lines`].
    pub line: usize,
    /// Index of the reading.
    pub reading: usize,
    /// f·(form factor)/κ_ref for every node of the common shift.
    pub position: Vec<f64>,
    /// (1−ε)·(visibility)/(1−p) for every latent state of the line's emitter.
    pub amplitude: Vec<f64>,
}

/// What all candidates of one inference share: the readings, the set-up and the nuisances.
#[derive(Debug, Clone)]
pub struct Scene<'a> {
    /// Readings.
    pub observations: &'a [Observation],
    /// Set-up.
    pub conditions: &'a Conditions,
    /// Constants.
    pub settings: &'a Settings,
    /// Amount α, the same nodes for every substance.
    pub amount: Quadrature,
    /// Common shift δ.
    pub offset: Quadrature,
    /// |R| without the blind stretches, nm.
    pub span_nm: f64,
    /// Median u_y of the readings that carry a strength; 0 if none.
    pub strength_uncertainty_dex: f64,
    median_uncertainty_nm: f64,
}

impl<'a> Scene<'a> {
    /// Fixes the nodes of all shared nuisances.
    pub fn new(
        observations: &'a [Observation],
        conditions: &'a Conditions,
        settings: &'a Settings,
    ) -> Self {
        let stated = observations.iter().filter_map(|o| o.strength_dex);
        let with_strengths = stated.clone().next().is_some();
        let offset = settings.offset.clone().unwrap_or_else(|| {
            Quadrature::offset(
                conditions.offset_nm,
                settings.offset_reach,
                shift_spacing(observations),
            )
        });
        let [low, high] = conditions.range_nm;
        let blind: f64 = conditions.blind_nm.iter().map(|[a, b]| b - a).sum();
        Self {
            observations,
            conditions,
            settings,
            amount: Quadrature::midpoints(
                conditions.dynamic_range_dex,
                settings.amount_nodes[usize::from(with_strengths)],
            ),
            offset,
            span_nm: (high - low - blind).max(1e-6),
            strength_uncertainty_dex: median(stated.map(|(_, u)| u)).unwrap_or(0.0),
            median_uncertainty_nm: median(observations.iter().map(|o| o.uncertainty_nm))
                .unwrap_or(0.0),
        }
    }

    /// κ_ref, readings per nm.
    pub fn clutter_density(&self) -> f64 {
        self.settings.clutter_reference / self.span_nm
    }

    /// p = (1−ε)·e·Φ(h/σ), σ² = τ² + (median u_y)².
    pub fn detection(&self, edge: f64, visibility_dex: f64, scatter_dex: f64) -> f64 {
        let sigma = scatter_dex.hypot(self.strength_uncertainty_dex);
        (1.0 - self.settings.overlook) * edge * step(visibility_dex, sigma)
    }

    /// The factor of r that depends on how visible a feature is:
    /// (1−ε)·Φ(h/σ)/(1−p) without strength, (1−ε)·N(y; h, σ²)/((1−p)·g(y)) with one, and
    /// (1−ε)·Φ((h−y)/σ)/((1−p)·e^{−y/0.4}) for a saturated one.
    pub fn amplitude(
        &self,
        reading: usize,
        visibility_dex: f64,
        scatter_dex: f64,
        missing: f64,
    ) -> f64 {
        let observation = &self.observations[reading];
        let mean = self.settings.clutter_strength_dex;
        let seen = match observation.strength_dex {
            None => step(
                visibility_dex,
                scatter_dex.hypot(self.strength_uncertainty_dex),
            ),
            Some((y, u_y)) => {
                let sigma = scatter_dex.hypot(u_y);
                let clutter = (-y / mean).exp();
                if observation.saturated {
                    step(visibility_dex - y, sigma) / clutter
                } else {
                    normal(y - visibility_dex, sigma * sigma) * mean / clutter
                }
            }
        };
        (1.0 - self.settings.overlook) * seen / missing
    }

    /// f·(form factor)/κ_ref at one shift.
    pub fn position(
        &self,
        reading: usize,
        wavelength_nm: f64,
        uncertainty_nm: f64,
        band_chance: f64,
        shift_nm: f64,
    ) -> f64 {
        let observation = &self.observations[reading];
        let z = observation.wavelength_nm - wavelength_nm - shift_nm;
        let variance = observation.uncertainty_nm.powi(2) + uncertainty_nm.powi(2);
        let (tail, factor) = (self.settings.tail_weight, self.settings.tail_factor);
        let density =
            (1.0 - tail) * normal(z, variance) + tail * normal(z, variance * factor * factor);
        density * form_factor(observation.band, band_chance) / self.clutter_density()
    }

    /// e = ∫ of the position density over what can be seen, s² = u² + u_i² + u_cal², both parts of f.
    fn edge(&self, wavelength_nm: f64, uncertainty_nm: f64) -> f64 {
        let conditions = self.conditions;
        let own = self.median_uncertainty_nm.hypot(uncertainty_nm);
        let tail = self.settings.tail_weight;
        let inside = |[low, high]: [f64; 2]| {
            [(1.0 - tail, 1.0), (tail, self.settings.tail_factor)]
                .iter()
                .map(|(weight, factor)| {
                    let s = (own * factor).hypot(conditions.offset_nm);
                    weight * (step(high - wavelength_nm, s) - step(low - wavelength_nm, s))
                })
                .sum::<f64>()
        };
        let blind: f64 = conditions.blind_nm.iter().map(|b| inside(*b)).sum();
        (inside(conditions.range_nm) - blind).clamp(0.0, 1.0)
    }

    /// The merge width at a position: the resolution, or less beside readings told apart there.
    /// Their distance is uncertain, and the lines they show may lie closer than they do.
    pub fn merge_width(&self, wavelength_nm: f64) -> f64 {
        /// Lines further apart than this share of the distance between two readings are two.
        const SPLIT_SHARE: f64 = 0.5;
        let width = self.conditions.resolution_nm;
        self.conditions
            .splits_nm
            .iter()
            .filter(|[a, b]| (a - width..=b + width).contains(&wavelength_nm))
            .map(|[a, b]| (b - a).abs() * SPLIT_SHARE)
            .fold(width, f64::min)
    }
}

/// Spacing of the shift nodes, nm: half the smallest uncertainty, and no wider than 1.5 times what
/// all readings together leave open, (Σu⁻²)^−½, where the trapezoid rule on a normal density still
/// errs by less than 2·e^{−2π²/1.5²} = 3e-4.
fn shift_spacing(observations: &[Observation]) -> f64 {
    const FLOOR_NM: f64 = 0.005;
    let finest = observations
        .iter()
        .map(|o| o.uncertainty_nm)
        .fold(f64::INFINITY, f64::min);
    let information: f64 = observations
        .iter()
        .map(|o| o.uncertainty_nm.max(FLOOR_NM).powi(-2))
        .sum();
    (0.5 * finest.max(FLOOR_NM)).min(1.5 * information.powf(-0.5))
}

/// Φ(x/σ), a step for σ = 0.
fn step(x: f64, sigma: f64) -> f64 {
    if sigma > 0.0 {
        phi(x / sigma)
    } else if x > 0.0 {
        1.0
    } else {
        0.0
    }
}

/// P(band | line, head, maximum): our judgement.
fn band_chance(form: FeatureForm) -> f64 {
    match form {
        FeatureForm::Line => 0.05,
        FeatureForm::BandHead => 0.7,
        FeatureForm::BandMax => 0.9,
    }
}

/// P(form as seen | feature) / P(form as seen | clutter); clutter is seen as a line 6 times in 10.
fn form_factor(seen_as_band: Option<bool>, band_chance: f64) -> f64 {
    match seen_as_band {
        None => 1.0,
        Some(true) => band_chance / 0.4,
        Some(false) => (1.0 - band_chance) / 0.6,
    }
}

/// A candidate made ready for one scene.
#[derive(Debug, Clone)]
pub struct Prepared {
    /// Lines in ascending wavelength.
    pub lines: Vec<Line>,
    /// Pairs by line, then reading.
    pub pairs: Vec<Pair>,
    /// Shift β of each emitter against the substance.
    pub shifts: Vec<Quadrature>,
    /// ln(1−p) by line and latent state of its emitter (`amount * shifts + shift`).
    pub ln_missing: Vec<Vec<f64>>,
    /// Σ over the lines of an emitter of the above.
    pub ln_missing_emitter: Vec<Vec<f64>>,
    /// Z: the chance of at least one visible feature.
    pub detectability: f64,
}

impl Prepared {
    /// Merges, drops what cannot be seen and tabulates all factors.
    pub fn new(scene: &Scene, candidate: &Candidate) -> Self {
        let lines = visible_lines(scene, candidate);
        let shifts: Vec<Quadrature> = emitter_shifts(candidate, &lines);
        let states = |e: usize| latent_states(&scene.amount, &shifts[e]);
        let ln_missing: Vec<Vec<f64>> = lines
            .iter()
            .map(|line| {
                states(line.emitter)
                    .map(|s| {
                        (1.0 - scene.detection(line.edge, s + line.level_dex, line.scatter_dex))
                            .ln()
                    })
                    .collect()
            })
            .collect();
        let mut ln_missing_emitter: Vec<Vec<f64>> = (0..shifts.len())
            .map(|e| vec![0.0; states(e).count()])
            .collect();
        for (line, row) in lines.iter().zip(&ln_missing) {
            for (sum, term) in ln_missing_emitter[line.emitter].iter_mut().zip(row) {
                *sum += term;
            }
        }
        let pairs = pairs(scene, &lines, &shifts, &ln_missing);
        let detectability = detectability(scene, &shifts, &ln_missing_emitter);
        Self {
            lines,
            pairs,
            shifts,
            ln_missing,
            ln_missing_emitter,
            detectability,
        }
    }
}

/// α + β for every latent state of an emitter, amounts outermost.
fn latent_states<'q>(
    amount: &'q Quadrature,
    shift: &'q Quadrature,
) -> impl Iterator<Item = f64> + 'q {
    amount
        .nodes()
        .iter()
        .flat_map(move |a| shift.nodes().iter().map(move |b| a + b))
}

/// One shift per emitter. An emitter that this kind of source excites less surely than the
/// substance's surest one may also be silent: a node far down, so that a salt without chloride is
/// not held against its chloride bands. A single emitter needs no shift against itself.
fn emitter_shifts(candidate: &Candidate, lines: &[Line]) -> Vec<Quadrature> {
    let visible = |e: usize| lines.iter().any(|l| l.emitter == e);
    let count = candidate.emitter_spread_dex.len();
    let single = (0..count).filter(|e| visible(*e)).count() < 2;
    (0..count)
        .map(|e| {
            if !visible(e) {
                return Quadrature::fixed(0.0);
            }
            let spread = if single {
                0.0
            } else {
                candidate.emitter_spread_dex[e]
            };
            let lit = (candidate.emitter_shows[e] / candidate.shows).clamp(0.0, 1.0);
            Quadrature::normal3(spread).or_far_down(1.0 - lit)
        })
        .collect()
}

/// Z = Σ_α w (1 − Π_e Σ_β w Π (1−p)).
fn detectability(scene: &Scene, shifts: &[Quadrature], ln_missing_emitter: &[Vec<f64>]) -> f64 {
    scene
        .amount
        .weights()
        .iter()
        .enumerate()
        .map(|(k, weight)| {
            let unseen: f64 = shifts
                .iter()
                .zip(ln_missing_emitter)
                .map(|(shift, sums)| {
                    let first = k * shift.len();
                    shift
                        .weights()
                        .iter()
                        .zip(&sums[first..first + shift.len()])
                        .map(|(w, ln)| w * ln.exp())
                        .sum::<f64>()
                })
                .product();
            weight * (1.0 - unseen)
        })
        .sum()
}

fn visible_lines(scene: &Scene, candidate: &Candidate) -> Vec<Line> {
    let mut lines = merged_lines(scene, candidate);
    if !scene.settings.prepare {
        return lines;
    }
    for line in &mut lines {
        line.edge = scene.edge(line.wavelength_nm, line.uncertainty_nm);
    }
    let strongest = |least_edge: f64| {
        lines
            .iter()
            .filter(|l| l.edge >= least_edge)
            .map(|l| l.level_dex)
            .fold(f64::NEG_INFINITY, f64::max)
    };
    let inside = strongest(0.5);
    let peak = if inside.is_finite() {
        inside
    } else {
        strongest(0.0)
    };
    let reach = scene.conditions.dynamic_range_dex;
    lines.retain_mut(|line| {
        line.level_dex -= peak;
        line.edge * step(reach + line.level_dex, line.scatter_dex) >= 0.005
    });
    lines
}

/// Merges features closer than the merge width, seeded by the strongest; ascending wavelength.
fn merged_lines(scene: &Scene, candidate: &Candidate) -> Vec<Line> {
    let mut order: Vec<usize> = (0..candidate.features.len())
        .filter(|i| candidate.features[*i].level_dex.is_finite())
        .collect();
    let feature = |i: usize| &candidate.features[i];
    order.sort_by(|a, b| {
        feature(*b)
            .level_dex
            .total_cmp(&feature(*a).level_dex)
            .then(
                feature(*a)
                    .wavelength_nm
                    .total_cmp(&feature(*b).wavelength_nm),
            )
    });
    let mut taken = vec![false; candidate.features.len()];
    let mut lines = Vec::new();
    for seed in order.iter().copied() {
        if taken[seed] {
            continue;
        }
        let centre = feature(seed).wavelength_nm;
        let width = if scene.settings.prepare {
            scene.merge_width(centre)
        } else {
            0.0
        };
        let members: Vec<usize> = order
            .iter()
            .copied()
            .filter(|i| {
                *i == seed || (!taken[*i] && (feature(*i).wavelength_nm - centre).abs() < width)
            })
            .collect();
        for i in &members {
            taken[*i] = true;
        }
        lines.push(merge(candidate, seed, &members));
    }
    lines.sort_by(|a, b| a.wavelength_nm.total_cmp(&b.wavelength_nm));
    lines
}

fn merge(candidate: &Candidate, seed: usize, members: &[usize]) -> Line {
    let parts: Vec<Part> = members
        .iter()
        .map(|i| {
            let f = &candidate.features[*i];
            Part {
                wavelength_nm: f.wavelength_nm,
                uncertainty_nm: f.uncertainty_nm,
                level_dex: f.level_dex,
                scatter_dex: f.scatter_dex,
                edge: 1.0,
                band_chance: band_chance(f.form),
            }
        })
        .collect();
    let (whole, _) = blend(&parts);
    Line {
        wavelength_nm: whole.wavelength_nm,
        uncertainty_nm: whole.uncertainty_nm,
        level_dex: whole.level_dex,
        scatter_dex: whole.scatter_dex,
        edge: whole.edge,
        emitter: candidate.features[seed].emitter,
        feature: seed,
        band_chance: whole.band_chance,
    }
}

/// All pairs whose r can reach the gate at some node.
fn pairs(
    scene: &Scene,
    lines: &[Line],
    shifts: &[Quadrature],
    ln_missing: &[Vec<f64>],
) -> Vec<Pair> {
    let mut pairs = Vec::new();
    for (i, line) in lines.iter().enumerate() {
        for reading in 0..scene.observations.len() {
            let position: Vec<f64> = scene
                .offset
                .nodes()
                .iter()
                .map(|shift| {
                    scene.position(
                        reading,
                        line.wavelength_nm,
                        line.uncertainty_nm,
                        line.band_chance,
                        *shift,
                    )
                })
                .collect();
            let best = position.iter().copied().fold(0.0, f64::max);
            // Cheap refusal before the amplitudes: with the largest odds a feature can have.
            if best * 1e4 < scene.settings.gate {
                continue;
            }
            let amplitude: Vec<f64> = latent_states(&scene.amount, &shifts[line.emitter])
                .zip(&ln_missing[i])
                .map(|(s, missing)| {
                    scene.amplitude(reading, s + line.level_dex, line.scatter_dex, missing.exp())
                })
                .collect();
            let largest = amplitude.iter().copied().fold(0.0, f64::max);
            if best * largest >= scene.settings.gate && best * largest > 0.0 {
                pairs.push(Pair {
                    line: i,
                    reading,
                    position,
                    amplitude,
                });
            }
        }
    }
    pairs
}
