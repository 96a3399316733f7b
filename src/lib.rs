//! Linstock tells what a flame or a discharge lamp contains from measured
//! emission lines.
//!
//! Data flows one way: readings, reduction, evidence, verdict, report.
//! A module knows the ones before it, never those after.
#![forbid(unsafe_code)]

pub mod cli;
pub mod evidence;
pub mod library;
pub mod reading;
pub mod reduction;
pub mod report;
pub mod setup;
pub mod store;
pub mod verdict;
