//! The model: visibility, assignment, clutter, offset, composition, search.
//!
//! Knows no instrument and no format: it takes plain numbers and gives plain numbers.

mod assembly;
mod blend;
mod composition;
mod density;
mod exhaustive;
mod matching;
mod prepare;
mod quadrature;
mod scene;
mod search;
mod settings;
mod summary;
mod view;

pub use density::median;
pub use exhaustive::{Entry, Exhaustive, exhaustive};
pub use quadrature::Quadrature;
pub use settings::{MixtureRule, PresenceRule, Settings};
pub use summary::{infer, infer_with};

/// One reading as the model sees it.
#[derive(Debug, Clone, PartialEq)]
pub struct Observation {
    /// Position x, nm, air.
    pub wavelength_nm: f64,
    /// Standard uncertainty u, nm.
    pub uncertainty_nm: f64,
    /// (y, u_y): decades above the faintest recordable strength and standard uncertainty.
    pub strength_dex: Option<(f64, f64)>,
    /// y is a lower bound.
    pub saturated: bool,
    /// `true` seen as a band, `false` as a line, absent unknown.
    pub band: Option<bool>,
}

/// What the set-up lets through.
#[derive(Debug, Clone, PartialEq)]
pub struct Conditions {
    /// Observable range R, nm.
    pub range_nm: [f64; 2],
    /// Blind stretches inside the range, disjoint, ascending, nm.
    pub blind_nm: Vec<[f64; 2]>,
    /// Merge width w, nm.
    pub resolution_nm: f64,
    /// Dynamic range D, decades.
    pub dynamic_range_dex: f64,
    /// Standard deviation u_cal of the shift common to all readings, nm.
    pub offset_nm: f64,
    /// Standard uncertainty of a stretch common to all readings.
    pub scale_relative: f64,
    /// Pairs of readings told apart although closer than `resolution_nm`: near them the merge
    /// width is half their distance.
    pub splits_nm: Vec<[f64; 2]>,
}

/// The form of a reference feature.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum FeatureForm {
    /// A spectral line.
    Line,
    /// A band edge.
    BandHead,
    /// A band maximum.
    BandMax,
}

/// A feature of a candidate, before preparation.
#[derive(Debug, Clone, PartialEq)]
pub struct CandidateFeature {
    /// Emitter index within the candidate.
    pub emitter: usize,
    /// Form.
    pub form: FeatureForm,
    /// Position λ, nm, air.
    pub wavelength_nm: f64,
    /// Standard uncertainty, nm.
    pub uncertainty_nm: f64,
    /// level_e + m_i + q(λ_i), decades, on the substance's own scale.
    pub level_dex: f64,
    /// Scatter τ, decades.
    pub scatter_dex: f64,
}

/// A substance that may be present, as the model sees it.
#[derive(Debug, Clone, PartialEq)]
pub struct Candidate {
    /// Prior probability π of being in the sample.
    pub prior: f64,
    /// v: the chance that this kind of source excites it at all.
    pub shows: f64,
    /// level_spread_dex per emitter.
    pub emitter_spread_dex: Vec<f64>,
    /// Per emitter: the chance that this kind of source excites it at all; the largest is `shows`.
    pub emitter_shows: Vec<f64>,
    /// Features of all emitters.
    pub features: Vec<CandidateFeature>,
}

/// A composition that was weighed.
#[derive(Debug, Clone, PartialEq)]
pub struct WeighedComposition {
    /// Indices into the candidates, ascending.
    pub members: Vec<usize>,
    /// Posterior probability.
    pub posterior: f64,
    /// ln E*(S) with κ_ref|R| = 0.3, nats; absent where E* is zero.
    pub log_evidence: Option<f64>,
}

/// What the readings say of one candidate.
#[derive(Debug, Clone, PartialEq)]
pub struct Presence {
    /// Z: the chance of at least one visible feature, given that the source excites it.
    pub detectability: f64,
    /// v·Z.
    pub testable: f64,
    /// P(caused at least one reading).
    pub detected: f64,
    /// P(is in the sample).
    pub physical: f64,
    /// The candidate stands on one reading only: without it its presence would fall below one half.
    pub rests_on_one_line: bool,
}

/// A possible cause of a reading.
#[derive(Debug, Clone, PartialEq)]
pub struct Cause {
    /// Candidate index.
    pub candidate: usize,
    /// Emitter index within the candidate.
    pub emitter: usize,
    /// Position of the (merged) feature, nm, air.
    pub feature_nm: f64,
    /// Index of the strongest original feature in the candidate's list.
    pub feature: usize,
    /// Posterior probability that this feature caused the reading.
    pub probability: f64,
    /// x − λ, nm.
    pub residual_nm: f64,
    /// (x − λ)/hypot(u, u_i).
    pub residual_sigma: f64,
}

/// What the model says of one reading.
#[derive(Debug, Clone, PartialEq)]
pub struct ReadingEvidence {
    /// Posterior probability that nothing in the weighed compositions caused it.
    pub unexplained: f64,
    /// Causes by falling probability.
    pub causes: Vec<Cause>,
}

/// A feature of the leading composition that was expected and not seen.
#[derive(Debug, Clone, PartialEq)]
pub struct MissingFeature {
    /// Candidate index.
    pub candidate: usize,
    /// Emitter index within the candidate.
    pub emitter: usize,
    /// Position, nm, air.
    pub wavelength_nm: f64,
    /// Index of the strongest original feature in the candidate's list.
    pub feature: usize,
    /// Chance that it would have been recorded.
    pub detection_probability: f64,
}

/// Posterior of a nuisance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Posterior {
    /// Mean.
    pub mean: f64,
    /// Standard deviation.
    pub sd: f64,
}

/// Everything the evidence says about one sample.
#[derive(Debug, Clone, PartialEq)]
pub struct Inference {
    /// Compositions by falling posterior; they sum to one.
    pub compositions: Vec<WeighedComposition>,
    /// Bound on the posterior mass of everything not evaluated, relative to what was.
    pub untested_mass_bound: f64,
    /// One per candidate.
    pub presence: Vec<Presence>,
    /// One per observation.
    pub readings: Vec<ReadingEvidence>,
    /// Of the leading composition, by falling detection probability (≥ 0.2 only).
    pub missing: Vec<MissingFeature>,
    /// The common shift δ under the leading composition, nm.
    pub offset_nm: Posterior,
    /// Root mean square of the residuals of explained readings under the leading composition, in
    /// standard uncertainties, after the common shift; absent with fewer than two.
    pub residual_rms_sigma: Option<f64>,
    /// Compositions when every prior is halved, then doubled: the leader's members.
    pub leader_with_priors_halved: Vec<usize>,
    /// See above.
    pub leader_with_priors_doubled: Vec<usize>,
    /// Posterior of compositions when candidates with a prior of one half or more are marginalised
    /// out: (members without the ubiquitous, posterior), by falling posterior.
    pub without_ubiquitous: Vec<(Vec<usize>, f64)>,
}
