//! The exact sum over matchings of features to readings.
//!
//! Each feature causes at most one reading and each reading has one cause. Features are taken in
//! order; a frontier holds the readings that earlier features may have taken and later ones may
//! still reach, a bit each. A reading is retired after its last feature.

/// Lanes: one per node of the clutter rate.
pub const LANES: usize = 4;

/// A value per clutter node.
pub type Lanes = [f64; LANES];

/// At most this many readings in the frontier: 2^12 states. Where more crowd within reach of one
/// another, a feature cannot take those that find no place.
const FRONTIER: usize = 12;

/// Features with the readings they may have caused, and working memory for the sum.
///
/// Sums for several columns (a node of the common shift in one clutter lane each) run side by
/// side: the pattern of matchings is the same in all of them.
#[derive(Debug, Default, Clone)]
pub struct Matching {
    columns: usize,
    /// Reading of each pair, feature after feature.
    readings: Vec<usize>,
    /// r of each pair, a row of columns per pair.
    r: Vec<f64>,
    /// End of each feature in `readings`.
    ends: Vec<usize>,
    /// Last feature that reaches each reading.
    last: Vec<usize>,
    /// Frontier: the reading of each bit.
    active: Vec<usize>,
    /// A row of columns per mask.
    states: Vec<f64>,
    /// (bit, pair) of the feature being taken.
    row: Vec<(usize, usize)>,
}

impl Matching {
    /// Forgets all features.
    pub fn clear(&mut self, columns: usize) {
        self.columns = columns;
        self.readings.clear();
        self.r.clear();
        self.ends.clear();
    }

    /// Adds a pair of the feature being built; `fill` writes r for every column.
    pub fn pair(&mut self, reading: usize, fill: impl FnOnce(&mut [f64])) {
        let start = self.r.len();
        self.r.resize(start + self.columns, 0.0);
        fill(&mut self.r[start..]);
        self.readings.push(reading);
    }

    /// Ends the feature being built; features without pairs are left out. Order by wavelength
    /// keeps the frontier short.
    pub fn end_feature(&mut self) {
        if self.ends.last().copied().unwrap_or(0) < self.readings.len() {
            self.ends.push(self.readings.len());
        }
    }

    /// Appends ln Σ over matchings Π r for every column.
    pub fn ln_sums(&mut self, out: &mut Vec<f64>) {
        let count = self.readings.iter().max().map_or(0, |j| j + 1);
        self.last.clear();
        self.last.resize(count, 0);
        let mut start = 0;
        for (feature, end) in self.ends.iter().enumerate() {
            for j in &self.readings[start..*end] {
                self.last[*j] = feature;
            }
            start = *end;
        }
        self.active.clear();
        self.states.clear();
        self.states.resize(self.columns, 1.0);
        let first = out.len();
        out.resize(first + self.columns, 0.0);
        let mut start = 0;
        for feature in 0..self.ends.len() {
            let end = self.ends[feature];
            self.take(start, end);
            start = end;
            self.retire(feature);
            if self.active.is_empty() || feature % 8 == 7 {
                rescale(&mut self.states, &mut out[first..]);
            }
        }
        for (ln, sum) in out[first..].iter_mut().zip(self.states.iter()) {
            *ln += sum.ln();
        }
    }

    /// Lets one more feature take at most one free reading. Masks descend so that the state a
    /// match comes from has not yet seen this feature.
    fn take(&mut self, start: usize, end: usize) {
        self.row.clear();
        for pair in start..end {
            let reading = self.readings[pair];
            let bit = match self.active.iter().position(|a| *a == reading) {
                Some(bit) => bit,
                None if self.active.len() < FRONTIER => {
                    self.active.push(reading);
                    self.states.resize(self.states.len() * 2, 0.0);
                    self.active.len() - 1
                }
                None => continue,
            };
            self.row.push((1 << bit, pair));
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

    /// Forgets whether readings were taken that no later feature reaches.
    fn retire(&mut self, feature: usize) {
        let width = self.columns;
        let mut bit = 0;
        while bit < self.active.len() {
            if self.last[self.active[bit]] > feature {
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

/// Keeps long products within range: each column on its own scale.
fn rescale(states: &mut [f64], ln_scale: &mut [f64]) {
    const HIGH: f64 = 1e60;
    if states.iter().all(|s| *s < HIGH) {
        return;
    }
    let width = ln_scale.len();
    for (column, ln) in ln_scale.iter_mut().enumerate() {
        let peak = states.iter().skip(column).step_by(width).copied().fold(0.0, f64::max);
        if peak > 1.0 {
            *ln += peak.ln();
            states.iter_mut().skip(column).step_by(width).for_each(|s| *s /= peak);
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
        let rows: Vec<Vec<(usize, f64)>> = (0..40).map(|_| (0..40).map(|j| (j, 2.0)).collect()).collect();
        assert!(frontier(&rows, [1.0; LANES]).iter().all(|x| x.is_finite() && *x > 0.0));
    }
}
