//! How long an identification takes, side by side: the search against weighing every composition,
//! a short candidate list against the whole library, the embedded library against its tables, few readings against a crowded lamp.

use criterion::{Criterion, criterion_group, criterion_main};
use linstock::evidence::{
    Candidate, CandidateFeature, Conditions, FeatureForm, Observation, Settings, exhaustive, infer,
};
use linstock::reading::read_table;
use linstock::{embedded, library, setup, verdict};
use std::hint::black_box;
use std::path::Path;

type Outcome<T> = Result<T, Box<dyn std::error::Error>>;

/// Everything one identification needs, read once.
struct Bench {
    library: library::Library,
    setup: setup::Setup,
    shortlist: verdict::Shortlist,
    table: linstock::reading::Table,
}

impl Bench {
    /// Readings and set-up of the project, with other candidates where those are named.
    fn new(readings: &str, setup_file: &str, candidates: Option<&str>) -> Outcome<Self> {
        let root = Path::new(env!("CARGO_MANIFEST_DIR"));
        let bytes = std::fs::read(root.join(readings))?;
        let file = setup::read_setup(&root.join(setup_file))?;
        let flags = setup::SetupOverrides {
            candidates: candidates.map(setup::Candidates::from_text),
            ..Default::default()
        };
        let setup = setup::resolve(Some(file), flags)?;
        let library = embedded::library()?;
        let shortlist = verdict::shortlist(&library, &setup)?;
        Ok(Self {
            shortlist,
            library,
            setup,
            table: read_table(readings, &bytes),
        })
    }

    fn run(&self) {
        assert!(!self.table.samples.is_empty(), "a bench without readings");
        for sample in &self.table.samples {
            let found =
                verdict::identify_sample(&self.library, &self.setup, &self.shortlist, sample);
            assert!(found.is_ok(), "a bench that identifies nothing");
            black_box(&found);
        }
    }
}

fn samples(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("identify");
    group.sample_size(10);
    let goniometer = "samples/goniometer.toml";
    let cases = [
        (
            "5 readings, 22 candidates",
            "samples/plover.csv",
            goniometer,
            None,
        ),
        (
            "5 readings, everything",
            "samples/plover.csv",
            goniometer,
            Some("everything"),
        ),
        (
            "18 readings of a lamp",
            "samples/bay_2.csv",
            "samples/ccd.toml",
            None,
        ),
        (
            "a recorded arc, everything",
            "tests/reference/arc_kastb_cd_he_hg.csv",
            "tests/reference/arc_kastb_cd_he_hg.toml",
            Some("everything"),
        ),
    ];
    for (name, readings, setup, candidates) in cases {
        let bench = Bench::new(readings, setup, candidates)
            .unwrap_or_else(|error| panic!("{name}: {error}"));
        group.bench_function(name, |b| b.iter(|| bench.run()));
    }
    group.finish();
}

/// `count` substances of three lines each; readings fit the first two.
fn scene(count: usize) -> (Vec<Observation>, Conditions, Vec<Candidate>) {
    let line = |wavelength_nm: f64, level_dex: f64| CandidateFeature {
        emitter: 0,
        form: FeatureForm::Line,
        wavelength_nm,
        uncertainty_nm: 0.005,
        level_dex,
        scatter_dex: 0.5,
    };
    let candidates: Vec<Candidate> = (0..count)
        .map(|k| {
            let shift = 7.3 * k as f64;
            Candidate {
                prior: 0.1,
                shows: 1.0,
                emitter_spread_dex: vec![0.3],
                emitter_shows: vec![1.0],
                features: vec![
                    line(420.0 + shift, 0.0),
                    line(510.0 + shift, -0.4),
                    line(600.0 + shift, -0.8),
                ],
            }
        })
        .collect();
    let observations = [420.3, 510.2, 427.1, 517.5, 607.0]
        .map(|wavelength_nm| Observation {
            wavelength_nm,
            uncertainty_nm: 0.4,
            strength_dex: None,
            saturated: false,
            band: None,
        })
        .to_vec();
    let conditions = Conditions {
        range_nm: [400.0, 700.0],
        blind_nm: Vec::new(),
        resolution_nm: 0.8,
        dynamic_range_dex: 2.0,
        offset_nm: 0.45,
        scale_relative: 0.0,
        splits_nm: Vec::new(),
    };
    (observations, conditions, candidates)
}

fn search(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("compositions of 7 candidates");
    group.sample_size(10);
    let (observations, conditions, candidates) = scene(7);
    let settings = Settings::default();
    group.bench_function("search", |b| {
        b.iter(|| black_box(infer(&observations, &conditions, &candidates)));
    });
    group.bench_function("enumeration", |b| {
        b.iter(|| {
            black_box(exhaustive(
                &observations,
                &conditions,
                &candidates,
                &settings,
            ))
        });
    });
    group.finish();
}

/// The embedded library against reading the same tables from their folder.
fn start(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("library");
    group.sample_size(20);
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("library");
    group.bench_function("embedded", |b| {
        b.iter(|| {
            let library = embedded::library();
            assert!(library.is_ok(), "a library that does not load");
            black_box(library)
        });
    });
    group.bench_function("from its tables", |b| {
        b.iter(|| {
            let library = library::load_folder(&folder);
            assert!(library.is_ok(), "tables that do not load");
            black_box(library)
        });
    });
    group.finish();
}

criterion_group!(benches, start, search, samples);
criterion_main!(benches);
