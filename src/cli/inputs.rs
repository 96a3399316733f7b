//! Reading tables from files and from standard input.

use super::Failure;
use crate::reading::{Refusal, Table, read_table};
use std::fs;
use std::io::{self, Read};

/// Tables that could be read, and what was refused, each in the order of the command line.
#[derive(Debug, Default)]
pub(super) struct Inputs {
    pub tables: Vec<Table>,
    pub refused: Vec<Refusal>,
}

/// Reads every input. One that is missing ends the run before anything is reported, for it is
/// likelier a slip of the pen than a gap to be worked around.
pub(super) fn read_inputs(names: &[String]) -> Result<Inputs, Failure> {
    if names.iter().filter(|name| *name == "-").count() > 1 {
        return Err(Failure::Usage(
            "standard input can be read only once (name - only once)".to_owned(),
        ));
    }
    let mut inputs = Inputs::default();
    for name in names {
        let table = read_table(name, &read_bytes(name)?);
        inputs.refused.extend(table.refused.iter().cloned());
        inputs.tables.push(table);
    }
    Ok(inputs)
}

fn read_bytes(name: &str) -> Result<Vec<u8>, Failure> {
    let read = if name == "-" {
        let mut bytes = Vec::new();
        io::stdin().lock().read_to_end(&mut bytes).map(|_| bytes)
    } else {
        fs::read(name)
    };
    read.map_err(|source| Failure::Input {
        input: name.to_owned(),
        source,
    })
}
