//! Flags over file over preset, checked as a whole.

use super::check::{check_together, check_values};
use super::file::SetupFile;
use super::presets::preset;
use super::{
    Candidates, Filter, InstrumentKind, Medium, NamedResponse, Response, Setup, SetupError,
    SetupFault,
};
use crate::library::SourceKind;
use std::path::PathBuf;

/// What a file or the flags say of a set-up; everything may be left unsaid.
///
/// Units and meanings are those of [`Setup`].
#[derive(Debug, Clone, Default, PartialEq)]
pub struct SetupOverrides {
    /// Kind of instrument.
    pub instrument: Option<InstrumentKind>,
    /// Observable range, nm.
    pub range_nm: Option<[f64; 2]>,
    /// Full width at half maximum, nm.
    pub resolution_nm: Option<f64>,
    /// Standard uncertainty of readings that state none, nm.
    pub uncertainty_nm: Option<f64>,
    /// Standard uncertainty of the common shift, nm.
    pub offset_nm: Option<f64>,
    /// Standard uncertainty of a common stretch, relative.
    pub scale_relative: Option<f64>,
    /// Dynamic range, decades.
    pub dynamic_range_dex: Option<f64>,
    /// Standard uncertainty of numeric strengths, decades.
    pub strength_uncertainty_dex: Option<f64>,
    /// Medium of wavelengths in the table.
    pub medium: Option<Medium>,
    /// Scale division read to, nm.
    pub division_nm: Option<f64>,
    /// Blind stretches, nm.
    pub blind_nm: Option<Vec<[f64; 2]>>,
    /// Filter by name; `none` takes away the filter of a file.
    pub filter: Option<String>,
    /// Dimmed stretches: (from nm, to nm, decades lost).
    pub dim_nm: Option<Vec<(f64, f64, f64)>>,
    /// No overlapping orders can appear.
    pub orders_filtered: Option<bool>,
    /// Smallest strength that would have been recorded.
    pub faintest: Option<f64>,
    /// The list was cut at this many readings.
    pub listed_at_most: Option<usize>,
    /// Response.
    pub response: Option<NamedResponse>,
    /// Kind of source.
    pub source: Option<SourceKind>,
    /// Traces to expect on any sample here.
    pub always: Option<Vec<String>>,
    /// Which substances are weighed.
    pub candidates: Option<Candidates>,
    /// Folder of a library of one's own.
    pub library: Option<PathBuf>,
}

impl SetupOverrides {
    /// What is said here, and what `below` says where this is silent.
    fn over(self, below: Self) -> Self {
        Self {
            instrument: self.instrument.or(below.instrument),
            range_nm: self.range_nm.or(below.range_nm),
            resolution_nm: self.resolution_nm.or(below.resolution_nm),
            uncertainty_nm: self.uncertainty_nm.or(below.uncertainty_nm),
            offset_nm: self.offset_nm.or(below.offset_nm),
            scale_relative: self.scale_relative.or(below.scale_relative),
            dynamic_range_dex: self.dynamic_range_dex.or(below.dynamic_range_dex),
            strength_uncertainty_dex: self
                .strength_uncertainty_dex
                .or(below.strength_uncertainty_dex),
            medium: self.medium.or(below.medium),
            division_nm: self.division_nm.or(below.division_nm),
            blind_nm: self.blind_nm.or(below.blind_nm),
            filter: self.filter.or(below.filter),
            dim_nm: self.dim_nm.or(below.dim_nm),
            orders_filtered: self.orders_filtered.or(below.orders_filtered),
            faintest: self.faintest.or(below.faintest),
            listed_at_most: self.listed_at_most.or(below.listed_at_most),
            response: self.response.or(below.response),
            source: self.source.or(below.source),
            always: self.always.or(below.always),
            candidates: self.candidates.or(below.candidates),
            library: self.library.or(below.library),
        }
    }
}

/// Resolves a set-up: flags over file over the preset of the kind of instrument.
///
/// Without a kind the instrument is a goniometer, without a source kind a flame.
///
/// # Errors
/// Every value of the flags that cannot be, and combinations that leave nothing to see.
/// Values of the file were checked when it was read.
pub fn resolve(file: Option<SetupFile>, flags: SetupOverrides) -> Result<Setup, SetupError> {
    let unplaced = |key: Option<&str>, message: String| SetupFault {
        input: None,
        line: None,
        key: key.map(str::to_owned),
        message,
    };
    let mut faults: Vec<SetupFault> = check_values(&flags)
        .into_iter()
        .map(|(key, message)| unplaced(Some(key), message))
        .collect();
    let said = flags.over(file.map(SetupFile::into_values).unwrap_or_default());
    let setup = with_defaults(said);
    if faults.is_empty() {
        faults.extend(
            check_together(&setup)
                .into_iter()
                .map(|message| unplaced(None, message)),
        );
    }
    match faults.is_empty() {
        true => Ok(setup),
        false => Err(SetupError { faults }),
    }
}

/// Fills what is unsaid from the preset of the kind of instrument.
fn with_defaults(said: SetupOverrides) -> Setup {
    let instrument = said.instrument.unwrap_or(InstrumentKind::Goniometer);
    let defaults = preset(instrument);
    let preset_response = || {
        let flat = || NamedResponse {
            name: "flat".to_owned(),
            response: Response::Flat,
        };
        NamedResponse::built_in(defaults.response).unwrap_or_else(flat)
    };
    Setup {
        instrument,
        range_nm: said.range_nm.unwrap_or(defaults.range_nm),
        resolution_nm: said.resolution_nm.unwrap_or(defaults.resolution_nm),
        uncertainty_nm: said.uncertainty_nm.unwrap_or(defaults.uncertainty_nm),
        offset_nm: said.offset_nm.unwrap_or(defaults.offset_nm),
        scale_relative: said.scale_relative.unwrap_or(defaults.scale_relative),
        dynamic_range_dex: said.dynamic_range_dex.unwrap_or(defaults.dynamic_range_dex),
        strength_uncertainty_dex: said
            .strength_uncertainty_dex
            .unwrap_or(defaults.strength_uncertainty_dex),
        medium: said.medium.unwrap_or(Medium::Air),
        division_nm: said.division_nm,
        blind_nm: said.blind_nm.unwrap_or_default(),
        filter: said.filter.as_deref().and_then(Filter::named),
        dim_nm: said.dim_nm.unwrap_or_default(),
        orders_filtered: said.orders_filtered.unwrap_or(defaults.orders_filtered),
        faintest: said.faintest,
        listed_at_most: said.listed_at_most,
        response: said.response.unwrap_or_else(preset_response),
        source: said.source.unwrap_or(SourceKind::Flame),
        always: said.always.unwrap_or_default(),
        candidates: said.candidates.unwrap_or(Candidates::Everything),
        library: said.library,
    }
}
