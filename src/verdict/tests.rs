//! What is said of evidence made by hand. Expected words are ours; thresholds are those of
//! evidence.md, "Decision" and "What the report must be able to say".

use super::fixture::{Fixture, strontium_with_sodium};
use super::*;
use crate::setup::{Candidates, InstrumentKind, SetupOverrides};

#[test]
fn a_clear_finding_is_decisive_and_names_the_ubiquitous_last() {
    let verdict = strontium_with_sodium().verdict();
    assert_eq!(verdict.decision, Decision::Decisive);
    assert_eq!(
        verdict.sentence,
        "Strontium, with sodium: probability 0.97, decisive."
    );
    assert_eq!(
        verdict.cautions,
        [
            "Open flame: keep burnable things away.",
            "Tubes and lamps get hot.",
            "Wash your hands."
        ]
    );
}

#[test]
fn below_ninety_hundredths_nothing_is_decisive() {
    for (posterior, expected) in [(0.899_9, Decision::Inconclusive), (0.9, Decision::Decisive)] {
        let fixture = strontium_with_sodium()
            .but(|inference| inference.compositions[0].posterior = posterior);
        assert_eq!(fixture.verdict().decision, expected, "{posterior}");
    }
}

#[test]
fn an_empty_leader_is_unexplained_only_if_there_are_readings() {
    let verdict = Fixture::new("500,0.3,\n")
        .compositions(&[(&[], 0.93), (&["lithium"], 0.07)])
        .verdict();
    assert_eq!(verdict.decision, Decision::Unexplained);
    assert_eq!(
        verdict.sentence,
        "Nothing in the library explains these readings: probability 0.93, unexplained."
    );
    // 1000 nm is out of the range of a goniometer read by eye: nothing is left.
    let verdict = Fixture::new("1000,0.3,\n")
        .compositions(&[(&[], 1.0)])
        .verdict();
    assert_eq!(verdict.decision, Decision::Inconclusive);
    assert!(
        verdict
            .warnings
            .iter()
            .any(|warning| warning.code() == "reading-out-of-range")
    );
}

#[test]
fn two_unexplained_readings_cap_the_answer() {
    let fixture = Fixture::new("460.9,0.3,\n500,0.3,\n550,0.3,\n")
        .compositions(&[(&["strontium"], 0.99)])
        .present("strontium", 0.99)
        .caused(0, "strontium", 0.99);
    let verdict = fixture.verdict();
    assert_eq!(fixture.codes().first(), Some(&"unlisted-substance-likely"));
    assert_eq!(verdict.decision, Decision::Inconclusive);
    assert_eq!(
        verdict.sentence,
        "A substance that is not listed is likely; of those weighed, the best fit is strontium: probability \
         0.990 at most, not decisive."
    );
    assert_eq!(verdict.readings[1].cause, None);
}

#[test]
fn one_unexplained_reading_is_said_but_caps_nothing() {
    let fixture = Fixture::new("460.9,0.3,\n500,0.3,\n")
        .compositions(&[(&["strontium"], 0.99)])
        .caused(0, "strontium", 0.99);
    assert!(
        fixture.codes().contains(&"unexplained-reading"),
        "{:?}",
        fixture.codes()
    );
    assert_eq!(fixture.verdict().decision, Decision::Decisive);
}

#[test]
fn a_list_cut_short_caps_the_answer() {
    let overrides = SetupOverrides {
        listed_at_most: Some(2),
        ..SetupOverrides::default()
    };
    let fixture = Fixture::with("460.9,0.3,\n606.1,0.5,\n", overrides)
        .compositions(&[(&["strontium"], 0.97)])
        .caused(0, "strontium", 0.99)
        .caused(1, "strontium", 0.99);
    assert!(
        fixture.codes().contains(&"list-cut-short"),
        "{:?}",
        fixture.codes()
    );
    assert_eq!(
        fixture.verdict().sentence,
        "Perhaps strontium, on a list cut short: probability 0.97 at most, not decisive."
    );
}

#[test]
fn untested_mass_keeps_an_answer_from_being_decisive() {
    for (bound, expected) in [
        (0.0099, Decision::Decisive),
        (0.01, Decision::Inconclusive),
        (f64::NAN, Decision::Inconclusive),
    ] {
        let fixture =
            strontium_with_sodium().but(|inference| inference.untested_mass_bound = bound);
        assert_eq!(fixture.verdict().decision, expected, "{bound}");
        let warned = fixture.codes().contains(&"untested-compositions");
        assert_eq!(warned, expected == Decision::Inconclusive, "{bound}");
    }
}

#[test]
fn twins_share_one_posterior_and_the_reading_that_tells_them_apart_is_named() {
    let fixture = Fixture::new("520.05,0.3,\n")
        .compositions(&[
            (&["alphium"], 0.55),
            (&["betium"], 0.40),
            (&["lithium"], 0.05),
        ])
        .present("alphium", 0.55)
        .present("betium", 0.40)
        .caused(0, "alphium", 0.55)
        .caused(0, "betium", 0.40);
    let verdict = fixture.verdict();
    // A further reading would part them, so the group is no answer yet.
    assert_eq!(verdict.decision, Decision::Inconclusive);
    assert_eq!(
        verdict.sentence,
        "Most likely alphium or betium: probability 0.95, not decisive."
    );
    let said: Vec<String> = verdict.warnings.iter().map(Warning::message).collect();
    assert!(
        said.iter()
            .any(|text| text == "These readings cannot tell alphium and betium apart."),
        "{said:?}"
    );
    let places: Vec<f64> = verdict
        .next_readings
        .iter()
        .map(|next| next.wavelength_nm)
        .collect();
    assert!(
        places.contains(&450.0) && places.contains(&640.0),
        "{places:?}"
    );
    assert_eq!(verdict.next_readings[0].separates, ["alphium", "betium"]);
}

#[test]
fn substances_that_explain_different_readings_are_no_twins() {
    let fixture = Fixture::new("520.05,0.3,\n450,0.3,\n")
        .compositions(&[(&["alphium"], 0.55), (&["betium"], 0.40)])
        .present("alphium", 0.55)
        .present("betium", 0.40)
        .caused(0, "alphium", 0.55)
        .caused(0, "betium", 0.40)
        .caused(1, "betium", 0.40);
    let verdict = fixture.verdict();
    assert_eq!(verdict.either_or, []);
    assert_eq!(
        verdict.sentence,
        "Most likely alphium: probability 0.55, not decisive."
    );
}

#[test]
fn a_known_mixture_goes_by_its_name() {
    let fixture = Fixture::new("460.9,0.3,\n589.2,0.3,\n670.8,0.3,\n")
        .compositions(&[(&["strontium", "lithium", "sodium"], 0.95)])
        .present("strontium", 0.99)
        .present("lithium", 0.98)
        .present("sodium", 0.97);
    let sentence = fixture.verdict().sentence;
    assert!(
        sentence
            .contains("strontium and lithium, with sodium (together met as red distress flare)"),
        "{sentence}"
    );
}

#[test]
fn the_answer_without_the_ubiquitous_is_said_when_it_differs() {
    let fixture =
        strontium_with_sodium().without_ubiquitous(&[(&["lithium"], 0.6), (&["strontium"], 0.4)]);
    assert!(fixture.codes().contains(&"with-and-without-ubiquitous"));
    assert!(
        !strontium_with_sodium()
            .codes()
            .contains(&"with-and-without-ubiquitous")
    );
    let verdict = strontium_with_sodium().verdict();
    assert_eq!(verdict.without_ubiquitous[0].described, "strontium");
}

#[test]
fn a_substance_on_one_reading_is_said_with_where_else_to_look() {
    let fixture = strontium_with_sodium();
    let strontium = fixture.candidate("strontium");
    let fixture = fixture.but(|inference| inference.presence[strontium].rests_on_one_line = true);
    let verdict = fixture.verdict();
    let warning = verdict
        .warnings
        .iter()
        .find(|warning| warning.code() == "rests-on-one-line");
    assert_eq!(
        warning.map(Warning::message).as_deref(),
        Some("Strontium rests on one reading, 460.9 ± 0.3 nm.")
    );
    assert_eq!(
        warning.map(Warning::next_step).as_deref(),
        Some("Look for strontium at 659.4 nm, with the slit wider or longer.")
    );
}

#[test]
fn what_cannot_show_is_not_excluded() {
    let fixture = strontium_with_sodium();
    let zinc = fixture.candidate("zinc");
    let fixture = fixture.but(|inference| inference.presence[zinc].testable = 0.01);
    let verdict = fixture.verdict();
    let warning = verdict
        .warnings
        .iter()
        .find(|warning| warning.code() == "cannot-be-tested");
    assert_eq!(
        warning.map(Warning::message).as_deref(),
        Some(
            "Cannot be tested here, not excluded (chance of showing at all in brackets): zinc (0.01)."
        )
    );
}

#[test]
fn what_was_asked_for_and_has_no_emitter_here_cannot_be_tested() {
    let overrides = SetupOverrides {
        source: Some(crate::library::SourceKind::Flame),
        candidates: Some(Candidates::Named(vec!["Sr".into(), "Zn".into()])),
        ..SetupOverrides::default()
    };
    let mut fixture = Fixture::with("460.9,0.3,\n", overrides)
        .compositions(&[(&["strontium"], 0.97)])
        .caused(0, "strontium", 0.97);
    let zinc = fixture.lineup.weighed.remove(1);
    fixture.inference.presence.remove(1);
    fixture.lineup.not_excited.push(zinc.substance);
    assert!(
        fixture.codes().contains(&"cannot-be-tested"),
        "{:?}",
        fixture.codes()
    );
}

#[test]
fn a_shift_and_wrong_uncertainties_are_said() {
    let due = |mean: f64, rms: Option<f64>| {
        let fixture = strontium_with_sodium().but(|inference| {
            inference.offset_nm = Posterior { mean, sd: 0.1 };
            inference.residual_rms_sigma = rms;
        });
        let codes = fixture.codes();
        [
            "common-shift",
            "uncertainties-too-small",
            "uncertainties-too-large",
        ]
        .map(|code| codes.contains(&code))
    };
    let stated = strontium_with_sodium().setup.offset_nm();
    assert_eq!(due(2.4 * stated, Some(1.0)), [false, false, false]);
    assert_eq!(due(-2.6 * stated, Some(1.0)), [true, false, false]);
    assert_eq!(due(0.0, Some(2.1)), [false, true, false]);
    // Three explained readings are too few to call the uncertainties too large.
    assert_eq!(due(0.0, Some(0.1)), [false, false, false]);
    assert_eq!(due(0.0, None), [false, false, false]);
}

#[test]
fn a_leader_that_hangs_on_the_priors_is_said() {
    let fixture =
        strontium_with_sodium().but(|inference| inference.leader_with_priors_halved.clear());
    let verdict = fixture.verdict();
    let warning = verdict
        .warnings
        .iter()
        .find(|warning| warning.code() == "prior-sensitivity");
    assert_eq!(
        warning.map(Warning::message).as_deref(),
        Some(
            "The answer depends on how common the substances are held to be: none of the weighed substances \
             if half as common, strontium, with sodium if twice as common."
        )
    );
}

#[test]
fn rows_from_memory_are_named() {
    let verdict = strontium_with_sodium().verdict();
    let warning = verdict
        .warnings
        .iter()
        .find(|warning| warning.code() == "rests-on-memory");
    let Some(Warning::RestsOnMemory { rows }) = warning else {
        panic!("not said: {:?}", verdict.warnings)
    };
    assert_eq!(rows.len(), 1);
    assert_eq!(
        (rows[0].table.as_str(), rows[0].row),
        ("features/strontium.csv", 3)
    );
    assert_eq!(
        (rows[0].emitter.as_str(), rows[0].what),
        ("SrOH", "position")
    );
}

#[test]
fn half_the_wavelength_of_a_strong_line_hints_at_another_order() {
    // 335.4 nm would be lithium at 670.78 nm taken for the second order.
    let rows = "670.8,0.3,\n335.4,0.3,\n";
    let codes = |instrument: InstrumentKind| {
        let overrides = SetupOverrides {
            instrument: Some(instrument),
            range_nm: Some([300.0, 720.0]),
            response: crate::setup::NamedResponse::built_in("flat"),
            ..SetupOverrides::default()
        };
        let fixture = Fixture::with(rows, overrides)
            .compositions(&[(&["lithium"], 0.97)])
            .present("lithium", 0.97)
            .caused(1, "lithium", 0.97);
        fixture.codes()
    };
    assert!(codes(InstrumentKind::Goniometer).contains(&"possible-order-mix-up"));
    assert!(
        !codes(InstrumentKind::Prism).contains(&"possible-order-mix-up"),
        "a prism has no orders"
    );
}

#[test]
fn every_warning_says_what_to_do_next() {
    let fixture = Fixture::new("460.9,,\n500,0.3,\n550,0.3,\n1000,0.3,\n")
        .compositions(&[(&["lithium"], 0.5)]);
    let warnings = fixture.verdict().warnings;
    assert!(warnings.len() >= 4, "{warnings:?}");
    for warning in &warnings {
        assert!(warning.message().ends_with('.'), "{warning:?}");
        assert!(warning.next_step().ends_with('.'), "{warning:?}");
        assert!(
            warning
                .code()
                .chars()
                .all(|letter| letter.is_ascii_lowercase() || letter == '-')
        );
    }
}

#[test]
fn evidence_that_points_nowhere_is_no_reason_to_fail() {
    let fixture = strontium_with_sodium().but(|inference| {
        inference.compositions[0].members.push(999);
        inference.readings[0].causes[0].feature = 999;
        inference.readings.truncate(2);
        inference.presence.truncate(1);
        inference.missing[0].candidate = 999;
    });
    let verdict = fixture.verdict();
    assert_eq!(verdict.readings.len(), 3);
    assert_eq!(verdict.readings[2].standing, Standing::Unexplained);
}
