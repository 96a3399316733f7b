//! The exact sum over matchings of features to readings.
//!
//! Each feature causes at most one reading and each reading has one cause. One side is taken in
//! order; a frontier holds those of the other side that earlier ones may have taken and later
//! ones may still reach, a bit each, and forgets each after its last partner. The sum is the same
//! whichever side is taken in order: few readings among many lines keep the frontier short one
//! way, a wide band over many readings the other.

use wide::f64x4;

/// Lanes: one per node of the clutter rate.
pub const LANES: usize = 4;

/// A value per clutter node.
pub type Lanes = [f64; LANES];

/// At most this many in the frontier: 2^12 states. Where more crowd within reach of one another,
/// pairs that find no place are left out.
const FRONTIER: usize = 12;

/// Columns that are summed side by side: few enough that all masks stay in the processor's cache.
const BLOCK: usize = 8;

type Block = [f64x4; 2];

const ONES: Block = [f64x4::ONE; 2];
const ZEROS: Block = [f64x4::ZERO; 2];

/// Features with the readings they may have caused, and working memory for the sum.
///
/// Sums for several columns (a node of the common shift in one clutter lane each) follow one plan,
/// a block of columns at a time: the pattern of matchings is the same in all of them.
#[derive(Debug, Default, Clone)]
pub struct Matching {
    columns: usize,
    /// (feature, reading), feature after feature.
    pairs: Vec<(usize, usize)>,
    /// r of each pair, the blocks of its columns in turn; columns beyond the last hold 0.
    r: Vec<Block>,
    /// r of the pair being added.
    filled: Vec<f64>,
    features: usize,
    /// (taken in order, held in the frontier, pair).
    order: Vec<(usize, usize, usize)>,
    other_order: Vec<(usize, usize, usize)>,
    /// Last place in the order of each one held in the frontier.
    last: Vec<usize>,
    /// Frontier: who is behind each bit.
    active: Vec<usize>,
    steps: Vec<Step>,
    /// (bit as a mask, pair) of all steps.
    partners: Vec<(usize, usize)>,
    /// Places of the bits that are forgotten, of all steps.
    forgotten: Vec<usize>,
    /// The sum so far for each mask, in the columns of one block.
    states: Vec<Block>,
    /// The same before the step.
    before: Vec<Block>,
}

/// One more is taken: it may have any of its partners, if that is free, or none.
#[derive(Debug, Clone, Copy)]
struct Step {
    /// Bits of the frontier while it is taken.
    bits: usize,
    /// End of its partners.
    partners: usize,
    /// End of the bits forgotten after it.
    forgotten: usize,
}

impl Matching {
    /// Forgets all features.
    pub fn clear(&mut self, columns: usize) {
        self.columns = columns;
        self.pairs.clear();
        self.r.clear();
        self.features = 0;
    }

    /// Adds a pair of the feature being built; `fill` writes r for every column.
    pub fn pair(&mut self, reading: usize, fill: impl FnOnce(&mut [f64])) {
        self.filled.clear();
        self.filled.resize(self.blocks() * BLOCK, 0.0);
        fill(&mut self.filled[..self.columns]);
        self.r.extend(self.filled.chunks_exact(BLOCK).map(|c| {
            let half = |k: usize| f64x4::new([c[k], c[k + 1], c[k + 2], c[k + 3]]);
            [half(0), half(4)]
        }));
        self.pairs.push((self.features, reading));
    }

    /// Ends the feature being built. Order by wavelength keeps the frontier short.
    pub fn end_feature(&mut self) {
        self.features += 1;
    }

    fn blocks(&self) -> usize {
        self.columns.div_ceil(BLOCK)
    }

    /// Appends ln Σ over matchings Π r for every column.
    pub fn ln_sums(&mut self, out: &mut Vec<f64>) {
        self.choose_side();
        self.plan();
        let first = out.len();
        for block in 0..self.blocks() {
            out.extend(self.sum_block(block));
        }
        out.truncate(first + self.columns);
    }

    /// Takes features or readings in order, whichever is cheaper.
    fn choose_side(&mut self) {
        self.order.clear();
        self.order
            .extend(self.pairs.iter().enumerate().map(|(p, (i, j))| (*i, *j, p)));
        self.other_order.clear();
        self.other_order
            .extend(self.pairs.iter().enumerate().map(|(p, (i, j))| (*j, *i, p)));
        self.other_order.sort_unstable();
        let by_feature = cost(&self.order, &mut self.last);
        if cost(&self.other_order, &mut self.last) < by_feature {
            std::mem::swap(&mut self.order, &mut self.other_order);
        } else {
            cost(&self.order, &mut self.last);
        }
    }

    /// What to do with the frontier, step by step.
    fn plan(&mut self) {
        self.active.clear();
        self.steps.clear();
        self.partners.clear();
        self.forgotten.clear();
        let mut start = 0;
        while start < self.order.len() {
            let outer = self.order[start].0;
            let mut end = start;
            while end < self.order.len() && self.order[end].0 == outer {
                let (_, inner, pair) = self.order[end];
                end += 1;
                let bit = match self.active.iter().position(|a| *a == inner) {
                    Some(bit) => bit,
                    None if self.active.len() < FRONTIER => {
                        self.active.push(inner);
                        self.active.len() - 1
                    }
                    None => continue,
                };
                self.partners.push((1 << bit, pair));
            }
            let bits = self.active.len();
            let mut bit = 0;
            while bit < self.active.len() {
                if self.last[self.active[bit]] >= end {
                    bit += 1;
                } else {
                    // Partners that none later in the order reaches.
                    self.active.remove(bit);
                    self.forgotten.push(bit);
                }
            }
            self.steps.push(Step {
                bits,
                partners: self.partners.len(),
                forgotten: self.forgotten.len(),
            });
            start = end;
        }
    }

    fn sum_block(&mut self, block: usize) -> [f64; BLOCK] {
        let blocks = self.blocks();
        let mut ln_scale = [0.0; BLOCK];
        let (mut partner, mut forgotten) = (0, 0);
        self.states.clear();
        self.states.push(ONES);
        for (taken, step) in self.steps.iter().enumerate() {
            self.states.resize(1 << step.bits, ZEROS);
            match &self.partners[partner..step.partners] {
                [(bit, pair)] => take_only(&mut self.states, *bit, &self.r[pair * blocks + block]),
                several => {
                    self.before.clone_from(&self.states);
                    for (bit, pair) in several {
                        let r = &self.r[pair * blocks + block];
                        take(&mut self.states, &self.before, *bit, r);
                    }
                }
            }
            for bit in &self.forgotten[forgotten..step.forgotten] {
                forget(&mut self.states, *bit);
            }
            (partner, forgotten) = (step.partners, step.forgotten);
            if self.states.len() == 1 || taken % 8 == 7 {
                rescale(&mut self.states, &mut ln_scale);
            }
        }
        let last = columns(self.states.first().unwrap_or(&ONES));
        std::array::from_fn(|c| ln_scale[c] + last[c].ln())
    }
}

/// to + from · r.
#[inline(always)]
fn added(to: &Block, from: &Block, r: &Block) -> Block {
    [to[0] + from[0] * r[0], to[1] + from[1] * r[1]]
}

/// Adds the matchings in which one is paired with the partner behind a bit. Masks that hold the
/// bit lie in runs, so that no mask needs to be looked at.
fn take(states: &mut [Block], before: &[Block], bit: usize, r: &Block) {
    let pairs = states
        .chunks_exact_mut(2 * bit)
        .zip(before.chunks_exact(2 * bit));
    for (to, from) in pairs {
        for (to, from) in to[bit..].iter_mut().zip(&from[..bit]) {
            *to = added(to, from, r);
        }
    }
}

/// [`take`] for one that has a single partner: masks without the bit stay as they were.
fn take_only(states: &mut [Block], bit: usize, r: &Block) {
    for run in states.chunks_exact_mut(2 * bit) {
        let (from, to) = run.split_at_mut(bit);
        for (to, from) in to.iter_mut().zip(&*from) {
            *to = added(to, from, r);
        }
    }
}

/// Forgets whether the partner behind a bit was taken.
fn forget(states: &mut Vec<Block>, bit: usize) {
    let run = 1 << bit;
    let half = states.len() / 2;
    for start in (0..half).step_by(run) {
        for k in 0..run {
            let (open, taken) = (states[2 * start + k], states[2 * start + run + k]);
            states[start + k] = [open[0] + taken[0], open[1] + taken[1]];
        }
    }
    states.truncate(half);
}

/// What a sum over these (feature, reading) pairs would cost from the cheaper side, in steps of
/// one pair and one mask.
pub fn work(pairs: &[(usize, usize)]) -> f64 {
    let mut last = Vec::new();
    let by_feature: Vec<_> = pairs.iter().map(|(i, j)| (*i, *j, 0)).collect();
    let mut by_reading: Vec<_> = pairs.iter().map(|(i, j)| (*j, *i, 0)).collect();
    by_reading.sort_unstable();
    cost(&by_feature, &mut last).min(cost(&by_reading, &mut last))
}

/// Multiplications the sum would cost; fills in the last place of each one held.
fn cost(order: &[(usize, usize, usize)], last: &mut Vec<usize>) -> f64 {
    let count = order.iter().map(|o| o.1 + 1).max().unwrap_or(0);
    last.clear();
    last.resize(count, usize::MAX);
    for (place, (_, inner, _)) in order.iter().enumerate() {
        last[*inner] = place;
    }
    let mut open = 0u32;
    let mut total = 0.0;
    let mut first_seen = vec![true; count];
    for (place, (_, inner, _)) in order.iter().enumerate() {
        if std::mem::replace(&mut first_seen[*inner], false) {
            open += 1;
        }
        total += f64::from(1u32 << open.min(FRONTIER as u32));
        if last[*inner] == place {
            open -= 1;
        }
    }
    total
}

/// Keeps long products within range: each column on its own scale.
fn rescale(states: &mut [Block], ln_scale: &mut [f64; BLOCK]) {
    const HIGH: f64 = 1e60;
    let peak = states.iter().fold(ZEROS, |peak, state| {
        [peak[0].fast_max(state[0]), peak[1].fast_max(state[1])]
    });
    let peak = columns(&peak);
    if peak.iter().all(|p| *p < HIGH) {
        return;
    }
    let factor: [f64; BLOCK] = std::array::from_fn(|c| match peak[c] < HIGH {
        true => 1.0,
        false => 1.0 / peak[c],
    });
    for c in 0..BLOCK {
        ln_scale[c] -= factor[c].ln();
    }
    let [a, b, c, d, e, f, g, h] = factor;
    let factor = [f64x4::new([a, b, c, d]), f64x4::new([e, f, g, h])];
    for state in states {
        *state = [state[0] * factor[0], state[1] * factor[1]];
    }
}

/// The columns of a block.
fn columns(block: &Block) -> [f64; BLOCK] {
    let ([a, b, c, d], [e, f, g, h]) = (block[0].to_array(), block[1].to_array());
    [a, b, c, d, e, f, g, h]
}

#[cfg(test)]
mod tests {
    use super::*;

    /// All matchings by recursion, one lane.
    fn brute(rows: &[Vec<(usize, f64)>], taken: u32) -> f64 {
        let Some((first, rest)) = rows.split_first() else {
            return 1.0;
        };
        let mut sum = brute(rest, taken);
        for (j, r) in first {
            if taken >> j & 1 == 0 {
                sum += r * brute(rest, taken | 1 << j);
            }
        }
        sum
    }

    fn frontier(rows: &[Vec<(usize, f64)>], scale: Lanes) -> Vec<f64> {
        let mut matching = Matching::default();
        matching.clear(LANES);
        for row in rows {
            for (j, r) in row {
                matching.pair(*j, |to| {
                    for (to, scale) in to.iter_mut().zip(scale) {
                        *to = r * scale;
                    }
                });
            }
            matching.end_feature();
        }
        let mut out = Vec::new();
        matching.ln_sums(&mut out);
        out
    }

    proptest::proptest! {
        #[test]
        fn agrees_with_enumeration(
            table in proptest::collection::vec(proptest::collection::vec(0.0f64..50.0, 5), 1..8)
        ) {
            let rows: Vec<Vec<(usize, f64)>> = table
                .iter()
                .map(|row| row.iter().copied().enumerate().filter(|(_, r)| *r > 15.0).collect())
                .collect();
            let ln = frontier(&rows, [1.0, 0.5, 0.1, 0.0]);
            let scaled = |s: f64| -> f64 {
                let rows: Vec<Vec<(usize, f64)>> =
                    rows.iter().map(|row| row.iter().map(|(j, r)| (*j, r * s)).collect()).collect();
                brute(&rows, 0).ln()
            };
            for (lane, s) in [1.0, 0.5, 0.1, 0.0].into_iter().enumerate() {
                proptest::prop_assert!((ln[lane] - scaled(s)).abs() < 1e-10);
            }
        }
    }

    #[test]
    fn long_products_stay_finite() {
        let rows: Vec<Vec<(usize, f64)>> = (0..300).map(|i| vec![(i, 1e6)]).collect();
        let ln = frontier(&rows, [1.0; LANES]);
        assert!((ln[0] - 300.0 * (1e6f64).ln_1p()).abs() < 1e-6);
    }

    #[test]
    fn a_crowd_beyond_the_frontier_is_no_disaster() {
        let rows: Vec<Vec<(usize, f64)>> = (0..40)
            .map(|_| (0..40).map(|j| (j, 2.0)).collect())
            .collect();
        assert!(
            frontier(&rows, [1.0; LANES])
                .iter()
                .all(|x| x.is_finite() && *x > 0.0)
        );
    }
}
