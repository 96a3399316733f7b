//! Loading a library: a folder on its own, or a folder laid over another library.
//!
//! A folder is used whole or refused; every fault in it is reported in one run.

use super::Library;
use super::assemble::assemble;
use super::table::TableFile;
use sha2::{Digest, Sha256};
use std::borrow::Cow;
use std::collections::BTreeMap;
use std::fmt;
use std::path::{Path, PathBuf};

/// The tables of a library folder by name within it.
pub type Tables = BTreeMap<String, String>;

/// One thing wrong with a library folder.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct LibraryFault {
    /// Table within the folder (`features/calcium.csv`).
    pub file: String,
    /// Line of the file, counted from 1; absent for a fault of the whole table.
    pub row: Option<usize>,
    /// Column by its name in the header; absent for a fault of a whole row.
    pub column: Option<String>,
    /// The offending text.
    pub text: Option<String>,
    /// What is wrong and, in parentheses, what to do; lower case, no full stop.
    pub message: String,
}

impl LibraryFault {
    /// A fault of a whole table.
    pub(super) fn of_file(file: &str, message: &str) -> Self {
        Self {
            file: file.to_owned(),
            row: None,
            column: None,
            text: None,
            message: message.to_owned(),
        }
    }
}

impl fmt::Display for LibraryFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}:", self.file)?;
        match (self.row, &self.column) {
            (Some(row), Some(column)) => write!(f, " row {row}, column {column}:")?,
            (Some(row), None) => write!(f, " row {row}:")?,
            (None, Some(column)) => write!(f, " column {column}:")?,
            (None, None) => {}
        }
        if let Some(text) = self.text.as_deref().filter(|text| !text.is_empty()) {
            write!(f, " {text:?}")?;
        }
        write!(f, " {}", self.message)
    }
}

/// Why a library cannot be used.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum LibraryError {
    /// The folder or a table in it cannot be read at all.
    #[error("library {path:?}: cannot be read: {reason}")]
    Unreadable {
        /// What was to be read.
        path: PathBuf,
        /// What the system says.
        reason: String,
    },
    /// The tables contradict themselves or the layout.
    #[error("library {name:?}: {}", listed(faults))]
    Faulty {
        /// The folder, or `embedded`.
        name: String,
        /// Everything found, by file and row.
        faults: Vec<LibraryFault>,
    },
}

/// The number of faults and, one a line, the first twenty of them.
fn listed(faults: &[LibraryFault]) -> String {
    const SHOWN: usize = 20;
    let mut text = match faults.len() {
        1 => "1 fault".to_owned(),
        n => format!("{n} faults"),
    };
    for fault in faults.iter().take(SHOWN) {
        text.push_str(&format!("\n  {fault}"));
    }
    if faults.len() > SHOWN {
        text.push_str(&format!("\n  and {} more", faults.len() - SHOWN));
    }
    text
}

/// A library made of one folder alone.
///
/// The folder must hold `substances.csv`, `emitters.csv`, `sources.csv` and at least one table in
/// `features/`; `composed.csv`, `lists.csv` and `cautions.csv` may be missing.
///
/// # Errors
/// [`LibraryError::Unreadable`] if the system cannot read it, [`LibraryError::Faulty`] with every
/// fault of every table otherwise.
pub fn load_folder(path: &Path) -> Result<Library, LibraryError> {
    let tables = folder_tables(path)?;
    assemble(None, &tables, digest(None, &tables)).map_err(|faults| faulty(path, faults))
}

/// A library with a folder laid over it.
///
/// One rule: what has the same key is replaced whole, everything else is added. Keys are the
/// substance id (with all its emitters and features), the composed name, the list name and the
/// caution key. A source key of the base may be repeated only word for word, since other rows
/// rest on it. Any table may be missing from the folder; its rows may refer to substances of the
/// base in `composed.csv` and `lists.csv`, to cautions and to sources of the base.
///
/// # Errors
/// As for [`load_folder`].
pub fn extend_from(base: Library, path: &Path) -> Result<Library, LibraryError> {
    let tables = folder_tables(path)?;
    let sha256 = digest(Some(&base), &tables);
    assemble(Some(base), &tables, sha256).map_err(|faults| faulty(path, faults))
}

/// The tables of a folder as they stand; none if the folder is not there yet.
///
/// # Errors
/// [`LibraryError::Unreadable`] if the system cannot read it or a table is not UTF-8.
pub fn read_tables(path: &Path) -> Result<Tables, LibraryError> {
    if !path.exists() {
        return Ok(Tables::new());
    }
    folder_tables(path)?
        .into_iter()
        .map(|table| {
            let text = String::from_utf8(table.bytes.into_owned());
            let text = text.map_err(|_| LibraryError::Unreadable {
                path: path.join(&table.name),
                reason: "not UTF-8".to_owned(),
            })?;
            Ok((table.name, text))
        })
        .collect()
}

/// A library with tables laid over it that are not in their folder yet; the rule is that of
/// [`extend_from`].
///
/// # Errors
/// [`LibraryError::Faulty`] with every fault of every table.
pub fn extend_with(base: Library, path: &Path, tables: &Tables) -> Result<Library, LibraryError> {
    let tables: Vec<TableFile> = tables
        .iter()
        .map(|(name, text)| TableFile {
            name: name.clone(),
            bytes: Cow::Borrowed(text.as_bytes()),
        })
        .collect();
    let sha256 = digest(Some(&base), &tables);
    assemble(Some(base), &tables, sha256).map_err(|faults| faulty(path, faults))
}

fn faulty(path: &Path, faults: Vec<LibraryFault>) -> LibraryError {
    LibraryError::Faulty {
        name: path.display().to_string(),
        faults,
    }
}

/// SHA-256 over the tables in order of name, each as its name, a line feed and its bytes; for an
/// extended library the digest of its base and a line feed come first.
fn digest(base: Option<&Library>, tables: &[TableFile<'_>]) -> String {
    let mut hasher = Sha256::new();
    if let Some(base) = base {
        hasher.update(base.sha256.as_bytes());
        hasher.update(b"\n");
    }
    for table in tables {
        hasher.update(table.name.as_bytes());
        hasher.update(b"\n");
        hasher.update(&table.bytes);
    }
    hasher
        .finalize()
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect()
}

/// The tables of a folder: `*.csv` in it and in its `features/`, sorted by name.
fn folder_tables(folder: &Path) -> Result<Vec<TableFile<'static>>, LibraryError> {
    let mut tables = Vec::new();
    collect_tables(folder, "", &mut tables)?;
    let features = folder.join("features");
    if features.is_dir() {
        collect_tables(&features, "features/", &mut tables)?;
    }
    tables.sort_by(|a, b| a.name.cmp(&b.name));
    Ok(tables)
}

fn collect_tables(
    folder: &Path,
    prefix: &str,
    tables: &mut Vec<TableFile<'static>>,
) -> Result<(), LibraryError> {
    let unreadable = |path: &Path, error: std::io::Error| LibraryError::Unreadable {
        path: path.to_owned(),
        reason: error.to_string(),
    };
    for entry in std::fs::read_dir(folder).map_err(|e| unreadable(folder, e))? {
        let path = entry.map_err(|e| unreadable(folder, e))?.path();
        if !is_table(&path) || path.is_dir() {
            continue;
        }
        let bytes = std::fs::read(&path).map_err(|e| unreadable(&path, e))?;
        let name = path.file_name().unwrap_or_default().to_string_lossy();
        tables.push(TableFile {
            name: format!("{prefix}{name}"),
            bytes: Cow::Owned(bytes),
        });
    }
    Ok(())
}

/// Tables end in `.csv`; hidden files are left-overs of editors and systems.
fn is_table(path: &Path) -> bool {
    let hidden = path
        .file_name()
        .is_some_and(|name| name.to_string_lossy().starts_with('.'));
    !hidden
        && path
            .extension()
            .is_some_and(|e| e.eq_ignore_ascii_case("csv"))
}

/// The small library of the tests.
#[cfg(test)]
pub(super) fn tiny() -> Library {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/cases/library/tiny");
    load_folder(&folder).unwrap_or_else(|error| panic!("{error}"))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn tiny_tables() -> Vec<TableFile<'static>> {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/cases/library/tiny");
        folder_tables(&folder).unwrap_or_else(|error| panic!("{error}"))
    }

    #[test]
    fn the_digest_knows_names_contents_and_base() {
        let tables = tiny_tables();
        let whole = digest(None, &tables);
        assert_eq!(whole, digest(None, &tiny_tables()));
        assert_ne!(whole, digest(None, &tables[1..]));
        assert_ne!(whole, digest(Some(&tiny()), &tables));
        // printf 'a.csv\nx' | sha256sum
        let one = TableFile {
            name: "a.csv".to_owned(),
            bytes: Cow::Borrowed(b"x"),
        };
        assert_eq!(
            digest(None, &[one]),
            "b6d5b4842ec507014268070145df5a4364436dc791a5115331e3a7db30abab48"
        );
    }

    #[test]
    fn a_long_list_of_faults_is_cut_when_shown() {
        let faults = vec![LibraryFault::of_file("a.csv", "is odd"); 23];
        let text = listed(&faults);
        assert!(text.starts_with("23 faults\n  a.csv: is odd\n"), "{text}");
        assert!(text.ends_with("\n  and 3 more"), "{text}");
    }

    proptest! {
        #[test]
        fn damaged_tables_are_refused_with_a_place_or_still_sound(
            which in any::<prop::sample::Index>(),
            from in any::<prop::sample::Index>(),
            length in 0_usize..40,
            put in prop_oneof![
                proptest::collection::vec(any::<u8>(), 0..12),
                "[0-9.,;\"\n#-]{0,12}".prop_map(String::into_bytes),
            ],
        ) {
            let mut tables = tiny_tables();
            let table = which.index(tables.len());
            let bytes = tables[table].bytes.to_mut();
            let from = from.index(bytes.len());
            let to = (from + length).min(bytes.len());
            bytes.splice(from..to, put);
            let lines = bytes.iter().filter(|b| matches!(b, b'\n' | b'\r')).count() + 1;
            let name = tables[table].name.clone();
            match assemble(None, &tables, String::new()) {
                Ok(library) => {
                    prop_assert!(library.substances.is_sorted_by(|a, b| a.id < b.id));
                    for feature in library.substances.iter().flat_map(|s| &s.emitters).flat_map(|e| &e.features) {
                        prop_assert!(feature.strength_dex.iter().flatten().all(|m| *m <= 0.0));
                        prop_assert!(feature.uncertainty_nm > 0.0);
                        prop_assert!(feature.source_position.iter().all(|i| *i < library.sources.len()));
                    }
                }
                Err(faults) => {
                    prop_assert!(!faults.is_empty());
                    for fault in faults {
                        prop_assert!(!fault.message.is_empty());
                        prop_assert!(fault.file != name || fault.row.is_none_or(|row| row <= lines));
                    }
                }
            }
        }
    }
}
