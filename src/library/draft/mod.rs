//! The rows of each table as they are read, and what can be said against a single row.

mod features;

pub(super) use features::features;

use super::layout::{
    CAUTIONS, COMPLETE_TO_DEX, COMPOSED, EMITTER_KINDS, EMITTERS, LEVEL_DEX, LEVEL_SPREAD_DEX,
    LISTS, PRIOR_CLASSES, SHOWS, SOURCE_KINDS, SOURCES, STANDINGS, SUBSTANCE_KINDS, SUBSTANCES,
};
use super::load::LibraryFault;
use super::table::{Cell, Row, TableFile, read};
use super::{Composed, Emitter, Excitation, Source, Substance, SubstanceKind};
use std::collections::HashMap;

/// A row that became something, with the line it stands on.
pub(in crate::library) struct Placed<T> {
    pub(in crate::library) line: usize,
    pub(in crate::library) value: T,
}

/// An emitter with the lines of its rows in `emitters.csv`.
pub(in crate::library) struct DraftEmitter {
    pub(in crate::library) emitter: Emitter,
    pub(in crate::library) lines: [Option<usize>; 3],
}

/// A substance whose emitters are still being collected.
pub(in crate::library) struct DraftSubstance {
    pub(in crate::library) line: usize,
    pub(in crate::library) substance: Substance,
    pub(in crate::library) emitters: Vec<DraftEmitter>,
}

/// Keys of what may be referred to, with the index each stands for.
pub(in crate::library) type Keys = HashMap<String, usize>;

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

pub(in crate::library) fn sources(
    table: &TableFile<'_>,
    faults: &mut Faults,
) -> Vec<Placed<Source>> {
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

pub(in crate::library) fn cautions(
    table: &TableFile<'_>,
    faults: &mut Faults,
) -> Vec<(String, String)> {
    let (mut rows, mut seen) = (Vec::new(), HashMap::new());
    read(table, &CAUTIONS, faults, |[key, text], row| {
        let caution = (row.filled(key).to_owned(), row.filled(text).to_owned());
        if first_of_its_kind(row, key, &mut seen, caution.0.clone()) {
            rows.push(caution);
        }
    });
    rows
}

pub(in crate::library) fn substances(
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
pub(in crate::library) fn emitters(
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

/// Reads `composed.csv`; parts must be among the substance ids.
pub(in crate::library) fn composed(
    table: &TableFile<'_>,
    ids: &Keys,
    faults: &mut Faults,
) -> Vec<Composed> {
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
pub(in crate::library) fn lists(
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
