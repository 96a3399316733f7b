//! Library folders that are to be refused, and how a folder is laid over a library.
//!
//! Each folder in `tests/cases/library/broken/` has a `faults.txt` with every fault it must be
//! refused for, one a line. Folders named `over-…` are laid over `tests/cases/library/tiny/`.

use linstock::library::{Library, LibraryError, PriorClass, SourceKind, extend_from, load_folder};
use std::path::PathBuf;

fn case(name: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
        .join("tests/cases/library")
        .join(name)
}

fn tiny() -> Library {
    load_folder(&case("tiny")).unwrap_or_else(|error| panic!("{error}"))
}

#[test]
fn broken_folders_are_refused_with_every_fault() {
    let mut names: Vec<String> = std::fs::read_dir(case("broken"))
        .expect("the cases are there")
        .map(|entry| {
            entry
                .expect("readable")
                .file_name()
                .to_string_lossy()
                .into_owned()
        })
        .collect();
    names.sort();
    assert!(names.len() >= 12, "cases are missing: {names:?}");
    let mut wrong = String::new();
    for name in names {
        let folder = case("broken").join(&name);
        let loaded = match name.starts_with("over-") {
            true => extend_from(tiny(), &folder),
            false => load_folder(&folder),
        };
        let found = match loaded {
            Ok(_) => "accepted\n".to_owned(),
            Err(LibraryError::Faulty { faults, .. }) => {
                faults.iter().map(|fault| format!("{fault}\n")).collect()
            }
            Err(other) => format!("{other}\n"),
        };
        let expected = std::fs::read_to_string(folder.join("faults.txt")).unwrap_or_default();
        if found != expected {
            wrong.push_str(&format!("== {name}: found\n{found}-- expected\n{expected}"));
        }
    }
    assert!(wrong.is_empty(), "\n{wrong}");
}

#[test]
fn a_folder_that_is_not_there_is_unreadable() {
    let error = load_folder(&case("nowhere")).expect_err("there is no such folder");
    assert!(matches!(error, LibraryError::Unreadable { .. }), "{error}");
}

#[test]
fn the_strongest_feature_of_an_emitter_has_strength_zero() {
    let library = tiny();
    let strontium = &library.substances[library.find("strontium").expect("known")];
    let strengths = |emitter: usize, kind: SourceKind| -> Vec<Option<f64>> {
        let features = strontium.emitters[emitter].features.iter();
        features.map(|f| f.strength_dex[kind.index()]).collect()
    };
    // The table says 1.2 and -3.1; 3 and 2.4; 0.4 and 0.2.
    let round = |values: Vec<Option<f64>>| -> Vec<Option<f64>> {
        let to_tenth = |v: f64| (v * 10.0).round() / 10.0;
        values.into_iter().map(|v| v.map(to_tenth)).collect()
    };
    assert_eq!(
        round(strengths(0, SourceKind::Flame)),
        [Some(0.0), Some(-4.3)]
    );
    assert_eq!(
        round(strengths(0, SourceKind::Discharge)),
        [Some(0.0), Some(-0.6)]
    );
    assert_eq!(strengths(0, SourceKind::Absorption), [None, None]);
    assert_eq!(
        round(strengths(1, SourceKind::Flame)),
        [Some(0.0), Some(-0.2)]
    );
}

#[test]
fn a_folder_laid_over_replaces_whole_and_adds_the_rest() {
    let base = tiny();
    let library = extend_from(base.clone(), &case("bench")).unwrap_or_else(|e| panic!("{e}"));
    let ids: Vec<&str> = library.substances.iter().map(|s| s.id.as_str()).collect();
    assert_eq!(
        ids,
        [
            "bench-lamp",
            "carbon-monoxide",
            "cobalt",
            "room-light",
            "sodium",
            "strontium"
        ]
    );

    let sodium = &library.substances[4];
    assert_eq!(sodium.name, "sodium of our lamp");
    assert!(sodium.aliases.is_empty(), "nothing of the old row is left");
    assert_eq!(sodium.emitters.len(), 1);
    assert!(sodium.emitters[0].excitation[SourceKind::Flame.index()].is_none());
    let keys = |indices: &[usize]| -> Vec<&str> {
        indices
            .iter()
            .map(|i| library.sources[*i].key.as_str())
            .collect()
    };
    let line = &sodium.emitters[0].features[0];
    assert_eq!(keys(&line.source_position), ["a-bench"]);
    assert_eq!(keys(&line.source_strength), ["a-bench", "practice"]);

    // `a-bench` sorts before the keys of the base, whose rows must follow theirs.
    let strontium = &library.substances[5];
    assert_eq!(
        keys(&strontium.emitters[0].features[0].source_position),
        ["positions"]
    );
    let excitation = strontium.emitters[0].excitation[0]
        .as_ref()
        .expect("it shows in flames");
    assert_eq!(keys(&excitation.source), ["practice"]);

    assert_eq!(
        library.list("lamps").expect("known"),
        ["bench-lamp", "carbon-monoxide"]
    );
    assert_eq!(library.list("teaching-salts").expect("known").len(), 2);
    assert_eq!(library.caution("look"), Some("Do not stare."));
    assert!(library.caution("hot-lamp").is_some());
    assert_eq!(library.composed.len(), base.composed.len());
    assert_ne!(library.sha256, base.sha256);
    assert_eq!(
        library,
        extend_from(base, &case("bench")).unwrap_or_else(|e| panic!("{e}")),
        "the same twice"
    );
}

#[test]
fn substances_sources_and_lists_are_sorted() {
    let library = tiny();
    assert!(library.substances.is_sorted_by(|a, b| a.id < b.id));
    assert!(library.sources.is_sorted_by(|a, b| a.key < b.key));
    assert!(library.lists.is_sorted_by(|a, b| a.0 < b.0));
    assert!(library.cautions.is_sorted_by(|a, b| a.0 < b.0));
    assert_eq!(library.sha256.len(), 64);
    assert_eq!(
        library.substances[0].prior[SourceKind::Discharge.index()],
        PriorClass::Usual
    );
}
