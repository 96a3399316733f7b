//! Published-by-us regression vectors of the evidence, to the printed digits. Each case is a
//! file; add one to add a case.

use linstock::evidence::{
    Candidate, CandidateFeature, Conditions, FeatureForm, MixtureRule, Observation, PresenceRule,
    Quadrature, Settings, exhaustive,
};
use serde::Deserialize;
use std::collections::BTreeMap;
use std::path::Path;

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Case {
    range_nm: [f64; 2],
    dynamic_range_dex: f64,
    offset_nm: f64,
    resolution_nm: f64,
    clutter: String,
    presence: String,
    mixture: String,
    candidate: Vec<CaseCandidate>,
    reading: Vec<CaseReading>,
    expected: Expected,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct CaseCandidate {
    name: String,
    prior: f64,
    features: Vec<[f64; 4]>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct CaseReading {
    wavelength_nm: f64,
    uncertainty_nm: f64,
    strength_dex: Option<(f64, f64)>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    detectability: BTreeMap<String, String>,
    #[serde(default)]
    ln_evidence_any: BTreeMap<String, String>,
    #[serde(default)]
    posterior: BTreeMap<String, String>,
}

/// The value agrees with the printed text in every printed digit.
fn check_printed(what: &str, value: f64, printed: &str) {
    let decimals = printed.split('.').nth(1).map_or(0, str::len);
    let expected: f64 = printed.parse().expect("a printed number");
    let half_unit = 0.5 * 10f64.powi(-(decimals as i32)) * 1.000_001;
    assert!(
        (value - expected).abs() <= half_unit,
        "{what}: {value} is not {printed}"
    );
}

fn settings(case: &Case) -> Settings {
    let z = [-3.2, -1.6, 0.0, 1.6, 3.2];
    let offset = Quadrature::weighted(
        z.iter().map(|z| z * case.offset_nm).collect(),
        z.iter().map(|z: &f64| (-0.5 * z * z).exp()).collect(),
    );
    let clutter = match case.clutter.as_str() {
        "single" => Quadrature::fixed(0.3),
        "mixture" => Settings::default().clutter,
        other => panic!("unknown clutter {other}"),
    };
    Settings {
        overlook: 0.03,
        tail_weight: 0.03,
        amount_nodes: [4, 4],
        offset: Some(offset),
        clutter,
        gate: 0.0,
        prepare: false,
        presence: match case.presence.as_str() {
            "inside" => PresenceRule::Inside,
            "subtract" => PresenceRule::Subtract,
            other => panic!("unknown presence {other}"),
        },
        mixture: match case.mixture.as_str() {
            "joint" => MixtureRule::Joint,
            "product" => MixtureRule::Product,
            other => panic!("unknown mixture {other}"),
        },
        ..Settings::default()
    }
}

fn check(path: &Path) {
    let text = std::fs::read_to_string(path).expect("a readable case");
    let case: Case = toml::from_str(&text).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    let observations: Vec<Observation> = case
        .reading
        .iter()
        .map(|r| Observation {
            wavelength_nm: r.wavelength_nm,
            uncertainty_nm: r.uncertainty_nm,
            strength_dex: r.strength_dex,
            saturated: false,
            band: None,
        })
        .collect();
    let conditions = Conditions {
        range_nm: case.range_nm,
        blind_nm: Vec::new(),
        resolution_nm: case.resolution_nm,
        dynamic_range_dex: case.dynamic_range_dex,
        offset_nm: case.offset_nm,
        scale_relative: 0.0,
        splits_nm: Vec::new(),
    };
    let candidates: Vec<Candidate> = case
        .candidate
        .iter()
        .map(|c| Candidate {
            prior: c.prior,
            shows: 1.0,
            emitter_spread_dex: vec![0.0],
            emitter_shows: vec![1.0],
            features: c
                .features
                .iter()
                .map(
                    |[wavelength_nm, uncertainty_nm, level_dex, scatter_dex]| CandidateFeature {
                        emitter: 0,
                        form: FeatureForm::Line,
                        wavelength_nm: *wavelength_nm,
                        uncertainty_nm: *uncertainty_nm,
                        level_dex: *level_dex,
                        scatter_dex: *scatter_dex,
                    },
                )
                .collect(),
        })
        .collect();
    let result = exhaustive(&observations, &conditions, &candidates, &settings(&case))
        .expect("few candidates");
    let name = path
        .file_stem()
        .unwrap_or_default()
        .to_string_lossy()
        .into_owned();
    for (c, z) in case.candidate.iter().zip(&result.detectability) {
        check_printed(
            &format!("{name}: Z of {}", c.name),
            *z,
            &case.expected.detectability[&c.name],
        );
    }
    let label = |members: &[usize]| match members {
        [] => "none".to_owned(),
        some => some
            .iter()
            .map(|m| case.candidate[*m].name.as_str())
            .collect::<Vec<_>>()
            .join("+"),
    };
    let mut compared = 0;
    for entry in &result.entries {
        let key = label(&entry.members);
        if let Some(printed) = case.expected.ln_evidence_any.get(&key) {
            check_printed(
                &format!("{name}: ln E' of {key}"),
                entry.ln_evidence_any,
                printed,
            );
            compared += 1;
        }
        if let Some(printed) = case.expected.posterior.get(&key) {
            check_printed(
                &format!("{name}: posterior of {key}"),
                entry.posterior,
                printed,
            );
            compared += 1;
        }
    }
    let stated = case.expected.ln_evidence_any.len() + case.expected.posterior.len();
    assert_eq!(
        compared, stated,
        "{name}: an expected value names no composition"
    );
}

#[test]
fn every_vector_agrees_to_the_printed_digits() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/cases/vectors");
    let mut paths: Vec<_> = std::fs::read_dir(folder)
        .expect("the folder of vectors")
        .map(|e| e.expect("an entry").path())
        .collect();
    paths.sort();
    assert!(paths.len() >= 6, "vectors are missing");
    for path in paths {
        check(&path);
    }
}
