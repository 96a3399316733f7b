//! Features too close to be told apart.

/// A feature that may blend with its neighbours.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Part {
    /// λ, nm.
    pub wavelength_nm: f64,
    /// u_i, nm.
    pub uncertainty_nm: f64,
    /// h, decades.
    pub level_dex: f64,
    /// τ, decades.
    pub scatter_dex: f64,
    /// e.
    pub edge: f64,
    /// Chance to be recorded as a band.
    pub band_chance: f64,
}

/// The feature that several look like, and the weights φ ∝ 10^h of its parts.
///
/// h_b = log10 Σ 10^h, λ_b = Σ φ λ, τ_b² = Σ φ² τ²,
/// u_b² = Σ φ² u² + Σ φ² (λ − λ_b)² min(τ ln 10, 1)².
pub fn blend(parts: &[Part]) -> (Part, Vec<f64>) {
    let peak = parts
        .iter()
        .map(|p| p.level_dex)
        .fold(f64::NEG_INFINITY, f64::max);
    let raw: Vec<f64> = parts
        .iter()
        .map(|p| 10f64.powf(p.level_dex - peak))
        .collect();
    let total: f64 = raw.iter().sum();
    let weights: Vec<f64> = raw.iter().map(|r| r / total).collect();
    let mean = |value: fn(&Part) -> f64| -> f64 {
        weights.iter().zip(parts).map(|(w, p)| w * value(p)).sum()
    };
    let wavelength_nm = mean(|p| p.wavelength_nm);
    let spread = |p: &Part| {
        let moved =
            (p.wavelength_nm - wavelength_nm) * (p.scatter_dex * std::f64::consts::LN_10).min(1.0);
        p.uncertainty_nm.powi(2) + moved.powi(2)
    };
    let variance: f64 = weights
        .iter()
        .zip(parts)
        .map(|(w, p)| w * w * spread(p))
        .sum();
    let scatter: f64 = weights
        .iter()
        .zip(parts)
        .map(|(w, p)| (w * p.scatter_dex).powi(2))
        .sum();
    let whole = Part {
        wavelength_nm,
        uncertainty_nm: variance.sqrt(),
        level_dex: peak + total.log10(),
        scatter_dex: scatter.sqrt(),
        edge: mean(|p| p.edge),
        band_chance: mean(|p| p.band_chance),
    };
    (whole, weights)
}

/// Groups a chain as an instrument shows it: the strongest absorbs the others within `width_nm`,
/// then the strongest of those left, and so on. Gives the indices of each group, seed first.
pub fn absorb(parts: &[Part], width_nm: f64) -> Vec<Vec<usize>> {
    let mut order: Vec<usize> = (0..parts.len()).collect();
    order.sort_by(|a, b| {
        parts[*b]
            .level_dex
            .total_cmp(&parts[*a].level_dex)
            .then(a.cmp(b))
    });
    let mut groups: Vec<Vec<usize>> = Vec::new();
    let mut left = order;
    while let Some(seed) = left.first().copied() {
        let near = |i: &usize| {
            *i == seed || (parts[*i].wavelength_nm - parts[seed].wavelength_nm).abs() < width_nm
        };
        let (group, rest) = left.iter().partition(|i| near(i));
        groups.push(group);
        left = rest;
    }
    groups
}

#[cfg(test)]
mod tests {
    use super::*;

    fn part(wavelength_nm: f64, level_dex: f64) -> Part {
        Part {
            wavelength_nm,
            uncertainty_nm: 0.005,
            level_dex,
            scatter_dex: 0.3,
            edge: 1.0,
            band_chance: 0.05,
        }
    }

    #[test]
    fn equal_lines_blend_halfway_and_twice_as_strong() {
        let (whole, weights) = blend(&[part(589.0, 0.0), part(589.6, 0.0)]);
        assert!((whole.wavelength_nm - 589.3).abs() < 1e-12);
        assert!((whole.level_dex - 2f64.log10()).abs() < 1e-12);
        assert_eq!(weights, vec![0.5, 0.5]);
    }

    #[test]
    fn a_far_weaker_line_changes_nothing() {
        let (whole, _) = blend(&[part(589.0, 0.0), part(589.6, -9.0)]);
        assert!((whole.wavelength_nm - 589.0).abs() < 1e-8);
        assert!((whole.scatter_dex - 0.3).abs() < 1e-8);
    }

    #[test]
    fn the_strongest_absorbs_first() {
        let chain = [
            part(500.0, -1.0),
            part(500.8, 0.0),
            part(501.6, -0.5),
            part(502.3, -0.2),
        ];
        assert_eq!(absorb(&chain, 1.0), vec![vec![1, 2, 0], vec![3]]);
    }
}
