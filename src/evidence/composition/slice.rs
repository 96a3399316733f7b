//! Numbers by shift node and clutter lane.

use super::super::matching::{LANES, Lanes};

/// ln of every term of the integrand by (shift in use, lane).
pub(super) type Slice = Vec<Lanes>;

pub(super) fn peak(slice: &Slice) -> f64 {
    slice
        .iter()
        .flatten()
        .copied()
        .fold(f64::NEG_INFINITY, f64::max)
}

pub(super) fn add(to: &mut Slice, from: &Slice) {
    combine(to, from, |a, b| a + b);
}

pub(super) fn subtract(from: &mut Slice, what: &Slice) {
    combine(from, what, |a, b| a - b);
}

pub(super) fn combine(to: &mut Slice, with: &Slice, op: impl Fn(f64, f64) -> f64) {
    for (a, b) in to.iter_mut().zip(with) {
        for l in 0..LANES {
            a[l] = op(a[l], b[l]);
        }
    }
}
