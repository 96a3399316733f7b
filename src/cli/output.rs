//! Where a report goes.

use super::Failure;
use crate::store::write_whole;
use clap::{Args, ValueEnum};
use std::io::{self, Write};
use std::path::PathBuf;

/// Format of a report.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum Format {
    /// For people, 80 columns wide
    Text,
    /// For programs
    Json,
}

/// When to use colour.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum Color {
    /// On a terminal, unless `NO_COLOR` is set
    Auto,
    /// Always
    Always,
    /// Never
    Never,
}

/// Where a report goes, as typed.
#[derive(Debug, Args)]
#[command(next_help_heading = "Output")]
pub(super) struct OutputOptions {
    /// Format of the report
    #[arg(long, value_enum, default_value_t = Format::Text, value_name = "FORMAT")]
    pub format: Format,
    /// Write the report to this file, whole or not at all
    #[arg(long, short, value_name = "FILE")]
    output: Option<PathBuf>,
    /// Use colour
    #[arg(long, value_enum, default_value_t = Color::Auto, value_name = "WHEN")]
    color: Color,
    /// Print the answers and what was refused, nothing else
    #[arg(long, short)]
    pub quiet: bool,
}

impl OutputOptions {
    /// Writes a report. Styles in it are stripped where they are not wanted.
    pub fn write(&self, report: &str) -> Result<(), Failure> {
        match &self.output {
            Some(path) => {
                let styled = self.color == Color::Always;
                let plain = || anstream::adapter::strip_str(report).to_string();
                let content = if styled { report.to_owned() } else { plain() };
                Ok(write_whole(path, content.as_bytes())?)
            }
            None => self.print(report).or_else(|error| match error.kind() {
                // Whoever reads has seen enough.
                io::ErrorKind::BrokenPipe => Ok(()),
                _ => Err(Failure::Print(error)),
            }),
        }
    }

    fn print(&self, report: &str) -> io::Result<()> {
        let stdout = io::stdout().lock();
        let choice = match self.color {
            Color::Auto => anstream::AutoStream::choice(&stdout),
            Color::Always => anstream::ColorChoice::Always,
            Color::Never => anstream::ColorChoice::Never,
        };
        let mut stream = anstream::AutoStream::new(stdout, choice);
        stream.write_all(report.as_bytes())?;
        stream.flush()
    }
}
