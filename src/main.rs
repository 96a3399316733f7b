//! The program: parse, run, print what went wrong, exit.
#![forbid(unsafe_code)]

use clap::Parser;
use linstock::cli::{Cli, Exit, Failure, run};
use linstock::report::plain;
use std::error::Error;
use std::io::Write;
use std::panic::catch_unwind;
use std::process::ExitCode;

fn main() -> ExitCode {
    let cli = Cli::parse();
    let exit = match catch_unwind(|| run(&cli)) {
        Ok(Ok(exit)) => exit,
        Ok(Err(failure)) => {
            explain(&failure);
            failure.exit()
        }
        // The message of the panic is on standard error already.
        Err(_) => Exit::Internal,
    };
    ExitCode::from(exit.code())
}

/// Prints a failure with its causes. A standard error that is gone is no reason to fail again.
fn explain(failure: &Failure) {
    let mut stderr = std::io::stderr().lock();
    let mut lead = "linstock: ";
    let mut next: Option<&dyn Error> = Some(failure);
    while let Some(error) = next {
        for line in error.to_string().lines() {
            let _ = writeln!(stderr, "{lead}{}", plain(line));
            lead = "  ";
        }
        next = error.source();
    }
}
