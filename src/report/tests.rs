//! Whole reports of evidence made by hand, as snapshots, and what must hold of any of them.

use super::*;
use crate::reading::{Refusal, read_table};
use crate::verdict::Verdict;
use crate::verdict::fixture::{Fixture, small_library, strontium_with_sodium};
use unicode_width::UnicodeWidthStr;

/// A view without what changes from version to version.
fn view(verdicts: &[Verdict], refused: &[Refusal]) -> IdentifyView {
    let library = small_library();
    let setup = strontium_with_sodium().setup;
    let tables = [read_table(
        "bench.csv",
        b"# by hand\nwavelength_nm,colour\n589,yellow\n",
    )];
    let verdicts: Vec<(String, Verdict)> = verdicts
        .iter()
        .map(|verdict| ("bench.csv".to_owned(), verdict.clone()))
        .collect();
    let run = IdentifyRun {
        library: &library,
        setup: &setup,
        tables: &tables,
        verdicts: &verdicts,
        refused,
    };
    let mut view = identify_view(&run);
    view.version = "0.0.0".to_owned();
    view.inputs[0].sha256 = "0123456789abcdef".repeat(4);
    view.library.sha256 = "fedcba9876543210".repeat(4);
    view
}

fn plain_text(view: &IdentifyView, detail: Detail) -> String {
    anstream::adapter::strip_str(&identify_text(view, detail)).to_string()
}

/// Nothing is sure: unexplained readings, a doubtful one, missing lines.
fn doubtful() -> Verdict {
    let mut verdict =
        Fixture::new("460.9,3,\n500,0.3,odd \u{1b}[31mred\n550,0.3,\n589.1,12,\n670.9,0.4,\n")
            .compositions(&[
                (&["lithium", "sodium"], 0.62),
                (&["lithium", "strontium"], 0.3),
                (&[], 0.08),
            ])
            .without_ubiquitous(&[(&["lithium"], 0.9), (&[], 0.1)])
            .present("lithium", 0.92)
            .present("sodium", 0.6)
            .caused(3, "sodium", 0.6)
            .caused(4, "lithium", 0.9)
            .missed("lithium", 610.36, 0.3)
            .verdict();
    verdict.sample = "lamp \u{202e}7".to_owned();
    verdict
}

fn refusal() -> Refusal {
    Refusal {
        input: "bench.csv".to_owned(),
        sample: Some("b".to_owned()),
        row: Some(7),
        column: Some("wavelength_nm".to_owned()),
        text: Some("58 9.0".to_owned()),
        message: "is not a number (did you mean 589.0?)".to_owned(),
    }
}

#[test]
fn text_of_a_decisive_sample() {
    insta::assert_snapshot!(plain_text(
        &view(&[strontium_with_sodium().verdict()], &[]),
        Detail::Full
    ));
}

#[test]
fn text_of_two_samples_and_a_refusal() {
    let verdicts = [strontium_with_sodium().verdict(), doubtful()];
    insta::assert_snapshot!(plain_text(&view(&verdicts, &[refusal()]), Detail::Full));
}

#[test]
fn text_of_answers_only() {
    let verdicts = [strontium_with_sodium().verdict(), doubtful()];
    insta::assert_snapshot!(plain_text(&view(&verdicts, &[refusal()]), Detail::Answers));
}

#[test]
fn json_of_a_doubtful_sample() -> Result<(), serde_json::Error> {
    let json = identify_json(&view(&[doubtful()], &[refusal()]))?;
    insta::assert_snapshot!(json);
    Ok(())
}

#[test]
fn text_fits_eighty_columns_and_nothing_in_it_acts() {
    let mut long = doubtful();
    long.sample = "a very long name ".repeat(20);
    long.readings[0].notes = vec!["x".repeat(300)];
    long.lanes[0].substance.name = "a substance with quite a name".to_owned();
    let text = plain_text(
        &view(&[long, strontium_with_sodium().verdict()], &[refusal()]),
        Detail::Full,
    );
    for line in text.lines() {
        assert!(line.width() <= 80, "{} columns: {line}", line.width());
        assert_eq!(plain(line), line);
    }
}

#[test]
fn styles_change_no_word() {
    let view = view(&[doubtful()], &[]);
    let styled = identify_text(&view, Detail::Full);
    assert!(styled.contains('\u{1b}'), "there is no style to take away");
    assert!(plain_text(&view, Detail::Full).contains("doubtful"));
}

#[test]
fn json_has_the_promised_keys_and_null_for_the_unknown() -> Result<(), serde_json::Error> {
    let mut verdict = doubtful();
    verdict.compositions[0].log_evidence = None;
    verdict.residual_rms_sigma = Some(f64::NAN);
    let json: serde_json::Value =
        serde_json::from_str(&identify_json(&view(&[verdict], &[refusal()]))?)?;
    assert_eq!(json["schema"], "linstock.identify/1");
    let sample = &json["samples"][0];
    // Keys of interface.md, "The JSON of identify".
    let promised = [
        (&json, "version inputs setup samples refused"),
        (&json["inputs"][0], "path sha256"),
        (
            sample,
            "sample decision compositions untested_mass_bound substances readings missing_lines warnings \
             next_readings cautions",
        ),
        (
            &sample["compositions"][0],
            "rank substances posterior log_evidence",
        ),
        (
            &sample["substances"][0],
            "substance symbol presence_probability physical_presence_probability testable rests_on_one_line",
        ),
        (
            &sample["readings"][0],
            "row rows wavelength_nm uncertainty_nm standing cause other_causes",
        ),
        (
            &sample["readings"][4]["cause"],
            "substance emitter feature_nm residual_nm residual_sigma",
        ),
        (
            &sample["missing_lines"][0],
            "substance emitter wavelength_nm detection_probability",
        ),
        (&sample["warnings"][0], "code message next_step"),
        (
            &sample["next_readings"][0],
            "wavelength_nm information_bits separates",
        ),
        (&json["refused"][0], "input sample row column text message"),
    ];
    for (object, keys) in promised {
        for key in keys.split_whitespace() {
            assert!(object.get(key).is_some(), "{key} is missing from {object}");
        }
    }
    assert!(sample["compositions"][0]["log_evidence"].is_null());
    assert!(sample["residual_rms_sigma"].is_null());
    assert!(sample["readings"][0]["cause"].is_null());
    assert_eq!(sample["sample"], "lamp \u{202e}7", "the name as typed");
    Ok(())
}
