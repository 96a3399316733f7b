//! The exact sum over matchings of features to readings.
//!
//! Each feature causes at most one reading and each reading has one cause. One side is taken in
//! order; a frontier holds those of the other side that earlier ones may have taken and later
//! ones may still reach, a bit each, and forgets each after its last partner. The sum is the same
//! whichever side is taken in order: few readings among many lines keep the frontier short one
//! way, a wide band over many readings the other.

/// Lanes: one per node of the clutter rate.
pub const LANES: usize = 4;

/// A value per clutter node.
pub type Lanes = [f64; LANES];

/// At most this many in the frontier: 2^12 states. Where more crowd within reach of one another,
/// pairs that find no place are left out.
const FRONTIER: usize = 12;

/// Features with the readings they may have caused, and working memory for the sum.
///
/// Sums for several columns (a node of the common shift in one clutter lane each) run side by
/// side: the pattern of matchings is the same in all of them.
#[derive(Debug, Default, Clone)]
pub struct Matching {
    columns: usize,
    /// (feature, reading), feature after feature.
    pairs: Vec<(usize, usize)>,
    /// r of each pair, a row of columns per pair.
    r: Vec<f64>,
    features: usize,
    /// (taken in order, held in the frontier, pair).
    order: Vec<(usize, usize, usize)>,
    other_order: Vec<(usize, usize, usize)>,
    /// Last place in the order of each one held in the frontier.
    last: Vec<usize>,
    /// Frontier: who is behind each bit.
    active: Vec<usize>,
    /// A row of columns per mask.
    states: Vec<f64>,
    /// (bit, pair) of the one being taken.
    row: Vec<(usize, usize)>,
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
        let start = self.r.len();
        self.r.resize(start + self.columns, 0.0);
        fill(&mut self.r[start..]);
        self.pairs.push((self.features, reading));
    }

    /// Ends the feature being built. Order by wavelength keeps the frontier short.
    pub fn end_feature(&mut self) {
        self.features += 1;
    }

    /// Appends ln Σ over matchings Π r for every column.
    pub fn ln_sums(&mut self, out: &mut Vec<f64>) {
        self.choose_side();
        self.active.clear();
        self.states.clear();
        self.states.resize(self.columns, 1.0);
        let first = out.len();
        out.resize(first + self.columns, 0.0);
        let mut start = 0;
        let mut taken = 0;
        while start < self.order.len() {
            let outer = self.order[start].0;
            let end = start
                + self.order[start..]
                    .iter()
                    .take_while(|o| o.0 == outer)
                    .count();
            self.take(start, end);
            self.retire(end - 1);
            taken += 1;
            if self.active.is_empty() || taken % 8 == 0 {
                rescale(&mut self.states, &mut out[first..]);
            }
            start = end;
        }
        for (ln, sum) in out[first..].iter_mut().zip(self.states.iter()) {
            *ln += sum.ln();
        }
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

    /// Lets one more take at most one free partner. Masks descend so that the state a match comes
    /// from has not yet seen this one.
    fn take(&mut self, start: usize, end: usize) {
        self.row.clear();
        for (_, inner, pair) in &self.order[start..end] {
            let bit = match self.active.iter().position(|a| a == inner) {
                Some(bit) => bit,
                None if self.active.len() < FRONTIER => {
                    self.active.push(*inner);
                    self.states.resize(self.states.len() * 2, 0.0);
                    self.active.len() - 1
                }
                None => continue,
            };
            self.row.push((1 << bit, *pair));
        }
        let width = self.columns;
        for mask in (1..self.states.len() / width).rev() {
            let (below, from_here) = self.states.split_at_mut(mask * width);
            let here = &mut from_here[..width];
            for (bit, pair) in &self.row {
                if mask & bit != 0 {
                    let from = &below[(mask ^ bit) * width..][..width];
                    let r = &self.r[pair * width..][..width];
                    for ((to, from), r) in here.iter_mut().zip(from).zip(r) {
                        *to += from * r;
                    }
                }
            }
        }
    }

    /// Forgets whether partners were taken that none later in the order reaches.
    fn retire(&mut self, place: usize) {
        let width = self.columns;
        let mut bit = 0;
        while bit < self.active.len() {
            if self.last[self.active[bit]] > place {
                bit += 1;
                continue;
            }
            self.active.remove(bit);
            let low = (1usize << bit) - 1;
            let half = self.states.len() / width / 2;
            for mask in 0..half {
                // Spread the mask around the bit that goes: it never lies before the mask itself.
                let open = (mask & low) | ((mask & !low) << 1);
                let taken = open | 1 << bit;
                for column in 0..width {
                    self.states[mask * width + column] =
                        self.states[open * width + column] + self.states[taken * width + column];
                }
            }
            self.states.truncate(half * width);
        }
    }
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
    let mut open = 0i32;
    let mut total = 0.0;
    let mut first_seen = vec![true; count];
    for (place, (_, inner, _)) in order.iter().enumerate() {
        if std::mem::replace(&mut first_seen[*inner], false) {
            open += 1;
        }
        total += f64::from(open.min(FRONTIER as i32)).exp2();
        if last[*inner] == place {
            open -= 1;
        }
    }
    total
}

/// Keeps long products within range: each column on its own scale.
fn rescale(states: &mut [f64], ln_scale: &mut [f64]) {
    const HIGH: f64 = 1e60;
    if states.iter().all(|s| *s < HIGH) {
        return;
    }
    let width = ln_scale.len();
    for (column, ln) in ln_scale.iter_mut().enumerate() {
        let peak = states
            .iter()
            .skip(column)
            .step_by(width)
            .copied()
            .fold(0.0, f64::max);
        if peak > 1.0 {
            *ln += peak.ln();
            states
                .iter_mut()
                .skip(column)
                .step_by(width)
                .for_each(|s| *s /= peak);
        }
    }
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
