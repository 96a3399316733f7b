//! One substance in full.

use super::view::{FeatureView, features, features_of, word};
use crate::library::{Library, SourceKind, Substance};
use crate::report::catalogue::Within;
use crate::setup::{InstrumentKind, SetupOverrides, resolve};
use serde::Serialize;
use std::collections::BTreeSet;

/// Features this far below the strongest of their kind of source, decades, are not on the page.
const LISTED_TO_DEX: f64 = -1.5;
/// So many lines are named for each instrument.
const TO_LOOK_FOR: usize = 4;
/// So many of the strongest features are held against the lines of other substances.
const COMPARED: usize = 8;
/// Lines of others this far below their own strongest, decades, are no near coincidence.
const RIVAL_TO_DEX: f64 = -1.5;

/// One substance in full.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct PageView {
    /// Stable identifier.
    pub substance: String,
    /// Name for people.
    pub name: String,
    /// Chemical symbol or short mark; may be empty.
    pub symbol: String,
    /// element, molecule, phosphor or lamp.
    pub kind: String,
    /// Other names people type.
    pub aliases: Vec<String>,
    /// Flame colour in plain words; empty if none.
    pub flame_colour: String,
    /// How commonly it is met, by kind of source.
    pub met: Vec<MetView>,
    /// Its emitters in each kind of source.
    pub emitters: Vec<EmitterView>,
    /// What to look for with each kind of instrument.
    pub look_for: Vec<LookForView>,
    /// Its stronger lines and bands in ascending wavelength.
    pub features: Vec<FeatureView>,
    /// Number of lines and bands in the library, weaker ones included.
    pub features_in_all: usize,
    /// Distance within which lines of others are named, nm.
    pub within_nm: f64,
    /// Lines of other substances beside the strongest of its own.
    pub near: Vec<NearView>,
    /// Cautions.
    pub cautions: Vec<String>,
    /// Why it counts as common or rare, and what to know of it.
    pub note: String,
    /// Sources of positions and strengths.
    pub sources: Vec<SourceView>,
}

/// How commonly a substance is met in a kind of source.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct MetView {
    /// flame, discharge or absorption.
    pub source: String,
    /// ubiquitous, background, usual, rare or never.
    pub class: String,
}

/// An emitter in one kind of source.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct EmitterView {
    /// `CaOH`.
    pub emitter: String,
    /// flame, discharge or absorption.
    pub source: String,
    /// Chance that the source lifts it above threshold at all.
    pub shows: f64,
    /// Strongest feature against the strongest of the substance, decades.
    pub level_dex: f64,
    /// Standard deviation of that from sample to sample, decades.
    pub level_spread_dex: f64,
    /// How far down its list is complete, decades.
    pub complete_to_dex: f64,
    /// Remark.
    pub remark: String,
}

/// What to look for with one kind of instrument in one kind of source.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LookForView {
    /// Kind of instrument.
    pub instrument: String,
    /// flame, discharge or absorption.
    pub source: String,
    /// Positions, the surest first, nm.
    pub wavelengths_nm: Vec<f64>,
    /// Emitters and colours, in the same order.
    pub what: Vec<String>,
}

/// A line of another substance beside one of this.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct NearView {
    /// Its own line, nm.
    pub wavelength_air_nm: f64,
    /// The other substance.
    pub substance: String,
    /// The other emitter.
    pub emitter: String,
    /// The other line, nm.
    pub other_nm: f64,
}

/// A source with its citation.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SourceView {
    /// Key in the tables.
    pub key: String,
    /// Citation with version.
    pub citation: String,
    /// published, computed, measured, memory or shaky.
    pub standing: String,
}

/// The page of a substance (an index); lines of others are named within a distance, nm.
pub fn substance_page(library: &Library, index: usize, within_nm: f64) -> Option<PageView> {
    let substance = library.substances.get(index)?;
    let all: Vec<FeatureView> = features_of(library, substance).collect();
    let mut strong: Vec<FeatureView> = all.iter().filter(|f| is_strong(f, &all)).cloned().collect();
    strong.sort_by(|a, b| a.wavelength_air_nm.total_cmp(&b.wavelength_air_nm));
    Some(PageView {
        substance: substance.id.clone(),
        name: substance.name.clone(),
        symbol: substance.symbol.clone(),
        kind: word(&substance.kind),
        aliases: substance.aliases.clone(),
        flame_colour: substance.flame_colour.clone(),
        met: SourceKind::ALL
            .map(|source| MetView {
                source: word(&source),
                class: word(&substance.prior[source.index()]),
            })
            .to_vec(),
        emitters: emitters(substance),
        look_for: look_for(&all),
        near: near(library, index, &all, within_nm),
        within_nm,
        features_in_all: all.len(),
        features: strong,
        cautions: substance
            .cautions
            .iter()
            .filter_map(|key| library.caution(key))
            .map(str::to_owned)
            .collect(),
        note: substance.note.clone(),
        sources: sources(library, substance),
    })
}

/// The strongest strength in a kind of source.
fn top(all: &[FeatureView], source: SourceKind) -> Option<f64> {
    all.iter()
        .filter_map(|f| f.strength_dex(source))
        .max_by(f64::total_cmp)
}

fn is_strong(feature: &FeatureView, all: &[FeatureView]) -> bool {
    SourceKind::ALL.into_iter().any(|source| {
        match (feature.strength_dex(source), top(all, source)) {
            (Some(own), Some(top)) => own - top >= LISTED_TO_DEX,
            _ => false,
        }
    })
}

fn emitters(substance: &Substance) -> Vec<EmitterView> {
    let of_source = |source: SourceKind| {
        substance.emitters.iter().filter_map(move |emitter| {
            let excitation = emitter.excitation[source.index()].as_ref()?;
            Some(EmitterView {
                emitter: emitter.name.clone(),
                source: word(&source),
                shows: excitation.shows,
                level_dex: excitation.level_dex,
                level_spread_dex: excitation.level_spread_dex,
                complete_to_dex: excitation.complete_to_dex,
                remark: excitation.remark.clone(),
            })
        })
    };
    SourceKind::ALL.into_iter().flat_map(of_source).collect()
}

/// The surest features for every kind of instrument, in its range and with its response.
fn look_for(all: &[FeatureView]) -> Vec<LookForView> {
    let mut rows = Vec::new();
    for source in SourceKind::ALL {
        if top(all, source).is_none() {
            continue;
        }
        for instrument in InstrumentKind::ALL {
            let flags = SetupOverrides {
                instrument: Some(instrument),
                source: Some(source),
                ..SetupOverrides::default()
            };
            let Ok(setup) = resolve(None, flags) else {
                continue;
            };
            let [low, high] = setup.range_nm();
            let mut seen: Vec<(f64, &FeatureView)> = all
                .iter()
                .filter(|f| (low..=high).contains(&f.wavelength_air_nm))
                .filter_map(|f| {
                    let strength = f.strength_dex(source)?;
                    Some((strength + setup.response_dex(f.wavelength_air_nm), f))
                })
                .collect();
            seen.sort_by(|a, b| b.0.total_cmp(&a.0));
            seen.truncate(TO_LOOK_FOR);
            rows.push(LookForView {
                instrument: word(&instrument),
                source: word(&source),
                wavelengths_nm: seen.iter().map(|(_, f)| f.wavelength_air_nm).collect(),
                what: seen
                    .iter()
                    .map(|(_, f)| format!("{}, {}", f.emitter, f.colour))
                    .collect(),
            });
        }
    }
    rows
}

/// Stronger lines of other substances beside the strongest of this one.
fn near(library: &Library, index: usize, all: &[FeatureView], within_nm: f64) -> Vec<NearView> {
    let mut strongest: Vec<&FeatureView> = all.iter().collect();
    strongest.sort_by(|a, b| {
        let (x, y) = (a.strongest_dex(), b.strongest_dex());
        y.partial_cmp(&x).unwrap_or(std::cmp::Ordering::Equal)
    });
    strongest.truncate(COMPARED);
    strongest.sort_by(|a, b| a.wavelength_air_nm.total_cmp(&b.wavelength_air_nm));
    let others: Vec<usize> = (0..library.substances.len())
        .filter(|i| *i != index)
        .collect();
    strongest
        .into_iter()
        .flat_map(|own| {
            let within = Within {
                near_nm: own.wavelength_air_nm,
                within_nm,
            };
            let mut named = BTreeSet::new();
            features(library, &others, Some(within))
                .into_iter()
                .filter(|f| f.strongest_dex().is_some_and(|dex| dex >= RIVAL_TO_DEX))
                .filter(move |f| named.insert(f.emitter.clone()))
                .map(|f| NearView {
                    wavelength_air_nm: own.wavelength_air_nm,
                    substance: f.substance,
                    emitter: f.emitter,
                    other_nm: f.wavelength_air_nm,
                })
        })
        .collect()
}

fn sources(library: &Library, substance: &Substance) -> Vec<SourceView> {
    let used: BTreeSet<usize> = substance
        .emitters
        .iter()
        .flat_map(|emitter| {
            let excitations = emitter.excitation.iter().flatten().flat_map(|e| &e.source);
            let features = emitter
                .features
                .iter()
                .flat_map(|f| f.source_position.iter().chain(&f.source_strength));
            excitations.chain(features).copied().collect::<Vec<_>>()
        })
        .collect();
    used.into_iter()
        .filter_map(|index| library.sources.get(index))
        .map(|source| SourceView {
            key: source.key.clone(),
            citation: match source.version.as_str() {
                "" | "-" => source.citation.clone(),
                version => format!("{} ({version})", source.citation),
            },
            standing: word(&source.standing),
        })
        .collect()
}
