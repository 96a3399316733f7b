//! The rows of each table as they are read, and what can be said against a single row.

use super::load::LibraryFault;
use super::table::{Bounds, Cell, Column, Row, TableFile, needed, optional, read};
use super::{
    Composed, Emitter, EmitterKind, Excitation, Feature, Form, PriorClass, Source, SourceKind,
    Standing, Substance, SubstanceKind,
};
use crate::reduction::air::AirWavelength;
use std::collections::HashMap;

const SUBSTANCE_KINDS: [(&str, SubstanceKind); 4] = [
    ("element", SubstanceKind::Element),
    ("molecule", SubstanceKind::Molecule),
    ("phosphor", SubstanceKind::Phosphor),
    ("lamp", SubstanceKind::Lamp),
];
const PRIOR_CLASSES: [(&str, PriorClass); 5] = [
    ("ubiquitous", PriorClass::Ubiquitous),
    ("background", PriorClass::Background),
    ("usual", PriorClass::Usual),
    ("rare", PriorClass::Rare),
    ("never", PriorClass::Never),
];
const SOURCE_KINDS: [(&str, SourceKind); 3] = [
    ("flame", SourceKind::Flame),
    ("discharge", SourceKind::Discharge),
    ("absorption", SourceKind::Absorption),
];
const EMITTER_KINDS: [(&str, EmitterKind); 4] = [
    ("atom", EmitterKind::Atom),
    ("ion", EmitterKind::Ion),
    ("molecule", EmitterKind::Molecule),
    ("phosphor", EmitterKind::Phosphor),
];
const FORMS: [(&str, Form); 3] = [
    ("line", Form::Line),
    ("band_head", Form::BandHead),
    ("band_max", Form::BandMax),
];
const STANDINGS: [(&str, Standing); 5] = [
    ("published", Standing::Published),
    ("computed", Standing::Computed),
    ("measured", Standing::Measured),
    ("memory", Standing::Memory),
    ("shaky", Standing::Shaky),
];
const DEGRADES: [(&str, Option<&str>); 4] = [
    ("", None),
    ("red", Some("red")),
    ("violet", Some("violet")),
    ("headless", Some("headless")),
];
const PERSISTENT: [(&str, bool); 2] = [("", false), ("yes", true)];

const WAVELENGTH_NM: Bounds = Bounds::between(240.0, 1100.0);
const UNCERTAINTY_NM: Bounds = Bounds::above(0.0, 20.0);
const WIDTH_NM: Bounds = Bounds::above(0.0, 500.0);
const STRENGTH_DEX: Bounds = Bounds::between(-100.0, 100.0);
const SCATTER_DEX: Bounds = Bounds::between(0.0, 5.0);
const SHOWS: Bounds = Bounds::between(0.0, 1.0);
const LEVEL_DEX: Bounds = Bounds::between(-20.0, 0.0);
const LEVEL_SPREAD_DEX: Bounds = Bounds::between(0.0, 5.0);
const COMPLETE_TO_DEX: Bounds = Bounds::between(-20.0, 0.0);
const POSITIVE: Bounds = Bounds::above(0.0, f64::INFINITY);
const ENERGY_PER_CM: Bounds = Bounds::between(0.0, 1.0e6);

const SOURCES: [Column; 5] = [
    needed("key"),
    needed("citation"),
    optional("version"),
    optional("licence"),
    needed("standing"),
];
const CAUTIONS: [Column; 2] = [needed("key"), needed("text")];
const SUBSTANCES: [Column; 11] = [
    needed("id"),
    needed("name"),
    needed("symbol"),
    needed("kind"),
    optional("aliases"),
    needed("prior_flame"),
    needed("prior_discharge"),
    needed("prior_absorption"),
    optional("flame_colour"),
    optional("cautions"),
    optional("note"),
];
const EMITTERS: [Column; 10] = [
    needed("emitter"),
    needed("substance"),
    needed("source_kind"),
    needed("kind"),
    needed("shows"),
    needed("level_dex"),
    needed("level_spread_dex"),
    needed("complete_to_dex"),
    optional("remark"),
    needed("source"),
];
const FEATURES: [Column; 18] = [
    needed("emitter"),
    needed("form"),
    needed("wavelength_air_nm"),
    needed("uncertainty_nm"),
    optional("degrades"),
    optional("width_nm"),
    optional("strength_flame_dex"),
    optional("strength_discharge_dex"),
    optional("strength_absorption_dex"),
    needed("scatter_dex"),
    optional("persistent"),
    optional("transition_rate_per_s"),
    optional("upper_weight"),
    optional("lower_level_cm-1"),
    optional("upper_level_cm-1"),
    needed("source_position"),
    needed("source_strength"),
    optional("note"),
];
const COMPOSED: [Column; 3] = [needed("name"), needed("parts"), optional("where_met")];
const LISTS: [Column; 2] = [needed("list"), needed("substance")];

/// A row that became something, with the line it stands on.
pub(super) struct Placed<T> {
    pub(super) line: usize,
    pub(super) value: T,
}

/// An emitter with the lines of its rows in `emitters.csv`.
pub(super) struct DraftEmitter {
    pub(super) emitter: Emitter,
    pub(super) lines: [Option<usize>; 3],
}

/// A substance whose emitters are still being collected.
pub(super) struct DraftSubstance {
    pub(super) line: usize,
    pub(super) substance: Substance,
    pub(super) emitters: Vec<DraftEmitter>,
}

/// Keys of what may be referred to, with the index each stands for.
pub(super) type Keys = HashMap<String, usize>;

type Faults = Vec<LibraryFault>;

/// Notes a key that stands twice; true if it is new.
fn first_of_its_kind<K: std::hash::Hash + Eq>(
    row: &mut Row<'_>,
    cell: Cell<'_>,
    seen: &mut HashMap<K, usize>,
    key: K,
) -> bool {
    if let Some(line) = seen.get(&key) {
        row.fault(cell, format!("stands already in row {line}"));
        return false;
    }
    seen.insert(key, row.line);
    true
}

pub(super) fn sources(table: &TableFile<'_>, faults: &mut Faults) -> Vec<Placed<Source>> {
    let (mut rows, mut seen) = (Vec::new(), HashMap::new());
    read(
        table,
        &SOURCES,
        faults,
        |[key, citation, version, licence, standing], row| {
            let source = Source {
                key: row.filled(key).to_owned(),
                citation: row.filled(citation).to_owned(),
                version: version.text.to_owned(),
                licence: licence.text.to_owned(),
                standing: row.word(standing, &STANDINGS),
            };
            if first_of_its_kind(row, key, &mut seen, source.key.clone()) {
                rows.push(Placed {
                    line: row.line,
                    value: source,
                });
            }
        },
    );
    rows
}

pub(super) fn cautions(table: &TableFile<'_>, faults: &mut Faults) -> Vec<(String, String)> {
    let (mut rows, mut seen) = (Vec::new(), HashMap::new());
    read(table, &CAUTIONS, faults, |[key, text], row| {
        let caution = (row.filled(key).to_owned(), row.filled(text).to_owned());
        if first_of_its_kind(row, key, &mut seen, caution.0.clone()) {
            rows.push(caution);
        }
    });
    rows
}

pub(super) fn substances(
    table: &TableFile<'_>,
    cautions: &[(String, String)],
    faults: &mut Faults,
) -> Vec<DraftSubstance> {
    let (mut rows, mut seen) = (Vec::new(), HashMap::new());
    read(table, &SUBSTANCES, faults, |cells, row| {
        let [
            id,
            name,
            symbol,
            kind,
            aliases,
            flame,
            discharge,
            absorption,
            colour,
            warn,
            note,
        ] = cells;
        let kind = row.word(kind, &SUBSTANCE_KINDS);
        let well_formed = |c: char| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '-';
        if !row.filled(id).chars().all(well_formed) {
            row.fault(
                id,
                "is not a lower-case name (use a to z, digits and hyphens)",
            );
        }
        if kind != SubstanceKind::Lamp {
            row.filled(symbol);
        }
        let warnings = row.several(warn);
        for key in &warnings {
            if !cautions.iter().any(|(known, _)| known == key) {
                let known = cautions.iter().map(|(known, _)| known.as_str());
                row.unresolved(warn, key, "a key of cautions.csv", known);
            }
        }
        let substance = Substance {
            id: id.text.to_owned(),
            name: row.filled(name).to_owned(),
            symbol: symbol.text.to_owned(),
            kind,
            aliases: owned(row.several(aliases)),
            prior: [flame, discharge, absorption].map(|cell| row.word(cell, &PRIOR_CLASSES)),
            flame_colour: colour.text.to_owned(),
            cautions: owned(warnings),
            note: note.text.to_owned(),
            emitters: Vec::new(),
        };
        if first_of_its_kind(row, id, &mut seen, substance.id.clone()) {
            rows.push(DraftSubstance {
                line: row.line,
                substance,
                emitters: Vec::new(),
            });
        }
    });
    rows
}

fn owned(texts: Vec<&str>) -> Vec<String> {
    texts.into_iter().map(str::to_owned).collect()
}

/// Reads `emitters.csv` into the substances it names.
pub(super) fn emitters(
    table: &TableFile<'_>,
    sources: &Keys,
    substances: &mut [DraftSubstance],
    faults: &mut Faults,
) {
    let ids: Keys = (substances.iter().enumerate())
        .map(|(index, draft)| (draft.substance.id.clone(), index))
        .collect();
    let mut homes: HashMap<String, (usize, usize)> = HashMap::new();
    read(table, &EMITTERS, faults, |cells, row| {
        let [
            name,
            home,
            source_kind,
            kind,
            shows,
            level,
            spread,
            complete,
            remark,
            source,
        ] = cells;
        let at = row.word(source_kind, &SOURCE_KINDS).index();
        let excitation = Excitation {
            shows: row.number(shows, SHOWS),
            level_dex: row.number(level, LEVEL_DEX),
            level_spread_dex: row.number(spread, LEVEL_SPREAD_DEX),
            complete_to_dex: row.number(complete, COMPLETE_TO_DEX),
            remark: remark.text.to_owned(),
            source: resolve(row, source, sources, "a key of sources.csv"),
        };
        let kind_word = kind;
        let kind = row.word(kind, &EMITTER_KINDS);
        let Some(&index) = ids.get(home.text) else {
            row.unresolved(
                home,
                home.text,
                "a substance of the substances.csv beside this table",
                ids.keys().map(String::as_str),
            );
            return;
        };
        let emitters = &mut substances[index].emitters;
        let (owner, place) =
            *(homes.entry(row.filled(name).to_owned())).or_insert((index, emitters.len()));
        if owner != index {
            row.fault(
                name,
                "belongs to another substance already (one emitter, one substance)",
            );
            return;
        }
        if place == emitters.len() {
            emitters.push(DraftEmitter {
                emitter: Emitter {
                    name: name.text.to_owned(),
                    kind,
                    excitation: [None, None, None],
                    features: Vec::new(),
                },
                lines: [None; 3],
            });
        }
        if !SOURCE_KINDS
            .iter()
            .any(|(word, _)| *word == source_kind.text)
        {
            return;
        }
        let draft = &mut emitters[place];
        if draft.emitter.kind != kind {
            row.fault(
                kind_word,
                "differs from the kind in an earlier row of this emitter",
            );
        }
        match draft.lines[at] {
            Some(line) => row.fault(
                source_kind,
                format!("stands for {} already in row {line}", name.text),
            ),
            None => {
                draft.lines[at] = Some(row.line);
                draft.emitter.excitation[at] = Some(excitation);
            }
        }
    });
}

/// The indices of the keys in a cell that names one or more.
fn resolve(row: &mut Row<'_>, cell: Cell<'_>, keys: &Keys, what: &str) -> Vec<usize> {
    if let Some(index) = keys.get(cell.text) {
        return vec![*index];
    }
    if row.filled(cell).is_empty() {
        return Vec::new();
    }
    let mut indices = Vec::new();
    for key in row.several(cell) {
        match keys.get(key) {
            Some(index) => indices.push(*index),
            None => row.unresolved(cell, key, what, keys.keys().map(String::as_str)),
        }
    }
    indices
}

/// Reads `features/<substance>.csv` into the emitters of that substance.
pub(super) fn features(
    table: &TableFile<'_>,
    sources: &Keys,
    draft: &mut DraftSubstance,
    faults: &mut Faults,
) {
    let mut previous_nm = WAVELENGTH_NM.low;
    let known = format!("an emitter of {} in emitters.csv", draft.substance.id);
    read(table, &FEATURES, faults, |cells, row| {
        let [emitter, form, wavelength, ..] = cells;
        // A wavelength that is no number says nothing of the order.
        let nm = (row.sound_number(wavelength, WAVELENGTH_NM)).unwrap_or(previous_nm);
        if nm < previous_nm {
            row.fault(
                wavelength,
                format!("comes after {previous_nm} (sort by wavelength)"),
            );
        }
        previous_nm = nm;
        let feature = feature(cells, nm, sources, row);
        let home = (draft.emitters.iter_mut()).find(|e| e.emitter.name == emitter.text);
        let Some(home) = home else {
            let names = draft.emitters.iter().map(|e| e.emitter.name.as_str());
            row.unresolved(emitter, emitter.text, &known, names);
            return;
        };
        let Some(feature) = feature else { return };
        let twin = (home.emitter.features.iter().rev())
            .take_while(|f| f.wavelength.nm() == nm)
            .find(|f| f.form == feature.form);
        match twin {
            Some(twin) => row.fault(
                form,
                format!("stands at this wavelength already in row {}", twin.row),
            ),
            None => home.emitter.features.push(feature),
        }
    });
}

fn feature(
    cells: [Cell<'_>; FEATURES.len()],
    nm: f64,
    sources: &Keys,
    row: &mut Row<'_>,
) -> Option<Feature> {
    let [
        _,
        form,
        wavelength,
        uncertainty,
        degrades,
        width,
        flame,
        discharge,
        absorption,
        scatter,
        persistent,
        rate,
        weight,
        lower,
        upper,
        from,
        strength_from,
        note,
    ] = cells;
    let strength_dex =
        [flame, discharge, absorption].map(|cell| row.number_if_any(cell, STRENGTH_DEX));
    if strength_dex == [None; 3] {
        row.fault(
            flame,
            "is empty, as are the others (a feature has a strength in some kind of source)",
        );
    }
    let lower_level_per_cm = row.number_if_any(lower, ENERGY_PER_CM);
    let upper_level_per_cm = row.number_if_any(upper, ENERGY_PER_CM);
    if let (Some(low), Some(high)) = (lower_level_per_cm, upper_level_per_cm)
        && low >= high
    {
        row.fault(upper, format!("is not above the lower level {low}"));
    }
    let Some(wavelength) = AirWavelength::new(nm) else {
        row.fault(wavelength, "is not a wavelength in air");
        return None;
    };
    Some(Feature {
        form: row.word(form, &FORMS),
        wavelength,
        uncertainty_nm: row.number(uncertainty, UNCERTAINTY_NM),
        degrades: row.word(degrades, &DEGRADES).map(str::to_owned),
        width_nm: row.number_if_any(width, WIDTH_NM),
        strength_dex,
        scatter_dex: row.number(scatter, SCATTER_DEX),
        persistent: row.word(persistent, &PERSISTENT),
        transition_rate_per_s: row.number_if_any(rate, POSITIVE),
        upper_weight: row.number_if_any(weight, POSITIVE),
        lower_level_per_cm,
        upper_level_per_cm,
        source_position: resolve(row, from, sources, "a key of sources.csv"),
        source_strength: resolve(row, strength_from, sources, "a key of sources.csv"),
        note: note.text.to_owned(),
        row: row.line,
    })
}

/// Reads `composed.csv`; parts must be among the substance ids.
pub(super) fn composed(table: &TableFile<'_>, ids: &Keys, faults: &mut Faults) -> Vec<Composed> {
    let (mut rows, mut seen) = (Vec::new(), HashMap::new());
    read(table, &COMPOSED, faults, |[name, parts, where_met], row| {
        row.filled(parts);
        let keys = row.several(parts);
        for (k, part) in keys.iter().enumerate() {
            if !ids.contains_key(*part) {
                row.unresolved(parts, part, "a substance", ids.keys().map(String::as_str));
            }
            if keys.get(..k).is_some_and(|before| before.contains(part)) {
                row.fault(parts, format!("names {part:?} twice"));
            }
        }
        let value = Composed {
            name: row.filled(name).to_owned(),
            parts: owned(keys),
            where_met: where_met.text.to_owned(),
        };
        if first_of_its_kind(row, name, &mut seen, value.name.clone()) {
            rows.push(value);
        }
    });
    rows
}

/// Reads `lists.csv` into lists in order of first appearance.
pub(super) fn lists(
    table: &TableFile<'_>,
    ids: &Keys,
    faults: &mut Faults,
) -> Vec<(String, Vec<String>)> {
    let mut lists: Vec<(String, Vec<String>)> = Vec::new();
    let mut seen = HashMap::new();
    read(table, &LISTS, faults, |[list, substance], row| {
        let (name, id) = (row.filled(list), row.filled(substance));
        if !ids.contains_key(id) {
            row.unresolved(substance, id, "a substance", ids.keys().map(String::as_str));
        }
        if !first_of_its_kind(row, substance, &mut seen, (name.to_owned(), id.to_owned())) {
            return;
        }
        match lists.iter_mut().find(|(known, _)| known == name) {
            Some((_, members)) => members.push(id.to_owned()),
            None => lists.push((name.to_owned(), vec![id.to_owned()])),
        }
    });
    lists
}
