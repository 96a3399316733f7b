//! The command line: flags as typed, resolved into plain settings. No mathematics here.

mod compute;
mod enrol;
mod exit;
mod failure;
mod identify;
mod inputs;
mod library;
mod options;
mod output;

pub use exit::Exit;
pub use failure::Failure;

use clap::{Parser, Subcommand};

/// Tells what a flame or a discharge lamp contains from measured emission lines.
#[derive(Debug, Parser)]
#[command(name = "linstock", version, max_term_width = 100, after_help = exit::HELP)]
pub struct Cli {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// Rank the compositions that explain a table of readings
    Identify(Box<identify::IdentifyOptions>),
    /// Look at the reference library: substances, lines and band heads
    #[command(subcommand)]
    Library(library::LibraryCommand),
}

/// Runs the command.
///
/// # Errors
/// Whatever keeps it from giving a report; [`Failure::exit`] is the status to end with.
pub fn run(cli: &Cli) -> Result<Exit, Failure> {
    match &cli.command {
        Command::Identify(options) => identify::run(options),
        Command::Library(command) => library::run(command),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    #[test]
    fn the_flags_are_consistent() {
        Cli::command().debug_assert();
    }
}
