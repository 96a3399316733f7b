//! From tables to a library: the order in which they are read, what only shows when they are put
//! together, and a folder laid over a base.

use super::draft::{self, DraftEmitter, DraftSubstance, Keys, Placed};
use super::load::LibraryFault;
use super::names::closest;
use super::table::TableFile;
use super::{Emitter, Library, Source, SourceKind, Substance};
use rayon::prelude::*;
use std::collections::BTreeMap;

const TABLES: [&str; 6] = [
    "cautions.csv",
    "composed.csv",
    "emitters.csv",
    "lists.csv",
    "sources.csv",
    "substances.csv",
];

/// What a folder that stands alone must hold.
const NEEDED_ALONE: [&str; 3] = ["emitters.csv", "sources.csv", "substances.csv"];

type Faults = Vec<LibraryFault>;

/// Puts tables, sorted by name, together to a library, over a base if there is one.
///
/// Each emitter's strongest strength per kind of source is subtracted, so that it becomes 0.
pub(super) fn assemble(
    base: Option<Library>,
    tables: &[TableFile<'_>],
    sha256: String,
) -> Result<Library, Faults> {
    let mut faults = Vec::new();
    check_tables(tables, base.is_some(), &mut faults);
    if !is_whole(tables, base.is_some()) {
        // Everything else that could be said follows from the tables that are missing.
        return Err(faults);
    }
    let base = base.unwrap_or_else(empty);
    let table = |name: &str| tables.iter().find(|t| t.name == name);

    let own_sources = table("sources.csv").map(|t| draft::sources(t, &mut faults));
    let (mut base, sources) = merge_sources(base, own_sources.unwrap_or_default(), &mut faults);
    let source_keys: Keys = keys(sources.iter().map(|s| s.key.as_str()));
    let own_cautions = table("cautions.csv").map(|t| draft::cautions(t, &mut faults));
    let mut cautions = lay_over(base.cautions, own_cautions.unwrap_or_default(), |c| &c.0);
    cautions.sort();

    let mut drafts = match table("substances.csv") {
        Some(t) => draft::substances(t, &cautions, &mut faults),
        None => Vec::new(),
    };
    if let Some(t) = table("emitters.csv") {
        draft::emitters(t, &source_keys, &mut drafts, &mut faults);
    }
    read_features(tables, &source_keys, &mut drafts, &mut faults);

    (base.substances).retain(|old| !drafts.iter().any(|new| new.substance.id == old.id));
    check_emitters(&drafts, &base.substances, &mut faults);
    check_names(&drafts, &base.substances, &mut faults);
    let mut substances = base.substances;
    substances.extend(drafts.into_iter().map(finish));
    substances.sort_by(|a, b| a.id.cmp(&b.id));

    let ids = keys(substances.iter().map(|s| s.id.as_str()));
    let own_composed = table("composed.csv").map(|t| draft::composed(t, &ids, &mut faults));
    let composed = lay_over(base.composed, own_composed.unwrap_or_default(), |c| &c.name);
    let own_lists = table("lists.csv").map(|t| draft::lists(t, &ids, &mut faults));
    let mut lists = lay_over(base.lists, own_lists.unwrap_or_default(), |l| &l.0);
    lists.sort();

    if !faults.is_empty() {
        faults.sort_by(|a, b| (&a.file, a.row).cmp(&(&b.file, b.row)));
        return Err(faults);
    }
    Ok(Library {
        substances,
        composed,
        lists,
        cautions,
        sources,
        sha256,
    })
}

fn empty() -> Library {
    Library {
        substances: Vec::new(),
        composed: Vec::new(),
        lists: Vec::new(),
        cautions: Vec::new(),
        sources: Vec::new(),
        sha256: String::new(),
    }
}

fn keys<'k>(names: impl Iterator<Item = &'k str>) -> Keys {
    names
        .enumerate()
        .map(|(index, name)| (name.to_owned(), index))
        .collect()
}

/// Tables that belong to no library, and needed ones that are missing.
fn check_tables(tables: &[TableFile<'_>], extends: bool, faults: &mut Faults) {
    for table in tables {
        if TABLES.contains(&table.name.as_str()) || table.name.starts_with("features/") {
            continue;
        }
        let near = closest(&table.name, TABLES.into_iter(), 1);
        let hint = match near.first() {
            Some(near) => format!("did you mean {near:?}?"),
            None => format!("tables are {} and features/*.csv", TABLES.join(", ")),
        };
        let message = format!("is not a table of a library ({hint})");
        faults.push(LibraryFault::of_file(&table.name, &message));
    }
    for name in NEEDED_ALONE {
        if !extends && !tables.iter().any(|t| t.name == name) {
            faults.push(LibraryFault::of_file(
                name,
                "is missing (a library that stands alone needs it)",
            ));
        }
    }
    if !extends && !tables.iter().any(|t| t.name.starts_with("features/")) {
        faults.push(LibraryFault::of_file(
            "features/",
            "holds no table (a library that stands alone needs one for each substance)",
        ));
    }
    if extends && tables.is_empty() {
        faults.push(LibraryFault::of_file(
            "substances.csv",
            "is missing, as is every other table",
        ));
    }
}

/// True if every table a library cannot do without is there.
fn is_whole(tables: &[TableFile<'_>], extends: bool) -> bool {
    extends
        || NEEDED_ALONE
            .iter()
            .all(|name| tables.iter().any(|t| t.name == *name))
}

/// Base rows whose key is not among the new ones, then the new ones.
fn lay_over<T>(base: Vec<T>, new: Vec<T>, key: impl Fn(&T) -> &str) -> Vec<T> {
    let mut rows: Vec<T> = (base.into_iter())
        .filter(|old| !new.iter().any(|n| key(n) == key(old)))
        .collect();
    rows.extend(new);
    rows
}

/// All sources sorted by key, and the base with its features referring to them.
fn merge_sources(
    mut base: Library,
    new: Vec<Placed<Source>>,
    faults: &mut Faults,
) -> (Library, Vec<Source>) {
    let old = std::mem::take(&mut base.sources);
    let mut all = old.clone();
    for Placed { line, value } in new {
        match old.iter().find(|known| known.key == value.key) {
            None => all.push(value),
            Some(known) if *known == value => {}
            Some(_) => faults.push(LibraryFault {
                file: "sources.csv".to_owned(),
                row: Some(line),
                column: Some("key".to_owned()),
                text: Some(value.key),
                message: "is a different source in the library below (take another key)".to_owned(),
            }),
        }
    }
    all.sort_by(|a, b| a.key.cmp(&b.key));
    let moved: Vec<usize> = (old.iter())
        .map(|known| all.partition_point(|s| s.key < known.key))
        .collect();
    let follow = |indices: &mut Vec<usize>| {
        for index in indices {
            *index = moved.get(*index).copied().unwrap_or(*index);
        }
    };
    for emitter in base.substances.iter_mut().flat_map(|s| &mut s.emitters) {
        emitter
            .excitation
            .iter_mut()
            .flatten()
            .for_each(|e| follow(&mut e.source));
        for feature in &mut emitter.features {
            follow(&mut feature.source_position);
            follow(&mut feature.source_strength);
        }
    }
    (base, all)
}

fn read_features(
    tables: &[TableFile<'_>],
    sources: &Keys,
    drafts: &mut [DraftSubstance],
    faults: &mut Faults,
) {
    let named: BTreeMap<&str, &TableFile> = tables
        .iter()
        .filter_map(|table| {
            let file = table.name.strip_prefix("features/")?;
            Some((file.rsplit_once('.').map_or(file, |(stem, _)| stem), table))
        })
        .collect();
    // Each table fills one substance: they can be read side by side.
    let mut found: Vec<(&str, Faults)> = drafts
        .par_iter_mut()
        .filter_map(|draft| {
            let table = *named.get(draft.substance.id.as_str())?;
            let mut own = Faults::new();
            draft::features(table, sources, draft, &mut own);
            Some((table.name.as_str(), own))
        })
        .collect();
    let known = |id: &str| drafts.iter().any(|draft| draft.substance.id == id);
    for (id, table) in named.iter().filter(|(id, _)| !known(id)) {
        let near = closest(id, drafts.iter().map(|d| d.substance.id.as_str()), 1);
        let hint = match near.first() {
            Some(near) => format!("did you mean {near}.csv?"),
            None => "add its row there".to_owned(),
        };
        let message =
            format!("is named after no substance of the substances.csv beside it ({hint})");
        let fault = LibraryFault::of_file(&table.name, &message);
        found.push((table.name.as_str(), vec![fault]));
    }
    found.sort_by_key(|(name, _)| *name);
    faults.extend(found.into_iter().flat_map(|(_, own)| own));
}

/// Substances without emitters, emitters without features, levels without a zero.
fn check_emitters(drafts: &[DraftSubstance], base: &[Substance], faults: &mut Faults) {
    for draft in drafts {
        let id = &draft.substance.id;
        if draft.emitters.is_empty() {
            faults.push(at(
                "substances.csv",
                draft.line,
                "id",
                id,
                "has no emitter in emitters.csv",
            ));
        }
        for emitter in &draft.emitters {
            check_emitter(emitter, id, base, faults);
        }
        for kind in SourceKind::ALL {
            let levels = (draft.emitters.iter()).filter_map(|e| {
                let excitation = e.emitter.excitation[kind.index()].as_ref()?;
                Some((excitation.level_dex, e.lines[kind.index()]))
            });
            if let Some((level, Some(line))) = levels.max_by(|a, b| a.0.total_cmp(&b.0))
                && level != 0.0
            {
                let message = format!(
                    "is the highest level of {id} in this kind of source (the strongest emitter has 0)"
                );
                faults.push(at(
                    "emitters.csv",
                    line,
                    "level_dex",
                    &level.to_string(),
                    &message,
                ));
            }
        }
    }
}

fn check_emitter(draft: &DraftEmitter, id: &str, base: &[Substance], faults: &mut Faults) {
    let name = &draft.emitter.name;
    let mut fault = |line: usize, message: String| {
        faults.push(at("emitters.csv", line, "emitter", name, &message));
    };
    let owner = (base.iter()).find(|s| s.emitters.iter().any(|e| e.name == *name));
    if let (Some(owner), Some(line)) = (owner, draft.lines.iter().flatten().min()) {
        let message = format!(
            "belongs to {} already (one emitter, one substance)",
            owner.id
        );
        fault(*line, message);
    }
    for kind in SourceKind::ALL {
        let Some(line) = draft.lines[kind.index()] else {
            continue;
        };
        let shown = |f: &super::Feature| f.strength_dex[kind.index()].is_some();
        if !draft.emitter.features.iter().any(shown) {
            let message = format!(
                "has no feature with a strength for this kind of source in features/{id}.csv"
            );
            fault(line, message);
        }
    }
}

/// Two substances one could not tell apart by id, name or symbol.
fn check_names(drafts: &[DraftSubstance], base: &[Substance], faults: &mut Faults) {
    for (k, draft) in drafts.iter().enumerate() {
        let own = &draft.substance;
        let earlier = drafts.iter().take(k).map(|d| &d.substance);
        for other in base.iter().chain(earlier) {
            if own.name == other.name {
                let message = format!("is the name of {} too", other.id);
                faults.push(at(
                    "substances.csv",
                    draft.line,
                    "name",
                    &own.name,
                    &message,
                ));
            }
            if own.symbol == other.symbol && !own.symbol.is_empty() {
                let message = format!("is the symbol of {} too", other.id);
                faults.push(at(
                    "substances.csv",
                    draft.line,
                    "symbol",
                    &own.symbol,
                    &message,
                ));
            }
        }
    }
}

fn at(file: &str, line: usize, column: &str, text: &str, message: &str) -> LibraryFault {
    LibraryFault {
        row: Some(line),
        column: Some(column.to_owned()),
        text: Some(text.to_owned()),
        ..LibraryFault::of_file(file, message)
    }
}

fn finish(draft: DraftSubstance) -> Substance {
    let mut substance = draft.substance;
    substance.emitters = draft
        .emitters
        .into_iter()
        .map(|d| relative(d.emitter))
        .collect();
    substance
}

/// Strengths relative to the strongest feature of the emitter in each kind of source.
fn relative(mut emitter: Emitter) -> Emitter {
    for kind in 0..SourceKind::ALL.len() {
        let strongest = (emitter.features.iter())
            .filter_map(|f| f.strength_dex[kind])
            .fold(f64::NEG_INFINITY, f64::max);
        for strength in emitter
            .features
            .iter_mut()
            .filter_map(|f| f.strength_dex[kind].as_mut())
        {
            *strength -= strongest;
        }
    }
    emitter
}
