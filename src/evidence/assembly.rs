//! The lines of several substances laid side by side: what blends with what, and which readings
//! have to be assigned together.

use super::blend::{Part, absorb, blend};
use super::matching::{LANES, Lanes, Matching, work as matching_work};
use super::prepare::{Prepared, Scene};

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
    fn state(&self, prepared: &Prepared, emitter: usize) -> usize {
        self.amount * prepared.shifts[emitter].len() + self.shifts[emitter]
    }
}

/// One line, or a chain of lines of several members closer than the merge width.
#[derive(Debug, Clone)]
enum Block {
    Single {
        member: usize,
        line: usize,
        /// (pair, local reading)
        pairs: Vec<(usize, usize)>,
    },
    Chain {
        /// (member, line)
        parts: Vec<(usize, usize)>,
        /// Local readings within reach.
        reach: Vec<usize>,
        width_nm: f64,
    },
}

/// Blocks and readings that are connected.
#[derive(Debug, Clone)]
pub struct Segment {
    blocks: Vec<Block>,
    /// Global indices, ascending.
    pub readings: Vec<usize>,
    /// Members (positions in the composition) with a line here, ascending.
    pub members: Vec<usize>,
    /// (member, emitter) with a line here.
    pub emitters: Vec<(usize, usize)>,
}

/// A composition laid out for evaluation.
#[derive(Debug, Clone)]
pub struct Assembly {
    /// Candidate index of each member.
    pub members: Vec<usize>,
    /// Connected parts.
    pub segments: Vec<Segment>,
    /// ln Π (1−p) of the lines outside chains, by member, emitter and latent state.
    own_missing: Vec<Vec<Vec<f64>>>,
    /// Number of chains that hold lines of more than one member.
    pub chains: usize,
}

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
    pairs: std::ops::Range<usize>,
}

/// Working memory for one thread.
#[derive(Debug, Default, Clone)]
pub struct Workspace {
    matching: Matching,
    lines: Vec<Realised>,
    /// Local reading of each pair.
    reading: Vec<usize>,
    /// r of pair q at shift d: `r[d * pairs + q]`.
    r: Vec<f64>,
    /// Number of shifts in `r`.
    shifts: usize,
    flat: Vec<f64>,
    /// Pairs that count, by line.
    live: Vec<Vec<usize>>,
    /// Σ r of lines that reach only one reading, by reading and shift.
    rivals: Vec<f64>,
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

    /// Computes the lines of a segment as they look in one latent state, and all r.
    fn realise(
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
    fn realise_single(
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
    fn realise_chain(
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

/// Appends the sums over matchings of a realised segment, one per shift. `r` is pair-major:
/// `r[q * shifts + d]`.
fn sums(
    stock: &Stock,
    segment: &Segment,
    work: &mut Workspace,
    is_barred: &dyn Fn(usize) -> bool,
    skip: Option<usize>,
    out: &mut Vec<Lanes>,
) {
    if work.reading.is_empty() {
        out.resize(out.len() + work.shifts, [0.0; LANES]);
        return;
    }
    work.find_live(stock.scene.settings.gate, is_barred, skip);
    if stock.scene.settings.gate > 0.0 {
        work.thin();
    }
    let Workspace {
        matching,
        live,
        reading,
        r,
        shifts,
        flat,
        ..
    } = work;
    let row = |q: usize| &r[q * *shifts..][..*shifts];
    if segment.readings.len() == 1 || live.len() == 1 {
        flat.clear();
        flat.resize(*shifts, 0.0);
        for q in live.iter().flatten() {
            for (sum, r) in flat.iter_mut().zip(row(*q)) {
                *sum += r;
            }
        }
        out.extend(
            flat.iter()
                .map(|sum| stock.lane_scale.map(|scale| (sum * scale).ln_1p())),
        );
        return;
    }
    matching.clear(*shifts * LANES);
    for pairs in live.iter() {
        for q in pairs {
            matching.pair(reading[*q], |to| {
                for (to, r) in to.chunks_exact_mut(LANES).zip(row(*q)) {
                    for (to, scale) in to.iter_mut().zip(stock.lane_scale) {
                        *to = r * scale;
                    }
                }
            });
        }
        matching.end_feature();
    }
    flat.clear();
    matching.ln_sums(flat);
    out.extend(
        flat.chunks_exact(LANES)
            .map(|c| std::array::from_fn(|l| c[l])),
    );
}

impl Workspace {
    /// Where readings crowd so much that the sum would take long, leaves out pairs far weaker
    /// than all that could explain the same reading together.
    fn thin(&mut self) {
        /// Steps of one pair and one mask that a sum may take.
        const AFFORDABLE: f64 = 4000.0;
        const SHARES: [f64; 4] = [1e-3, 1e-2, 3e-2, 0.1];
        let Self {
            reading,
            r,
            shifts,
            live,
            rivals,
            ..
        } = self;
        let row = |q: usize| &r[q * *shifts..][..*shifts];
        for share in SHARES {
            let pairs: Vec<(usize, usize)> = live
                .iter()
                .enumerate()
                .flat_map(|(i, qs)| qs.iter().map(move |q| (i, *q)))
                .collect();
            let ends: Vec<(usize, usize)> = pairs.iter().map(|(i, q)| (*i, reading[*q])).collect();
            if matching_work(&ends) <= AFFORDABLE {
                return;
            }
            let count = ends.iter().map(|(_, j)| j + 1).max().unwrap_or(0);
            rivals.clear();
            rivals.resize(count * *shifts, 0.0);
            for (_, q) in &pairs {
                for (to, r) in rivals[reading[*q] * *shifts..][..*shifts]
                    .iter_mut()
                    .zip(row(*q))
                {
                    *to += r;
                }
            }
            for qs in live.iter_mut() {
                qs.retain(|q| {
                    let rivals = &rivals[reading[*q] * *shifts..][..*shifts];
                    row(*q).iter().zip(rivals).any(|(r, all)| *r > share * all)
                });
            }
            live.retain(|qs| !qs.is_empty());
        }
    }

    /// The pairs that count, line by line: r above the gate at some shift, and above it still
    /// after a rival that can explain nothing else. A reading j with lines that reach only it,
    /// Σ r = R, is left over with probability at most 1/(1 + R), so another pair there can carry
    /// at most r/(1 + R).
    fn find_live(&mut self, gate: f64, is_barred: &dyn Fn(usize) -> bool, skip: Option<usize>) {
        const PASSES: usize = 2;
        let gate = 0.1 * gate;
        let Self {
            lines,
            reading,
            r,
            shifts,
            live,
            rivals,
            ..
        } = self;
        let row = |q: usize| &r[q * *shifts..][..*shifts];
        live.clear();
        // A blend is caused by the member that holds most of it.
        for line in lines.iter().filter(|l| !is_barred(l.owner.0)) {
            let counts = |q: &usize| skip != Some(reading[*q]) && row(*q).iter().any(|r| *r > gate);
            let pairs: Vec<usize> = line.pairs.clone().filter(counts).collect();
            if !pairs.is_empty() {
                live.push(pairs);
            }
        }
        let count = reading.iter().max().map_or(0, |j| j + 1);
        for _ in 0..PASSES {
            if live.iter().all(|pairs| pairs.len() == 1) {
                return;
            }
            rivals.clear();
            rivals.resize(count * *shifts, 0.0);
            for pairs in live.iter().filter(|pairs| pairs.len() == 1) {
                let to = &mut rivals[reading[pairs[0]] * *shifts..][..*shifts];
                for (to, r) in to.iter_mut().zip(row(pairs[0])) {
                    *to += r;
                }
            }
            for pairs in live.iter_mut().filter(|pairs| pairs.len() > 1) {
                pairs.retain(|q| {
                    let rivals = &rivals[reading[*q] * *shifts..][..*shifts];
                    row(*q)
                        .iter()
                        .zip(rivals)
                        .any(|(r, rival)| *r > gate * (1.0 + rival))
                });
            }
            live.retain(|pairs| !pairs.is_empty());
        }
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

/// Single lines and chains, in ascending wavelength; single lines that reach no reading are left
/// out (their missing factors are counted elsewhere).
fn blocks(stock: &Stock, members: &[usize]) -> Vec<Block> {
    let mut all: Vec<(f64, usize, usize)> = members
        .iter()
        .enumerate()
        .flat_map(|(m, candidate)| {
            let lines = &stock.prepared[*candidate].lines;
            lines
                .iter()
                .enumerate()
                .map(move |(i, line)| (line.wavelength_nm, m, i))
        })
        .collect();
    all.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    let mut blocks = Vec::new();
    let mut start = 0;
    while start < all.len() {
        let mut end = start + 1;
        let width = |x: f64| stock.scene.merge_width(x);
        while end < all.len()
            && all[end].0 - all[end - 1].0 < width(0.5 * (all[end].0 + all[end - 1].0))
        {
            end += 1;
        }
        let chain = &all[start..end];
        if chain.iter().any(|c| c.1 != chain[0].1) {
            blocks.push(Block::Chain {
                parts: chain.iter().map(|(_, m, i)| (*m, *i)).collect(),
                reach: Vec::new(),
                width_nm: width(0.5 * (chain[0].0 + chain[chain.len() - 1].0)),
            });
        } else {
            for (_, member, line) in chain {
                let pairs: Vec<(usize, usize)> = pairs_of(stock, members, *member, *line)
                    .map(|(pair, reading)| (pair, reading))
                    .collect();
                if !pairs.is_empty() {
                    blocks.push(Block::Single {
                        member: *member,
                        line: *line,
                        pairs,
                    });
                }
            }
        }
        start = end;
    }
    blocks
}

/// (pair, global reading) of one line; pairs are sorted by line.
fn pairs_of<'s>(
    stock: &'s Stock,
    members: &[usize],
    member: usize,
    line: usize,
) -> impl Iterator<Item = (usize, usize)> + 's {
    let pairs = &stock.prepared[members[member]].pairs;
    let first = pairs.partition_point(|p| p.line < line);
    pairs[first..]
        .iter()
        .take_while(move |p| p.line == line)
        .enumerate()
        .map(move |(i, p)| (first + i, p.reading))
}

/// Groups blocks that share readings, directly or through others.
fn segments(stock: &Stock, members: &[usize], blocks: Vec<Block>) -> Vec<Segment> {
    let reach_of = |block: &Block| -> Vec<usize> {
        match block {
            Block::Single { pairs, .. } => pairs.iter().map(|(_, reading)| *reading).collect(),
            Block::Chain { parts, .. } => {
                let mut all: Vec<usize> = parts
                    .iter()
                    .flat_map(|(m, line)| {
                        pairs_of(stock, members, *m, *line).map(|(_, reading)| reading)
                    })
                    .collect();
                all.sort_unstable();
                all.dedup();
                all
            }
        }
    };
    let reaches: Vec<Vec<usize>> = blocks.iter().map(reach_of).collect();
    let group = group_by_readings(&reaches, stock.scene.observations.len());
    let mut parts: Vec<Vec<(Block, Vec<usize>)>> = Vec::new();
    let mut place: std::collections::BTreeMap<usize, usize> = Default::default();
    for ((block, reach), key) in blocks.into_iter().zip(reaches).zip(group) {
        let at = *place.entry(key).or_insert_with(|| {
            parts.push(Vec::new());
            parts.len() - 1
        });
        parts[at].push((block, reach));
    }
    parts
        .into_iter()
        .map(|p| segment(stock, members, p))
        .collect()
}

/// A key per block; blocks with the same key belong together. Blocks without readings stand alone.
fn group_by_readings(reaches: &[Vec<usize>], readings: usize) -> Vec<usize> {
    let mut root: Vec<usize> = (0..readings + reaches.len()).collect();
    fn find(root: &mut [usize], mut x: usize) -> usize {
        while root[x] != x {
            root[x] = root[root[x]];
            x = root[x];
        }
        x
    }
    for (b, reach) in reaches.iter().enumerate() {
        for j in reach {
            let (p, q) = (find(&mut root, readings + b), find(&mut root, *j));
            root[p.max(q)] = p.min(q);
        }
    }
    (0..reaches.len())
        .map(|b| find(&mut root, readings + b))
        .collect()
}

fn segment(stock: &Stock, members: &[usize], parts: Vec<(Block, Vec<usize>)>) -> Segment {
    let mut readings: Vec<usize> = parts
        .iter()
        .flat_map(|(_, reach)| reach.iter().copied())
        .collect();
    readings.sort_unstable();
    readings.dedup();
    let local = |global: usize| readings.binary_search(&global).unwrap_or(0);
    let mut blocks = Vec::with_capacity(parts.len());
    let mut owners: Vec<(usize, usize)> = Vec::new();
    for (block, reach) in parts {
        let emitter = |m: usize, line: usize| stock.prepared[members[m]].lines[line].emitter;
        blocks.push(match block {
            Block::Single {
                member,
                line,
                pairs,
            } => {
                owners.push((member, emitter(member, line)));
                let pairs = pairs
                    .into_iter()
                    .map(|(pair, j)| (pair, local(j)))
                    .collect();
                Block::Single {
                    member,
                    line,
                    pairs,
                }
            }
            Block::Chain {
                parts, width_nm, ..
            } => {
                owners.extend(parts.iter().map(|(m, line)| (*m, emitter(*m, *line))));
                Block::Chain {
                    parts,
                    reach: reach.into_iter().map(local).collect(),
                    width_nm,
                }
            }
        });
    }
    owners.sort_unstable();
    owners.dedup();
    let mut present: Vec<usize> = owners.iter().map(|(m, _)| *m).collect();
    present.dedup();
    Segment {
        blocks,
        readings,
        members: present,
        emitters: owners,
    }
}
