//! Normal density and distribution, and sums of logarithms.

use statrs::function::erf::erfc;

const LN_SQRT_TAU: f64 = 0.918_938_533_204_672_8;

/// Density of a centred normal with variance `variance` at `z`.
pub fn normal(z: f64, variance: f64) -> f64 {
    (-0.5 * z * z / variance - 0.5 * variance.ln() - LN_SQRT_TAU).exp()
}

/// Standard normal distribution function Φ(x).
pub fn phi(x: f64) -> f64 {
    0.5 * erfc(-x * std::f64::consts::FRAC_1_SQRT_2)
}

/// ln Σ exp(x) without overflow; −∞ for an empty sum.
pub fn ln_sum_exp(terms: &[f64]) -> f64 {
    let peak = terms.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if peak == f64::NEG_INFINITY {
        return peak;
    }
    peak + terms.iter().map(|x| (x - peak).exp()).sum::<f64>().ln()
}

/// The middle value; the mean of the two middle ones for an even count; absent for none.
pub fn median(values: impl IntoIterator<Item = f64>) -> Option<f64> {
    let mut sorted: Vec<f64> = values.into_iter().collect();
    sorted.sort_by(f64::total_cmp);
    let middle = sorted.len() / 2;
    match sorted.len() {
        0 => None,
        n if n % 2 == 1 => Some(sorted[middle]),
        _ => Some(0.5 * (sorted[middle - 1] + sorted[middle])),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use statrs::distribution::{Continuous, ContinuousCDF, Normal};

    /// Against the normal distribution of the statrs crate.
    #[test]
    fn agrees_with_statrs() {
        let unit = Normal::new(0.0, 1.0).expect("unit normal");
        let wide = Normal::new(0.0, 0.3).expect("normal");
        for k in -60..=60 {
            let x = f64::from(k) * 0.1;
            assert!((phi(x) - unit.cdf(x)).abs() < 1e-14);
            assert!((normal(x, 0.09) / wide.pdf(x) - 1.0).abs() < 1e-12);
        }
    }

    #[test]
    fn sums_of_logarithms_do_not_overflow() {
        assert!((ln_sum_exp(&[1000.0, 1000.0]) - (1000.0 + 2f64.ln())).abs() < 1e-12);
        assert_eq!(ln_sum_exp(&[]), f64::NEG_INFINITY);
    }
}
