//! Every sample, as the program reports it: exit status, leading compositions, warnings, and the
//! whole text and JSON against tests/golden. `UPDATE_GOLDEN=1 cargo test --test samples` writes
//! the golden files anew; look at what changed before keeping it.

use serde::Deserialize;
use serde_json::Value;
use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

type Outcome = Result<(), Box<dyn std::error::Error>>;

/// Columns of a plain terminal.
const TERMINAL: usize = 80;
/// Relative difference allowed between numbers of the JSON: processors round the last digits of
/// exponentials differently.
const SAME_NUMBER: f64 = 1e-5;

#[derive(Deserialize)]
struct Cases {
    sample: Vec<Case>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Case {
    readings: String,
    setup: String,
    status: i32,
    /// Per sample of the file: the substances of the leading composition.
    leaders: Vec<BTreeSet<String>>,
    /// Codes of warnings that some sample of the file must carry.
    #[serde(default)]
    warns: Vec<String>,
}

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn cases() -> Result<Vec<Case>, Box<dyn std::error::Error>> {
    let text = std::fs::read_to_string(root().join("tests/cases/samples.toml"))?;
    Ok(toml::from_str::<Cases>(&text)?.sample)
}

fn identify(case: &Case, format: &str) -> Result<Output, Box<dyn std::error::Error>> {
    Ok(Command::new(env!("CARGO_BIN_EXE_linstock"))
        .current_dir(root())
        .arg("identify")
        .arg(format!("samples/{}.csv", case.readings))
        .arg("--setup")
        .arg(format!("samples/{}.toml", case.setup))
        .args(["--format", format])
        .output()?)
}

fn golden(case: &Case, extension: &str) -> PathBuf {
    root()
        .join("tests/golden")
        .join(format!("{}.{extension}", case.readings))
}

/// The golden text of a report; written first where that is asked for.
fn expected(path: &Path, found: &str) -> Result<String, Box<dyn std::error::Error>> {
    if std::env::var_os("UPDATE_GOLDEN").is_some() {
        std::fs::create_dir_all(path.parent().ok_or("no folder")?)?;
        std::fs::write(path, found)?;
    }
    std::fs::read_to_string(path).map_err(|e| format!("{}: {e}", path.display()).into())
}

/// Where two JSON values differ by more than rounding.
fn difference(at: &str, found: &Value, golden: &Value) -> Option<String> {
    match (found, golden) {
        (Value::Object(a), Value::Object(b)) => {
            let keys: BTreeSet<&String> = a.keys().chain(b.keys()).collect();
            keys.into_iter()
                .find_map(|k| {
                    let (x, y) = (a.get(k)?, b.get(k)?);
                    difference(&format!("{at}.{k}"), x, y)
                })
                .or_else(|| (a.len() != b.len()).then(|| format!("{at}: other keys")))
        }
        (Value::Array(a), Value::Array(b)) if a.len() == b.len() => a
            .iter()
            .zip(b)
            .enumerate()
            .find_map(|(i, (x, y))| difference(&format!("{at}[{i}]"), x, y)),
        (Value::Number(a), Value::Number(b)) => {
            let (a, b) = (a.as_f64()?, b.as_f64()?);
            ((a - b).abs() > SAME_NUMBER * (1e-3 + a.abs().max(b.abs())))
                .then(|| format!("{at}: {a} instead of {b}"))
        }
        _ => (found != golden).then(|| format!("{at}: {found} instead of {golden}")),
    }
}

fn leader(sample: &Value) -> BTreeSet<String> {
    sample["compositions"][0]["substances"]
        .as_array()
        .into_iter()
        .flatten()
        .filter_map(|s| s.as_str().map(String::from))
        .collect()
}

fn check(case: &Case) -> Outcome {
    let output = identify(case, "json")?;
    let text = String::from_utf8(output.stdout)?;
    let json: Value = serde_json::from_str(&text)?;
    let name = &case.readings;
    assert_eq!(output.status.code(), Some(case.status), "{name}");

    let samples = json["samples"].as_array().ok_or("no samples")?;
    let leaders: Vec<BTreeSet<String>> = samples.iter().map(leader).collect();
    assert_eq!(leaders, case.leaders, "{name}");
    let warned: BTreeSet<&str> = samples
        .iter()
        .flat_map(|s| s["warnings"].as_array().into_iter().flatten())
        .filter_map(|w| w["code"].as_str())
        .collect();
    for code in &case.warns {
        assert!(
            warned.contains(code.as_str()),
            "{name}: no {code} in {warned:?}"
        );
    }

    let golden_json: Value = serde_json::from_str(&expected(&golden(case, "json"), &text)?)?;
    if let Some(difference) = difference(name, &json, &golden_json) {
        panic!("{difference}");
    }

    let output = identify(case, "text")?;
    let text = String::from_utf8(output.stdout)?;
    assert_eq!(output.status.code(), Some(case.status), "{name}");
    let widest = text.lines().map(|l| l.chars().count()).max().unwrap_or(0);
    assert!(widest <= TERMINAL, "{name}: {widest} columns");
    assert_eq!(text, expected(&golden(case, "txt"), &text)?, "{name}");
    Ok(())
}

#[test]
fn every_sample_is_reported_as_it_should_be() -> Outcome {
    cases()?.iter().try_for_each(check)
}

#[test]
fn every_file_of_the_samples_is_used_and_described() -> Outcome {
    let readme = std::fs::read_to_string(root().join("samples/README.md"))?;
    let cases = cases()?;
    for entry in std::fs::read_dir(root().join("samples"))? {
        let name = entry?.file_name().into_string().map_err(|_| "odd name")?;
        let used = cases
            .iter()
            .any(|c| name == format!("{}.csv", c.readings) || name == format!("{}.toml", c.setup));
        assert!(used || name == "README.md", "{name} is in no case");
        assert!(
            readme.contains(&name) || name == "README.md",
            "{name} is not described"
        );
    }
    Ok(())
}
