//! From the cells of one row to a reading, with every fault of the row.

use super::cell::{
    Notation, read_above_zero, read_form, read_order, read_position, read_strength, read_yes_no,
};
use super::column::Column;
use super::header::Header;
use super::quote::clean_name;
use super::unit::Unit;
use super::{Position, Reading};

/// A cell that cannot be used.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CellFault {
    /// Index of its column.
    pub column: usize,
    /// What is wrong and what to try.
    pub message: String,
}

/// Reads a row that has as many cells as the header. The faults, if any, in order of columns.
pub fn read_row(
    line: usize,
    cells: &[String],
    header: &Header,
    notation: Notation,
) -> Result<Reading, Vec<CellFault>> {
    let mut row = Row {
        notation,
        faults: Vec::new(),
    };
    let mut position = None;
    let mut reading = Reading {
        row: line,
        position: Position::Nanometre(0.0),
        uncertainty: None,
        strength: None,
        strength_uncertainty_dex: None,
        form: None,
        width_nm: None,
        saturated: false,
        order: 1,
        repeat_of: None,
        observer: None,
        label: None,
        note: None,
    };
    for (index, (cell, column)) in cells.iter().zip(&header.columns).enumerate() {
        let Some(column) = column else { continue };
        let cell = cell.trim();
        if let Column::Position(unit) = column {
            position =
                position.or(row.check(index, |notation| read_position(cell, *unit, notation)));
            continue;
        }
        if cell.is_empty() {
            continue;
        }
        let name = || Some(clean_name(cell));
        let above_zero = |unit| move |notation| read_above_zero(cell, unit, notation);
        match column {
            Column::Uncertainty(unit) => {
                reading.uncertainty = row.check(index, above_zero(Some(*unit)))
            }
            Column::StrengthUncertainty => {
                reading.strength_uncertainty_dex = row.check(index, above_zero(Some(Unit::Decade)));
            }
            Column::Width => reading.width_nm = row.check(index, above_zero(Some(Unit::Nanometre))),
            Column::Strength => reading.strength = row.check(index, |n| read_strength(cell, n)),
            Column::Form => reading.form = row.check(index, |_| read_form(cell)),
            Column::Saturated => {
                reading.saturated = row.check(index, |_| read_yes_no(cell)).unwrap_or_default();
            }
            Column::Order => reading.order = row.check(index, |_| read_order(cell)).unwrap_or(1),
            Column::RepeatOf => reading.repeat_of = name(),
            Column::Observer => reading.observer = name(),
            Column::Label => reading.label = name(),
            Column::Note => reading.note = Some(cell.to_owned()),
            Column::Position(_) | Column::Sample | Column::Unused => {}
        }
    }
    match position {
        Some(position) if row.faults.is_empty() => Ok(Reading {
            position,
            ..reading
        }),
        _ => Err(row.faults),
    }
}

/// Collects the faults of a row.
struct Row {
    notation: Notation,
    faults: Vec<CellFault>,
}

impl Row {
    fn check<T>(
        &mut self,
        column: usize,
        read: impl FnOnce(Notation) -> Result<T, String>,
    ) -> Option<T> {
        read(self.notation)
            .map_err(|message| self.faults.push(CellFault { column, message }))
            .ok()
    }
}
