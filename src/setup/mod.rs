//! The instrument and the source: presets, a TOML file and flags, resolved once.
//! Nothing later reads flags.
//!
//! [`presets`] holds the defaults of each kind of instrument, [`read_setup`]
//! reads a file, and [`resolve`] lays flags over the file over the preset and
//! checks the whole. A [`Setup`] that exists is consistent.

mod check;
mod file;
mod filters;
pub mod presets;
mod resolve;
mod response;
mod values;
mod view;
mod words;

pub use file::{SetupFile, parse_setup, read_setup};
pub use filters::{FILTERS, Filter};
pub use resolve::{SetupOverrides, resolve};
pub use response::{NamedResponse, Response, UNSEEN_DEX};
pub use view::SetupView;
pub use words::UnknownWord;

use crate::library::SourceKind;
use std::path::{Path, PathBuf};

/// How much wider the common shift is taken than `offset_nm` says: claims were
/// right as often as stated only with this margin, whatever the origin of the offset.
pub const OFFSET_WIDENING: f64 = 1.5;

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

/// Which substances are weighed. Names are as typed; the library resolves them.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Candidates {
    /// The whole library (classes other than `never`).
    Everything,
    /// A named list of the library.
    List(String),
    /// Substances by name, symbol or alias.
    Named(Vec<String>),
}

impl Candidates {
    /// Reads `everything`, a list name, or names separated by commas.
    ///
    /// One name without a comma is taken for a list; whoever resolves it may
    /// fall back to a substance of that name.
    pub fn from_text(text: &str) -> Self {
        let text = text.trim();
        if text.eq_ignore_ascii_case("everything") {
            Self::Everything
        } else if text.contains(',') {
            let names = text
                .split(',')
                .map(str::trim)
                .filter(|name| !name.is_empty());
            Self::Named(names.map(str::to_owned).collect())
        } else {
            Self::List(text.to_owned())
        }
    }
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
    filter: Option<&'static Filter>,
    dim_nm: Vec<(f64, f64, f64)>,
    orders_filtered: bool,
    faintest: Option<f64>,
    listed_at_most: Option<usize>,
    response: NamedResponse,
    source: SourceKind,
    always: Vec<String>,
    candidates: Candidates,
    library: Option<PathBuf>,
}

impl Setup {
    /// The kind of instrument the defaults came from.
    pub fn instrument(&self) -> InstrumentKind {
        self.instrument
    }

    /// The range as stated, nm in air; see [`Setup::seen_range`].
    pub fn range_nm(&self) -> [f64; 2] {
        self.range_nm
    }

    /// Full width at half maximum, nm.
    pub fn resolution_nm(&self) -> f64 {
        self.resolution_nm
    }

    /// Standard uncertainty of readings that state none, nm.
    pub fn uncertainty_nm(&self) -> f64 {
        self.uncertainty_nm
    }

    /// Standard uncertainty of the shift common to all readings as stated, nm.
    pub fn offset_nm(&self) -> f64 {
        self.offset_nm
    }

    /// The standard deviation the model takes for the common shift, nm:
    /// `offset_nm` times [`OFFSET_WIDENING`]; u_cal in the model.
    pub fn common_shift_nm(&self) -> f64 {
        self.offset_nm * OFFSET_WIDENING
    }

    /// Standard uncertainty of a stretch common to all readings, relative.
    pub fn scale_relative(&self) -> f64 {
        self.scale_relative
    }

    /// Decades between the strongest feature and the weakest that would be noticed.
    pub fn dynamic_range_dex(&self) -> f64 {
        self.dynamic_range_dex
    }

    /// Standard uncertainty of a numeric strength that states none, decades.
    pub fn strength_uncertainty_dex(&self) -> f64 {
        self.strength_uncertainty_dex
    }

    /// Medium of wavelengths in the table; wavenumbers are always vacuum.
    pub fn medium(&self) -> Medium {
        self.medium
    }

    /// Scale division read to, nm.
    pub fn division_nm(&self) -> Option<f64> {
        self.division_nm
    }

    /// Blind stretches as stated, nm; see [`Setup::blind_stretches`].
    pub fn blind_nm(&self) -> &[[f64; 2]] {
        &self.blind_nm
    }

    /// The filter in the beam.
    pub fn filter(&self) -> Option<&'static Filter> {
        self.filter
    }

    /// Dimmed stretches: (from nm, to nm, decades lost).
    pub fn dim_nm(&self) -> &[(f64, f64, f64)] {
        &self.dim_nm
    }

    /// True if no overlapping orders can appear.
    pub fn orders_filtered(&self) -> bool {
        self.orders_filtered
    }

    /// The smallest strength that would have been recorded, on the scale of the table.
    pub fn faintest(&self) -> Option<f64> {
        self.faintest
    }

    /// The list was cut at this many readings.
    pub fn listed_at_most(&self) -> Option<usize> {
        self.listed_at_most
    }

    /// How the eye or detector weighs wavelengths, without filter and dimmed stretches.
    pub fn response(&self) -> &Response {
        &self.response.response
    }

    /// The response by name (`eye`, `flat`, `camera`, `ccd` or a file name).
    pub fn response_name(&self) -> &str {
        &self.response.name
    }

    /// The kind of source.
    pub fn source(&self) -> SourceKind {
        self.source
    }

    /// Traces to expect on any sample here, by name.
    pub fn always(&self) -> &[String] {
        &self.always
    }

    /// Which substances are weighed.
    pub fn candidates(&self) -> &Candidates {
        &self.candidates
    }

    /// Folder of a library of one's own.
    pub fn library(&self) -> Option<&Path> {
        self.library.as_deref()
    }

    /// q(λ) ≤ 0, decades, at a wavelength in air: response, filter and dimmed stretches together.
    ///
    /// Never below [`UNSEEN_DEX`], so that sums and differences stay finite. The
    /// common level of q has no meaning; only differences between wavelengths do.
    pub fn response_dex(&self, wavelength_nm: f64) -> f64 {
        let filter = self
            .filter
            .map_or(0.0, |filter| filter.decades(wavelength_nm));
        let dimmed: f64 = self
            .dim_nm
            .iter()
            .filter(|(from, to, _)| (*from..=*to).contains(&wavelength_nm))
            .map(|(_, _, lost)| lost)
            .sum();
        (self.response().decades(wavelength_nm) + filter - dimmed).clamp(UNSEEN_DEX, 0.0)
    }

    /// The range, less what the eye cannot see when it is the detector, nm in air.
    pub fn seen_range(&self) -> [f64; 2] {
        seen(self.range_nm, self.response())
    }

    /// Blind stretches of set-up and filter inside [`Setup::seen_range`]: merged, ascending, nm in air.
    pub fn blind_stretches(&self) -> Vec<[f64; 2]> {
        let [low, high] = self.seen_range();
        let filter = self.filter.map_or(&[][..], |filter| filter.blind_nm);
        let mut stretches: Vec<[f64; 2]> = self
            .blind_nm
            .iter()
            .chain(filter)
            .map(|[from, to]| [from.max(low), to.min(high)])
            .filter(|[from, to]| from < to)
            .collect();
        stretches.sort_by(|a, b| a[0].total_cmp(&b[0]));
        merge(stretches)
    }

    /// True if a feature at this wavelength (nm, air) lies in a blind stretch; ends belong to it.
    pub fn is_blind(&self, wavelength_nm: f64) -> bool {
        let stretches = self.blind_stretches();
        stretches
            .iter()
            .any(|[from, to]| (*from..=*to).contains(&wavelength_nm))
    }
}

/// The part of a range that a response lets through.
fn seen(range_nm: [f64; 2], response: &Response) -> [f64; 2] {
    match response {
        Response::Eye => {
            let [low, high] = response::EYE_RANGE_NM;
            [range_nm[0].max(low), range_nm[1].min(high)]
        }
        Response::Flat | Response::Curve(_) => range_nm,
    }
}

/// Joins ascending stretches that touch or overlap.
fn merge(stretches: Vec<[f64; 2]>) -> Vec<[f64; 2]> {
    let mut merged: Vec<[f64; 2]> = Vec::new();
    for [from, to] in stretches {
        match merged.last_mut() {
            Some(last) if from <= last[1] => last[1] = last[1].max(to),
            _ => merged.push([from, to]),
        }
    }
    merged
}

/// One thing that is wrong with a set-up.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SetupFault {
    /// File as named on the command line; absent for a flag or a combination of values.
    pub input: Option<String>,
    /// Line of the file.
    pub line: Option<usize>,
    /// Key as the file spells it (`instrument.range_nm`).
    pub key: Option<String>,
    /// What is wrong, what was expected and what to try; lower case, no full stop.
    pub message: String,
}

impl std::fmt::Display for SetupFault {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let place = [
            self.line.map(|line| format!("line {line}")),
            self.key.as_ref().map(|key| format!("key {key}")),
        ];
        let place = place.into_iter().flatten().collect::<Vec<_>>().join(", ");
        let input = self.input.as_deref().unwrap_or("set-up");
        match place.is_empty() {
            true => write!(f, "{input}: {}", self.message),
            false => write!(f, "{input}: {place}: {}", self.message),
        }
    }
}

/// A set-up that cannot be used, with everything that is wrong with it.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{}", faults.iter().map(SetupFault::to_string).collect::<Vec<_>>().join("\n"))]
pub struct SetupError {
    /// The faults, in order of lines; at least one.
    pub faults: Vec<SetupFault>,
}

#[cfg(test)]
mod tests;
