//! A substance made ready for a set-up: features merged to what the instrument resolves, their
//! visibility, and every factor that does not depend on the other substances.

use super::blend::{Part, blend};
use super::quadrature::Quadrature;
use super::scene::{Scene, step};
use super::{Candidate, FeatureForm};

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

/// P(band | line, head, maximum): our judgement.
fn band_chance(form: FeatureForm) -> f64 {
    match form {
        FeatureForm::Line => 0.05,
        FeatureForm::BandHead => 0.7,
        FeatureForm::BandMax => 0.9,
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
