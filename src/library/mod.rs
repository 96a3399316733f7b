//! What is known: substances, their emitters, lines and band heads, each with
//! its source. Loading checks everything; a loaded library is consistent.

mod assemble;
mod compute;
mod draft;
mod layout;
mod load;
mod names;
mod priors;
mod table;

pub use compute::{Computation, Difference, compute};
pub use load::{
    LibraryError, LibraryFault, Tables, extend_from, extend_with, load_folder, read_tables,
};
pub use names::NameError;
pub use priors::Selection;

use crate::reduction::air::AirWavelength;
use serde::{Deserialize, Serialize};

/// The kind of light source a sample is read in.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum SourceKind {
    /// A flame or an open arc with a salt in it.
    Flame,
    /// A gas discharge: spectrum tubes and lamps.
    Discharge,
    /// Dark lines against a continuum.
    Absorption,
}

impl SourceKind {
    /// All kinds, in the order of the library's columns.
    pub const ALL: [SourceKind; 3] = [Self::Flame, Self::Discharge, Self::Absorption];

    /// Index into the per-kind arrays of this module.
    pub fn index(self) -> usize {
        self as usize
    }
}

/// How commonly a substance is met in one kind of source.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum PriorClass {
    /// On nearly every sample (sodium in flames).
    Ubiquitous,
    /// Comes with the source or the room, not with the sample.
    Background,
    /// Commonly met.
    Usual,
    /// Seldom met.
    Rare,
    /// Not a candidate unless listed by name.
    Never,
}

/// What a substance is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum SubstanceKind {
    /// A chemical element.
    Element,
    /// A molecule or radical.
    Molecule,
    /// A lamp phosphor.
    Phosphor,
    /// A lamp or light that counts as one emitter.
    Lamp,
}

/// What an emitter is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum EmitterKind {
    /// A neutral atom.
    Atom,
    /// An atomic ion.
    Ion,
    /// A molecule or molecular ion.
    Molecule,
    /// A phosphor or a lamp seen as one.
    Phosphor,
}

/// The form of a feature.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Form {
    /// A spectral line.
    Line,
    /// The sharp edge of a band.
    BandHead,
    /// The maximum of a diffuse band.
    BandMax,
}

/// How far a source can be trusted.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Standing {
    /// A published value.
    Published,
    /// Computed by us from published values.
    Computed,
    /// Measured by us.
    Measured,
    /// Recalled, not looked up.
    Memory,
    /// Must not decide anything.
    Shaky,
}

/// A source of values.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Source {
    /// Key used in the tables.
    pub key: String,
    /// Citation.
    pub citation: String,
    /// Version or date.
    pub version: String,
    /// Licence of the carrier.
    pub licence: String,
    /// How far it can be trusted.
    pub standing: Standing,
}

/// A line or a band feature.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Feature {
    /// Line, band head or band maximum.
    pub form: Form,
    /// Position in standard air.
    pub wavelength: AirWavelength,
    /// Standard uncertainty of the position, nm.
    pub uncertainty_nm: f64,
    /// The side a band shades to (`red`, `violet`, `headless`), if known.
    pub degrades: Option<String>,
    /// Full width, nm, if known.
    pub width_nm: Option<f64>,
    /// Strength per kind of source, decades relative to the strongest feature of the same emitter
    /// (the strongest has 0); absent if the feature does not show in that kind of source.
    pub strength_dex: [Option<f64>; 3],
    /// Scatter of real strengths about the stated one, decades.
    pub scatter_dex: f64,
    /// Marked persistent: among the last to vanish on dilution.
    pub persistent: bool,
    /// Transition probability, s⁻¹, if known.
    pub transition_rate_per_s: Option<f64>,
    /// Statistical weight of the upper level, if known.
    pub upper_weight: Option<f64>,
    /// Lower level, cm⁻¹, if known.
    pub lower_level_per_cm: Option<f64>,
    /// Upper level, cm⁻¹, if known.
    pub upper_level_per_cm: Option<f64>,
    /// Indices into [`Library::sources`] for the position.
    pub source_position: Vec<usize>,
    /// Indices into [`Library::sources`] for the strengths: values first, then the rules that
    /// made strengths of them.
    pub source_strength: Vec<usize>,
    /// Remarks.
    pub note: String,
    /// Row in its table (line of the file).
    pub row: usize,
}

/// An emitter in one kind of source.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Excitation {
    /// Chance that this kind of source lifts the emitter above threshold at all.
    pub shows: f64,
    /// Strength of its strongest feature relative to the strongest emitter of the substance, decades.
    pub level_dex: f64,
    /// Standard deviation of that level from one sample to another, decades.
    pub level_spread_dex: f64,
    /// How far below its strongest feature the list of features is complete, decades (negative).
    pub complete_to_dex: f64,
    /// Remark for the reader.
    pub remark: String,
    /// Indices into [`Library::sources`] for the chance and the level.
    pub source: Vec<usize>,
}

/// An emitter (`Ca I`, `CaOH`) with its features.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Emitter {
    /// Name as spectroscopists write it.
    pub name: String,
    /// What it is.
    pub kind: EmitterKind,
    /// How it behaves per kind of source; absent if it is not met there.
    pub excitation: [Option<Excitation>; 3],
    /// Features in ascending wavelength.
    pub features: Vec<Feature>,
}

/// Something a report may name.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Substance {
    /// Stable identifier, a lower-case English name.
    pub id: String,
    /// Name for reports.
    pub name: String,
    /// Chemical symbol or short mark.
    pub symbol: String,
    /// What it is.
    pub kind: SubstanceKind,
    /// Other names people type.
    pub aliases: Vec<String>,
    /// Prior class per kind of source.
    pub prior: [PriorClass; 3],
    /// Flame colour in plain words; empty if none.
    pub flame_colour: String,
    /// Keys into [`Library::cautions`].
    pub cautions: Vec<String>,
    /// Why the prior classes are what they are.
    pub note: String,
    /// Emitters in order of the tables.
    pub emitters: Vec<Emitter>,
}

/// A name for a finding made of several substances.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Composed {
    /// Name for reports.
    pub name: String,
    /// Substance ids.
    pub parts: Vec<String>,
    /// Where it is met.
    pub where_met: String,
}

/// A loaded, consistent reference library.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Library {
    /// Substances, sorted by id.
    pub substances: Vec<Substance>,
    /// Composed names.
    pub composed: Vec<Composed>,
    /// Named candidate lists, sorted by name: (list, substance ids).
    pub lists: Vec<(String, Vec<String>)>,
    /// Cautions: (key, text), sorted by key.
    pub cautions: Vec<(String, String)>,
    /// Sources, sorted by key.
    pub sources: Vec<Source>,
    /// SHA-256 over all tables in order of file name, lower-case hex.
    pub sha256: String,
}
