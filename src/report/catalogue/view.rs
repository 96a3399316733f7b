//! Plain views of library rows.

use crate::library::{Emitter, Feature, Form, Library, SourceKind, Substance};
use serde::Serialize;

/// A substance in a list.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ListedView {
    /// Stable identifier.
    pub substance: String,
    /// Name for people.
    pub name: String,
    /// Chemical symbol or short mark; may be empty.
    pub symbol: String,
    /// element, molecule, phosphor or lamp.
    pub kind: String,
    /// Emitters by name.
    pub emitters: Vec<String>,
    /// Number of lines and band features.
    pub features: usize,
    /// Prior class in flame, discharge and absorption.
    pub prior: [String; 3],
}

/// A line or band feature.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct FeatureView {
    /// `Sr I`.
    pub emitter: String,
    /// Identifier of its substance.
    pub substance: String,
    /// line, band_head or band_max.
    pub form: &'static str,
    /// Position in standard air, nm.
    pub wavelength_air_nm: f64,
    /// Standard uncertainty of the position, nm.
    pub uncertainty_nm: f64,
    /// Colour word.
    pub colour: &'static str,
    /// Strength in a flame, decades against the strongest of the substance; absent if it does not
    /// show there.
    pub strength_flame_dex: Option<f64>,
    /// The same in a discharge.
    pub strength_discharge_dex: Option<f64>,
    /// The same as a dark line.
    pub strength_absorption_dex: Option<f64>,
    /// Keys of the sources of the position.
    pub source: Vec<String>,
    /// Remark of the row.
    pub note: String,
}

impl FeatureView {
    /// Strength in one kind of source.
    pub fn strength_dex(&self, source: SourceKind) -> Option<f64> {
        match source {
            SourceKind::Flame => self.strength_flame_dex,
            SourceKind::Discharge => self.strength_discharge_dex,
            SourceKind::Absorption => self.strength_absorption_dex,
        }
    }

    /// The strongest of its strengths.
    pub fn strongest_dex(&self) -> Option<f64> {
        SourceKind::ALL
            .into_iter()
            .filter_map(|source| self.strength_dex(source))
            .max_by(f64::total_cmp)
    }
}

/// A stretch of wavelengths about a position.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Within {
    /// Middle, nm, air.
    pub near_nm: f64,
    /// Largest distance, nm.
    pub within_nm: f64,
}

/// All substances, sorted by name.
pub fn listed(library: &Library) -> Vec<ListedView> {
    let mut rows: Vec<ListedView> = library.substances.iter().map(listed_view).collect();
    rows.sort_by(|a, b| a.name.cmp(&b.name));
    rows
}

fn listed_view(substance: &Substance) -> ListedView {
    ListedView {
        substance: substance.id.clone(),
        name: substance.name.clone(),
        symbol: substance.symbol.clone(),
        kind: word(&substance.kind),
        emitters: substance.emitters.iter().map(|e| e.name.clone()).collect(),
        features: substance.emitters.iter().map(|e| e.features.len()).sum(),
        prior: substance.prior.map(|class| word(&class)),
    }
}

/// The word of an enumeration as the tables write it.
pub(super) fn word<T: Serialize>(value: &T) -> String {
    serde_json::to_value(value)
        .ok()
        .and_then(|value| value.as_str().map(str::to_owned))
        .unwrap_or_default()
}

/// Features of the given substances (indices; all if empty), in ascending wavelength; with a
/// stretch only those in it, nearest first.
pub fn features(library: &Library, chosen: &[usize], within: Option<Within>) -> Vec<FeatureView> {
    let mut rows: Vec<FeatureView> = library
        .substances
        .iter()
        .enumerate()
        .filter(|(index, _)| chosen.is_empty() || chosen.contains(index))
        .flat_map(|(_, substance)| features_of(library, substance))
        .filter(|row| {
            within.is_none_or(|w| (row.wavelength_air_nm - w.near_nm).abs() <= w.within_nm)
        })
        .collect();
    let distance = |row: &FeatureView| {
        within.map_or(row.wavelength_air_nm, |w| {
            (row.wavelength_air_nm - w.near_nm).abs()
        })
    };
    rows.sort_by(|a, b| {
        distance(a)
            .total_cmp(&distance(b))
            .then_with(|| a.substance.cmp(&b.substance))
            .then_with(|| a.emitter.cmp(&b.emitter))
    });
    rows
}

/// Features of one substance, emitter after emitter.
pub(super) fn features_of<'l>(
    library: &'l Library,
    substance: &'l Substance,
) -> impl Iterator<Item = FeatureView> + 'l {
    substance.emitters.iter().flat_map(move |emitter| {
        emitter
            .features
            .iter()
            .map(move |feature| feature_view(library, substance, emitter, feature))
    })
}

fn feature_view(
    library: &Library,
    substance: &Substance,
    emitter: &Emitter,
    feature: &Feature,
) -> FeatureView {
    let strength = |source: SourceKind| {
        let excitation = emitter.excitation[source.index()].as_ref()?;
        let own = feature.strength_dex[source.index()]?;
        Some(rounded(own + excitation.level_dex))
    };
    let nm = feature.wavelength.nm();
    FeatureView {
        emitter: emitter.name.clone(),
        substance: substance.id.clone(),
        form: match feature.form {
            Form::Line => "line",
            Form::BandHead => "band_head",
            Form::BandMax => "band_max",
        },
        wavelength_air_nm: nm,
        uncertainty_nm: feature.uncertainty_nm,
        colour: super::colour_word(nm),
        strength_flame_dex: strength(SourceKind::Flame),
        strength_discharge_dex: strength(SourceKind::Discharge),
        strength_absorption_dex: strength(SourceKind::Absorption),
        source: feature
            .source_position
            .iter()
            .filter_map(|index| library.sources.get(*index))
            .map(|source| source.key.clone())
            .collect(),
        note: feature.note.clone(),
    }
}

/// Strengths are known to a hundredth of a decade at best.
fn rounded(dex: f64) -> f64 {
    (dex * 100.0).round() / 100.0
}
