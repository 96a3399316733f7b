//! The lines of several substances laid side by side: what blends with what, and which readings
//! have to be assigned together.

mod layout;
mod realise;
mod sums;

use super::matching::{LANES, Lanes};
use super::prepare::Prepared;
use super::scene::Scene;
pub use layout::Segment;
use layout::{Block, blocks, segments};
pub use realise::{Realised, Workspace};
use sums::sums;

/// What all compositions of one inference are built from.
#[derive(Debug)]
pub struct Stock<'a> {
    /// Readings, set-up, nuisances.
    pub scene: Scene<'a>,
    /// Candidates, made ready.
    pub prepared: Vec<Prepared>,
    /// κ_ref/κ per lane; lanes without a node repeat the first.
    pub lane_scale: Lanes,
    /// ln(weight · (κ/κ_ref)^n · e^{−(κ−κ_ref)|R|}) per lane; −∞ in lanes without a node.
    pub lane_ln_weight: Lanes,
}

impl<'a> Stock<'a> {
    /// Prepares the candidates for the scene.
    pub fn new(scene: Scene<'a>, prepared: Vec<Prepared>) -> Self {
        let reference = scene.settings.clutter_reference;
        let count = scene.observations.len() as f64;
        let first = scene
            .settings
            .clutter
            .nodes()
            .first()
            .copied()
            .unwrap_or(reference);
        let mut lane_scale = [reference / first; LANES];
        let mut lane_ln_weight = [f64::NEG_INFINITY; LANES];
        let clutter = &scene.settings.clutter;
        for (l, (rate, weight)) in clutter
            .nodes()
            .iter()
            .zip(clutter.weights())
            .take(LANES)
            .enumerate()
        {
            lane_scale[l] = reference / rate;
            lane_ln_weight[l] = weight.ln() + count * (rate / reference).ln() - (rate - reference);
        }
        Self {
            scene,
            prepared,
            lane_scale,
            lane_ln_weight,
        }
    }
}

/// The latent state of one member: the amount node and a shift node per emitter.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Latent {
    /// Index into the amount nodes.
    pub amount: usize,
    /// Index into the shift nodes of each emitter.
    pub shifts: Vec<usize>,
}

impl Latent {
    pub(super) fn state(&self, prepared: &Prepared, emitter: usize) -> usize {
        self.amount * prepared.shifts[emitter].len() + self.shifts[emitter]
    }
}

/// A composition laid out for evaluation.
#[derive(Debug, Clone)]
pub struct Assembly {
    /// Candidate index of each member.
    pub members: Vec<usize>,
    /// Connected parts.
    pub segments: Vec<Segment>,
    /// ln Π (1−p) of the lines outside chains, by member, emitter and latent state.
    pub(super) own_missing: Vec<Vec<Vec<f64>>>,
    /// Number of chains that hold lines of more than one member.
    pub chains: usize,
}

impl Assembly {
    /// Lays out a composition; `members` are candidate indices in ascending order.
    pub fn new(stock: &Stock, members: &[usize]) -> Self {
        let blocks = blocks(stock, members);
        let mut own_missing: Vec<Vec<Vec<f64>>> = members
            .iter()
            .map(|m| stock.prepared[*m].ln_missing_emitter.clone())
            .collect();
        let mut chains = 0;
        for block in &blocks {
            if let Block::Chain { parts, .. } = block {
                chains += 1;
                for (member, line) in parts {
                    let prepared = &stock.prepared[members[*member]];
                    let sums = &mut own_missing[*member][prepared.lines[*line].emitter];
                    for (sum, term) in sums.iter_mut().zip(&prepared.ln_missing[*line]) {
                        *sum -= term;
                    }
                }
            }
        }
        let segments = segments(stock, members, blocks);
        Self {
            members: members.to_vec(),
            segments,
            own_missing,
            chains,
        }
    }

    /// ln Π (1−p) of the lines of one member outside chains.
    pub fn own_missing(&self, stock: &Stock, member: usize, latent: &Latent) -> f64 {
        let prepared = &stock.prepared[self.members[member]];
        self.own_missing[member]
            .iter()
            .enumerate()
            .map(|(e, sums)| sums[latent.state(prepared, e)])
            .sum()
    }

    /// A number that tells apart all latent states a segment can be in.
    pub fn state_key(&self, stock: &Stock, segment: &Segment, latents: &[Latent]) -> u64 {
        segment.emitters.iter().fold(0, |key, (member, emitter)| {
            let prepared = &stock.prepared[self.members[*member]];
            let states = prepared.ln_missing_emitter[*emitter].len() as u64;
            key.wrapping_mul(states)
                .wrapping_add(latents[*member].state(prepared, *emitter) as u64)
        })
    }

    /// ln of the sum over matchings of one segment for every set of barred members and every
    /// shift asked for, as `out[bars * shifts.len() + d]`; gives ln Π (1−p) of its chains.
    ///
    /// `barred` lists the members that are barred in turn: set b bars `barred[i]` where bit i of b
    /// is set. `without` is a reading (global index) that may match nothing.
    #[expect(
        clippy::too_many_arguments,
        reason = "the inner call of every integral"
    )]
    pub fn ln_segment(
        &self,
        stock: &Stock,
        segment: &Segment,
        latents: &[Latent],
        shifts: &[usize],
        barred: &[usize],
        without: Option<usize>,
        work: &mut Workspace,
        out: &mut Vec<Lanes>,
    ) -> f64 {
        let ln_missing = self.realise(stock, segment, latents, shifts, work);
        out.clear();
        let skip = without.and_then(|j| segment.readings.iter().position(|r| *r == j));
        for bars in 0..1usize << barred.len() {
            let is_barred = |member: usize| {
                barred
                    .iter()
                    .position(|b| *b == member)
                    .is_some_and(|i| bars >> i & 1 == 1)
            };
            sums(stock, segment, work, &is_barred, skip, out);
        }
        ln_missing
    }
}
