//! The lines of a segment as they look in one latent state.

use super::super::blend::{Part, absorb, blend};
use super::super::matching::Matching;
use super::layout::{Block, Segment};
use super::sums::sums;
use super::{Assembly, Latent, Stock};

/// A line of the laid-out composition with the r of every reading in its segment, at one shift.
#[derive(Debug, Clone)]
pub struct Realised {
    /// (member, line, φ) of the part that holds most of it.
    pub owner: (usize, usize, f64),
    /// λ, nm.
    pub wavelength_nm: f64,
    /// u_i, nm.
    pub uncertainty_nm: f64,
    /// p.
    pub detection: f64,
    /// Half-open range into the pair buffers.
    pub(super) pairs: std::ops::Range<usize>,
}

/// Working memory for one thread.
#[derive(Debug, Default, Clone)]
pub struct Workspace {
    pub(super) matching: Matching,
    pub(super) lines: Vec<Realised>,
    /// Local reading of each pair.
    pub(super) reading: Vec<usize>,
    /// r of pair q at shift d: `r[d * pairs + q]`.
    pub(super) r: Vec<f64>,
    /// Number of shifts in `r`.
    pub(super) shifts: usize,
    pub(super) flat: Vec<f64>,
    /// Pairs that count, by line.
    pub(super) live: Vec<Vec<usize>>,
    /// Σ r of lines that reach only one reading, by reading and shift.
    pub(super) rivals: Vec<f64>,
    /// Largest share of each pair in what could explain its reading.
    pub(super) share: Vec<f64>,
    /// (line, reading) of the live pairs.
    pub(super) ends: Vec<(usize, usize)>,
}

impl Assembly {
    /// Computes the lines of a segment as they look in one latent state, and all r.
    pub(super) fn realise(
        &self,
        stock: &Stock,
        segment: &Segment,
        latents: &[Latent],
        shifts: &[usize],
        work: &mut Workspace,
    ) -> f64 {
        work.shifts = shifts.len();
        work.lines.clear();
        work.reading.clear();
        // Chains append their positions shift by shift; singles look theirs up: both go through
        // `columns` (pair-major) and are transposed at the end.
        let mut columns: Vec<f64> = std::mem::take(&mut work.r);
        columns.clear();
        let mut ln_missing = 0.0;
        for block in &segment.blocks {
            match block {
                Block::Single {
                    member,
                    line,
                    pairs,
                } => {
                    self.realise_single(
                        stock,
                        (*member, *line),
                        pairs,
                        latents,
                        shifts,
                        work,
                        &mut columns,
                    );
                }
                Block::Chain {
                    parts,
                    reach,
                    width_nm,
                } => {
                    ln_missing += self.realise_chain(
                        stock,
                        segment,
                        parts,
                        reach,
                        *width_nm,
                        latents,
                        shifts,
                        work,
                        &mut columns,
                    );
                }
            }
        }
        work.r = columns;
        ln_missing
    }

    #[expect(clippy::too_many_arguments, reason = "one step of `realise`")]
    pub(super) fn realise_single(
        &self,
        stock: &Stock,
        (member, line): (usize, usize),
        pairs: &[(usize, usize)],
        latents: &[Latent],
        shifts: &[usize],
        work: &mut Workspace,
        columns: &mut Vec<f64>,
    ) {
        let prepared = &stock.prepared[self.members[member]];
        let shape = &prepared.lines[line];
        let state = latents[member].state(prepared, shape.emitter);
        let start = work.reading.len();
        for (pair, local) in pairs {
            let pair = &prepared.pairs[*pair];
            let amplitude = pair.amplitude[state];
            work.reading.push(*local);
            columns.extend(shifts.iter().map(|d| amplitude * pair.position[*d]));
        }
        work.lines.push(Realised {
            owner: (member, line, 1.0),
            wavelength_nm: shape.wavelength_nm,
            uncertainty_nm: shape.uncertainty_nm,
            detection: -prepared.ln_missing[line][state].exp_m1(),
            pairs: start..work.reading.len(),
        });
    }

    #[expect(clippy::too_many_arguments, reason = "one step of `realise`")]
    pub(super) fn realise_chain(
        &self,
        stock: &Stock,
        segment: &Segment,
        parts: &[(usize, usize)],
        reach: &[usize],
        width_nm: f64,
        latents: &[Latent],
        shifts: &[usize],
        work: &mut Workspace,
        columns: &mut Vec<f64>,
    ) -> f64 {
        let scene = &stock.scene;
        let shapes: Vec<Part> = parts
            .iter()
            .map(|(member, line)| {
                let prepared = &stock.prepared[self.members[*member]];
                let shape = &prepared.lines[*line];
                let latent = &latents[*member];
                let shift = prepared.shifts[shape.emitter].nodes()[latent.shifts[shape.emitter]];
                Part {
                    wavelength_nm: shape.wavelength_nm,
                    uncertainty_nm: shape.uncertainty_nm,
                    level_dex: shape.level_dex + scene.amount.nodes()[latent.amount] + shift,
                    scatter_dex: shape.scatter_dex,
                    edge: shape.edge,
                    band_chance: shape.band_chance,
                }
            })
            .collect();
        let mut ln_missing = 0.0;
        let first = work.lines.len();
        for group in absorb(&shapes, width_nm) {
            let chosen: Vec<Part> = group.iter().map(|i| shapes[*i]).collect();
            let (whole, weights) = blend(&chosen);
            let detection = scene.detection(whole.edge, whole.level_dex, whole.scatter_dex);
            ln_missing += (1.0 - detection).ln();
            let start = work.reading.len();
            for local in reach {
                let reading = segment.readings[*local];
                let amplitude =
                    scene.amplitude(reading, whole.level_dex, whole.scatter_dex, 1.0 - detection);
                work.reading.push(*local);
                columns.extend(shifts.iter().map(|d| {
                    let shift = scene.offset.nodes()[*d];
                    amplitude
                        * scene.position(
                            reading,
                            whole.wavelength_nm,
                            whole.uncertainty_nm,
                            whole.band_chance,
                            shift,
                        )
                }));
            }
            work.lines.push(Realised {
                owner: owner(parts, &group, &weights),
                wavelength_nm: whole.wavelength_nm,
                uncertainty_nm: whole.uncertainty_nm,
                detection,
                pairs: start..work.reading.len(),
            });
        }
        work.lines[first..].sort_by(|a, b| a.wavelength_nm.total_cmp(&b.wavelength_nm));
        ln_missing
    }

    /// For every line of a segment at one shift: the line, and (reading, probability) of having
    /// caused it, in the given lane.
    pub fn causes(
        &self,
        stock: &Stock,
        segment: &Segment,
        latents: &[Latent],
        shift: usize,
        lane: usize,
    ) -> Vec<(Realised, Vec<(usize, f64)>)> {
        let mut work = Workspace::default();
        self.realise(stock, segment, latents, &[shift], &mut work);
        let mut out = Vec::new();
        sums(stock, segment, &mut work, &|_| false, None, &mut out);
        let whole = out[0][lane];
        let lines = work.lines.clone();
        let r: Vec<f64> = work.r.clone();
        let readings = work.reading.clone();
        lines
            .into_iter()
            .map(|line| {
                let found = line
                    .pairs
                    .clone()
                    .filter(|q| r[*q] * stock.lane_scale[lane] > 1e-6)
                    .map(|q| {
                        // The rest of the segment, with this line and this reading taken out.
                        for other in line.pairs.clone() {
                            work.r[other] = 0.0;
                        }
                        out.clear();
                        sums(
                            stock,
                            segment,
                            &mut work,
                            &|_| false,
                            Some(readings[q]),
                            &mut out,
                        );
                        let rest = out[0][lane];
                        work.r.copy_from_slice(&r);
                        let ln = (r[q] * stock.lane_scale[lane]).ln() + rest - whole;
                        (segment.readings[readings[q]], ln.exp().min(1.0))
                    })
                    .collect();
                (line, found)
            })
            .collect()
    }
}

/// The member that holds the largest share of a blend, with its strongest line there.
fn owner(parts: &[(usize, usize)], group: &[usize], weights: &[f64]) -> (usize, usize, f64) {
    let share = |member: usize| -> f64 {
        group
            .iter()
            .zip(weights)
            .filter(|(i, _)| parts[**i].0 == member)
            .map(|(_, w)| w)
            .sum()
    };
    // Groups list the strongest first, so that ties go to it.
    let mut best = (0, 0, f64::NEG_INFINITY);
    for i in group {
        let (member, line) = parts[*i];
        let held = share(member);
        if held > best.2 {
            best = (member, line, held);
        }
    }
    best
}
