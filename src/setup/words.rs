//! The words of a set-up: kinds by name, with a suggestion for a misspelt one.

use super::{InstrumentKind, Medium};
use crate::library::SourceKind;
use std::str::FromStr;

/// A word that is none of those known; the message says which are and which was probably meant.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{0}")]
pub struct UnknownWord(pub(super) String);

impl UnknownWord {
    /// `what` with its article, as in "a medium".
    pub(super) fn new(what: &str, typed: &str, known: &[&str]) -> Self {
        let remedy = match nearest(typed, known) {
            Some(meant) => format!("did you mean \"{meant}\"?"),
            None => format!("known: {}", known.join(", ")),
        };
        Self(format!("\"{typed}\" is not {what} ({remedy})"))
    }
}

/// The known word that a typed one was probably meant to be.
pub(super) fn nearest<'a>(typed: &str, known: &[&'a str]) -> Option<&'a str> {
    let typed = typed.trim().to_lowercase().replace(['_', ' '], "-");
    known
        .iter()
        .map(|word| (strsim::jaro_winkler(&typed, &word.replace('_', "-")), *word))
        .filter(|(likeness, _)| *likeness >= 0.85)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, word)| word)
}

impl InstrumentKind {
    /// All kinds, simplest first.
    pub const ALL: [Self; 5] = [
        Self::ScaleSpectroscope,
        Self::Goniometer,
        Self::Prism,
        Self::Camera,
        Self::Ccd,
    ];

    /// The name used in set-up files and flags.
    pub fn name(self) -> &'static str {
        match self {
            Self::ScaleSpectroscope => "scale-spectroscope",
            Self::Goniometer => "goniometer",
            Self::Prism => "prism",
            Self::Camera => "camera",
            Self::Ccd => "ccd",
        }
    }
}

impl FromStr for InstrumentKind {
    type Err = UnknownWord;

    fn from_str(text: &str) -> Result<Self, UnknownWord> {
        let known = Self::ALL.map(Self::name);
        let found = Self::ALL.into_iter().find(|kind| kind.name() == text);
        found.ok_or_else(|| UnknownWord::new("a kind of instrument", text, &known))
    }
}

impl Medium {
    /// Both media.
    pub const ALL: [Self; 2] = [Self::Air, Self::Vacuum];

    /// The name used in set-up files and flags.
    pub fn name(self) -> &'static str {
        match self {
            Self::Air => "air",
            Self::Vacuum => "vacuum",
        }
    }
}

impl FromStr for Medium {
    type Err = UnknownWord;

    fn from_str(text: &str) -> Result<Self, UnknownWord> {
        let known = Self::ALL.map(Self::name);
        let found = Self::ALL.into_iter().find(|medium| medium.name() == text);
        found.ok_or_else(|| UnknownWord::new("a medium", text, &known))
    }
}

/// The name of a kind of source in set-up files and flags.
pub(super) fn source_name(kind: SourceKind) -> &'static str {
    match kind {
        SourceKind::Flame => "flame",
        SourceKind::Discharge => "discharge",
        SourceKind::Absorption => "absorption",
    }
}

/// The kind of source of that name.
pub(super) fn source_kind(text: &str) -> Result<SourceKind, UnknownWord> {
    let known = SourceKind::ALL.map(source_name);
    let found = SourceKind::ALL
        .into_iter()
        .find(|kind| source_name(*kind) == text);
    found.ok_or_else(|| UnknownWord::new("a kind of source", text, &known))
}
