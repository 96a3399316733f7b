//! The instrument and the source: presets, a TOML file and flags, resolved once.
//! Nothing later reads flags.

use crate::library::SourceKind;

/// The kind of instrument; sets the defaults of a [`Setup`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, serde::Serialize, serde::Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum InstrumentKind {
    /// Hand-held spectroscope with a printed scale, read by eye.
    ScaleSpectroscope,
    /// Grating or prism on a divided circle, read by eye.
    Goniometer,
    /// Prism spectroscope with a calibrated scale, read by eye.
    Prism,
    /// Camera behind a grating.
    Camera,
    /// Small spectrometer with a line detector.
    Ccd,
}

/// The medium in which wavelengths of the table are stated.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, serde::Serialize, serde::Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Medium {
    /// Standard air.
    Air,
    /// Vacuum.
    Vacuum,
}

/// Which substances are weighed.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Candidates {
    /// The whole library (classes other than `never`).
    Everything,
    /// A named list of the library.
    List(String),
    /// Substances by name, symbol or alias.
    Named(Vec<String>),
}

/// How the eye or detector weighs wavelengths.
#[derive(Debug, Clone, PartialEq)]
pub enum Response {
    /// The eye's photopic curve with a violet correction.
    Eye,
    /// The same everywhere in range.
    Flat,
    /// A curve: (nm, decades ≤ 0), ascending; constant outside.
    Curve(Vec<(f64, f64)>),
}

/// A resolved, checked set-up. Every field has a getter of the same name.
#[derive(Debug, Clone, PartialEq)]
pub struct Setup {
    instrument: InstrumentKind,
    range_nm: [f64; 2],
    resolution_nm: f64,
    uncertainty_nm: f64,
    offset_nm: f64,
    scale_relative: f64,
    dynamic_range_dex: f64,
    strength_uncertainty_dex: f64,
    medium: Medium,
    division_nm: Option<f64>,
    blind_nm: Vec<[f64; 2]>,
    filter: Option<String>,
    dim_nm: Vec<(f64, f64, f64)>,
    orders_filtered: bool,
    faintest: Option<f64>,
    listed_at_most: Option<usize>,
    response: Response,
    source: SourceKind,
    always: Vec<String>,
    candidates: Candidates,
}
