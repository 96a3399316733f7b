//! `linstock library` from outside.

use std::path::Path;
use std::process::{Command, Output};

type Outcome = Result<(), Box<dyn std::error::Error>>;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

fn library(arguments: &[&str]) -> Result<Output, std::io::Error> {
    Command::new(env!("CARGO_BIN_EXE_linstock"))
        .current_dir(root())
        .arg("library")
        .args(arguments)
        .output()
}

fn text(arguments: &[&str]) -> Result<String, Box<dyn std::error::Error>> {
    let output = library(arguments)?;
    assert!(output.status.success(), "{arguments:?}");
    Ok(String::from_utf8(output.stdout)?)
}

#[test]
fn every_row_of_the_tables_is_printed_as_it_stands() -> Outcome {
    let printed = text(&["lines", "--format", "csv"])?;
    let mut reader = csv::Reader::from_reader(printed.as_bytes());
    let header = "emitter,substance,form,wavelength_air_nm,uncertainty_nm,source";
    assert_eq!(
        reader.headers()?.iter().collect::<Vec<_>>().join(","),
        header
    );
    let mut printed: Vec<[String; 4]> = Vec::new();
    for row in reader.records() {
        let row = row?;
        printed.push([&row[0], &row[1], &row[3], &row[5]].map(str::to_owned));
    }
    let mut stored: Vec<[String; 4]> = Vec::new();
    for entry in std::fs::read_dir(root().join("library/features"))? {
        let path = entry?.path();
        let substance = path
            .file_stem()
            .and_then(|s| s.to_str())
            .ok_or("odd name")?;
        let mut table = csv::Reader::from_path(&path)?;
        let column = |name: &str, header: &csv::StringRecord| {
            header
                .iter()
                .position(|h| h == name)
                .ok_or(format!("no {name}"))
        };
        let header = table.headers()?.clone();
        let emitter = column("emitter", &header)?;
        let position = column("wavelength_air_nm", &header)?;
        let source = column("source_position", &header)?;
        for row in table.records() {
            let row = row?;
            let nm: f64 = row[position].parse()?;
            stored.push([
                row[emitter].to_owned(),
                substance.to_owned(),
                nm.to_string(),
                row[source].to_owned(),
            ]);
        }
    }
    printed.sort();
    stored.sort();
    assert_eq!(printed.len(), stored.len());
    assert_eq!(printed, stored);
    Ok(())
}

#[test]
fn what_lies_near_comes_nearest_first() -> Outcome {
    let json = text(&[
        "lines", "--near", "667.82", "--within", "0.05", "--format", "json",
    ])?;
    let rows: serde_json::Value = serde_json::from_str(&json)?;
    let rows = rows.as_array().ok_or("no rows")?;
    let distances: Vec<f64> = rows
        .iter()
        .filter_map(|r| r["wavelength_air_nm"].as_f64())
        .map(|nm| (nm - 667.82).abs())
        .collect();
    assert!(distances.is_sorted() && distances.iter().all(|d| *d <= 0.05));
    // Helium 667.815 and neon 667.828: NIST Atomic Spectra Database.
    for emitter in ["He I", "Ne I"] {
        assert!(rows.iter().any(|r| r["emitter"] == emitter), "{emitter}");
    }
    Ok(())
}

#[test]
fn a_page_is_as_it_was_and_fits_a_terminal() -> Outcome {
    for name in ["strontium", "helium", "room light"] {
        let page = text(&["show", name])?;
        let widest = page.lines().map(|l| l.chars().count()).max().unwrap_or(0);
        assert!(widest <= 80, "{name}: {widest} columns");
        let golden = root().join(format!("tests/golden/show_{}.txt", name.replace(' ', "_")));
        if std::env::var_os("UPDATE_GOLDEN").is_some() {
            std::fs::write(&golden, &page)?;
        }
        assert_eq!(page, std::fs::read_to_string(golden)?, "{name}");
    }
    Ok(())
}

#[test]
fn names_symbols_and_formulas_lead_to_one_page() -> Outcome {
    let page = text(&["show", "strontium"])?;
    for name in ["Sr", "SrCl2", "STRONTIUM"] {
        assert_eq!(text(&["show", name])?, page);
    }
    let output = library(&["show", "strontim"])?;
    assert_eq!(output.status.code(), Some(2));
    assert!(String::from_utf8(output.stderr)?.contains("strontium"));
    Ok(())
}

#[test]
fn every_substance_is_listed() -> Outcome {
    let csv = text(&["list", "--format", "csv"])?;
    let count = include_str!("../library/substances.csv").lines().count();
    assert_eq!(csv.lines().count(), count);
    let list = text(&["list"])?;
    assert!(list.lines().all(|l| l.chars().count() <= 80));
    Ok(())
}

#[test]
fn a_folder_is_checked_and_every_fault_has_its_row() -> Outcome {
    let good = library(&["check", "--alone", "library"])?;
    assert!(good.status.success());
    let folder = tempfile::tempdir()?;
    std::fs::write(
        folder.path().join("lists.csv"),
        "list,substance\nmine,lithium\nmine,unobtainium\n",
    )?;
    let bad = library(&["check", &folder.path().to_string_lossy()])?;
    assert_eq!(bad.status.code(), Some(65));
    let message = String::from_utf8(bad.stderr)?;
    assert!(
        message.contains("row 3") && message.contains("unobtainium"),
        "{message}"
    );
    assert_eq!(
        library(&["check", "no/such/folder"])?.status.code(),
        Some(66)
    );
    Ok(())
}

#[test]
fn wrong_numbers_are_refused() -> Outcome {
    for wrong in [
        &["lines", "--near", "589", "--within", "0"][..],
        &["lines", "--within", "2"],
        &["lines", "--near", "five"],
        &["show", "Sr", "--within", "nan"],
    ] {
        assert_eq!(library(wrong)?.status.code(), Some(2), "{wrong:?}");
    }
    Ok(())
}

/// A lamp that the library does not know is named once it is enrolled, and not before.
#[test]
fn an_enrolled_lamp_is_found_again() -> Outcome {
    let folder = tempfile::tempdir()?;
    let into = folder.path().join("own");
    let into = into.to_string_lossy();
    let lamp = "samples/bay_8.csv";
    let setup = ["--setup", "samples/ccd.toml"];
    let enrol = |name: &str, more: &[&str]| {
        library(
            &[
                &["enrol", lamp, "--name", name, "--into", &into][..],
                &setup,
                more,
            ]
            .concat(),
        )
    };
    let output = enrol("Bay 8 lamp", &["--contains", "Hg"])?;
    let said = String::from_utf8(output.stdout)?;
    assert!(output.status.success(), "{said}");
    assert!(
        said.starts_with("Cautions") && said.contains("ercury"),
        "{said}"
    );

    let known = Command::new(env!("CARGO_BIN_EXE_linstock"))
        .current_dir(root())
        .args([
            "identify",
            lamp,
            "--setup",
            "samples/ccd.toml",
            "--candidates",
            "everything",
        ])
        .args(["--library", &into, "--format", "json"])
        .output()?;
    let report: serde_json::Value = serde_json::from_slice(&known.stdout)?;
    let leader = &report["samples"][0]["compositions"][0]["substances"];
    assert_eq!(leader, &serde_json::json!(["bay-8-lamp"]));
    assert_eq!(known.status.code(), Some(0));

    let checked = library(&["check", &into])?;
    assert!(checked.status.success());
    assert_eq!(enrol("Bay 8 lamp", &[])?.status.code(), Some(65));
    assert!(enrol("Bay 8 lamp", &["--replace"])?.status.success());
    assert_eq!(enrol("helium", &[])?.status.code(), Some(2));
    assert_eq!(enrol("??", &[])?.status.code(), Some(65));
    Ok(())
}

#[test]
fn what_cannot_be_enrolled_leaves_no_folder() -> Outcome {
    let folder = tempfile::tempdir()?;
    let into = folder.path().join("own");
    for (readings, status) in [
        ("samples/empty.csv", 65),
        ("samples/class.csv", 2),
        ("no/such.csv", 66),
    ] {
        let path = into.to_string_lossy();
        let arguments = ["enrol", readings, "--name", "x", "--into", &path];
        assert_eq!(
            library(&arguments)?.status.code(),
            Some(status),
            "{readings}"
        );
        assert!(!into.exists(), "{readings}");
    }
    Ok(())
}

/// The dark lines of daylight have their handbook places (Fraunhofer's letters, nm, from memory).
#[test]
fn fraunhofer_lines_are_where_handbooks_have_them() -> Outcome {
    let printed = text(&["lines", "--format", "json"])?;
    let rows: serde_json::Value = serde_json::from_str(&printed)?;
    let rows = rows.as_array().ok_or("no rows")?;
    for (letter, nm, emitter, within) in [
        ("A", 759.37, "O2", 0.8),
        ("B", 686.72, "O2", 0.7),
        ("C", 656.28, "H I", 0.01),
        ("D1", 589.59, "Na I", 0.01),
        ("D2", 589.00, "Na I", 0.01),
        ("E", 527.04, "Fe I", 0.01),
        ("b", 518.36, "Mg I", 0.01),
        ("F", 486.13, "H I", 0.01),
        ("G", 430.79, "Fe I", 0.01),
        ("H", 396.85, "Ca II", 0.01),
        ("K", 393.37, "Ca II", 0.01),
    ] {
        let there = rows.iter().any(|r| {
            let at = r["wavelength_air_nm"].as_f64().unwrap_or(f64::NAN);
            r["emitter"] == emitter
                && r["strength_absorption_dex"].is_number()
                && (at - nm).abs() <= within
        });
        assert!(there, "{letter}: no {emitter} near {nm}");
    }
    Ok(())
}

#[test]
fn computed_strengths_of_the_library_are_those_of_their_rules() -> Outcome {
    let printed = text(&["compute", "library"])?;
    let count = printed.split(' ').nth(1).ok_or("no count")?;
    assert!(count.parse::<usize>()? > 3500, "{printed}");
    assert!(printed.contains("every other one"), "{printed}");
    Ok(())
}

#[test]
fn a_strength_that_does_not_follow_is_named_and_mended() -> Outcome {
    let folder = tempfile::tempdir()?;
    let features = folder.path().join("features");
    std::fs::create_dir(&features)?;
    let sound = std::fs::read_to_string(root().join("library/features/lithium.csv"))?;
    // Li I 274.1 is as faint in a flame as its rate and level say.
    let row = sound
        .lines()
        .find(|line| line.contains("flame-thermal-2200K") && !line.contains("flame-growth"))
        .ok_or("no thermal row")?;
    let strength = row.split(',').nth(6).ok_or("no strength")?;
    let wrong = sound.replacen(row, &row.replacen(strength, "1.25", 1), 1);
    let table = features.join("lithium.csv");
    std::fs::write(&table, &wrong)?;

    let path = folder.path().to_str().ok_or("odd path")?;
    let output = library(&["compute", path])?;
    assert_eq!(output.status.code(), Some(65));
    let printed = String::from_utf8(output.stdout)?;
    assert!(
        printed.contains("1.25") && printed.contains(strength),
        "{printed}"
    );
    assert_eq!(std::fs::read_to_string(&table)?, wrong);

    assert!(library(&["compute", path, "--write"])?.status.success());
    assert_eq!(std::fs::read_to_string(&table)?, sound);
    assert!(library(&["compute", path])?.status.success());
    Ok(())
}
