//! A set-up file in TOML: every key known, every value located.

use super::check::check_values;
use super::values::{candidates, count, each, number, numbers, text, truth, word};
use super::words::{nearest, source_kind};
use super::{NamedResponse, SetupError, SetupFault, SetupOverrides};
use std::collections::BTreeMap;
use std::ops::Range;
use std::path::Path;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

/// A set-up file that was read and checked value by value.
#[derive(Debug, Clone, PartialEq)]
pub struct SetupFile {
    name: String,
    values: SetupOverrides,
}

impl SetupFile {
    /// The file as named on the command line.
    pub fn name(&self) -> &str {
        &self.name
    }

    /// What the file says.
    pub fn values(&self) -> &SetupOverrides {
        &self.values
    }

    /// What the file says, by value.
    pub fn into_values(self) -> SetupOverrides {
        self.values
    }
}

/// Reads a set-up file; response curves it names are looked for beside it.
///
/// # Errors
/// If it cannot be read or is not UTF-8, and everything [`parse_setup`] refuses.
pub fn read_setup(path: &Path) -> Result<SetupFile, SetupError> {
    let name = path.display().to_string();
    let text = std::fs::read_to_string(path).map_err(|error| {
        let message = format!("cannot be read: {error}");
        SetupError {
            faults: vec![SetupFault {
                input: Some(name.clone()),
                line: None,
                key: None,
                message,
            }],
        }
    })?;
    parse_setup(&text, &name, path.parent().unwrap_or(Path::new("")))
}

/// Reads the text of a set-up file. `name` is what messages call it, `folder` is
/// where the files it names are.
///
/// # Errors
/// All faults of the text in one go: broken TOML, unknown keys and tables, values
/// of the wrong kind, values that cannot be.
pub fn parse_setup(text: &str, name: &str, folder: &Path) -> Result<SetupFile, SetupError> {
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let mut walk = Walk {
        text,
        folder,
        values: SetupOverrides::default(),
        lines: BTreeMap::new(),
        faults: Vec::new(),
    };
    let (document, broken) = DeTable::parse_recoverable(text);
    for error in &broken {
        walk.fault(
            error.span(),
            None,
            format!("not TOML: {}", error.message().to_lowercase()),
        );
    }
    if broken.is_empty() {
        walk.document(document.get_ref());
        walk.check();
    }
    let Walk {
        values, mut faults, ..
    } = walk;
    if faults.is_empty() {
        return Ok(SetupFile {
            name: name.to_owned(),
            values,
        });
    }
    faults.sort_by_key(|fault| fault.line);
    for fault in &mut faults {
        fault.input = Some(name.to_owned());
    }
    Err(SetupError { faults })
}

/// The way through a document.
struct Walk<'a> {
    text: &'a str,
    folder: &'a Path,
    values: SetupOverrides,
    lines: BTreeMap<String, usize>,
    faults: Vec<SetupFault>,
}

impl Walk<'_> {
    /// Notes a fault at a place in the text.
    fn fault(&mut self, span: Option<Range<usize>>, key: Option<String>, message: String) {
        let line = span.map(|span| self.line(span.start));
        self.faults.push(SetupFault {
            input: None,
            line,
            key,
            message,
        });
    }

    /// The line of a byte, counted from 1.
    fn line(&self, byte: usize) -> usize {
        self.text.bytes().take(byte).filter(|b| *b == b'\n').count() + 1
    }

    /// Takes the tables of the document.
    fn document(&mut self, document: &DeTable<'_>) {
        for (table, value) in document {
            let name = table.get_ref().as_ref();
            match value.get_ref() {
                DeValue::Table(keys) if TABLES.contains(&name) => self.table(name, keys),
                _ => {
                    let message = stray(name);
                    self.fault(Some(table.span()), Some(name.to_owned()), message);
                }
            }
        }
    }

    /// Takes the keys of one table.
    fn table(&mut self, table: &str, keys: &DeTable<'_>) {
        for (spanned, value) in keys {
            let name = spanned.get_ref().as_ref();
            let full = format!("{table}.{name}");
            let taken = match KEYS
                .iter()
                .find(|key| key.table == table && key.name == name)
            {
                Some(key) => (key.take)(&mut self.values, value, self.folder),
                None => Err(unknown_key(table, name)),
            };
            match taken {
                Ok(()) => {
                    let line = self.line(value.span().start);
                    self.lines.insert(full, line);
                }
                Err(message) => self.fault(Some(spanned.span()), Some(full), message),
            }
        }
    }

    /// Checks what was taken.
    fn check(&mut self) {
        for (key, message) in check_values(&self.values) {
            let line = self.lines.get(key).copied();
            self.faults.push(SetupFault {
                input: None,
                line,
                key: Some(key.to_owned()),
                message,
            });
        }
    }
}

/// The tables of a set-up file.
const TABLES: [&str; 2] = ["instrument", "source"];

/// Takes one value into a set-up, or says what was expected.
type Take = fn(&mut SetupOverrides, &Spanned<DeValue<'_>>, &Path) -> Result<(), String>;

/// A key of a set-up file.
struct Key {
    table: &'static str,
    name: &'static str,
    take: Take,
}

/// A key of `[instrument]`.
const fn instrument(name: &'static str, take: Take) -> Key {
    Key {
        table: "instrument",
        name,
        take,
    }
}

/// A key of `[source]`.
const fn source(name: &'static str, take: Take) -> Key {
    Key {
        table: "source",
        name,
        take,
    }
}

/// Every key there is.
const KEYS: [Key; 21] = [
    instrument("kind", |to, value, _| put(&mut to.instrument, word(value))),
    instrument("range_nm", |to, value, _| {
        put(&mut to.range_nm, numbers(value))
    }),
    instrument("resolution_nm", |to, value, _| {
        put(&mut to.resolution_nm, number(value))
    }),
    instrument("uncertainty_nm", |to, value, _| {
        put(&mut to.uncertainty_nm, number(value))
    }),
    instrument("offset_nm", |to, value, _| {
        put(&mut to.offset_nm, number(value))
    }),
    instrument("scale_relative", |to, value, _| {
        put(&mut to.scale_relative, number(value))
    }),
    instrument("dynamic_range", |to, value, _| {
        put(&mut to.dynamic_range_dex, number(value))
    }),
    instrument("strength_uncertainty_dex", |to, value, _| {
        put(&mut to.strength_uncertainty_dex, number(value))
    }),
    instrument("medium", |to, value, _| put(&mut to.medium, word(value))),
    instrument("division_nm", |to, value, _| {
        put(&mut to.division_nm, number(value))
    }),
    instrument("blind_nm", |to, value, _| {
        put(&mut to.blind_nm, each(value, numbers))
    }),
    instrument("filter", |to, value, _| {
        put(&mut to.filter, text(value).map(str::to_owned))
    }),
    instrument("dim_nm", |to, value, _| {
        let triple = |value: &_| numbers(value).map(|[from, to, lost]| (from, to, lost));
        put(&mut to.dim_nm, each(value, triple))
    }),
    instrument("orders_filtered", |to, value, _| {
        put(&mut to.orders_filtered, truth(value))
    }),
    instrument("faintest", |to, value, _| {
        put(&mut to.faintest, number(value))
    }),
    instrument("listed_at_most", |to, value, _| {
        put(&mut to.listed_at_most, count(value))
    }),
    instrument("response", |to, value, folder| {
        put(
            &mut to.response,
            text(value).and_then(|name| NamedResponse::read(name, folder)),
        )
    }),
    source("kind", |to, value, _| {
        let kind = text(value).and_then(|name| source_kind(name).map_err(|e| e.to_string()));
        put(&mut to.source, kind)
    }),
    source("always", |to, value, _| {
        put(
            &mut to.always,
            each(value, |value| text(value).map(str::to_owned)),
        )
    }),
    source("candidates", |to, value, _| {
        put(&mut to.candidates, candidates(value))
    }),
    source("library", |to, value, folder| {
        put(&mut to.library, text(value).map(|path| folder.join(path)))
    }),
];

/// Stores a value that could be read.
fn put<T>(slot: &mut Option<T>, value: Result<T, String>) -> Result<(), String> {
    *slot = Some(value?);
    Ok(())
}

/// What to say of a key that its table does not have.
fn unknown_key(table: &str, name: &str) -> String {
    if let Some(key) = KEYS.iter().find(|key| key.name == name) {
        return format!("this key belongs in [{}]", key.table);
    }
    let here: Vec<&str> = KEYS
        .iter()
        .filter(|key| key.table == table)
        .map(|key| key.name)
        .collect();
    let remedy = match nearest(name, &here) {
        Some(meant) => format!("did you mean {meant}?"),
        None => format!("known: {}", here.join(", ")),
    };
    format!("no such key in [{table}] ({remedy})")
}

/// What to say of something outside the two tables.
fn stray(name: &str) -> String {
    if TABLES.contains(&name) {
        return format!("expected a table (write [{name}] on a line of its own)");
    }
    if let Some(key) = KEYS.iter().find(|key| key.name == name) {
        return format!(
            "this key belongs in a table (write [{}] above it)",
            key.table
        );
    }
    match nearest(name, &TABLES) {
        Some(meant) => format!("no such table (did you mean [{meant}]?)"),
        None => "no such table (known: [instrument], [source])".to_owned(),
    }
}
