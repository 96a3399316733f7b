//! The header of a table: which column means what.

use super::TableRemark;
use super::column::{Column, WAVELENGTH_WORDS, known, likely, normalise};
use super::quote::{clean_name, quoted, shorten};
use super::unit::Unit;
use std::collections::HashSet;

/// A fault of the header; it refuses the file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct HeaderFault {
    /// Column as written.
    pub column: Option<String>,
    /// What is wrong and what to try.
    pub message: String,
}

/// A header once understood.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Header {
    /// Names as written, cleaned of control characters.
    pub names: Vec<String>,
    /// Meaning of each column. A misspelt column has the meaning it resembles, so that its cells
    /// are checked in the same run.
    pub columns: Vec<Option<Column>>,
    /// Faults in order of columns.
    pub faults: Vec<HeaderFault>,
    /// Remarks in order of columns.
    pub remarks: Vec<TableRemark>,
}

impl Header {
    /// The unit of the position column, if there is one.
    pub fn position_unit(&self) -> Option<Unit> {
        self.columns.iter().find_map(|column| match column {
            Some(Column::Position(unit)) => Some(*unit),
            _ => None,
        })
    }

    /// Index of the first column with that meaning.
    pub fn index_of(&self, column: Column) -> Option<usize> {
        self.columns.iter().position(|known| *known == Some(column))
    }
}

/// How many of the cells are known column names.
pub fn recognised(cells: &[String]) -> usize {
    cells
        .iter()
        .filter(|cell| known(&normalise(cell)).is_some())
        .count()
}

/// Understands a header. `filled` tells whether a column holds anything below its name.
pub fn read_header(cells: &[String], filled: impl Fn(usize) -> bool) -> Header {
    let mut header = Header::default();
    let mut seen: HashSet<String> = HashSet::new();
    let unit = cells.iter().find_map(|cell| match known(&normalise(cell)) {
        Some(Column::Position(unit)) => Some(unit),
        _ => None,
    });
    for (index, cell) in cells.iter().enumerate() {
        let name = clean_name(cell);
        let key = normalise(cell);
        let mut meaning = known(&key);
        if key.is_empty() {
            if filled(index) {
                let column = format!("column {} (without a name)", index + 1);
                header.remarks.push(TableRemark::UnknownColumn { column });
            }
        } else if seen.contains(&key) {
            header.fault(
                &name,
                format!("{} is named twice (keep one of the columns)", quoted(&name)),
            );
            meaning = None;
        } else if meaning == Some(Column::Unused) {
            header.remarks.push(TableRemark::UnusedColumn {
                column: shorten(&name),
            });
        } else if meaning.is_none() {
            match likely(&key, unit) {
                Some((meant, column)) => {
                    header.fault(
                        &name,
                        format!(
                            "{} is not a known column (did you mean {meant}?)",
                            quoted(&name)
                        ),
                    );
                    meaning =
                        Some(column).filter(|column| !header.columns.contains(&Some(*column)));
                }
                None => header.remarks.push(TableRemark::UnknownColumn {
                    column: shorten(&name),
                }),
            }
        }
        seen.insert(key);
        header.names.push(name);
        header.columns.push(meaning);
    }
    check_units(&mut header);
    header
}

impl Header {
    fn fault(&mut self, column: &str, message: String) {
        self.faults.push(HeaderFault {
            column: Some(shorten(column)),
            message,
        });
    }
}

/// One position column, and an uncertainty in its unit.
fn check_units(header: &mut Header) {
    let positions: Vec<&String> = header
        .columns
        .iter()
        .zip(&header.names)
        .filter(|(column, _)| matches!(column, Some(Column::Position(_))))
        .map(|(_, name)| name)
        .collect();
    if positions.len() > 1 {
        let names: Vec<String> = positions.iter().map(|name| shorten(name)).collect();
        let message = format!(
            "{} both give the position (keep one of them)",
            names.join(" and ")
        );
        header.faults.push(HeaderFault {
            column: None,
            message,
        });
    }
    let Some(unit) = header.position_unit() else {
        // A misspelt wavelength column has a meaning by now and does not come here.
        let message = missing_position(&header.names);
        header.faults.push(HeaderFault {
            column: None,
            message,
        });
        return;
    };
    for (column, name) in header.columns.clone().into_iter().zip(header.names.clone()) {
        if let Some(Column::Uncertainty(other)) = column
            && other != unit
        {
            let message = format!(
                "{} is in {} but the position is in {} (did you mean uncertainty_{}?)",
                quoted(&name),
                other.name(),
                unit.name(),
                unit.name(),
            );
            header.fault(&name, message);
        }
    }
}

fn missing_position(names: &[String]) -> String {
    let seen: Vec<String> = names
        .iter()
        .filter(|name| !name.is_empty())
        .take(12)
        .map(|name| quoted(name))
        .collect();
    let looks_like_data = names
        .iter()
        .any(|name| name.starts_with(|c: char| c.is_ascii_digit()));
    let meant = names.iter().find(|name| {
        let key = normalise(name);
        WAVELENGTH_WORDS.contains(&key.as_str())
            || key.contains("wavelength")
            || key.contains("lambda")
    });
    let remedy = match meant {
        Some(name) => format!("did you mean wavelength_nm where {} stands?", quoted(name)),
        None if looks_like_data => {
            "the first line must name the columns, such as wavelength_nm".to_owned()
        }
        None => "name one wavelength_nm, wavelength_angstrom or wavenumber_cm-1".to_owned(),
    };
    format!(
        "no column holds the wavelength; columns seen: {} ({remedy})",
        seen.join(", ")
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    fn header(names: &[&str]) -> Header {
        let cells: Vec<String> = names.iter().map(|name| (*name).to_owned()).collect();
        read_header(&cells, |_| true)
    }

    #[test]
    fn names_are_matched_without_case_spaces_and_dashes() {
        let header = header(&["Wavelength NM", "uncertaintynm", "REPEAT-OF", "Warm up s"]);
        assert_eq!(
            header.columns,
            [
                Some(Column::Position(Unit::Nanometre)),
                Some(Column::Uncertainty(Unit::Nanometre)),
                Some(Column::RepeatOf),
                Some(Column::Unused),
            ]
        );
        assert_eq!(header.faults, []);
        assert_eq!(
            header.remarks,
            [TableRemark::UnusedColumn {
                column: "Warm up s".into()
            }]
        );
    }

    #[test]
    fn faults_of_the_whole_header() {
        let messages = |names: &[&str]| -> Vec<String> {
            header(names)
                .faults
                .into_iter()
                .map(|fault| fault.message)
                .collect()
        };
        assert_eq!(
            messages(&["wavelength_nm", "wavelength_angstrom"]),
            ["wavelength_nm and wavelength_angstrom both give the position (keep one of them)"]
        );
        assert_eq!(
            messages(&["wavelength_nm", "Wavelength-nm"]),
            ["\"Wavelength-nm\" is named twice (keep one of the columns)"]
        );
        assert_eq!(
            messages(&["wavenumber_cm-1", "uncertainty_nm"]),
            [
                "\"uncertainty_nm\" is in nm but the position is in cm-1 (did you mean uncertainty_cm-1?)"
            ]
        );
        assert_eq!(
            messages(&["lambda", "colour"]),
            [
                "no column holds the wavelength; columns seen: \"lambda\", \"colour\" (did you mean wavelength_nm where \"lambda\" stands?)"
            ]
        );
    }
}
