//! The one quadrature type that serves every nuisance.

use ndarray::Array1;

/// Nodes and weights of a one-dimensional integral against a probability density.
///
/// Weights sum to one.
#[derive(Debug, Clone, PartialEq)]
pub struct Quadrature {
    nodes: Array1<f64>,
    weights: Array1<f64>,
}

impl Quadrature {
    /// From nodes and relative weights; weights are normalised.
    pub fn weighted(nodes: Vec<f64>, weights: Vec<f64>) -> Self {
        debug_assert_eq!(nodes.len(), weights.len());
        let weights = Array1::from_vec(weights);
        let total = weights.sum();
        Self {
            nodes: Array1::from_vec(nodes),
            weights: weights / total,
        }
    }

    /// One node: the nuisance is known.
    pub fn fixed(node: f64) -> Self {
        Self::weighted(vec![node], vec![1.0])
    }

    /// `count` midpoints of a uniform density on `[0, upper]`.
    pub fn midpoints(upper: f64, count: usize) -> Self {
        let step = upper / count as f64;
        let nodes = Array1::from_shape_fn(count, |k| (k as f64 + 0.5) * step);
        Self::weighted(nodes.to_vec(), vec![1.0; count])
    }

    /// Three Gauss-Hermite nodes of a normal density: 0 and ±√3 standard deviations with weights
    /// 2/3 and 1/6 (Abramowitz & Stegun 25.4.46, n = 3); one node if the deviation is zero.
    pub fn normal3(sd: f64) -> Self {
        if sd <= 0.0 {
            return Self::fixed(0.0);
        }
        let reach = 3f64.sqrt() * sd;
        Self::weighted(vec![-reach, 0.0, reach], vec![1.0, 4.0, 1.0])
    }

    /// With probability `chance` the nuisance lies so far down that nothing shows: a first node
    /// at −12 decades.
    pub fn or_far_down(self, chance: f64) -> Self {
        const FAR_DOWN_DEX: f64 = -12.0;
        if chance < 1e-3 {
            return self;
        }
        let mut nodes = vec![FAR_DOWN_DEX];
        nodes.extend(self.nodes.iter());
        let mut weights = vec![chance];
        weights.extend(self.weights.iter().map(|w| w * (1.0 - chance)));
        Self::weighted(nodes, weights)
    }

    /// The shift common to all readings: uniform nodes over ±`reach` standard deviations, weights
    /// from 0.95 N(0, sd²) + 0.05 N(0, (5 sd)²), at least 13 nodes, spaced at most `spacing` (nm),
    /// at most 2001; one node if `sd` is zero.
    pub fn offset(sd: f64, reach: f64, spacing: f64) -> Self {
        const FLOOR_NM: f64 = 0.001;
        if sd <= 0.0 {
            return Self::fixed(0.0);
        }
        let half = reach * sd;
        let wanted = 1.0 + (2.0 * half / spacing.max(FLOOR_NM)).ceil();
        // An odd count keeps a node at zero.
        let count = (wanted.clamp(13.0, 2001.0) as usize) | 1;
        let nodes = Array1::linspace(-half, half, count);
        let weights = nodes.mapv(|x| {
            let z = x / sd;
            0.95 * (-0.5 * z * z).exp() + 0.05 / 5.0 * (-0.5 * z * z / 25.0).exp()
        });
        Self::weighted(nodes.to_vec(), weights.to_vec())
    }

    /// Number of nodes.
    pub fn len(&self) -> usize {
        self.nodes.len()
    }

    /// Whether there are no nodes.
    pub fn is_empty(&self) -> bool {
        self.nodes.is_empty()
    }

    /// The nodes, ascending where the density is ordered.
    pub fn nodes(&self) -> &[f64] {
        self.nodes.as_slice().unwrap_or(&[])
    }

    /// The weights; they sum to one.
    pub fn weights(&self) -> &[f64] {
        self.weights.as_slice().unwrap_or(&[])
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn moment(q: &Quadrature, power: i32) -> f64 {
        q.nodes()
            .iter()
            .zip(q.weights())
            .map(|(x, w)| w * x.powi(power))
            .sum()
    }

    #[test]
    fn gauss_hermite_is_exact_to_the_fifth_moment() {
        let q = Quadrature::normal3(0.7);
        for (power, expected) in [
            (0, 1.0),
            (1, 0.0),
            (2, 0.49),
            (3, 0.0),
            (4, 3.0 * 0.49 * 0.49),
        ] {
            assert!(
                (moment(&q, power) - expected).abs() < 1e-12,
                "moment {power}"
            );
        }
    }

    #[test]
    fn offset_nodes_are_fine_enough_and_bounded() {
        let q = Quadrature::offset(0.3, 3.2, 0.025);
        let step = q.nodes()[1] - q.nodes()[0];
        assert!(step <= 0.025 + 1e-12, "step {step}");
        assert_eq!(Quadrature::offset(0.3, 3.2, 3.0).len(), 13);
        assert_eq!(Quadrature::offset(100.0, 16.0, 1e-9).len(), 2001);
        assert_eq!(Quadrature::offset(0.0, 3.2, 0.1).len(), 1);
    }

    #[test]
    fn weights_sum_to_one() {
        for q in [
            Quadrature::midpoints(2.0, 16),
            Quadrature::normal3(0.5),
            Quadrature::offset(0.4, 3.2, 0.3),
        ] {
            assert!((moment(&q, 0) - 1.0).abs() < 1e-12);
        }
    }
}
