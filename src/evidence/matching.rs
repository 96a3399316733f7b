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
#[derive(Debug, Default, Clone)]
pub struct Matching {
    /// (reading, r at κ_ref), feature after feature.
    pairs: Vec<(usize, f64)>,
    /// End of each feature in `pairs`.
    ends: Vec<usize>,
    /// Last feature that reaches each reading.
    last: Vec<usize>,
    /// Frontier: the reading of each bit.
    active: Vec<usize>,
    states: Vec<Lanes>,
    row: Vec<(usize, f64)>,
}

impl Matching {
    /// Forgets all features.
    pub fn clear(&mut self) {
        self.pairs.clear();
        self.ends.clear();
    }

    /// Adds a feature; order by wavelength keeps the frontier short. Features without readings
    /// are left out.
    pub fn push(&mut self, pairs: impl Iterator<Item = (usize, f64)>) {
        let before = self.pairs.len();
        self.pairs.extend(pairs);
        if self.pairs.len() > before {
            self.ends.push(self.pairs.len());
        }
    }

    /// ln Σ over matchings Π r, per lane; `scale[l]` = κ_ref/κ_l multiplies every r in lane l.
    pub fn ln_sum(&mut self, scale: &Lanes) -> Lanes {
        let readings = self.pairs.iter().map(|(j, _)| j + 1).max().unwrap_or(0);
        self.last.clear();
        self.last.resize(readings, 0);
        let mut start = 0;
        for (feature, end) in self.ends.iter().enumerate() {
            for (j, _) in &self.pairs[start..*end] {
                self.last[*j] = feature;
            }
            start = *end;
        }
        self.active.clear();
        self.states.clear();
        self.states.push([1.0; LANES]);
        let mut ln_scale = [0.0; LANES];
        let mut start = 0;
        for feature in 0..self.ends.len() {
            let end = self.ends[feature];
            self.take(start, end, scale);
            start = end;
            self.retire(feature);
            rescale(&mut self.states, &mut ln_scale);
        }
        std::array::from_fn(|l| self.states.iter().map(|s| s[l]).sum::<f64>().ln() + ln_scale[l])
    }

    /// Lets one more feature take at most one free reading. Masks descend so that the state a
    /// match comes from has not yet seen this feature.
    fn take(&mut self, start: usize, end: usize, scale: &Lanes) {
        self.row.clear();
        for (reading, r) in &self.pairs[start..end] {
            let bit = match self.active.iter().position(|a| a == reading) {
                Some(bit) => bit,
                None if self.active.len() < FRONTIER => {
                    self.active.push(*reading);
                    self.states.resize(self.states.len() * 2, [0.0; LANES]);
                    self.active.len() - 1
                }
                None => continue,
            };
            self.row.push((1 << bit, *r));
        }
        for mask in (1..self.states.len()).rev() {
            let mut gain = [0.0; LANES];
            for (bit, r) in &self.row {
                if mask & bit != 0 {
                    let from = &self.states[mask ^ bit];
                    for l in 0..LANES {
                        gain[l] += from[l] * (r * scale[l]);
                    }
                }
            }
            for l in 0..LANES {
                self.states[mask][l] += gain[l];
            }
        }
    }

    /// Forgets whether readings were taken that no later feature reaches.
    fn retire(&mut self, feature: usize) {
        let mut bit = 0;
        while bit < self.active.len() {
            if self.last[self.active[bit]] > feature {
                bit += 1;
                continue;
            }
            self.active.remove(bit);
            let low = (1usize << bit) - 1;
            let half = self.states.len() / 2;
            for mask in 0..half {
                // Spread the mask around the bit that goes: it never lies before the mask itself.
                let open = (mask & low) | ((mask & !low) << 1);
                let (free, taken) = (self.states[open], self.states[open | 1 << bit]);
                for l in 0..LANES {
                    self.states[mask][l] = free[l] + taken[l];
                }
            }
            self.states.truncate(half);
        }
    }
}

/// Keeps long products within range: each lane on its own scale.
fn rescale(states: &mut [Lanes], ln_scale: &mut Lanes) {
    const HIGH: f64 = 1e100;
    for l in 0..LANES {
        let peak = states.iter().map(|s| s[l]).fold(0.0, f64::max);
        if peak > HIGH {
            ln_scale[l] += peak.ln();
            for state in states.iter_mut() {
                state[l] /= peak;
            }
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

    fn frontier(rows: &[Vec<(usize, f64)>], scale: Lanes) -> Lanes {
        let mut matching = Matching::default();
        for row in rows {
            matching.push(row.iter().copied());
        }
        matching.ln_sum(&scale)
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
