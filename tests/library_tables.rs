//! Guards of the reference tables that are part of the program: what the loader does not check,
//! and what follows from laws of nature. `library_outside.rs` compares with published tables.

use linstock::embedded;
use linstock::library::{Emitter, Feature, Form, Library, SourceKind, Standing};
use linstock::reduction::air::VacuumWavelength;
use std::sync::OnceLock;

/// Bound on a line's difference from a published value, nm.
const LINE_NM: f64 = 0.01;

/// Boltzmann constant, cm⁻¹ K⁻¹ (CODATA 2018, exact value of k/hc rounded).
const BOLTZMANN_PER_CM: f64 = 0.695_034_800;

fn library() -> &'static Library {
    static LIBRARY: OnceLock<Library> = OnceLock::new();
    LIBRARY.get_or_init(|| embedded::library().unwrap_or_else(|error| panic!("{error}")))
}

fn emitters() -> impl Iterator<Item = &'static Emitter> {
    library().substances.iter().flat_map(|s| &s.emitters)
}

fn emitter(name: &str) -> &'static Emitter {
    let found = emitters().find(|e| e.name == name);
    found.unwrap_or_else(|| panic!("the library has no {name}"))
}

fn nearest(emitter: &Emitter, nm: f64) -> &Feature {
    let distance = |f: &&Feature| (f.wavelength.nm() - nm).abs();
    let found = (emitter.features.iter()).min_by(|a, b| distance(a).total_cmp(&distance(b)));
    found.unwrap_or_else(|| panic!("{} has no features", emitter.name))
}

/// The wavelength in air of a transition between two levels, nm.
fn air_nm(lower_per_cm: f64, upper_per_cm: f64) -> f64 {
    let vacuum = VacuumWavelength::from_wavenumber(upper_per_cm - lower_per_cm);
    vacuum.expect("levels differ").to_air().nm()
}

/// Median, 95th percentile and maximum of absolute differences.
struct Spread {
    median: f64,
    p95: f64,
    max: f64,
}

fn spread(what: &str, mut differences: Vec<f64>) -> Spread {
    assert!(!differences.is_empty(), "{what}: nothing was compared");
    differences.sort_by(f64::total_cmp);
    let at = |share: f64| differences[((differences.len() - 1) as f64 * share) as usize];
    let spread = Spread {
        median: at(0.5),
        p95: at(0.95),
        max: at(1.0),
    };
    println!(
        "{what}: {} values, median {:.4}, 95th percentile {:.4}, maximum {:.4}",
        differences.len(),
        spread.median,
        spread.p95,
        spread.max
    );
    spread
}

#[test]
fn the_tables_are_whole_and_in_order() {
    let library = library();
    assert!(library.substances.is_sorted_by(|a, b| a.id < b.id));
    assert!(library.sources.is_sorted_by(|a, b| a.key < b.key));
    assert!(library.cautions.is_sorted_by(|a, b| a.0 < b.0));
    let mut names: Vec<&str> = emitters().map(|e| e.name.as_str()).collect();
    let count = names.len();
    names.sort_unstable();
    names.dedup();
    assert_eq!(names.len(), count, "an emitter belongs to one substance");
    for emitter in emitters() {
        let name = &emitter.name;
        assert!(emitter.excitation.iter().any(Option::is_some), "{name}");
        assert!(
            emitter
                .features
                .is_sorted_by(|a, b| a.wavelength <= b.wavelength),
            "{name}"
        );
        for kind in SourceKind::ALL {
            let strengths = emitter
                .features
                .iter()
                .filter_map(|f| f.strength_dex[kind.index()]);
            let strongest = strengths.fold(f64::NEG_INFINITY, f64::max);
            match emitter.excitation[kind.index()] {
                Some(_) => assert_eq!(strongest, 0.0, "{name}, {kind:?}"),
                None => assert!(strongest <= 0.0, "{name}, {kind:?}"),
            }
        }
    }
}

#[test]
fn every_value_has_a_source_and_every_caution_is_for_somebody() {
    let library = library();
    let mut used = vec![false; library.sources.len()];
    for emitter in emitters() {
        let features = emitter.features.iter();
        let of_features = features.flat_map(|f| f.source_position.iter().chain(&f.source_strength));
        let of_levels = emitter.excitation.iter().flatten().flat_map(|e| &e.source);
        for index in of_features.chain(of_levels) {
            used[*index] = true;
        }
        for feature in &emitter.features {
            assert!(!feature.source_position.is_empty() && !feature.source_strength.is_empty());
        }
    }
    let idle: Vec<&str> = (library.sources.iter().zip(&used))
        .filter_map(|(source, used)| (!used).then_some(source.key.as_str()))
        .collect();
    assert!(idle.is_empty(), "sources nothing rests on: {idle:?}");
    for source in &library.sources {
        assert!(
            source.standing != Standing::Published || !source.version.is_empty(),
            "{} is published and has no version or date",
            source.key
        );
    }
    for (key, _) in &library.cautions {
        assert!(
            library.substances.iter().any(|s| s.cautions.contains(key)),
            "caution {key} is given for no substance"
        );
    }
}

#[test]
fn every_name_leads_to_its_own_substance() {
    let library = library();
    for substance in &library.substances {
        let names = [&substance.id, &substance.name, &substance.symbol];
        let emitters = substance.emitters.iter().map(|e| &e.name);
        let all = names.into_iter().chain(&substance.aliases).chain(emitters);
        for name in all.filter(|name| !name.is_empty()) {
            let found = library
                .find(name)
                .map(|index| library.substances[index].id.as_str());
            assert_eq!(found, Ok(substance.id.as_str()), "{name:?}");
        }
    }
}

#[test]
fn the_first_edition_holds_what_it_must() {
    let elements =
        "Li Na K Rb Cs Ca Sr Ba Cu B In Tl Mg Mn Pb H He Ne Ar Kr Xe Hg Cd Zn O CO OH CH C2 N2";
    for symbol in elements.split(' ') {
        assert!(library().find(symbol).is_ok(), "{symbol}");
    }
    let bands = "CaOH;CaCl;SrOH;SrCl;BaOH;BaO;BaCl;CuOH;CuCl;CuH;BO2;OH;CH;C2 Swan;CO Angstrom;\
                 N2 first positive;N2 second positive;N2+";
    for name in bands.split(';') {
        emitter(name);
    }
    // The worst near coincidence (NIST ASD): He 667.815, Ne 667.828.
    assert!((nearest(emitter("He I"), 667.815).wavelength.nm() - 667.815).abs() < 0.002);
    assert!((nearest(emitter("Ne I"), 667.828).wavelength.nm() - 667.828).abs() < 0.002);
}

#[test]
fn composed_names_and_lists_are_of_use() {
    let library = library();
    for composed in &library.composed {
        let found = library.composed_for(&composed.parts);
        assert!(found.contains(&composed), "{}", composed.name);
        assert!(composed.parts.len() >= 2, "{} has one part", composed.name);
    }
    assert!(
        library
            .list("teaching-salts")
            .is_ok_and(|ids| ids.len() >= 9)
    );
}

/// λ_vac⁻¹ = R_H (1/4 − 1/n²), R_H = R_∞/(1 + m_e/m_p); R_∞ and m_e/m_p from CODATA 2018.
/// Fine structure shifts the centroids by less than the bound.
#[test]
fn balmer_lines_follow_from_the_rydberg_constant() {
    const R_INFINITY_PER_M: f64 = 10_973_731.568_157;
    const ELECTRON_TO_PROTON: f64 = 5.446_170_214_889e-4;
    let r_hydrogen_per_cm = R_INFINITY_PER_M / (1.0 + ELECTRON_TO_PROTON) / 100.0;
    let mut differences = Vec::new();
    for n in 3..=9_u32 {
        let n = f64::from(n);
        let expected = air_nm(r_hydrogen_per_cm * (-0.25), -r_hydrogen_per_cm / (n * n));
        let found = nearest(emitter("H I"), expected).wavelength.nm();
        differences.push((found - expected).abs());
    }
    let spread = spread("Balmer lines, nm", differences);
    assert!(spread.max < LINE_NM, "{}", spread.max);
}

/// Where a line has both levels, its position follows from them.
#[test]
fn positions_agree_with_the_levels_beside_them() {
    let mut differences = Vec::new();
    let mut wrong = String::new();
    for emitter in emitters() {
        for feature in emitter.features.iter().filter(|f| f.form == Form::Line) {
            let levels = (feature.lower_level_per_cm, feature.upper_level_per_cm);
            let (Some(lower), Some(upper)) = levels else {
                continue;
            };
            let expected = air_nm(lower, upper);
            let difference = (feature.wavelength.nm() - expected).abs();
            if difference > f64::max(LINE_NM, 4.0 * feature.uncertainty_nm) {
                let nm = feature.wavelength.nm();
                wrong.push_str(&format!(
                    "{} {nm}: levels give {expected:.4}\n",
                    emitter.name
                ));
            }
            differences.push(difference);
        }
    }
    assert!(wrong.is_empty(), "\n{wrong}");
    assert!(
        differences.len() > 3000,
        "{} lines have levels",
        differences.len()
    );
    let spread = spread("lines against their levels, nm", differences);
    assert!(spread.median < 0.001 && spread.p95 < 0.005 && spread.max < 0.05);
}

/// A flame strength by the thermal rule is log10(gA/λ) − E/(kT ln 10) at 2200 K on a common scale,
/// so that differences within an emitter must be those of the rule, to the two decimals given.
#[test]
fn thermal_flame_strengths_follow_from_rates_and_levels() {
    const TEMPERATURE_K: f64 = 2200.0;
    let library = library();
    let mut compared = 0;
    for emitter in emitters() {
        let mut offsets = Vec::new();
        for feature in &emitter.features {
            let keys: Vec<&str> = feature
                .source_strength
                .iter()
                .map(|i| library.sources[*i].key.as_str())
                .collect();
            let Some(strength) = feature.strength_dex[SourceKind::Flame.index()] else {
                continue;
            };
            if !keys.contains(&"flame-thermal-2200K") || keys.contains(&"flame-growth") {
                continue;
            }
            let values = (
                feature.transition_rate_per_s,
                feature.upper_weight,
                feature.upper_level_per_cm,
            );
            let (Some(rate), Some(weight), Some(level)) = values else {
                panic!(
                    "{} row {}: the rule needs rate, weight and level",
                    emitter.name, feature.row
                );
            };
            let rule = (weight * rate / feature.wavelength.nm()).log10()
                - level / (BOLTZMANN_PER_CM * TEMPERATURE_K * std::f64::consts::LN_10);
            offsets.push(strength - rule);
            compared += 1;
        }
        let low = offsets.iter().copied().fold(f64::INFINITY, f64::min);
        let high = offsets.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        assert!(
            offsets.is_empty() || high - low < 0.011,
            "{}: offsets from {low} to {high}",
            emitter.name
        );
    }
    assert!(compared > 500, "only {compared} rows name the rule alone");
}
