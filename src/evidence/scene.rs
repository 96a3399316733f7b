//! What all candidates of one inference share: the readings, the set-up and the nuisances.

use super::density::{median, normal, phi};
use super::quadrature::Quadrature;
use super::settings::Settings;
use super::{Conditions, Observation};

/// What all candidates of one inference share: the readings, the set-up and the nuisances.
#[derive(Debug, Clone)]
pub struct Scene<'a> {
    /// Readings.
    pub observations: &'a [Observation],
    /// Set-up.
    pub conditions: &'a Conditions,
    /// Constants.
    pub settings: &'a Settings,
    /// Amount α, the same nodes for every substance.
    pub amount: Quadrature,
    /// Common shift δ.
    pub offset: Quadrature,
    /// |R| without the blind stretches, nm.
    pub span_nm: f64,
    /// Median u_y of the readings that carry a strength; 0 if none.
    pub strength_uncertainty_dex: f64,
    median_uncertainty_nm: f64,
}

impl<'a> Scene<'a> {
    /// Fixes the nodes of all shared nuisances.
    pub fn new(
        observations: &'a [Observation],
        conditions: &'a Conditions,
        settings: &'a Settings,
    ) -> Self {
        let stated = observations.iter().filter_map(|o| o.strength_dex);
        let with_strengths = stated.clone().next().is_some();
        let offset = settings.offset.clone().unwrap_or_else(|| {
            Quadrature::offset(
                conditions.offset_nm,
                settings.offset_reach,
                shift_spacing(observations),
            )
        });
        let [low, high] = conditions.range_nm;
        let blind: f64 = conditions.blind_nm.iter().map(|[a, b]| b - a).sum();
        Self {
            observations,
            conditions,
            settings,
            amount: Quadrature::midpoints(
                conditions.dynamic_range_dex,
                settings.amount_nodes[usize::from(with_strengths)],
            ),
            offset,
            span_nm: (high - low - blind).max(1e-6),
            strength_uncertainty_dex: median(stated.map(|(_, u)| u)).unwrap_or(0.0),
            median_uncertainty_nm: median(observations.iter().map(|o| o.uncertainty_nm))
                .unwrap_or(0.0),
        }
    }

    /// κ_ref, readings per nm.
    pub fn clutter_density(&self) -> f64 {
        self.settings.clutter_reference / self.span_nm
    }

    /// p = (1−ε)·e·Φ(h/σ), σ² = τ² + (median u_y)².
    pub fn detection(&self, edge: f64, visibility_dex: f64, scatter_dex: f64) -> f64 {
        let sigma = scatter_dex.hypot(self.strength_uncertainty_dex);
        (1.0 - self.settings.overlook) * edge * step(visibility_dex, sigma)
    }

    /// The factor of r that depends on how visible a feature is:
    /// (1−ε)·Φ(h/σ)/(1−p) without strength, (1−ε)·N(y; h, σ²)/((1−p)·g(y)) with one, and
    /// (1−ε)·Φ((h−y)/σ)/((1−p)·e^{−y/0.4}) for a saturated one.
    pub fn amplitude(
        &self,
        reading: usize,
        visibility_dex: f64,
        scatter_dex: f64,
        missing: f64,
    ) -> f64 {
        let observation = &self.observations[reading];
        let mean = self.settings.clutter_strength_dex;
        let seen = match observation.strength_dex {
            None => step(
                visibility_dex,
                scatter_dex.hypot(self.strength_uncertainty_dex),
            ),
            Some((y, u_y)) => {
                let sigma = scatter_dex.hypot(u_y);
                let clutter = (-y / mean).exp();
                if observation.saturated {
                    step(visibility_dex - y, sigma) / clutter
                } else {
                    normal(y - visibility_dex, sigma * sigma) * mean / clutter
                }
            }
        };
        (1.0 - self.settings.overlook) * seen / missing
    }

    /// f·(form factor)/κ_ref at one shift.
    pub fn position(
        &self,
        reading: usize,
        wavelength_nm: f64,
        uncertainty_nm: f64,
        band_chance: f64,
        shift_nm: f64,
    ) -> f64 {
        let observation = &self.observations[reading];
        let z = observation.wavelength_nm - wavelength_nm - shift_nm;
        let variance = observation.uncertainty_nm.powi(2) + uncertainty_nm.powi(2);
        let (tail, factor) = (self.settings.tail_weight, self.settings.tail_factor);
        let density =
            (1.0 - tail) * normal(z, variance) + tail * normal(z, variance * factor * factor);
        density * form_factor(observation.band, band_chance) / self.clutter_density()
    }

    /// e = ∫ of the position density over what can be seen, s² = u² + u_i² + u_cal², both parts of f.
    pub(super) fn edge(&self, wavelength_nm: f64, uncertainty_nm: f64) -> f64 {
        let conditions = self.conditions;
        let own = self.median_uncertainty_nm.hypot(uncertainty_nm);
        let tail = self.settings.tail_weight;
        let inside = |[low, high]: [f64; 2]| {
            [(1.0 - tail, 1.0), (tail, self.settings.tail_factor)]
                .iter()
                .map(|(weight, factor)| {
                    let s = (own * factor).hypot(conditions.offset_nm);
                    weight * (step(high - wavelength_nm, s) - step(low - wavelength_nm, s))
                })
                .sum::<f64>()
        };
        let blind: f64 = conditions.blind_nm.iter().map(|b| inside(*b)).sum();
        (inside(conditions.range_nm) - blind).clamp(0.0, 1.0)
    }

    /// The merge width at a position: the resolution, or less beside readings told apart there.
    /// Their distance is uncertain, and the lines they show may lie closer than they do.
    pub fn merge_width(&self, wavelength_nm: f64) -> f64 {
        /// Lines further apart than this share of the distance between two readings are two.
        const SPLIT_SHARE: f64 = 0.5;
        let width = self.conditions.resolution_nm;
        self.conditions
            .splits_nm
            .iter()
            .filter(|[a, b]| (a - width..=b + width).contains(&wavelength_nm))
            .map(|[a, b]| (b - a).abs() * SPLIT_SHARE)
            .fold(width, f64::min)
    }
}

/// Spacing of the shift nodes, nm: half the smallest uncertainty, and no wider than 1.5 times what
/// all readings together leave open, (Σu⁻²)^−½, where the trapezoid rule on a normal density still
/// errs by less than 2·e^{−2π²/1.5²} = 3e-4.
fn shift_spacing(observations: &[Observation]) -> f64 {
    const FLOOR_NM: f64 = 0.005;
    let finest = observations
        .iter()
        .map(|o| o.uncertainty_nm)
        .fold(f64::INFINITY, f64::min);
    let information: f64 = observations
        .iter()
        .map(|o| o.uncertainty_nm.max(FLOOR_NM).powi(-2))
        .sum();
    (0.5 * finest.max(FLOOR_NM)).min(1.5 * information.powf(-0.5))
}

/// Φ(x/σ), a step for σ = 0.
pub(super) fn step(x: f64, sigma: f64) -> f64 {
    if sigma > 0.0 {
        phi(x / sigma)
    } else if x > 0.0 {
        1.0
    } else {
        0.0
    }
}

/// P(form as seen | feature) / P(form as seen | clutter); clutter is seen as a line 6 times in 10.
fn form_factor(seen_as_band: Option<bool>, band_chance: f64) -> f64 {
    match seen_as_band {
        None => 1.0,
        Some(true) => band_chance / 0.4,
        Some(false) => (1.0 - band_chance) / 0.6,
    }
}
