//! The exact sum over matchings of features to readings.
//!
//! Each feature causes at most one reading and each reading has one cause. Features are taken in
//! order; a frontier holds the readings that earlier features may have taken and later ones may
//! still reach. A reading is retired after its last feature.

/// Lanes: one per node of the clutter rate.
pub const LANES: usize = 4;

/// A value per clutter node.
pub type Lanes = [f64; LANES];

/// At most this many readings in the frontier: 2^12 states.
const FRONTIER: usize = 12;

/// The order of entering and retiring readings, fixed by which features can reach which readings.
#[derive(Debug, Clone)]
pub struct Plan {
    steps: Vec<Step>,
    slots: usize,
    readings: usize,
}

#[derive(Debug, Clone, Default)]
struct Step {
    /// (local reading, slot) that enter before the block.
    enter: Vec<(usize, usize)>,
    /// Slots that retire after it.
    retire: Vec<usize>,
}

impl Plan {
    /// `reach[b]` lists the local readings that block b of features can reach. Readings beyond
    /// what the frontier can hold are refused: gives the blocks and readings that overflow.
    pub fn new(reach: &[Vec<usize>], readings: usize) -> Result<Self, Overflow> {
        let mut first = vec![usize::MAX; readings];
        let mut last = vec![0; readings];
        for (block, reached) in reach.iter().enumerate() {
            for j in reached {
                first[*j] = first[*j].min(block);
                last[*j] = block;
            }
        }
        let mut free: Vec<usize> = (0..FRONTIER).rev().collect();
        let mut slot_of = vec![usize::MAX; readings];
        let mut slots = 0;
        let mut steps = vec![Step::default(); reach.len()];
        for (block, step) in steps.iter_mut().enumerate() {
            for j in 0..readings {
                if first[j] == block {
                    let Some(slot) = free.pop() else {
                        return Err(Overflow { block });
                    };
                    slot_of[j] = slot;
                    slots = slots.max(slot + 1);
                    step.enter.push((j, slot));
                }
            }
            for j in 0..readings {
                if first[j] != usize::MAX && last[j] == block {
                    step.retire.push(slot_of[j]);
                    free.push(slot_of[j]);
                    free.sort_unstable_by(|a, b| b.cmp(a));
                }
            }
        }
        Ok(Self { steps, slots, readings })
    }
}

/// Too many readings within reach of one block of features.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Overflow {
    /// The block.
    pub block: usize,
}

/// Working memory, reused from call to call.
#[derive(Debug, Default, Clone)]
pub struct Scratch {
    states: Vec<Lanes>,
    slot_of: Vec<usize>,
}

/// One feature: (local reading, r at κ_ref) for every reading it may have caused.
pub type Row<'a> = &'a [(usize, f64)];

/// ln Σ over matchings Π r, per lane; `scale[l]` = κ_ref/κ_l multiplies every r in lane l.
///
/// `rows_of` hands over the features of one block of the plan, one by one.
pub fn ln_matchings(
    plan: &Plan,
    scale: &Lanes,
    scratch: &mut Scratch,
    mut rows_of: impl FnMut(usize, &mut dyn FnMut(Row)),
) -> Lanes {
    let mut ln_scale = [0.0; LANES];
    scratch.states.clear();
    scratch.states.resize(1 << plan.slots, [0.0; LANES]);
    scratch.states[0] = [1.0; LANES];
    scratch.slot_of.clear();
    scratch.slot_of.resize(plan.readings, usize::MAX);
    for (block, step) in plan.steps.iter().enumerate() {
        for (reading, slot) in &step.enter {
            scratch.slot_of[*reading] = *slot;
        }
        let Scratch { states, slot_of } = scratch;
        rows_of(block, &mut |row| add_feature(states, slot_of, row, scale));
        for slot in &step.retire {
            retire(&mut scratch.states, *slot);
        }
        rescale(&mut scratch.states, &mut ln_scale);
    }
    let mut total = [0.0; LANES];
    for state in &scratch.states {
        for l in 0..LANES {
            total[l] += state[l];
        }
    }
    std::array::from_fn(|l| total[l].ln() + ln_scale[l])
}

/// Lets one more feature take at most one free reading. Masks descend so that the state a match
/// comes from has not yet seen this feature.
fn add_feature(states: &mut [Lanes], slot_of: &[usize], row: Row, scale: &Lanes) {
    for mask in (1..states.len()).rev() {
        let mut gain = [0.0; LANES];
        for (reading, r) in row {
            let bit = 1usize << slot_of[*reading];
            if mask & bit != 0 {
                let from = &states[mask ^ bit];
                for l in 0..LANES {
                    gain[l] += from[l] * (r * scale[l]);
                }
            }
        }
        for l in 0..LANES {
            states[mask][l] += gain[l];
        }
    }
}

/// Forgets whether the reading in a slot was taken.
fn retire(states: &mut [Lanes], slot: usize) {
    let bit = 1usize << slot;
    for mask in 0..states.len() {
        if mask & bit != 0 {
            let taken = std::mem::replace(&mut states[mask], [0.0; LANES]);
            for l in 0..LANES {
                states[mask ^ bit][l] += taken[l];
            }
        }
    }
}

/// Keeps long products within range: each lane on its own scale.
fn rescale(states: &mut [Lanes], ln_scale: &mut Lanes) {
    const HIGH: f64 = 1e150;
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

    fn frontier(rows: &[Vec<(usize, f64)>], readings: usize, scale: Lanes) -> Lanes {
        let reach: Vec<Vec<usize>> = rows.iter().map(|r| r.iter().map(|(j, _)| *j).collect()).collect();
        let plan = Plan::new(&reach, readings).expect("small");
        ln_matchings(&plan, &scale, &mut Scratch::default(), |b, add| add(&rows[b]))
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
            let ln = frontier(&rows, 5, [1.0, 0.5, 0.1, 0.0]);
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
        let ln = frontier(&rows, 300, [1.0; LANES]);
        assert!((ln[0] - 300.0 * (1e6f64).ln_1p()).abs() < 1e-6);
    }
}
