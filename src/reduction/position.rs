//! Where a reading lies, in standard air.

use super::ReductionError;
use super::air::{AirWavelength, VacuumWavelength};
use crate::reading::{Position, Reading};
use crate::setup::{Medium, Setup};

/// Position and standard uncertainty of one row.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Place {
    /// Position, nm, air.
    pub wavelength_nm: f64,
    /// Standard uncertainty, nm, reading of the division included.
    pub uncertainty_nm: f64,
}

/// Converts a row to air, with the set-up's uncertainty if it states none.
pub(super) fn place(reading: &Reading, setup: &Setup) -> Result<Place, ReductionError> {
    let wavelength =
        in_air(reading.position, setup.medium()).ok_or_else(|| unusable_position(reading))?;
    let stated = reading.uncertainty.map_or(setup.uncertainty_nm(), |u| {
        uncertainty_nm(reading.position, u)
    });
    if !(stated.is_finite() && stated > 0.0) {
        let value = reading.uncertainty.unwrap_or(stated);
        let expected = "above zero and finite";
        return Err(ReductionError::Unusable {
            row: reading.row,
            what: "uncertainty",
            value,
            expected,
        });
    }
    Ok(Place {
        wavelength_nm: wavelength.nm(),
        uncertainty_nm: with_division(stated, setup.division_nm()),
    })
}

/// Wavelengths are in the medium of the set-up, wavenumbers always in vacuum.
fn in_air(position: Position, medium: Medium) -> Option<AirWavelength> {
    let wavelength = |nm: f64| match medium {
        Medium::Air => AirWavelength::new(nm),
        Medium::Vacuum => VacuumWavelength::new(nm).map(VacuumWavelength::to_air),
    };
    match position {
        Position::Nanometre(nm) => wavelength(nm),
        Position::Angstrom(angstrom) => wavelength(angstrom / 10.0),
        Position::PerCentimetre(per_cm) => {
            VacuumWavelength::from_wavenumber(per_cm).map(VacuumWavelength::to_air)
        }
    }
}

/// The uncertainty in nm: u for nm, u/10 for angstrom, λ² u_ν · 10⁻⁷ for wavenumbers (λ in nm,
/// u_ν in cm⁻¹). The refractive index changes it by three parts in ten thousand, which is left out.
fn uncertainty_nm(position: Position, u: f64) -> f64 {
    match position {
        Position::Nanometre(_) => u,
        Position::Angstrom(_) => u / 10.0,
        Position::PerCentimetre(per_cm) => {
            let wavelength_nm = 1e7 / per_cm;
            wavelength_nm * wavelength_nm * u * 1e-7
        }
    }
}

/// A scale division adds division/√12 to u, in quadrature: the reading lies anywhere within it.
fn with_division(uncertainty_nm: f64, division_nm: Option<f64>) -> f64 {
    division_nm.map_or(uncertainty_nm, |division| {
        uncertainty_nm.hypot(division / 12f64.sqrt())
    })
}

/// A position that is no wavelength.
fn unusable_position(reading: &Reading) -> ReductionError {
    let (Position::Nanometre(value) | Position::Angstrom(value) | Position::PerCentimetre(value)) =
        reading.position;
    let expected = "a wavelength between 100 and 2000 nm";
    ReductionError::Unusable {
        row: reading.row,
        what: "position",
        value,
        expected,
    }
}
