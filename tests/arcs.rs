//! Recorded arc lamps, weighed against the whole library: every lamp that burned is found, and nothing that did not.
//!
//! The peak lists and what burned come from outside: see `tests/reference/recipe.md`.

use std::collections::BTreeMap;
use std::path::Path;
use std::process::Command;

type Outcome = Result<(), Box<dyn std::error::Error>>;

/// A lamp that burned is present with at least this probability.
const FOUND: f64 = 0.9;
/// Whatever did not burn stays at or below this probability.
const FALSELY_FOUND: f64 = 0.5;

/// The probability that each substance caused at least one reading of the recorded lamp `name`.
fn presences(name: &str) -> Result<BTreeMap<String, f64>, Box<dyn std::error::Error>> {
    let reference = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference");
    let output = Command::new(env!("CARGO_BIN_EXE_linstock"))
        .arg("identify")
        .arg(reference.join(format!("{name}.csv")))
        .arg("--setup")
        .arg(reference.join(format!("{name}.toml")))
        .args(["--candidates", "everything"])
        .args(["--format", "json", "--exit-zero"])
        .output()?;
    if !output.status.success() {
        return Err(String::from_utf8_lossy(&output.stderr).into_owned().into());
    }
    let report: serde_json::Value = serde_json::from_slice(&output.stdout)?;
    let rows = report["samples"][0]["substances"]
        .as_array()
        .ok_or("no substances in the report")?;
    rows.iter()
        .map(|row| {
            let substance = row["substance"].as_str().ok_or("no name")?;
            let presence = row["presence_probability"]
                .as_f64()
                .ok_or("no probability")?;
            Ok((substance.to_owned(), presence))
        })
        .collect()
}

/// `burned` are the lamps of the record; `beside` may show as well, for the reason given with each test.
fn check(name: &str, burned: &[&str], beside: &[&str]) -> Outcome {
    let presences = presences(name)?;
    for substance in burned {
        let presence = presences.get(*substance).copied().unwrap_or(0.0);
        assert!(
            presence > FOUND,
            "{name}: {substance} burned, but is given {presence}: {presences:?}"
        );
    }
    for (substance, presence) in &presences {
        if burned.contains(&substance.as_str()) || beside.contains(&substance.as_str()) {
            continue;
        }
        assert!(
            *presence <= FALSELY_FOUND,
            "{name}: {substance} did not burn, but is given {presence}: {presences:?}"
        );
    }
    Ok(())
}

#[test]
fn cadmium_helium_and_mercury_are_found() -> Outcome {
    check("arc_kastb_cd_he_hg", &["cadmium", "helium", "mercury"], &[])
}

/// The filling gases of the lamps leave their strongest lines of the range: argon 415.86 and 420.07, neon 534.11 and 540.06.
#[test]
fn cadmium_mercury_and_zinc_are_found() -> Outcome {
    check(
        "arc_lrisb_cd_hg_zn",
        &["cadmium", "mercury", "zinc"],
        &["argon", "neon"],
    )
}

/// Cadmium 643.85 and zinc 636.23 show beside the five lamps that were listed.
#[cfg(feature = "long-tests")]
#[test]
fn five_lamps_at_once_are_found() -> Outcome {
    check(
        "arc_lrisr_ar_hg_kr_ne_xe",
        &["argon", "krypton", "mercury", "neon", "xenon"],
        &["cadmium", "zinc"],
    )
}
