//! Units that stand in a header or behind a number.

/// A unit that stands in a header or behind a number.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Unit {
    /// nm
    Nanometre,
    /// Å, 0.1 nm
    Angstrom,
    /// cm⁻¹, in vacuum
    PerCentimetre,
    /// µm
    Micrometre,
    /// Powers of ten.
    Decade,
    /// A unit that is known only by name.
    Other(&'static str),
}

impl Unit {
    /// Name for messages.
    pub fn name(self) -> &'static str {
        match self {
            Self::Nanometre => "nm",
            Self::Angstrom => "angstrom",
            Self::PerCentimetre => "cm-1",
            Self::Micrometre => "micrometres",
            Self::Decade => "dex",
            Self::Other(name) => name,
        }
    }

    /// A position in this unit as a wavelength in nm, the difference of air and vacuum left aside.
    pub fn to_nm(self, value: f64) -> Option<f64> {
        match self {
            Self::Nanometre => Some(value),
            Self::Angstrom => Some(value / 10.0),
            Self::PerCentimetre => Some(1e7 / value),
            Self::Micrometre => Some(value * 1e3),
            Self::Decade | Self::Other(_) => None,
        }
    }
}
