//! What was measured: readings as they stand in a table, each with its row.
//!
//! Nothing is converted here but text to numbers; positions keep the unit
//! they were written in and [`crate::reduction`] turns them into air
//! wavelengths.

mod cell;
mod column;
mod decode;
mod header;
mod number;
mod owner;
mod quote;
mod records;
mod row;
mod table;
mod unit;

pub use quote::{escape_control, quoted, shorten};
pub use table::read_table;

use std::collections::BTreeSet;
use std::fmt;

/// The position of a reading in the unit of its column.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Position {
    /// Wavelength in nanometres, in the medium of the set-up.
    Nanometre(f64),
    /// Wavelength in angstrom, in the medium of the set-up.
    Angstrom(f64),
    /// Wavenumber in cm⁻¹, always in vacuum.
    PerCentimetre(f64),
}

/// A strength as it was written down.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Strength {
    /// A number on any linear scale.
    Number(f64),
    /// One of the four words.
    Word(StrengthWord),
}

/// The four strength words.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum StrengthWord {
    /// Barely noticed.
    Faint,
    /// Plain to see.
    Medium,
    /// Bright.
    Strong,
    /// Outshines the rest.
    Dominant,
}

/// The form of a feature as the observer saw it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ObservedForm {
    /// A sharp line.
    Line,
    /// A band, with or without an edge.
    Band,
}

/// One row of a readings table.
#[derive(Debug, Clone, PartialEq)]
pub struct Reading {
    /// Line of the file on which the row starts, counted from 1 as an editor counts.
    pub row: usize,
    /// Position in its own unit.
    pub position: Position,
    /// Standard uncertainty (k = 1) in the unit of the position; absent if the table states none.
    pub uncertainty: Option<f64>,
    /// Strength, if stated.
    pub strength: Option<Strength>,
    /// Standard uncertainty of the strength in decades, if stated.
    pub strength_uncertainty_dex: Option<f64>,
    /// Form as seen, if stated.
    pub form: Option<ObservedForm>,
    /// Observed full width, nm, if stated.
    pub width_nm: Option<f64>,
    /// The peak was clipped: its strength is a lower bound.
    pub saturated: bool,
    /// Diffraction order the reading was taken in (1 if not stated).
    pub order: u32,
    /// Mark shared by repeats of one feature.
    pub repeat_of: Option<String>,
    /// Who read it.
    pub observer: Option<String>,
    /// What the lamp or bottle claims to be.
    pub label: Option<String>,
    /// Free text.
    pub note: Option<String>,
}

/// The readings that belong together.
#[derive(Debug, Clone, PartialEq)]
pub struct Sample {
    /// Name from the `sample` column, or the file stem (`stdin` for standard input). Control
    /// characters are escaped and runs of white space are one space; so they are in
    /// `repeat_of`, `observer` and `label`, but a note is as written.
    pub name: String,
    /// Rows in the order of the file.
    pub readings: Vec<Reading>,
}

/// How a table was written, as found out by reading it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Dialect {
    /// `UTF-8`, `UTF-8 with BOM`, `UTF-16LE`, `UTF-16BE` or `Windows-1252`; `unknown` for bytes
    /// that are no text.
    pub encoding: &'static str,
    /// `,` `;` or tab; absent for a one-column table.
    pub separator: Option<char>,
    /// `.` or `,`.
    pub decimal_sign: char,
}

/// Something that cannot be used: a row, a sample or a whole file.
///
/// Column, text and message quote at most 40 characters of a cell, and control characters are
/// escaped: they can be printed as they are.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Refusal {
    /// Input as named on the command line.
    pub input: String,
    /// Sample it belongs to; absent for a file-level fault.
    pub sample: Option<String>,
    /// Line of the file; absent for a file-level fault without a row.
    pub row: Option<usize>,
    /// Column name as written in the header.
    pub column: Option<String>,
    /// The offending text.
    pub text: Option<String>,
    /// What is wrong, what was expected and what to try; lower case, no full stop.
    pub message: String,
}

/// `readings.csv: row 7, column wavelength_nm: "58 9.0" is not a number (did you mean 589.0?)`
impl fmt::Display for Refusal {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: ", escape_control(&self.input))?;
        match (self.row, &self.column) {
            (Some(row), Some(column)) => write!(f, "row {row}, column {column}: ")?,
            (Some(row), None) => write!(f, "row {row}: ")?,
            (None, Some(column)) => write!(f, "column {column}: ")?,
            (None, None) => {}
        }
        f.write_str(&self.message)
    }
}

/// A remark about a table that does not stop its use.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum TableRemark {
    /// A column that means nothing here.
    UnknownColumn {
        /// Header text.
        column: String,
    },
    /// A column that means something but not to this command.
    UnusedColumn {
        /// Header text.
        column: String,
    },
}

/// A table of readings after reading it once.
#[derive(Debug, Clone, PartialEq)]
pub struct Table {
    /// Input as named on the command line (`-` for standard input).
    pub input: String,
    /// SHA-256 of the bytes, lower-case hex.
    pub sha256: String,
    /// Dialect that was read.
    pub dialect: Dialect,
    /// Samples that can be used, in order of first appearance.
    pub samples: Vec<Sample>,
    /// Everything that was refused, in order of rows. A refused row refuses its whole sample,
    /// which then is not in `samples`. An entry without a sample refuses the file.
    pub refused: Vec<Refusal>,
    /// Names of samples refused for a row of their own.
    pub refused_samples: BTreeSet<String>,
    /// Remarks, in order of columns.
    pub remarks: Vec<TableRemark>,
    /// `#` comment lines without the mark, in order; else as written, not escaped.
    pub comments: Vec<String>,
}

impl Table {
    /// The file as a whole was refused; no sample of it can be used.
    pub fn is_refused(&self) -> bool {
        self.refused.iter().any(|refusal| refusal.sample.is_none())
    }
}
