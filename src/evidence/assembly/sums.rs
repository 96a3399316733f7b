//! The sum over matchings of a realised segment.

use super::super::matching::{LANES, Lanes, work as matching_work};
use super::Stock;
use super::layout::Segment;
use super::realise::Workspace;

/// Appends the sums over matchings of a realised segment, one per shift. `r` is pair-major:
/// `r[q * shifts + d]`.
pub(super) fn sums(
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
    /// Pairs of line and reading in the segment realised last.
    pub fn pairs(&self) -> usize {
        self.reading.len()
    }

    /// Where readings crowd so much that the sum would take long, leaves out pairs far weaker
    /// than all that could explain the same reading together.
    fn thin(&mut self) {
        /// Steps of one pair and one mask that a sum may take.
        const AFFORDABLE: f64 = 4000.0;
        const SHARES: [f64; 4] = [1e-3, 1e-2, 3e-2, 0.1];
        if self.work() <= AFFORDABLE {
            return;
        }
        self.find_shares();
        for share in SHARES {
            let shares = &self.share;
            for qs in &mut self.live {
                qs.retain(|q| shares[*q] > share);
            }
            self.live.retain(|qs| !qs.is_empty());
            if self.work() <= AFFORDABLE {
                return;
            }
        }
    }

    /// What the sum over the live pairs would cost.
    fn work(&mut self) -> f64 {
        self.ends.clear();
        for (i, qs) in self.live.iter().enumerate() {
            self.ends.extend(qs.iter().map(|q| (i, self.reading[*q])));
        }
        matching_work(&self.ends)
    }

    /// The largest share, over the shifts, that each live pair has in all that could explain its
    /// reading.
    fn find_shares(&mut self) {
        let Self {
            reading,
            r,
            shifts,
            live,
            rivals,
            share,
            ..
        } = self;
        let count = reading.iter().max().map_or(0, |j| j + 1);
        rivals.clear();
        rivals.resize(count * *shifts, 0.0);
        for q in live.iter().flatten() {
            let to = &mut rivals[reading[*q] * *shifts..][..*shifts];
            for (to, r) in to.iter_mut().zip(&r[q * *shifts..][..*shifts]) {
                *to += r;
            }
        }
        share.clear();
        share.resize(reading.len(), 0.0);
        for q in live.iter().flatten() {
            let all = &rivals[reading[*q] * *shifts..][..*shifts];
            let own = &r[q * *shifts..][..*shifts];
            share[*q] = own.iter().zip(all).fold(
                0.0,
                |most, (r, all)| {
                    if *r > most * all { r / all } else { most }
                },
            );
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
