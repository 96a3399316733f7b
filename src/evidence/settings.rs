//! The constants of the model, and what tests may change.

use super::quadrature::Quadrature;

/// How presence is counted in E*.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PresenceRule {
    /// A barred substance keeps its missing factors and may match nothing, inside the sum over
    /// matchings. Right with and without blends.
    Inside,
    /// Inclusion and exclusion of whole evidences E'. Right only without blends.
    Subtract,
}

/// How the amounts of a mixture are integrated.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum MixtureRule {
    /// One global mode and the product of the one-substance profiles about it.
    Product,
    /// The full joint grid.
    Joint,
}

/// Constants of the model.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// ε: chance that a visible feature is overlooked.
    pub overlook: f64,
    /// ρ: weight of the wide part of the position density.
    pub tail_weight: f64,
    /// Standard deviations of the wide part, in those of the narrow one.
    pub tail_factor: f64,
    /// Mean of the exponential density of clutter strengths, decades.
    pub clutter_strength_dex: f64,
    /// κ|R| and weights: expected clutter readings in the observable range.
    pub clutter: Quadrature,
    /// κ_ref|R|: the clutter that likelihoods are stated relative to.
    pub clutter_reference: f64,
    /// Nodes of the amount without and with strengths.
    pub amount_nodes: [usize; 2],
    /// Nodes of the common shift; absent: by the rule of [`Quadrature::offset`].
    pub offset: Option<Quadrature>,
    /// Reach of the common shift in standard deviations.
    pub offset_reach: f64,
    /// Matches with r below this are left out; 0 keeps all.
    pub gate: f64,
    /// Merge features of one substance closer than the resolution, count edges and drop features
    /// that could not be seen. Off only in tests of the bare formulas.
    pub prepare: bool,
    /// Presence algebra.
    pub presence: PresenceRule,
    /// Integration of mixtures.
    pub mixture: MixtureRule,
    /// The search stops when the mass not evaluated is bounded below this share.
    pub search_tolerance: f64,
    /// Most compositions evaluated, whatever the bound; the bound then tells what is left.
    pub search_limit: usize,
    /// Most work spent on it, in pairs of line and reading times shift nodes times sets of barred members:
    /// where readings crowd, a single composition can take as long as a hundred others. Counted
    /// and not timed, so that the answer does not hang on the machine.
    pub search_work: f64,
}

impl Default for Settings {
    fn default() -> Self {
        Self {
            overlook: 0.05,
            tail_weight: 0.10,
            tail_factor: 3.0,
            clutter_strength_dex: 0.4,
            clutter: Quadrature::weighted(vec![0.3, 1.0, 3.0, 9.0], vec![0.70, 0.15, 0.10, 0.05]),
            clutter_reference: 0.3,
            amount_nodes: [16, 32],
            offset: None,
            offset_reach: 3.2,
            gate: 1e-3,
            prepare: true,
            presence: PresenceRule::Inside,
            mixture: MixtureRule::Product,
            search_tolerance: 1e-3,
            search_limit: 600,
            search_work: 2e8,
        }
    }
}
