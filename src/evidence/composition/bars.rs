//! Which members have to be barred in turn.

use super::super::matching::LANES;
use super::profile::{Profile, positions};

/// Members whose absence would matter less than this are not barred in turn.
const CERTAIN: f64 = 1e-7;

/// Most members barred in turn: 2^6 sets.
const MOST_BARRED: usize = 6;

impl Profile<'_, '_> {
    /// Bars members that became doubtful at the present state; says whether there were any.
    pub fn bar_more(&mut self) -> bool {
        let mut all = self.find_doubtful();
        all.retain(|m| !self.doubtful.contains(m));
        all.truncate(MOST_BARRED.saturating_sub(self.doubtful.len()));
        if all.is_empty() {
            return false;
        }
        self.doubtful.extend(all);
        self.doubtful.sort_unstable();
        self.place_bars();
        self.refresh();
        true
    }

    pub(super) fn place_bars(&mut self) {
        for (bars, segment) in self.local_bars.iter_mut().zip(&self.assembly.segments) {
            *bars = positions(&self.doubtful, |m| segment.members.contains(m));
        }
    }

    /// Members that might have caused nothing: exp(ln L barred − ln L) above a threshold anywhere.
    pub(super) fn find_doubtful(&mut self) -> Vec<usize> {
        let count = self.assembly.members.len();
        if count == 1 {
            return vec![0];
        }
        let mut ratio = vec![vec![[0.0; LANES]; self.shifts.len()]; count];
        for segment in &self.assembly.segments {
            for m in &segment.members {
                let mut out = Vec::new();
                self.assembly.ln_segment(
                    self.stock,
                    segment,
                    &self.latents,
                    &self.shifts,
                    &[*m],
                    None,
                    &mut self.work,
                    &mut out,
                );
                let half = self.shifts.len();
                for d in 0..half {
                    for l in 0..LANES {
                        ratio[*m][d][l] += out[half + d][l] - out[d][l];
                    }
                }
            }
        }
        let mut worst: Vec<(f64, usize)> = ratio
            .iter()
            .enumerate()
            .map(|(m, nodes)| {
                (
                    nodes
                        .iter()
                        .flatten()
                        .copied()
                        .fold(f64::NEG_INFINITY, f64::max),
                    m,
                )
            })
            .filter(|(ln, _)| *ln > CERTAIN.ln())
            .collect();
        worst.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
        worst.truncate(MOST_BARRED);
        let mut doubtful: Vec<usize> = worst.into_iter().map(|(_, m)| m).collect();
        doubtful.sort_unstable();
        doubtful
    }
}
