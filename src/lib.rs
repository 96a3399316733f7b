//! Linstock tells what a flame or a discharge lamp contains from measured emission lines.
//!
//! ```
//! use linstock::{embedded, reading, setup, verdict};
//!
//! # fn main() -> Result<(), Box<dyn std::error::Error>> {
//! let table = reading::read_table(
//!     "tube 4",
//!     b"wavelength_nm,uncertainty_nm\n656.6,0.4\n486.0,0.4\n434.3,0.4\n410.0,0.5\n",
//! );
//! let file = setup::parse_setup(
//!     "[instrument]\nkind = 'goniometer'\n[source]\nkind = 'discharge'\n",
//!     "bench.toml",
//!     std::path::Path::new("."),
//! )?;
//! let setup = setup::resolve(Some(file), setup::SetupOverrides::default())?;
//! let library = embedded::library()?;
//! let shortlist = verdict::shortlist(&library, &setup)?;
//! let found = verdict::identify_sample(&library, &setup, &shortlist, &table.samples[0])?;
//! let leader = &found.verdict.compositions[0];
//! assert_eq!(leader.substances[0].id, "hydrogen");
//! assert!(leader.posterior > 0.9);
//! # Ok(())
//! # }
//! ```
//!
//! Data flows one way: readings, reduction, evidence, verdict, report. A module knows the ones
//! before it, never those after. These hold throughout:
//!
//! - Only [`cli`] and [`store`] write; only table reading, set-up and library loading read.
//!   [`evidence`] knows no instrument and no format.
//! - One quadrature type serves every nuisance.
//! - The same input, library and version give the same bytes, whatever the number of threads.
//! - Every number shown has a unit. A value that is unknown is absent, never zero.
//! - A file is used whole or refused; input that is not recognised never succeeds.
#![forbid(unsafe_code)]

// In the order in which data passes them.
pub mod reading;

pub mod setup;

pub mod reduction;

pub mod library;

pub mod embedded;

pub mod enrolment;

pub mod evidence;

pub mod verdict;

pub mod report;

pub mod store;

pub mod cli;
