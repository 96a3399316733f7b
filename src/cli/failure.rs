//! What keeps a command from giving a report.

use super::Exit;
use crate::enrolment::EnrolError;
use crate::library::LibraryError;
use crate::setup::SetupError;
use crate::store::StoreError;
use crate::verdict::ShortlistError;
use std::io;

/// What keeps a command from giving a report.
#[derive(Debug, thiserror::Error)]
pub enum Failure {
    /// Flags that do not go together or cannot be.
    #[error("{0}")]
    Usage(String),
    /// An input that cannot be read.
    #[error("{input:?} cannot be read")]
    Input {
        /// As named on the command line.
        input: String,
        /// What the system says.
        source: io::Error,
    },
    /// A set-up that cannot be used.
    #[error(transparent)]
    Setup(#[from] SetupError),
    /// A library that cannot be used.
    #[error(transparent)]
    Library(#[from] LibraryError),
    /// Candidates that the library does not know.
    #[error("{error}")]
    Shortlist {
        /// What is the matter.
        error: ShortlistError,
        /// Flags name substances; otherwise the set-up file does.
        from_flags: bool,
    },
    /// A sample that cannot be enrolled.
    #[error(transparent)]
    Enrol(#[from] EnrolError),
    /// Readings that cannot be used, one message a line.
    #[error("{0}")]
    Readings(String),
    /// Output that cannot be written to a file.
    #[error(transparent)]
    Store(#[from] StoreError),
    /// Output that cannot be written to standard output.
    #[error("standard output cannot be written")]
    Print(#[source] io::Error),
    /// A report that cannot be put into its format.
    #[error("the report cannot be written as JSON")]
    Json(#[from] serde_json::Error),
    /// A table that cannot be put into its format.
    #[error("the table cannot be written as CSV")]
    Csv(#[from] csv::Error),
}

impl Failure {
    /// The exit status it calls for.
    pub fn exit(&self) -> Exit {
        match self {
            Self::Usage(_)
            | Self::Shortlist {
                from_flags: true, ..
            } => Exit::Usage,
            // A fault of the flags names no file.
            Self::Setup(error) if error.faults.iter().all(|fault| fault.input.is_none()) => {
                Exit::Usage
            }
            Self::Setup(_)
            | Self::Readings(_)
            | Self::Enrol(_)
            | Self::Shortlist { .. }
            | Self::Library(LibraryError::Faulty { .. }) => Exit::BadData,
            Self::Input { .. } | Self::Library(LibraryError::Unreadable { .. }) => Exit::NoInput,
            Self::Store(_) | Self::Print(_) => Exit::NoOutput,
            Self::Json(_) | Self::Csv(_) => Exit::Internal,
        }
    }
}
