//! The program from outside: exit status, streams, files.

use std::io::Write;
use std::process::{Command, Output, Stdio};

type Outcome = Result<(), Box<dyn std::error::Error>>;

const CLEAR: &str = "wavelength_nm,uncertainty_nm\n460.8,0.3\n606.1,0.5\n589.2,0.3\n";

/// Runs `linstock identify -` on a table, without the colours of whoever runs the tests.
fn identify(table: &str, flags: &[&str]) -> Result<Output, Box<dyn std::error::Error>> {
    let mut child = Command::new(env!("CARGO_BIN_EXE_linstock"))
        .arg("identify")
        .args(flags)
        .arg("-")
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()?;
    // A program that refuses its flags does not read on.
    let _ = child
        .stdin
        .take()
        .ok_or("no standard input")?
        .write_all(table.as_bytes());
    Ok(child.wait_with_output()?)
}

fn status(table: &str, flags: &[&str]) -> Result<Option<i32>, Box<dyn std::error::Error>> {
    Ok(identify(table, flags)?.status.code())
}

#[test]
fn a_refused_sample_is_listed_and_the_rest_is_reported() -> Outcome {
    let table = "sample,wavelength_nm,uncertainty_nm\na,460.8,0.3\na,606.1,0.5\nb,58 9.0,0.3\n";
    let output = identify(table, &[])?;
    let text = String::from_utf8(output.stdout)?;
    assert_eq!(output.status.code(), Some(65), "{text}");
    assert!(
        text.contains("Refused\n") && text.contains("58 9.0"),
        "{text}"
    );
    assert!(text.contains("trontium"), "{text}");
    assert!(!text.contains('\u{1b}'), "colour in a pipe");
    Ok(())
}

#[test]
fn nothing_to_read_is_bad_data() -> Outcome {
    for table in ["", "\n\n", "wavelength_nm\n", "# only a comment\n"] {
        assert_eq!(status(table, &[])?, Some(65), "{table:?}");
    }
    Ok(())
}

fn text(table: &str, flags: &[&str]) -> Result<String, Box<dyn std::error::Error>> {
    Ok(String::from_utf8(identify(table, flags)?.stdout)?)
}

/// Sodium D 588.995 and 589.592 nm (NIST ASD) are not resolved by a hand spectroscope.
#[test]
fn sodium_before_a_white_lamp_is_a_dark_line() -> Outcome {
    let table = "wavelength_nm,uncertainty_nm\n589.2,1.5\n";
    let found = text(table, &["--instrument", "prism", "--source", "absorption"])?;
    assert!(found.starts_with("Sodium: probability"), "{found}");
    Ok(())
}

/// A filament: one maximum hundreds of nanometres wide (common practice, no source).
#[test]
fn a_continuous_spectrum_is_said_to_be_one() -> Outcome {
    let table = "wavelength_nm,uncertainty_nm,form,width_nm\n620,5,band,300\n";
    for source in ["flame", "discharge", "absorption"] {
        let found = text(table, &["--instrument", "ccd", "--source", source])?;
        assert!(found.starts_with("A continuous spectrum"), "{found}");
    }
    Ok(())
}

#[test]
fn usage_missing_input_and_unwritable_output_have_their_own_status() -> Outcome {
    assert_eq!(status(CLEAR, &["--range", "700:400"])?, Some(2));
    assert_eq!(status(CLEAR, &["--no-such-flag"])?, Some(2));
    assert_eq!(status(CLEAR, &["--candidates", "unobtainium"])?, Some(2));
    assert_eq!(status(CLEAR, &["--resolution", "-1"])?, Some(2));
    assert_eq!(status(CLEAR, &["-"])?, Some(2), "standard input twice");
    assert_eq!(status(CLEAR, &["/no/such/file.csv"])?, Some(66));
    assert_eq!(status(CLEAR, &["--setup", "/no/such/file.toml"])?, Some(66));
    assert_eq!(status(CLEAR, &["--library", "/no/such/folder"])?, Some(66));
    assert_eq!(
        status(CLEAR, &["--output", "/no/such/folder/report"])?,
        Some(73)
    );
    Ok(())
}

#[test]
fn exit_zero_hides_what_is_no_fault() -> Outcome {
    let unknown = "wavelength_nm,uncertainty_nm\n431.7,0.05\n477.7,0.05\n533.3,0.05\n";
    let instrument = ["--instrument", "ccd"];
    let code = status(unknown, &instrument)?;
    assert!(matches!(code, Some(10 | 11)), "{code:?}");
    assert_eq!(
        status(unknown, &[&instrument[..], &["--exit-zero"]].concat())?,
        Some(0)
    );
    Ok(())
}

#[test]
fn json_goes_to_a_file_whole_and_names_the_input() -> Outcome {
    let folder = tempfile::tempdir()?;
    let path = folder.path().join("report.json");
    let output = identify(
        CLEAR,
        &[
            "--format",
            "json",
            "--output",
            path.to_str().ok_or("odd path")?,
        ],
    )?;
    assert!(output.stdout.is_empty());
    let json: serde_json::Value = serde_json::from_str(&std::fs::read_to_string(&path)?)?;
    assert_eq!(json["schema"], "linstock.identify/1");
    assert_eq!(json["inputs"][0]["path"], "-");
    assert_eq!(
        json["samples"][0]["readings"].as_array().map(Vec::len),
        Some(3)
    );
    Ok(())
}

#[test]
fn the_same_input_gives_the_same_bytes_on_any_number_of_threads() -> Outcome {
    let mut table = "sample,wavelength_nm,uncertainty_nm\n".to_owned();
    for sample in 0..8 {
        table.push_str(&format!(
            "s{sample},460.8,0.3\ns{sample},606.{sample},0.5\n"
        ));
    }
    let on = |threads: &str| -> Result<Vec<u8>, Box<dyn std::error::Error>> {
        let folder = tempfile::tempdir()?;
        let path = folder.path().join("class.csv");
        std::fs::write(&path, &table)?;
        let mut command = Command::new(env!("CARGO_BIN_EXE_linstock"));
        command
            .current_dir(folder.path())
            .env("RAYON_NUM_THREADS", threads);
        Ok(command
            .args(["identify", "class.csv", "--format", "json"])
            .output()?
            .stdout)
    };
    let once = on("1")?;
    assert!(!once.is_empty());
    assert!(once == on("4")?, "the reports differ");
    Ok(())
}

#[test]
fn a_reader_that_has_seen_enough_is_no_fault() -> Outcome {
    let mut child = Command::new(env!("CARGO_BIN_EXE_linstock"))
        .args(["identify", "--format", "json", "-", "--exit-zero"])
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()?;
    drop(child.stdout.take());
    child
        .stdin
        .take()
        .ok_or("no standard input")?
        .write_all(CLEAR.as_bytes())?;
    let output = child.wait_with_output()?;
    assert_eq!(
        output.status.code(),
        Some(0),
        "{}",
        String::from_utf8_lossy(&output.stderr)
    );
    Ok(())
}
