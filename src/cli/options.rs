//! Options that several commands share: the set-up and the library.

use super::Failure;
use crate::embedded;
use crate::library::{Library, SourceKind, extend_from, load_folder};
use crate::setup::{
    Candidates, InstrumentKind, Medium, NamedResponse, Setup, SetupOverrides, read_setup, resolve,
};
use clap::Args;
use std::io;
use std::path::{Path, PathBuf};

/// The set-up as typed; each flag goes before the set-up file.
#[derive(Debug, Args)]
#[command(next_help_heading = "Set-up")]
pub(super) struct SetupOptions {
    /// Set-up file (TOML)
    #[arg(long, value_name = "FILE")]
    setup: Option<PathBuf>,
    /// Kind of instrument: scale-spectroscope, goniometer, prism, camera or ccd
    #[arg(long, value_name = "KIND")]
    instrument: Option<InstrumentKind>,
    /// Kind of source: flame, discharge or absorption (dark lines against a continuum)
    #[arg(long, value_name = "KIND", value_parser = source)]
    source: Option<SourceKind>,
    /// What is weighed: everything, a list of the library, or names or symbols parted by commas
    #[arg(long, value_name = "LIST")]
    candidates: Option<String>,
    /// Traces to expect on any sample here, parted by commas
    #[arg(long, value_name = "NAMES", value_delimiter = ',')]
    always: Option<Vec<String>>,
    /// Observable range, nm
    #[arg(long, value_name = "FROM:TO", value_parser = stretch)]
    range: Option<[f64; 2]>,
    /// Full width at half maximum, nm
    #[arg(long, value_name = "NM")]
    resolution: Option<f64>,
    /// Standard uncertainty of readings that state none, nm
    #[arg(long, value_name = "NM")]
    uncertainty: Option<f64>,
    /// Standard uncertainty of a shift common to all readings, nm
    #[arg(long, value_name = "NM")]
    offset: Option<f64>,
    /// Standard uncertainty of a stretch common to all readings, relative
    #[arg(long, value_name = "RATIO")]
    scale: Option<f64>,
    /// Decades between the strongest feature and the weakest that would be noticed
    #[arg(long, value_name = "DECADES")]
    dynamic_range: Option<f64>,
    /// Medium the wavelengths are stated in: air or vacuum
    #[arg(long, value_name = "MEDIUM")]
    medium: Option<Medium>,
    /// Scale division read to, nm
    #[arg(long, value_name = "NM")]
    division: Option<f64>,
    /// Stretch where nothing can be seen, nm (may be repeated)
    #[arg(long, value_name = "FROM:TO", value_parser = stretch)]
    blind: Vec<[f64; 2]>,
    /// Filter in the beam by name (none takes away that of the file)
    #[arg(long, value_name = "NAME")]
    filter: Option<String>,
    /// Smallest strength that would have been recorded
    #[arg(long, value_name = "STRENGTH")]
    faintest: Option<f64>,
    /// The list was cut at this many readings
    #[arg(long, value_name = "N")]
    listed_at_most: Option<usize>,
    /// How wavelengths are weighed: eye, flat or a file
    #[arg(long, value_name = "CURVE")]
    response: Option<String>,
    /// Whether lines of other diffraction orders are kept out: true or false
    #[arg(long, value_name = "BOOL")]
    orders_filtered: Option<bool>,
}

impl SetupOptions {
    /// Whether flags name substances to weigh or to expect.
    pub fn names_substances(&self) -> bool {
        self.candidates.is_some() || self.always.is_some()
    }

    /// Flags over file over preset.
    pub fn resolve(&self, library: &LibraryOptions) -> Result<Setup, Failure> {
        let file = self.setup.as_deref().map(read_file).transpose()?;
        let response = self
            .response
            .as_deref()
            .map(|name| NamedResponse::read(name, Path::new("")));
        let response = response
            .transpose()
            .map_err(|error| Failure::Usage(format!("--response: {error}")))?;
        let flags = SetupOverrides {
            instrument: self.instrument,
            range_nm: self.range,
            resolution_nm: self.resolution,
            uncertainty_nm: self.uncertainty,
            offset_nm: self.offset,
            scale_relative: self.scale,
            dynamic_range_dex: self.dynamic_range,
            medium: self.medium,
            division_nm: self.division,
            blind_nm: Some(self.blind.clone()).filter(|blind| !blind.is_empty()),
            filter: self.filter.clone(),
            orders_filtered: self.orders_filtered,
            faintest: self.faintest,
            listed_at_most: self.listed_at_most,
            response,
            source: self.source,
            always: self.always.clone(),
            candidates: self.candidates.as_deref().map(Candidates::from_text),
            library: library.library.clone(),
            ..SetupOverrides::default()
        };
        Ok(resolve(file, flags)?)
    }
}

/// A set-up file that is not there is a missing input, not a faulty one.
fn read_file(path: &Path) -> Result<crate::setup::SetupFile, Failure> {
    std::fs::metadata(path)
        .and_then(|known| {
            if known.is_dir() {
                Err(io::ErrorKind::IsADirectory.into())
            } else {
                Ok(())
            }
        })
        .map_err(|source| Failure::Input {
            input: path.display().to_string(),
            source,
        })?;
    Ok(read_setup(path)?)
}

/// The library as typed.
#[derive(Debug, Args)]
#[command(next_help_heading = "Library")]
pub(super) struct LibraryOptions {
    /// Folder of tables laid over the library of the program
    #[arg(long, value_name = "DIR", conflicts_with = "library_only")]
    library: Option<PathBuf>,
    /// Folder of tables to use instead of the library of the program
    #[arg(long, value_name = "DIR")]
    library_only: Option<PathBuf>,
}

impl LibraryOptions {
    /// The library that the flags, or else the set-up file, ask for.
    pub fn load(&self, setup: &Setup) -> Result<Library, Failure> {
        if let Some(path) = &self.library_only {
            return Ok(load_folder(path)?);
        }
        let base = embedded::library()?;
        Ok(match setup.library() {
            Some(path) => extend_from(base, path)?,
            None => base,
        })
    }
}

impl LibraryOptions {
    /// The library that the flags ask for, where there is no set-up.
    pub fn load_for_reading(&self) -> Result<Library, Failure> {
        if let Some(path) = &self.library_only {
            return Ok(load_folder(path)?);
        }
        let base = embedded::library()?;
        Ok(match &self.library {
            Some(path) => extend_from(base, path)?,
            None => base,
        })
    }
}

fn source(text: &str) -> Result<SourceKind, String> {
    match text {
        "flame" => Ok(SourceKind::Flame),
        "discharge" => Ok(SourceKind::Discharge),
        "absorption" => Ok(SourceKind::Absorption),
        _ => Err("expected flame, discharge or absorption".to_owned()),
    }
}

/// `400:700`, nm.
fn stretch(text: &str) -> Result<[f64; 2], String> {
    let number = |part: &str| {
        part.trim()
            .parse::<f64>()
            .ok()
            .filter(|number| number.is_finite())
    };
    let ends = text
        .split_once(':')
        .and_then(|(from, to)| Some([number(from)?, number(to)?]));
    match ends {
        Some([from, to]) if from < to => Ok([from, to]),
        Some(_) => Err("the first end must be the smaller".to_owned()),
        None => Err("expected two wavelengths in nm, such as 400:700".to_owned()),
    }
}

#[cfg(test)]
mod tests {
    use super::stretch;

    #[test]
    fn stretches_have_two_ends_in_order() {
        assert_eq!(stretch("400:700"), Ok([400.0, 700.0]));
        assert_eq!(stretch(" 400.5 : 700 "), Ok([400.5, 700.0]));
        for wrong in [
            "", "400", "400:", "400-700", "700:400", "400:400", "nan:700", "400:inf", "1:2:3",
        ] {
            assert!(stretch(wrong).is_err(), "{wrong:?} was taken");
        }
    }
}
