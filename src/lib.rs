//! Linstock tells what a flame or a discharge lamp contains from measured
//! emission lines.
//!
//! Data flows one way: readings, reduction, evidence, verdict, report.
//! A module knows the ones before it, never those after.
#![forbid(unsafe_code)]

pub mod library;
pub mod reading;
pub mod reduction;
pub mod setup;
pub mod evidence;
pub mod verdict;
pub mod report;
pub mod store;
pub mod cli;
