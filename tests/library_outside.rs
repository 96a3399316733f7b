//! Every position of the reference tables that an outside table holds too, against that table.
//!
//! The heads of the files in `tests/reference/` name their origin and recipe. `UPDATE_GOLDEN=1`
//! rewrites the tables in `library/README.md` and the list of rows that no outside source covers.

use linstock::embedded;
use linstock::library::{Emitter, Feature, Form, Library, SourceKind, Standing};
use linstock::reduction::air::VacuumWavelength;
use std::collections::{BTreeMap, BTreeSet};
use std::fmt::Write;
use std::path::PathBuf;
use std::sync::Mutex;

/// Bound on a line's difference from a published value, nm.
const LINE_NM: f64 = 0.01;
/// Bound where a row stands for fine structure, isotopes or hyperfine structure not resolved,
/// which its uncertainty says: above [`SHARP_NM`].
const UNRESOLVED_NM: f64 = 0.02;
/// Uncertainty up to which a row claims a single sharp line, nm.
const SHARP_NM: f64 = 0.006;

/// A table of `tests/reference/`.
struct Outside {
    file: &'static str,
    /// For the table in the README.
    origin: &'static str,
    /// Rows that the library may leave out, because they are too weak.
    may_miss: usize,
    /// At least so many rows are compared.
    at_least: usize,
    median_nm: f64,
    p95_nm: f64,
}

const OUTSIDE: [Outside; 8] = [
    Outside {
        file: "listed_desispec.csv",
        origin: "desispec 0.70.0, every listed line of Ar Cd He Hg Kr Ne Xe Zn",
        may_miss: 270,
        at_least: 1900,
        median_nm: 0.0002,
        p95_nm: 0.001,
    },
    Outside {
        file: "lines_desispec.csv",
        origin: "desispec 0.70.0, the strongest lines",
        may_miss: 0,
        at_least: 120,
        median_nm: 0.0002,
        p95_nm: 0.001,
    },
    Outside {
        file: "listed_pypeit.csv",
        origin: "pypeit 2.0.1, arc line lists of single ions",
        may_miss: 6,
        at_least: 600,
        median_nm: 0.0002,
        p95_nm: 0.001,
    },
    Outside {
        file: "listed_rascal.csv",
        origin: "rascal 0.3.11, every listed line of Ar Cu He Hg Kr Ne Xe",
        may_miss: 15,
        at_least: 700,
        median_nm: 0.0002,
        p95_nm: 0.001,
    },
    Outside {
        file: "lines_linetools.csv",
        origin: "linetools 0.3.2, resonance lines of Morton",
        may_miss: 0,
        at_least: 120,
        median_nm: 0.0005,
        p95_nm: 0.005,
    },
    Outside {
        file: "arc_levels.csv",
        origin: "ARC 3.10.2, levels of Li Na K Rb Cs",
        may_miss: 0,
        at_least: 50,
        median_nm: 0.0005,
        p95_nm: 0.003,
    },
    Outside {
        file: "levels_ca_sr_yb.csv",
        origin: "ARC 3.10.2, levels of Ca Sr Yb",
        may_miss: 0,
        at_least: 35,
        median_nm: 0.0005,
        p95_nm: 0.005,
    },
    Outside {
        file: "bands_moose.csv",
        origin: "moose-spectra 0.3.1, band spectra of C2 CN N2 N2+ NH OH",
        may_miss: 0,
        at_least: 55,
        median_nm: 0.1,
        p95_nm: 0.35,
    },
];

fn project(path: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join(path)
}

fn read(path: &str) -> String {
    std::fs::read_to_string(project(path)).unwrap_or_else(|error| panic!("{path}: {error}"))
}

fn library() -> Library {
    embedded::library().unwrap_or_else(|error| panic!("{error}"))
}

fn emitters(library: &Library) -> BTreeMap<&str, &Emitter> {
    let all = library.substances.iter().flat_map(|s| &s.emitters);
    all.map(|e| (e.name.as_str(), e)).collect()
}

/// (emitter, wavelength in air) of each row.
fn rows(outside: &Outside) -> Vec<(String, f64)> {
    let text = read(&format!("tests/reference/{}", outside.file));
    let mut reader = csv::ReaderBuilder::new()
        .comment(Some(b'#'))
        .from_reader(text.as_bytes());
    let records = reader.records().map(|r| r.expect("a row"));
    records
        .map(|r| (r[0].to_owned(), r[1].parse().expect("a wavelength")))
        .collect()
}

/// How far a published position of this very feature may lie, nm.
fn bound_nm(feature: &Feature) -> f64 {
    match feature.form {
        Form::Line if feature.uncertainty_nm <= SHARP_NM => LINE_NM,
        Form::Line => UNRESOLVED_NM,
        Form::BandHead | Form::BandMax => feature.uncertainty_nm.max(0.3),
    }
}

/// The features a published position may stand for, with their distance.
fn held(emitter: &Emitter, nm: f64) -> impl Iterator<Item = (&Feature, f64)> {
    let distances = emitter
        .features
        .iter()
        .map(move |f| (f, (f.wavelength.nm() - nm).abs()));
    distances.filter(|(f, distance)| *distance <= bound_nm(f) + 1e-9)
}

/// Compares one table; its line for the README. Rows that agree are noted as covered.
fn compare<'l>(
    outside: &Outside,
    emitters: &BTreeMap<&'l str, &'l Emitter>,
    covered: &mut BTreeSet<(&'l str, usize)>,
) -> String {
    let mut differences = Vec::new();
    let mut missed = Vec::new();
    for (name, nm) in rows(outside) {
        let Some((name, emitter)) = emitters.get_key_value(name.as_str()) else {
            panic!("{}: the library has no {name}", outside.file);
        };
        let nearest = held(emitter, nm).map(|(_, d)| d).min_by(f64::total_cmp);
        match nearest {
            Some(difference) => differences.push(difference),
            None => missed.push(format!("{name} {nm}")),
        }
        covered.extend(held(emitter, nm).map(|(f, _)| (*name, f.row)));
    }
    let file = outside.file;
    assert!(
        missed.len() <= outside.may_miss,
        "{file}: {} rows have no counterpart within the bound: {}",
        missed.len(),
        missed.join(", ")
    );
    assert!(
        differences.len() >= outside.at_least,
        "{file}: {}",
        differences.len()
    );
    differences.sort_by(f64::total_cmp);
    let at = |share: f64| differences[((differences.len() - 1) as f64 * share) as usize];
    let (median, p95) = (at(0.5), at(0.95));
    assert!(median <= outside.median_nm, "{file}: median {median}");
    assert!(p95 <= outside.p95_nm, "{file}: 95th percentile {p95}");
    format!(
        "| {} | {} | {median:.4} | {p95:.4} | {:.4} | {} |\n",
        outside.origin,
        differences.len(),
        at(1.0),
        missed.len()
    )
}

/// Whether the levels of a line, which come from another table than its position, give it.
fn follows_from_levels(feature: &Feature) -> bool {
    let levels = feature.lower_level_per_cm.zip(feature.upper_level_per_cm);
    let vacuum = levels.and_then(|(low, high)| VacuumWavelength::from_wavenumber(high - low));
    vacuum.is_some_and(|v| (v.to_air().nm() - feature.wavelength.nm()).abs() <= bound_nm(feature))
}

/// The features no outside table holds, per emitter; their number, how many of them follow from
/// their levels, and the number of all.
fn uncovered(library: &Library, covered: &BTreeSet<(&str, usize)>) -> (String, [usize; 3]) {
    let (mut text, mut count, mut by_levels, mut all) = (String::new(), 0, 0, 0);
    for (name, emitter) in emitters(library) {
        all += emitter.features.len();
        let left: Vec<&Feature> = (emitter.features.iter())
            .filter(|f| !covered.contains(&(name, f.row)))
            .collect();
        count += left.len();
        by_levels += left.iter().filter(|f| follows_from_levels(f)).count();
        let left: Vec<String> = left.iter().map(|f| f.wavelength.nm().to_string()).collect();
        if !left.is_empty() {
            let total = emitter.features.len();
            let line = format!("{name}, {} of {total}: {}", left.len(), left.join(" "));
            let options = textwrap::Options::new(100).subsequent_indent("  ");
            text.push_str(&textwrap::fill(&line, options));
            text.push('\n');
        }
    }
    (text, [count, by_levels, all])
}

/// One row per emitter: features, strengths by kind of source, standing of the sources.
fn counts(library: &Library) -> String {
    let features: usize = emitters(library).values().map(|e| e.features.len()).sum();
    let levels = emitters(library)
        .values()
        .map(|e| e.excitation.iter().flatten().count())
        .sum::<usize>();
    let mut text = format!(
        "{} substances, {} emitters in {levels} rows, {features} features, {} sources.\n\n",
        library.substances.len(),
        emitters(library).len(),
        library.sources.len()
    );
    text.push_str(
        "| emitter | features | flame | discharge | absorption | from memory | shaky |\n",
    );
    text.push_str("|---|---|---|---|---|---|---|\n");
    for substance in &library.substances {
        for emitter in &substance.emitters {
            let shown = |kind: SourceKind| {
                let all = emitter.features.iter();
                all.filter(|f| f.strength_dex[kind.index()].is_some())
                    .count()
            };
            let resting_on = |standing: Standing| {
                let rests = |f: &&Feature| {
                    let mut sources = f.source_position.iter().chain(&f.source_strength);
                    sources.any(|s| library.sources[*s].standing == standing)
                };
                emitter.features.iter().filter(rests).count()
            };
            writeln!(
                text,
                "| {} | {} | {} | {} | {} | {} | {} |",
                emitter.name,
                emitter.features.len(),
                shown(SourceKind::Flame),
                shown(SourceKind::Discharge),
                shown(SourceKind::Absorption),
                resting_on(Standing::Memory),
                resting_on(Standing::Shaky)
            )
            .expect("text");
        }
    }
    text
}

/// Puts `found` in the place of a marked block where that is asked for; says what stands there.
fn block(path: &str, name: &str, found: &str) -> String {
    // Two tests rewrite the same file.
    static WRITING: Mutex<()> = Mutex::new(());
    let _guard = WRITING.lock();
    let text = read(path);
    let (open, close) = (
        format!("<!-- {name} -->\n"),
        format!("<!-- end of {name} -->"),
    );
    let (before, rest) = text
        .split_once(&open)
        .unwrap_or_else(|| panic!("{path}: no {open}"));
    let (old, after) = rest
        .split_once(&close)
        .unwrap_or_else(|| panic!("{path}: no {close}"));
    if updating() {
        let new = format!("{before}{open}{found}{close}{after}");
        std::fs::write(project(path), new).expect("written");
        return found.to_owned();
    }
    old.to_owned()
}

fn updating() -> bool {
    std::env::var_os("UPDATE_GOLDEN").is_some()
}

#[test]
fn positions_agree_with_every_outside_table() {
    let library = library();
    let emitters = emitters(&library);
    let mut covered = BTreeSet::new();
    let mut table = String::from(
        "| outside source | compared | median nm | 95th percentile nm | maximum nm | not held |\n|---|---|---|---|---|---|\n",
    );
    for outside in &OUTSIDE {
        table.push_str(&compare(outside, &emitters, &mut covered));
    }
    let (list, [count, by_levels, all]) = uncovered(&library, &covered);
    writeln!(
        table,
        "\nNo outside table covers {count} of {all} rows; {by_levels} of these follow from the levels beside them."
    )
    .expect("text");
    assert_eq!(block("library/README.md", "differences", &table), table);

    let golden = "tests/golden/library_uncovered.txt";
    if updating() {
        std::fs::write(project(golden), &list).expect("written");
    }
    assert_eq!(list, read(golden));
}

#[test]
fn the_counts_in_the_readme_are_those_of_the_tables() {
    let counts = counts(&library());
    assert_eq!(block("library/README.md", "counts", &counts), counts);
}
