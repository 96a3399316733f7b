//! Build script: checks the tables of `library` and compiles them for embedding, so that a start
//! of the program does not read a megabyte of text. A faulty table stops the build with its rows.

// The modules are those of the program; only loading is of use here.
#![allow(dead_code, unused_imports)]
#![forbid(unsafe_code)]

mod library;

mod reduction {
    pub mod air;
}

use std::error::Error;
use std::path::Path;
use std::process::ExitCode;

fn main() -> ExitCode {
    for watched in [
        "library",
        "src/library",
        "src/reduction/air.rs",
        "src/compile_library.rs",
    ] {
        println!("cargo::rerun-if-changed={watched}");
    }
    match compile() {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("{error}");
            ExitCode::FAILURE
        }
    }
}

fn compile() -> Result<(), Box<dyn Error>> {
    let folder = Path::new(&std::env::var("CARGO_MANIFEST_DIR")?).join("library");
    let compiled = postcard::to_stdvec(&library::load_folder(&folder)?)?;
    let target = Path::new(&std::env::var("OUT_DIR")?).join("library.bin");
    std::fs::write(target, compiled)?;
    Ok(())
}
