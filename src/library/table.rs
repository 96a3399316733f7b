//! One table of the library: from bytes to checked cells.
//!
//! A fault is noted and a stand-in value takes its place, so that the rest of the row, and
//! everything that refers to it, is still checked in the same run. A library with a fault is
//! never handed out, so no stand-in is ever seen.

use super::load::LibraryFault;
use super::names::closest;
use std::borrow::Cow;

/// A table as found: its name within the library folder and its bytes.
pub(super) struct TableFile<'a> {
    /// `substances.csv`, `features/calcium.csv`; always with forward slashes.
    pub(super) name: String,
    pub(super) bytes: Cow<'a, [u8]>,
}

/// A column of a table.
#[derive(Clone, Copy)]
pub(super) struct Column {
    name: &'static str,
    needed: bool,
}

/// A column every table of its kind must have.
pub(super) const fn needed(name: &'static str) -> Column {
    Column { name, needed: true }
}

/// A column that may be left out; its cells then count as empty.
pub(super) const fn optional(name: &'static str) -> Column {
    Column {
        name,
        needed: false,
    }
}

/// A cell with the name of its column.
#[derive(Clone, Copy)]
pub(super) struct Cell<'a> {
    column: &'static str,
    /// Text without surrounding blanks.
    pub(super) text: &'a str,
}

/// The values a number may have.
#[derive(Clone, Copy)]
pub(super) struct Bounds {
    pub(super) low: f64,
    low_included: bool,
    high: f64,
}

impl Bounds {
    /// From `low` to `high`, both included.
    pub(super) const fn between(low: f64, high: f64) -> Self {
        Self {
            low,
            low_included: true,
            high,
        }
    }

    /// Above `low`, up to and including `high`.
    pub(super) const fn above(low: f64, high: f64) -> Self {
        Self {
            low,
            low_included: false,
            high,
        }
    }

    fn hold(self, value: f64) -> bool {
        value <= self.high && (value > self.low || (self.low_included && value == self.low))
    }
}

impl std::fmt::Display for Bounds {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let Self { low, high, .. } = self;
        match (self.low_included, high.is_finite()) {
            (true, _) => write!(f, "between {low} and {high}"),
            (false, true) => write!(f, "above {low} and at most {high}"),
            (false, false) => write!(f, "above {low}"),
        }
    }
}

/// Where a row stands and where its faults go.
pub(super) struct Row<'a> {
    file: &'a str,
    /// Line of the file, counted from 1.
    pub(super) line: usize,
    faults: &'a mut Vec<LibraryFault>,
}

impl Row<'_> {
    /// Notes a fault of one cell.
    pub(super) fn fault(&mut self, cell: Cell<'_>, message: impl Into<String>) {
        self.faults.push(LibraryFault {
            file: self.file.to_owned(),
            row: Some(self.line),
            column: Some(cell.column.to_owned()),
            text: Some(cell.text.to_owned()),
            message: message.into(),
        });
    }

    /// Text that must not be empty.
    pub(super) fn filled<'c>(&mut self, cell: Cell<'c>) -> &'c str {
        if cell.text.is_empty() {
            self.fault(cell, "is empty (a value is needed here)");
        }
        cell.text
    }

    /// A number that must be there.
    pub(super) fn number(&mut self, cell: Cell<'_>, bounds: Bounds) -> f64 {
        self.sound_number(cell, bounds).unwrap_or(bounds.high)
    }

    /// A number that must be there; `None` after a fault.
    pub(super) fn sound_number(&mut self, cell: Cell<'_>, bounds: Bounds) -> Option<f64> {
        if cell.text.is_empty() {
            self.fault(cell, "is empty (a number is needed here)");
        }
        self.number_if_any(cell, bounds)
    }

    /// A number, or `None` where the cell is empty and after a fault.
    pub(super) fn number_if_any(&mut self, cell: Cell<'_>, bounds: Bounds) -> Option<f64> {
        if cell.text.is_empty() {
            return None;
        }
        match cell.text.parse::<f64>() {
            Ok(value) if !value.is_finite() => self.fault(cell, "is not finite"),
            Ok(value) if bounds.hold(value) => return Some(value),
            Ok(_) => self.fault(cell, format!("is out of range (must be {bounds})")),
            Err(_) => self.fault(cell, not_a_number(cell.text)),
        }
        None
    }

    /// One of a few words, written exactly.
    pub(super) fn word<T: Copy, const K: usize>(
        &mut self,
        cell: Cell<'_>,
        words: &[(&'static str, T); K],
    ) -> T {
        if let Some((_, value)) = words.iter().find(|(word, _)| *word == cell.text) {
            return *value;
        }
        let known = words.iter().map(|(word, _)| *word);
        let (empty, known): (Vec<&str>, Vec<&str>) = known.partition(|word| word.is_empty());
        let or_empty = if empty.is_empty() { "" } else { " (or empty)" };
        self.fault(
            cell,
            format!("is not one of {}{or_empty}", known.join(", ")),
        );
        const { assert!(K > 0, "a choice of words has at least one") };
        words[0].1
    }

    /// The values of a cell that may hold several, separated by `;`.
    pub(super) fn several<'c>(&mut self, cell: Cell<'c>) -> Vec<&'c str> {
        if cell.text.is_empty() {
            return Vec::new();
        }
        let mut values: Vec<&str> = cell.text.split(';').map(str::trim).collect();
        if values.contains(&"") {
            self.fault(cell, "has an empty value between semicolons");
            values.retain(|value| !value.is_empty());
        }
        values
    }

    /// A reference to something that is not there.
    pub(super) fn unresolved<'k>(
        &mut self,
        cell: Cell<'_>,
        missing: &str,
        what: &str,
        known: impl Iterator<Item = &'k str>,
    ) {
        let hint = closest(missing, known, 1)
            .first()
            .map(|near| format!(" (did you mean {near:?}?)"))
            .unwrap_or_default();
        let subject = if missing == cell.text {
            "is".to_owned()
        } else {
            format!("holds {missing:?}, which is")
        };
        self.fault(cell, format!("{subject} not {what}{hint}"));
    }
}

/// Says what is wrong with a number, with the number that was likely meant.
fn not_a_number(text: &str) -> String {
    let joined: String = text
        .chars()
        .filter(|c| !c.is_whitespace())
        .map(|c| match c {
            ',' => '.',
            '\u{2212}' | '\u{2013}' => '-',
            other => other,
        })
        .collect();
    match joined.parse::<f64>() {
        Ok(value) if value.is_finite() => format!("is not a number (did you mean {joined}?)"),
        _ => "is not a number".to_owned(),
    }
}

/// Reads a table row by row. Columns are found by name in any order; rows that are blank or start
/// with `#` are skipped. Every fault is noted and reading goes on.
pub(super) fn read<const N: usize>(
    table: &TableFile<'_>,
    columns: &[Column; N],
    faults: &mut Vec<LibraryFault>,
    mut each: impl FnMut([Cell<'_>; N], &mut Row<'_>),
) {
    let bytes = table
        .bytes
        .strip_prefix(b"\xEF\xBB\xBF")
        .unwrap_or(&table.bytes);
    if let Err(error) = std::str::from_utf8(bytes) {
        let line = 1 + newlines(bytes.get(..error.valid_up_to()).unwrap_or(bytes));
        faults.push(LibraryFault {
            row: Some(line),
            ..LibraryFault::of_file(&table.name, "is not UTF-8 text (save it as CSV UTF-8)")
        });
        return;
    }
    let mut reader = csv::ReaderBuilder::new()
        .has_headers(false)
        .flexible(true)
        .comment(Some(b'#'))
        .from_reader(bytes);
    let mut record = csv::StringRecord::new();
    let mut header: Option<(usize, [Option<usize>; N])> = None;
    // The text was found to be UTF-8, and reading from memory cannot fail otherwise.
    while reader.read_record(&mut record).unwrap_or(false) {
        if record.iter().all(|cell| cell.trim().is_empty()) {
            continue;
        }
        let line = starting_line(bytes, record.position());
        let Some((width, places)) = &header else {
            let places = find_columns(&table.name, line, &record, columns, faults);
            let whole = columns
                .iter()
                .zip(&places)
                .all(|(c, p)| !c.needed || p.is_some());
            if !whole {
                return;
            }
            header = Some((record.len(), places));
            continue;
        };
        if record.len() != *width {
            let message = format!(
                "has {} cells where the header has {width} (put quotes about a cell that holds a comma)",
                record.len()
            );
            faults.push(LibraryFault {
                row: Some(line),
                ..LibraryFault::of_file(&table.name, &message)
            });
            continue;
        }
        let cells = std::array::from_fn(|k| Cell {
            column: columns[k].name,
            text: places[k].and_then(|p| record.get(p)).unwrap_or("").trim(),
        });
        let mut row = Row {
            file: &table.name,
            line,
            faults,
        };
        each(cells, &mut row);
    }
    if header.is_none() {
        faults.push(LibraryFault::of_file(
            &table.name,
            "is empty (a header line is needed)",
        ));
    }
}

/// The place of each column in the header; faults for what is missing, doubled or unknown.
fn find_columns<const N: usize>(
    file: &str,
    line: usize,
    header: &csv::StringRecord,
    columns: &[Column; N],
    faults: &mut Vec<LibraryFault>,
) -> [Option<usize>; N] {
    let mut places = [None; N];
    let mut fault = |column: &str, message: String| {
        faults.push(LibraryFault {
            file: file.to_owned(),
            row: Some(line),
            column: Some(column.to_owned()),
            text: None,
            message,
        });
    };
    for (place, title) in header.iter().map(str::trim).enumerate() {
        match columns.iter().position(|c| c.name == title) {
            Some(known) if places[known].is_none() => places[known] = Some(place),
            Some(_) => fault(title, "stands twice in the header".to_owned()),
            None => {
                let near = closest(title, columns.iter().map(|c| c.name), 1);
                let hint = match near.first() {
                    Some(near) => format!("did you mean {near:?}?"),
                    None => format!("columns here are {}", columns.map(|c| c.name).join(", ")),
                };
                fault(title, format!("is not a column of this table ({hint})"));
            }
        }
    }
    for (column, _) in columns
        .iter()
        .zip(&places)
        .filter(|(c, p)| c.needed && p.is_none())
    {
        fault(column.name, "is missing from the header".to_owned());
    }
    places
}

/// The line a record starts on, counted from 1. The reader counts from where the record before
/// ended, which leaves blank lines, comments and the second half of CRLF still to be passed over.
fn starting_line(bytes: &[u8], position: Option<&csv::Position>) -> usize {
    let Some(position) = position else { return 1 };
    let mut line = position.line() as usize;
    let mut rest = bytes.get(position.byte() as usize..).unwrap_or(&[]);
    loop {
        match rest {
            [b'\n', after @ ..] => {
                line += 1;
                rest = after;
            }
            [b'\r', after @ ..] => rest = after,
            [b'#', ..] => {
                let end = rest.iter().position(|b| *b == b'\n').unwrap_or(rest.len());
                rest = rest.get(end..).unwrap_or(&[]);
            }
            _ => return line,
        }
    }
}

fn newlines(bytes: &[u8]) -> usize {
    bytes.iter().filter(|b| **b == b'\n').count()
}
