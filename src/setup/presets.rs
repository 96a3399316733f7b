//! The defaults of each kind of instrument.
//!
//! All of them are common practice, no source: what instruments of a school or a
//! teaching laboratory do in unpractised hands. A set-up that knows better says so.

use super::InstrumentKind;

/// The defaults of one kind of instrument; see the keys of a set-up file for the meaning of each.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Preset {
    /// Observable range, nm.
    pub range_nm: [f64; 2],
    /// Full width at half maximum, nm.
    pub resolution_nm: f64,
    /// Standard uncertainty of a reading, nm.
    pub uncertainty_nm: f64,
    /// Standard uncertainty of the common shift, nm.
    pub offset_nm: f64,
    /// Standard uncertainty of a common stretch, relative.
    pub scale_relative: f64,
    /// Decades between the strongest feature and the weakest noticed.
    pub dynamic_range_dex: f64,
    /// Standard uncertainty of a numeric strength, decades.
    pub strength_uncertainty_dex: f64,
    /// No overlapping orders.
    pub orders_filtered: bool,
    /// Name of the response.
    pub response: &'static str,
}

/// The defaults of a kind of instrument.
pub fn preset(kind: InstrumentKind) -> &'static Preset {
    match kind {
        InstrumentKind::ScaleSpectroscope => &SCALE_SPECTROSCOPE,
        InstrumentKind::Goniometer => &GONIOMETER,
        InstrumentKind::Prism => &PRISM,
        InstrumentKind::Camera => &CAMERA,
        InstrumentKind::Ccd => &CCD,
    }
}

/// What an eye sees of bright lines in a darkened room, nm; the red of potassium is in it.
const EYE_RANGE_NM: [f64; 2] = [400.0, 780.0];

/// Hand-held, a printed scale with divisions of 5 or 10 nm beside the slit image; the scale
/// shifts with the position of the eye, which is the common offset.
const SCALE_SPECTROSCOPE: Preset = Preset {
    range_nm: EYE_RANGE_NM,
    resolution_nm: 4.0,
    uncertainty_nm: 3.0,
    offset_nm: 1.5,
    scale_relative: 0.0,
    dynamic_range_dex: 1.5,
    strength_uncertainty_dex: 0.2,
    orders_filtered: true,
    response: "eye",
};

/// A grating of 300-600 lines per mm on a circle read to one or two minutes of arc; the offset is
/// the zero and the grating constant. Readings in the second order overlap with the third.
const GONIOMETER: Preset = Preset {
    range_nm: EYE_RANGE_NM,
    resolution_nm: 0.8,
    uncertainty_nm: 0.5,
    offset_nm: 0.3,
    scale_relative: 0.0,
    dynamic_range_dex: 2.0,
    strength_uncertainty_dex: 0.2,
    orders_filtered: false,
    response: "eye",
};

/// One prism of flint glass and a scale calibrated with known lines; worst in the red, where
/// the dispersion is smallest. A prism has no orders.
const PRISM: Preset = Preset {
    range_nm: EYE_RANGE_NM,
    resolution_nm: 2.0,
    uncertainty_nm: 1.5,
    offset_nm: 0.8,
    scale_relative: 0.0,
    dynamic_range_dex: 1.8,
    strength_uncertainty_dex: 0.2,
    orders_filtered: true,
    response: "eye",
};

/// A telephone behind a grating sheet, calibrated with two or three lines. Its strengths pass
/// an unknown tone curve, its blocking glass ends the spectrum near 690 nm.
const CAMERA: Preset = Preset {
    range_nm: [400.0, 690.0],
    resolution_nm: 3.0,
    uncertainty_nm: 1.5,
    offset_nm: 0.8,
    scale_relative: 0.001,
    dynamic_range_dex: 2.0,
    strength_uncertainty_dex: 0.5,
    orders_filtered: false,
    response: "camera",
};

/// A small factory-calibrated spectrometer with order-sorting coating.
const CCD: Preset = Preset {
    range_nm: [350.0, 850.0],
    resolution_nm: 1.0,
    uncertainty_nm: 0.3,
    offset_nm: 0.2,
    scale_relative: 0.0,
    dynamic_range_dex: 3.0,
    strength_uncertainty_dex: 0.2,
    orders_filtered: true,
    response: "ccd",
};
