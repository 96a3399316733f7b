//! Air and vacuum wavelengths as types.

/// A wavelength in standard air (15 °C, 101325 Pa, dry), nm.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct AirWavelength(f64);
