//! Which sample a row belongs to, also where the row is damaged.

use super::column::Column;
use super::header::Header;
use super::quote::{clean_name, escape_control};
use super::records::Record;
use std::collections::BTreeSet;
use std::path::Path;

/// Which sample a row belongs to.
pub struct Owners {
    default: String,
    /// Index of the sample column; absent if there is none or no row names a sample.
    column: Option<usize>,
    width: usize,
    /// Names in rows that have the right number of cells.
    known: BTreeSet<String>,
}

impl Owners {
    /// Collects the names of `rows`, the rows below `header`.
    pub fn new(input: &str, header: &Header, rows: &[Record]) -> Self {
        let width = header.names.len();
        let column = header.index_of(Column::Sample);
        let known: BTreeSet<String> = rows
            .iter()
            .filter(|row| row.cells.len() == width)
            .filter_map(|row| row.cells.get(column?))
            .map(|cell| clean_name(cell))
            .filter(|name| !name.is_empty())
            .collect();
        let named = column.filter(|column| {
            rows.iter().any(|row| {
                row.cells
                    .get(*column)
                    .is_some_and(|cell| !cell.trim().is_empty())
            })
        });
        Self {
            default: default_name(input),
            column: named,
            width,
            known,
        }
    }

    /// The name of the sample, or `None` if it cannot be told.
    pub fn of(&self, cells: &[String]) -> Option<String> {
        let Some(column) = self.column else {
            return Some(self.default.clone());
        };
        let name_at = |index: usize| {
            cells
                .get(index)
                .map(|cell| clean_name(cell))
                .filter(|name| !name.is_empty())
        };
        let from_left = name_at(column);
        if cells.len() == self.width || column == 0 {
            return from_left;
        }
        // Cells are missing or too many somewhere: counted from either end, one name must be that
        // of a sample met in a sound row, and not two different ones.
        let from_right = (column + cells.len())
            .checked_sub(self.width)
            .and_then(name_at);
        let met: BTreeSet<String> = [from_left, from_right]
            .into_iter()
            .flatten()
            .filter(|name| self.known.contains(name))
            .collect();
        if met.len() == 1 {
            met.into_iter().next()
        } else {
            None
        }
    }
}

/// The file stem, or `stdin`.
fn default_name(input: &str) -> String {
    if input == "-" {
        return "stdin".to_owned();
    }
    let stem = Path::new(input)
        .file_stem()
        .map(|stem| clean_name(&stem.to_string_lossy()));
    stem.filter(|stem| !stem.is_empty())
        .unwrap_or_else(|| escape_control(input))
}
