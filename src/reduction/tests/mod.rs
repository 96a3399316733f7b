//! The rules of reduction, each by small samples, and what holds for all samples.

mod pooling;
mod positions;
mod properties;
mod strengths;

use super::*;
use crate::reading::{Position, Strength, StrengthWord};
use crate::setup::{Candidates, InstrumentKind, Medium, SetupOverrides, resolve};

/// A CCD from 380 to 800 nm with w = 0.8 nm.
fn ccd() -> SetupOverrides {
    SetupOverrides {
        instrument: Some(InstrumentKind::Ccd),
        range_nm: Some([380.0, 800.0]),
        resolution_nm: Some(0.8),
        candidates: Some(Candidates::Everything),
        ..SetupOverrides::default()
    }
}

fn setup(said: SetupOverrides) -> Setup {
    resolve(None, said).unwrap()
}

fn at(row: usize, position: Position, uncertainty: Option<f64>) -> Reading {
    Reading {
        row,
        position,
        uncertainty,
        strength: None,
        strength_uncertainty_dex: None,
        form: None,
        width_nm: None,
        saturated: false,
        order: 1,
        repeat_of: None,
        observer: None,
        label: None,
        note: None,
    }
}

fn nm(row: usize, nm: f64, uncertainty: f64) -> Reading {
    at(row, Position::Nanometre(nm), Some(uncertainty))
}

fn by(observer: &str, reading: Reading) -> Reading {
    Reading {
        observer: Some(observer.to_owned()),
        ..reading
    }
}

fn marked(mark: &str, reading: Reading) -> Reading {
    Reading {
        repeat_of: Some(mark.to_owned()),
        ..reading
    }
}

fn strong(number: f64, reading: Reading) -> Reading {
    Reading {
        strength: Some(Strength::Number(number)),
        ..reading
    }
}

fn word(word: StrengthWord, reading: Reading) -> Reading {
    Reading {
        strength: Some(Strength::Word(word)),
        ..reading
    }
}

fn sample(readings: Vec<Reading>) -> Sample {
    Sample {
        name: "s".to_owned(),
        readings,
    }
}

fn reduced(readings: Vec<Reading>, said: SetupOverrides) -> ReducedSample {
    reduce(&sample(readings), &setup(said)).unwrap()
}

/// `count` readings a good way apart with strengths 1, 2, 3, …
fn ladder(count: usize) -> Vec<Reading> {
    (0..count)
        .map(|i| strong(1.0 + i as f64, nm(i + 2, 400.0 + 10.0 * i as f64, 0.2)))
        .collect()
}

fn heights(sample: &ReducedSample) -> Vec<f64> {
    sample
        .readings
        .iter()
        .filter_map(|r| Some(r.strength?.above_faintest_dex))
        .collect()
}

fn close(a: f64, b: f64) -> bool {
    (a - b).abs() < 1e-9
}
