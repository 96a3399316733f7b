//! Tables of readings: cases as file pairs, and properties of the reader.

use linstock::reading::{
    ObservedForm, Position, Reading, Refusal, Sample, Strength, StrengthWord, Table, TableRemark,
    read_table,
};
use proptest::prelude::*;
use serde_json::{Value, json};
use std::fmt::Write;
use std::path::{Path, PathBuf};

fn case_folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/cases/table")
}

/// Every `NAME.csv` reads as `NAME.expected.json` says. The expected files were judged one by one
/// against the rules for a readings file; there is no outside source.
#[test]
fn cases() {
    let mut names: Vec<PathBuf> = std::fs::read_dir(case_folder())
        .expect("the folder of cases")
        .map(|entry| entry.expect("an entry").path())
        .filter(|path| path.extension().is_some_and(|extension| extension == "csv"))
        .collect();
    names.sort();
    assert!(names.len() >= 30, "only {} cases found", names.len());
    let faults: Vec<String> = names.iter().filter_map(|path| check(path).err()).collect();
    assert!(faults.is_empty(), "{}", faults.join("\n\n"));
}

/// No expected file stands without its table.
#[test]
fn no_expectation_without_a_case() {
    for entry in std::fs::read_dir(case_folder()).expect("the folder of cases") {
        let path = entry.expect("an entry").path();
        let name = path
            .file_name()
            .expect("a name")
            .to_string_lossy()
            .into_owned();
        if let Some(stem) = name.strip_suffix(".expected.json") {
            assert!(
                case_folder().join(format!("{stem}.csv")).exists(),
                "{name} has no table"
            );
        }
    }
}

fn check(path: &Path) -> Result<(), String> {
    let name = path
        .file_name()
        .expect("a name")
        .to_string_lossy()
        .into_owned();
    let table = read_table(
        &name,
        &std::fs::read(path).map_err(|e| format!("{name}: {e}"))?,
    );
    let actual = view(&table);
    let shown = serde_json::to_string_pretty(&actual).expect("a view");
    let expected = std::fs::read_to_string(path.with_extension("expected.json"))
        .map_err(|e| format!("{name}: expected file: {e}; the table reads as\n{shown}"))?;
    let expected: Value = serde_json::from_str(&expected).map_err(|e| format!("{name}: {e}"))?;
    if actual == expected {
        return Ok(());
    }
    Err(format!(
        "{name} reads as\n{shown}\ninstead of\n{expected:#}"
    ))
}

/// What a case compares: everything but the digest. Absent members are left out.
fn view(table: &Table) -> Value {
    let remarks = table.remarks.iter().map(|remark| match remark {
        TableRemark::UnknownColumn { column } => format!("unknown: {column}"),
        TableRemark::UnusedColumn { column } => format!("unused: {column}"),
    });
    let dialect = &table.dialect;
    json!({
        "dialect": format!("{}, {:?}, {:?}", dialect.encoding, dialect.separator, dialect.decimal_sign),
        "comments": table.comments,
        "remarks": remarks.collect::<Vec<String>>(),
        "samples": table.samples.iter().map(|sample| json!({
            "sample": sample.name,
            "readings": sample.readings.iter().map(reading_view).collect::<Vec<Value>>(),
        })).collect::<Vec<Value>>(),
        "refused": table.refused.iter().map(refusal_view).collect::<Vec<Value>>(),
        "refused_samples": table.refused_samples,
    })
}

fn refusal_view(refusal: &Refusal) -> Value {
    json!({
        "sample": refusal.sample,
        "text": refusal.text,
        "message": refusal.to_string(),
    })
}

fn reading_view(reading: &Reading) -> Value {
    let position = match reading.position {
        Position::Nanometre(value) => format!("{value} nm"),
        Position::Angstrom(value) => format!("{value} angstrom"),
        Position::PerCentimetre(value) => format!("{value} cm-1"),
    };
    let strength = reading.strength.map(|strength| match strength {
        Strength::Number(value) => json!(value),
        Strength::Word(word) => json!(format!("{word:?}").to_lowercase()),
    });
    let mut view = json!({
        "row": reading.row,
        "position": position,
        "uncertainty": reading.uncertainty,
        "strength": strength,
        "strength_uncertainty_dex": reading.strength_uncertainty_dex,
        "form": reading.form.map(|form| format!("{form:?}").to_lowercase()),
        "width_nm": reading.width_nm,
        "saturated": reading.saturated.then_some(true),
        "order": Some(reading.order).filter(|order| *order != 1),
        "repeat_of": reading.repeat_of,
        "observer": reading.observer,
        "label": reading.label,
        "note": reading.note,
    });
    if let Some(members) = view.as_object_mut() {
        members.retain(|_, value| !value.is_null());
    }
    view
}

/// How a table is written for the round trip.
#[derive(Debug, Clone, Copy)]
struct Writing {
    encoding: &'static str,
    separator: char,
    decimal: char,
    line_end: &'static str,
    quote_everything: bool,
    unit: usize,
}

fn writings() -> impl Strategy<Value = Writing> {
    (
        prop::sample::select(vec![
            "UTF-8",
            "UTF-8 with BOM",
            "UTF-16LE",
            "UTF-16BE",
            "Windows-1252",
        ]),
        prop::sample::select(vec![',', ';', '\t']),
        prop::sample::select(vec!['.', ',']),
        prop::sample::select(vec!["\n", "\r\n", "\r"]),
        any::<bool>(),
        0usize..3,
    )
        .prop_map(
            |(encoding, separator, decimal, line_end, quote_everything, unit)| Writing {
                encoding,
                separator,
                decimal,
                line_end,
                quote_everything,
                unit,
            },
        )
}

const POSITION_COLUMNS: [(&str, &str); 3] = [
    ("wavelength_nm", "uncertainty_nm"),
    ("wavelength_angstrom", "uncertainty_angstrom"),
    ("wavenumber_cm-1", "uncertainty_cm-1"),
];

fn readings() -> impl Strategy<Value = Vec<(u8, Reading)>> {
    let text = || prop::option::of("[a-zé,;\"#.]([a-zé,;\" \t#.0-9]{0,8}[a-zé,;\"#.])?");
    let reading = (
        (
            0u8..3,
            5_000.0f64..20_000.0,
            prop::option::of(1e-3f64..10.0),
            prop::option::of(1e-6f64..1e9),
        ),
        (
            prop::option::of(0.01f64..3.0),
            prop::option::of(any::<bool>()),
            prop::option::of(1e-3f64..50.0),
        ),
        (any::<bool>(), 1u32..9, text(), text()),
    )
        .prop_map(
            |(
                (sample, position, uncertainty, strength),
                (dex, band, width),
                (saturated, order, label, note),
            )| {
                let reading = Reading {
                    row: 0,
                    // Within the limits of every unit once divided by ten for nm.
                    position: Position::Angstrom(position),
                    uncertainty,
                    strength: strength.map(Strength::Number),
                    strength_uncertainty_dex: dex,
                    form: band.map(|band| {
                        if band {
                            ObservedForm::Band
                        } else {
                            ObservedForm::Line
                        }
                    }),
                    width_nm: width,
                    saturated,
                    order,
                    repeat_of: None,
                    observer: None,
                    label: label.map(|text| text.split_whitespace().collect::<Vec<_>>().join(" ")),
                    note,
                };
                (sample, reading)
            },
        );
    prop::collection::vec(reading, 1..12)
}

fn positioned(reading: &Reading, unit: usize) -> Position {
    match (reading.position, unit) {
        (Position::Angstrom(value), 0) => Position::Nanometre(value / 10.0),
        (Position::Angstrom(value), 2) => Position::PerCentimetre(value),
        (position, _) => position,
    }
}

/// Writes the rows and gives the bytes with the samples that should be read from them.
fn write_table(rows: &[(u8, Reading)], writing: Writing) -> (Vec<u8>, Vec<Sample>) {
    let (position, uncertainty) = POSITION_COLUMNS[writing.unit];
    let names = [
        "sample",
        position,
        uncertainty,
        "strength",
        "strength_uncertainty_dex",
        "form",
        "width_nm",
        "saturated",
        "order",
        "label",
        "note",
    ];
    let mut text = String::from("# a comment");
    text.push_str(writing.line_end);
    write_row(&mut text, &names.map(str::to_owned), writing);
    let mut samples: Vec<Sample> = Vec::new();
    for (index, (sample, reading)) in rows.iter().enumerate() {
        let number = |value: Option<f64>| {
            value.map_or_else(String::new, |value| {
                value.to_string().replace('.', &writing.decimal.to_string())
            })
        };
        let read = Reading {
            row: index + 3,
            position: positioned(reading, writing.unit),
            ..reading.clone()
        };
        let position = match read.position {
            Position::Nanometre(value)
            | Position::Angstrom(value)
            | Position::PerCentimetre(value) => value,
        };
        let strength = match reading.strength {
            Some(Strength::Number(value)) => Some(value),
            _ => None,
        };
        let name = format!("lamp {sample}");
        let form = reading.form.map(|form| format!("{form:?}"));
        let cells = [
            name.clone(),
            number(Some(position)),
            number(reading.uncertainty),
            number(strength),
            number(reading.strength_uncertainty_dex),
            form.unwrap_or_default(),
            number(reading.width_nm),
            if reading.saturated {
                "yes".into()
            } else {
                String::new()
            },
            reading.order.to_string(),
            reading.label.clone().unwrap_or_default(),
            reading.note.clone().unwrap_or_default(),
        ];
        write_row(&mut text, &cells, writing);
        match samples.iter_mut().find(|sample| sample.name == name) {
            Some(sample) => sample.readings.push(read),
            None => samples.push(Sample {
                name,
                readings: vec![read],
            }),
        }
    }
    (encode(&text, writing.encoding), samples)
}

fn write_row(text: &mut String, cells: &[String], writing: Writing) {
    let cells = cells.iter().map(|cell| {
        let must = cell.contains([writing.separator, '"']);
        if must || writing.quote_everything {
            format!("\"{}\"", cell.replace('"', "\"\""))
        } else {
            cell.clone()
        }
    });
    let row: Vec<String> = cells.collect();
    let _ = write!(
        text,
        "{}{}",
        row.join(&writing.separator.to_string()),
        writing.line_end
    );
}

fn encode(text: &str, encoding: &str) -> Vec<u8> {
    match encoding {
        "UTF-8 with BOM" => [b"\xef\xbb\xbf", text.as_bytes()].concat(),
        "UTF-16LE" => "\u{feff}"
            .encode_utf16()
            .chain(text.encode_utf16())
            .flat_map(u16::to_le_bytes)
            .collect(),
        "UTF-16BE" => "\u{feff}"
            .encode_utf16()
            .chain(text.encode_utf16())
            .flat_map(u16::to_be_bytes)
            .collect(),
        // é is the only letter beyond ASCII here, and its code is the same in both.
        "Windows-1252" => text
            .chars()
            .filter_map(|c| u8::try_from(u32::from(c)).ok())
            .collect(),
        _ => text.as_bytes().to_vec(),
    }
}

/// Whatever is read, what is refused and what is used exclude each other.
fn assert_consistent(table: &Table) {
    for refusal in &table.refused {
        assert!(
            !refusal.to_string().contains(|c: char| c.is_control()),
            "{refusal}"
        );
        assert!(
            !refusal.message.ends_with('.') && !refusal.message.is_empty(),
            "{refusal}"
        );
    }
    for sample in &table.samples {
        assert!(!sample.readings.is_empty() && !table.refused_samples.contains(&sample.name));
        assert!(sample.readings.is_sorted_by_key(|reading| reading.row));
    }
    assert!(!table.is_refused() || table.samples.is_empty());
    assert!(
        !table.samples.is_empty() || !table.refused.is_empty(),
        "read nothing and refused nothing"
    );
    assert!(table.refused.is_sorted_by_key(|refusal| refusal.row));
}

proptest! {
    #[test]
    fn a_written_table_reads_back_equal(rows in readings(), writing in writings()) {
        let (bytes, samples) = write_table(&rows, writing);
        let table = read_table("lot.csv", &bytes);
        prop_assert_eq!(&table.refused, &vec![]);
        prop_assert_eq!(&table.samples, &samples);
        prop_assert_eq!(table.dialect.separator, Some(writing.separator));
        prop_assert_eq!(&table.comments, &vec!["a comment".to_owned()]);
        assert_consistent(&table);
    }

    #[test]
    fn any_bytes_are_read_or_refused(bytes in prop::collection::vec(any::<u8>(), 0..200)) {
        assert_consistent(&read_table("any", &bytes));
    }

    /// Text made of what matters to the reader gets further than random bytes.
    #[test]
    fn any_near_table_is_read_or_refused(
        header in prop::sample::select(vec!["wavelength_nm", "sample,wavelength_nm,strength", "wavelength_angstrom;sample", "sep=;\nform\twavenumber_cm-1", ""]),
        body in "([0-9.,;\t\"\n\r# a-f\u{a0}\u{2212}é±-]|589|He|nan|1e|line|\u{1b}\\[31m|\n){0,60}",
    ) {
        assert_consistent(&read_table("near.csv", format!("{header}\n{body}").as_bytes()));
    }

    /// A damaged sample is refused and the others stay as they were.
    #[test]
    fn a_bad_row_refuses_its_sample_only(rows in readings(), writing in writings(), bad in 0u8..3) {
        let (bytes, samples) = write_table(&rows, writing);
        let mut text = encode_guard(&bytes, writing);
        write_row(&mut text, &[format!("lamp {bad}"), "yellow".into()].into_iter()
            .chain(std::iter::repeat_n(String::new(), 9)).collect::<Vec<_>>(), writing);
        let table = read_table("lot.csv", text.as_bytes());
        let others: Vec<Sample> = samples.into_iter().filter(|s| s.name != format!("lamp {bad}")).collect();
        prop_assert_eq!(&table.samples, &others);
        prop_assert_eq!(table.refused.len(), 1);
        prop_assert_eq!(table.refused[0].row, Some(rows.len() + 3));
    }
}

/// The text again, as UTF-8.
fn encode_guard(bytes: &[u8], writing: Writing) -> String {
    let units = |pair: fn([u8; 2]) -> u16| -> Vec<u16> {
        bytes
            .chunks_exact(2)
            .map(|chunk| pair([chunk[0], chunk[1]]))
            .collect()
    };
    match writing.encoding {
        "UTF-16LE" => String::from_utf16_lossy(&units(u16::from_le_bytes)),
        "UTF-16BE" => String::from_utf16_lossy(&units(u16::from_be_bytes)),
        "Windows-1252" => bytes.iter().map(|byte| char::from(*byte)).collect(),
        _ => String::from_utf8_lossy(bytes).into_owned(),
    }
}

/// The digest is that of the bytes: SHA-256 of the empty string, FIPS 180-4 example values.
#[test]
fn the_digest_is_of_the_bytes() {
    let digest = "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855";
    assert_eq!(read_table("-", b"").sha256, digest);
}

#[test]
fn a_sample_without_a_name_is_named_after_the_file() {
    for (input, name) in [
        ("-", "stdin"),
        ("day 2/lamp.7.csv", "lamp.7"),
        ("lamp", "lamp"),
        ("\u{1b}[31m.csv", "\\u{1b}[31m"),
    ] {
        assert_eq!(
            read_table(input, b"wavelength_nm\n589.3\n").samples[0].name,
            name
        );
    }
}

#[test]
fn a_large_table_is_read_in_passing() {
    let mut text = String::from("wavelength_nm,strength,sample\n");
    for row in 0..100_000 {
        let _ = writeln!(text, "{}.5,{},s{}", 400 + row % 300, row + 1, row % 50);
    }
    let table = read_table("large.csv", text.as_bytes());
    assert_eq!(table.samples.len(), 50);
    assert_eq!(
        table
            .samples
            .iter()
            .map(|sample| sample.readings.len())
            .sum::<usize>(),
        100_000
    );
}

#[test]
fn words_of_strength_are_words() {
    let table = read_table("-", b"wavelength_nm,strength\n589.3,DOMINANT\n");
    assert_eq!(
        table.samples[0].readings[0].strength,
        Some(Strength::Word(StrengthWord::Dominant))
    );
}

/// A table turned on its side has as many columns as another has rows.
#[test]
fn a_very_wide_header_is_refused_in_passing() {
    let header: Vec<String> = (0..50_000).map(|column| format!("{column}.5")).collect();
    let table = read_table("wide.csv", format!("{}\n1\n", header.join(",")).as_bytes());
    assert!(table.is_refused());
    assert!(
        table
            .refused
            .iter()
            .all(|refusal| refusal.message.len() < 1000)
    );
}
