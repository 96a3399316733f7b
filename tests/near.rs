//! Near coincidences: told apart where that can be done, said to be inseparable where it cannot.

use serde::Deserialize;
use serde_json::Value;
use std::collections::BTreeSet;
use std::io::Write;
use std::path::Path;
use std::process::{Command, Stdio};

type Outcome = Result<(), Box<dyn std::error::Error>>;

#[derive(Deserialize)]
struct Cases {
    case: Vec<Case>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Case {
    name: String,
    flags: Vec<String>,
    /// (wavelength, standard uncertainty), nm.
    readings: Vec<(f64, f64)>,
    #[serde(default = "yes")]
    separate: bool,
    leader: Option<BTreeSet<String>>,
}

fn yes() -> bool {
    true
}

fn identify(case: &Case) -> Result<Value, Box<dyn std::error::Error>> {
    let mut table = "wavelength_nm,uncertainty_nm\n".to_owned();
    for (nm, u) in &case.readings {
        table.push_str(&format!("{nm},{u}\n"));
    }
    let mut child = Command::new(env!("CARGO_BIN_EXE_linstock"))
        .args(["identify", "--format", "json", "--exit-zero"])
        .args(&case.flags)
        .arg("-")
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()?;
    child
        .stdin
        .take()
        .ok_or("no standard input")?
        .write_all(table.as_bytes())?;
    let output = child.wait_with_output()?;
    Ok(serde_json::from_slice(&output.stdout)?)
}

#[test]
fn near_coincidences_are_told_apart_or_said_to_be_inseparable() -> Outcome {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/cases/near.toml");
    let cases: Cases = toml::from_str(&std::fs::read_to_string(path)?)?;
    for case in &cases.case {
        let report = identify(case).map_err(|e| format!("{}: {e}", case.name))?;
        let sample = &report["samples"][0];
        let warned = sample["warnings"]
            .as_array()
            .into_iter()
            .flatten()
            .any(|w| w["code"] == "cannot-separate");
        assert_eq!(warned, !case.separate, "{}: {sample:#}", case.name);
        if let Some(leader) = &case.leader {
            let found: BTreeSet<String> = sample["compositions"][0]["substances"]
                .as_array()
                .into_iter()
                .flatten()
                .filter_map(|s| s.as_str().map(str::to_owned))
                .collect();
            assert_eq!(&found, leader, "{}", case.name);
            assert_eq!(sample["decision"], "decisive", "{}: {sample:#}", case.name);
        }
    }
    Ok(())
}
