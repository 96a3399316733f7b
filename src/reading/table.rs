//! Reading a table of readings: every fault found in one run.

use super::cell::Notation;
use super::column::Column;
use super::decode::decode;
use super::header::{Header, read_header, recognised};
use super::number::{Shape, may_be_grouped, shape, split_unit};
use super::owner::Owners;
use super::quote::{quoted, shorten};
use super::records::{Record, split};
use super::row::read_row;
use super::{Dialect, Reading, Refusal, Sample, Strength, Table};
use sha2::{Digest, Sha256};
use std::collections::{BTreeSet, HashMap};
use std::fmt::Write;

/// Reads a table of readings.
///
/// `input` is the file as named on the command line (`-` for standard input); it stands in every
/// refusal and names the sample of a table without a `sample` column.
///
/// This never fails as a whole, so that the faults of several files can be listed side by side:
/// what cannot be used stands in [`Table::refused`]. A fault of a row refuses its sample, the
/// others are in [`Table::samples`]. A fault of the file is a refusal without a sample; then
/// [`Table::is_refused`] holds, no sample is given, and the rows have still been checked as far
/// as the header could be understood.
pub fn read_table(input: &str, bytes: &[u8]) -> Table {
    let mut table = Table {
        input: input.to_owned(),
        sha256: hex_digest(bytes),
        dialect: Dialect {
            encoding: "unknown",
            separator: None,
            decimal_sign: '.',
        },
        samples: Vec::new(),
        refused: Vec::new(),
        refused_samples: BTreeSet::new(),
        remarks: Vec::new(),
        comments: Vec::new(),
    };
    match decode(bytes) {
        Ok((text, encoding)) => {
            table.dialect.encoding = encoding;
            read_text(&mut table, &text);
        }
        Err(message) => refuse_file(&mut table, None, message),
    }
    // Stable, so faults of one row stay in order of columns; those without a row come first.
    table.refused.sort_by_key(|refusal| refusal.row);
    if table.is_refused() {
        table.samples.clear();
    }
    table
}

fn hex_digest(bytes: &[u8]) -> String {
    Sha256::digest(bytes)
        .iter()
        .fold(String::with_capacity(64), |mut hex, byte| {
            // Writing to a string cannot fail.
            let _ = write!(hex, "{byte:02x}");
            hex
        })
}

fn refuse_file(table: &mut Table, row: Option<usize>, message: String) {
    table.refused.push(Refusal {
        input: table.input.clone(),
        sample: None,
        row,
        column: None,
        text: None,
        message,
    });
}

fn read_text(table: &mut Table, text: &str) {
    let records = match split(text, recognised) {
        Ok(records) => records,
        Err(unclosed) => {
            let message = "a quotation mark is opened here and never closed (double it if it belongs to the text)";
            return refuse_file(table, Some(unclosed.line), message.to_owned());
        }
    };
    table.dialect.separator = records.separator;
    table.comments = records.comments;
    let mut rows = records.rows.into_iter();
    let Some(first) = rows.next() else {
        return refuse_file(
            table,
            None,
            "no readings: the file holds no table (name the columns in the first line)".into(),
        );
    };
    let mut rows: Vec<Record> = rows.collect();
    let filled = |column: usize| {
        rows.iter().any(|row| {
            row.cells
                .get(column)
                .is_some_and(|cell| !cell.trim().is_empty())
        })
    };
    let mut names = first.cells.clone();
    // Spreadsheets leave empty names behind the last column.
    while names.last().is_some_and(|name| name.trim().is_empty()) && !filled(names.len() - 1) {
        names.pop();
    }
    let mut header = read_header(&names, filled);
    for fault in std::mem::take(&mut header.faults) {
        table.refused.push(Refusal {
            input: table.input.clone(),
            sample: None,
            row: Some(first.line),
            text: fault.column.clone(),
            column: fault.column,
            message: fault.message,
        });
    }
    table.remarks = std::mem::take(&mut header.remarks);
    if rows.is_empty() {
        return refuse_file(
            table,
            None,
            "no readings: nothing follows the header (give one reading a row)".into(),
        );
    }
    trim_rows(&mut rows, header.names.len());
    let notation = survey(table, &header, &rows);
    table.dialect.decimal_sign = notation.decimal;
    read_rows(table, &header, notation, &rows);
}

/// Spreadsheets fill rows up with empty cells; those beyond the header go.
fn trim_rows(rows: &mut [Record], width: usize) {
    for row in rows {
        while row.cells.len() > width && row.cells.last().is_some_and(|cell| cell.trim().is_empty())
        {
            row.cells.pop();
        }
    }
}

/// Finds the decimal sign of the file; two of them refuse it.
fn survey(table: &mut Table, header: &Header, rows: &[Record]) -> Notation {
    let mut first: Option<(char, usize)> = None;
    let mut other_seen = false;
    let mut certain = false;
    for row in rows
        .iter()
        .filter(|row| row.cells.len() == header.names.len())
    {
        for (index, (cell, column)) in row.cells.iter().zip(&header.columns).enumerate() {
            let Some(column) = column.filter(holds_numbers) else {
                continue;
            };
            let (number, _) = split_unit(cell);
            let Shape::Number(_, Some(sign)) = shape(&number) else {
                continue;
            };
            certain |= column != Column::Strength || !may_be_grouped(&number);
            let (expected, line) = *first.get_or_insert((sign, row.line));
            if sign != expected && !other_seen {
                other_seen = true;
                let name = |sign| if sign == ',' { "comma" } else { "point" };
                let message = format!(
                    "{} has a decimal {} but row {line} has a decimal {} (use one sign in a file)",
                    quoted(cell),
                    name(sign),
                    name(expected),
                );
                table.refused.push(Refusal {
                    input: table.input.clone(),
                    sample: None,
                    row: Some(row.line),
                    column: header.names.get(index).map(|name| shorten(name)),
                    text: Some(shorten(cell)),
                    message,
                });
            }
        }
    }
    let decimal = first.map_or('.', |(sign, _)| sign);
    Notation {
        decimal,
        grouping_suspected: decimal == ',' && !certain,
    }
}

fn holds_numbers(column: &Column) -> bool {
    matches!(
        column,
        Column::Position(_)
            | Column::Uncertainty(_)
            | Column::Strength
            | Column::StrengthUncertainty
            | Column::Width
    )
}

fn read_rows(table: &mut Table, header: &Header, notation: Notation, rows: &[Record]) {
    let owners = Owners::new(&table.input, header, rows);
    let mut index_of: HashMap<String, usize> = HashMap::new();
    for row in rows {
        let Some(name) = owners.of(&row.cells) else {
            refuse_ownerless(table, header, row);
            continue;
        };
        if row.cells.len() != header.names.len() {
            refuse_row(
                table,
                &name,
                row,
                None,
                ragged(row, header, table.dialect.separator),
            );
            continue;
        }
        match read_row(row.line, &row.cells, header, notation) {
            Ok(reading) => {
                let index = *index_of.entry(name.clone()).or_insert(table.samples.len());
                match table.samples.get_mut(index) {
                    Some(sample) => sample.readings.push(reading),
                    None => table.samples.push(Sample {
                        name,
                        readings: vec![reading],
                    }),
                }
            }
            Err(faults) => {
                for fault in faults {
                    refuse_row(
                        table,
                        &name,
                        row,
                        header
                            .names
                            .get(fault.column)
                            .zip(row.cells.get(fault.column)),
                        fault.message,
                    );
                }
            }
        }
    }
    refuse_mixed_strengths(table, header, rows);
    let refused = &table.refused_samples;
    table
        .samples
        .retain(|sample| !refused.contains(&sample.name));
}

fn refuse_row(
    table: &mut Table,
    sample: &str,
    row: &Record,
    cell: Option<(&String, &String)>,
    message: String,
) {
    table.refused_samples.insert(sample.to_owned());
    table.refused.push(Refusal {
        input: table.input.clone(),
        sample: Some(sample.to_owned()),
        row: Some(row.line),
        column: cell.map(|(name, _)| shorten(name)),
        text: cell.map(|(_, text)| shorten(text)),
        message,
    });
}

/// A row of which nobody can tell the sample refuses the file: left out, it might be missing from
/// a sample that is then used by half.
fn refuse_ownerless(table: &mut Table, header: &Header, row: &Record) {
    let message = if row.cells.len() == header.names.len() {
        "the sample is not named (write its name in every row)".to_owned()
    } else {
        let fault = ragged(row, header, table.dialect.separator);
        format!("{fault}; the sample it belongs to cannot be told")
    };
    refuse_file(table, Some(row.line), message);
    if let (Some(refusal), Some(index)) =
        (table.refused.last_mut(), header.index_of(Column::Sample))
    {
        refusal.column = header.names.get(index).map(|name| shorten(name));
    }
}

fn ragged(row: &Record, header: &Header, separator: Option<char>) -> String {
    let (cells, columns) = (row.cells.len(), header.names.len());
    let fault = format!(
        "the row has {cells} cell{} but the header has {columns}",
        if cells == 1 { "" } else { "s" },
    );
    let other_separator = row.cells.iter().any(|cell| cell.contains(['\t', ';', ',']));
    let remedy = match separator {
        Some(',') if cells > columns => {
            "put a decimal comma, or a text with a comma, between quotation marks"
        }
        _ if cells > columns => "put a text that holds the separator between quotation marks",
        _ if cells == 1 && other_separator => "separate the cells as in the header",
        _ => "write the separators of empty cells too",
    };
    format!("{fault} ({remedy})")
}

/// Words and numbers do not lie on one scale.
fn refuse_mixed_strengths(table: &mut Table, header: &Header, rows: &[Record]) {
    let is_word = |reading: &Reading| reading.strength.map(|s| matches!(s, Strength::Word(_)));
    let mut mixed = Vec::new();
    for sample in &table.samples {
        let mut kinds = sample
            .readings
            .iter()
            .filter_map(|r| Some((r.row, is_word(r)?)));
        let Some((first_row, first_kind)) = kinds.next() else {
            continue;
        };
        if let Some((line, _)) = kinds.find(|(_, kind)| *kind != first_kind) {
            mixed.push((sample.name.clone(), first_row, first_kind, line));
        }
    }
    for (sample, first_row, first_is_word, line) in mixed {
        // Rows are in order of their lines.
        let Ok(at) = rows.binary_search_by_key(&line, |row| row.line) else {
            continue;
        };
        let Some(row) = rows.get(at) else { continue };
        let cell = header
            .index_of(Column::Strength)
            .and_then(|index| header.names.get(index).zip(row.cells.get(index)));
        let (this, that) = if first_is_word {
            ("number", "word")
        } else {
            ("word", "number")
        };
        let text = cell.map_or_else(String::new, |(_, text)| quoted(text));
        let message = format!(
            "{text} is a {this} but row {first_row} has a {that} (use one kind of strength in a sample)"
        );
        refuse_row(table, &sample, row, cell, message);
    }
}
