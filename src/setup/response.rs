//! How the eye or a detector weighs wavelengths, in decades.

use super::words::nearest;
use std::path::Path;

/// The lowest response, decades: nothing passes. Finite, so that no sum becomes undefined.
pub const UNSEEN_DEX: f64 = -12.0;

/// Beyond these wavelengths the eye sees nothing, nm.
pub(super) const EYE_RANGE_NM: [f64; 2] = [390.0, 780.0];

/// How the eye or detector weighs wavelengths.
#[derive(Debug, Clone, PartialEq)]
pub enum Response {
    /// The eye's photopic curve with a violet correction.
    Eye,
    /// The same everywhere in range.
    Flat,
    /// A curve: (nm, decades ≤ 0), ascending; constant outside.
    Curve(Vec<(f64, f64)>),
}

impl Response {
    /// The response at a wavelength (nm), decades, between [`UNSEEN_DEX`] and 0.
    pub fn decades(&self, wavelength_nm: f64) -> f64 {
        match self {
            Self::Eye => eye_dex(wavelength_nm),
            Self::Flat => 0.0,
            Self::Curve(points) => interpolate(points, wavelength_nm).clamp(UNSEEN_DEX, 0.0),
        }
    }
}

/// A response and what it was called: `eye`, `flat`, `camera`, `ccd` or a file name.
#[derive(Debug, Clone, PartialEq)]
pub struct NamedResponse {
    /// Name as typed.
    pub name: String,
    /// The response.
    pub response: Response,
}

impl NamedResponse {
    /// Names that need no file.
    pub const NAMES: [&str; 4] = ["eye", "flat", "camera", "ccd"];

    /// One of [`NamedResponse::NAMES`].
    pub fn built_in(name: &str) -> Option<Self> {
        let response = match name {
            "eye" => Response::Eye,
            "flat" => Response::Flat,
            "camera" => Response::Curve(CAMERA.to_vec()),
            "ccd" => Response::Curve(CCD.to_vec()),
            _ => return None,
        };
        Some(Self {
            name: name.to_owned(),
            response,
        })
    }

    /// A response by name, or from a CSV file of `nm,decades` whose path is relative to `folder`.
    ///
    /// # Errors
    /// A message if the file cannot be read, is no such table, does not ascend,
    /// or holds a value above zero.
    pub fn read(name: &str, folder: &Path) -> Result<Self, String> {
        if let Some(known) = Self::built_in(name) {
            return Ok(known);
        }
        let text = std::fs::read_to_string(folder.join(name)).map_err(|error| {
            let remedy = nearest(name, &Self::NAMES).map_or_else(
                || format!("known without a file: {}", Self::NAMES.join(", ")),
                |meant| format!("did you mean \"{meant}\"?"),
            );
            format!("\"{name}\" cannot be read as a response curve: {error} ({remedy})")
        })?;
        let points = parse_curve(&text).map_err(|fault| format!("\"{name}\": {fault}"))?;
        Ok(Self {
            name: name.to_owned(),
            response: Response::Curve(points),
        })
    }
}

/// Reads rows of `nm,decades`; a first row without numbers is a header, `#` starts a comment line.
pub(super) fn parse_curve(text: &str) -> Result<Vec<(f64, f64)>, String> {
    let mut points: Vec<(f64, f64)> = Vec::new();
    let mut header_allowed = true;
    for (index, line) in text.trim_start_matches('\u{feff}').lines().enumerate() {
        let line = line.trim();
        if line.is_empty() || line.starts_with('#') {
            continue;
        }
        let header =
            std::mem::take(&mut header_allowed) && !line.contains(|c: char| c.is_ascii_digit());
        if header {
            continue;
        }
        let point = parse_point(line).map_err(|fault| format!("line {}: {fault}", index + 1))?;
        if points.last().is_some_and(|last| last.0 >= point.0) {
            return Err(format!(
                "line {}: wavelengths must ascend (\"{line}\" does not)",
                index + 1
            ));
        }
        points.push(point);
    }
    match points.len() {
        0 | 1 => Err("a response curve needs at least two rows of nm,decades".to_owned()),
        _ => Ok(points),
    }
}

/// One row of a response curve.
fn parse_point(line: &str) -> Result<(f64, f64), String> {
    let number = |cell: &str| {
        cell.trim()
            .parse::<f64>()
            .ok()
            .filter(|value| value.is_finite())
    };
    let (nm, decades) = line
        .split_once(',')
        .and_then(|(nm, decades)| Some((number(nm)?, number(decades)?)))
        .ok_or_else(|| format!("\"{line}\" is not two numbers nm,decades"))?;
    if !(100.0..=2000.0).contains(&nm) {
        return Err(format!(
            "\"{nm}\" is not a wavelength between 100 and 2000 nm"
        ));
    }
    if decades > 0.0 {
        return Err(format!(
            "\"{decades}\" is above zero (decades below the best wavelength are negative)"
        ));
    }
    Ok((nm, decades))
}

/// Straight lines between points (position, value) in ascending order; constant outside, 0 if empty.
pub(super) fn interpolate(points: &[(f64, f64)], x: f64) -> f64 {
    let after = points.partition_point(|point| point.0 <= x);
    match (
        after.checked_sub(1).and_then(|before| points.get(before)),
        points.get(after),
    ) {
        (Some(a), Some(b)) => a.1 + (b.1 - a.1) * (x - a.0) / (b.0 - a.0),
        (Some(edge), None) | (None, Some(edge)) => edge.1,
        (None, None) => 0.0,
    }
}

/// How much of the photopic decades count for lines seen one by one.
///
/// The photopic curve compares brightness side by side. A watcher at a spectroscope sees single
/// lines, far above threshold, on dark ground with a partly adapted eye, and moves towards a weak
/// one until it shows: the red lines of potassium at 766-770 nm and the violet of mercury at
/// 405 nm are read in every class. Half the decades, common practice, no source.
const SINGLE_LINES: f64 = 0.5;

/// The eye's response to single lines, decades below its peak at 555 nm; nothing outside
/// 390-780 nm. People differ at both ends by about 0.3 decades; the scatter of every strength in
/// the model covers that.
fn eye_dex(wavelength_nm: f64) -> f64 {
    let [low, high] = EYE_RANGE_NM;
    match (low..=high).contains(&wavelength_nm) {
        true => SINGLE_LINES * interpolate(&EYE, wavelength_nm),
        false => UNSEEN_DEX,
    }
}

/// log10 of the photopic luminous efficiency, our table: CIE 1924 from 460 nm up, and below
/// it raised as later work found necessary (by 0.8 at 400-410 nm, nothing at 460). From memory.
#[rustfmt::skip]
const EYE: [(f64, f64); 41] = [
    (390.0, -3.10), (400.0, -2.58), (410.0, -2.12), (420.0, -1.76), (430.0, -1.56),
    (440.0, -1.44), (450.0, -1.36), (460.0, -1.22), (470.0, -1.04), (480.0, -0.86),
    (490.0, -0.68), (500.0, -0.49), (510.0, -0.30), (520.0, -0.15), (530.0, -0.06),
    (540.0, -0.02), (550.0, -0.002), (555.0, 0.0), (560.0, -0.002), (570.0, -0.02),
    (580.0, -0.06), (590.0, -0.12), (600.0, -0.20), (610.0, -0.30), (620.0, -0.42),
    (630.0, -0.58), (640.0, -0.76), (650.0, -0.97), (660.0, -1.21), (670.0, -1.49),
    (680.0, -1.77), (690.0, -2.09), (700.0, -2.39), (710.0, -2.68), (720.0, -2.98),
    (730.0, -3.28), (740.0, -3.60), (750.0, -3.92), (760.0, -4.22), (770.0, -4.52),
    (780.0, -4.82),
];

/// A colour camera, all channels together: lens and sensor fail in the violet, the
/// infrared-blocking glass cuts from about 650 nm. Common practice, no source.
#[rustfmt::skip]
const CAMERA: [(f64, f64); 12] = [
    (390.0, -2.0), (400.0, -1.2), (420.0, -0.5), (440.0, -0.15), (470.0, 0.0), (540.0, 0.0),
    (600.0, -0.05), (630.0, -0.15), (650.0, -0.3), (670.0, -0.6), (690.0, -1.2), (720.0, -2.5),
];

/// A silicon line detector behind a grating blazed for the visible. Common practice, no source.
#[rustfmt::skip]
const CCD: [(f64, f64); 9] = [
    (300.0, -1.2), (350.0, -0.7), (400.0, -0.3), (450.0, -0.1), (500.0, 0.0), (650.0, 0.0),
    (750.0, -0.2), (850.0, -0.6), (1000.0, -1.5),
];

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn eye_agrees_with_the_photopic_curve() {
        // CIE 1924 V(λ), handbook values from memory.
        for (nm, v) in [
            (450.0, 0.038),
            (500.0, 0.323),
            (550.0, 0.995),
            (600.0, 0.631),
            (650.0, 0.107),
            (700.0, 0.0041),
        ] {
            let off = Response::Eye.decades(nm) / SINGLE_LINES - f64::log10(v);
            let allowed = if nm < 460.0 { 0.1 } else { 0.01 };
            assert!(off.abs() < allowed, "{nm} nm is off by {off} dex");
        }
    }

    #[test]
    fn eye_is_raised_in_the_violet_and_blind_beyond_its_ends() {
        // CIE 1924 V(400) = .000396, V(410) = .00121, from memory.
        for (nm, v) in [(400.0, 0.000396), (410.0, 0.00121)] {
            let raised = Response::Eye.decades(nm) / SINGLE_LINES - f64::log10(v);
            assert!(
                (0.7..0.9).contains(&raised),
                "{nm} nm is raised by {raised} dex"
            );
        }
        assert_eq!(Response::Eye.decades(389.9), UNSEEN_DEX);
        assert_eq!(Response::Eye.decades(780.1), UNSEEN_DEX);
        assert!(Response::Eye.decades(780.0) > -5.0);
    }

    #[test]
    fn built_in_curves_ascend_and_stay_at_or_below_zero() {
        for points in [&EYE[..], &CAMERA, &CCD] {
            assert!(points.windows(2).all(|pair| pair[0].0 < pair[1].0));
            assert!(
                points
                    .iter()
                    .all(|point| (UNSEEN_DEX..=0.0).contains(&point.1))
            );
            assert!(
                points.iter().any(|point| point.1 == 0.0),
                "a curve must touch zero"
            );
        }
    }

    #[test]
    fn curve_files_are_read_or_refused_with_the_line() {
        let points = parse_curve("\u{feff}# mine\nnm,decades\r\n400, -1\n\n500,0\n").unwrap();
        assert_eq!(points, [(400.0, -1.0), (500.0, 0.0)]);
        let curve = Response::Curve(points);
        assert_eq!(
            [350.0, 450.0, 600.0].map(|nm| curve.decades(nm)),
            [-1.0, -0.5, 0.0]
        );
        for (text, expected) in [
            ("400,-1\n400,0\n", "line 2: wavelengths must ascend"),
            ("400,-1\n500,0.2\n", "line 2: \"0.2\" is above zero"),
            ("400,-1\n5x0,0\n", "line 2: \"5x0,0\" is not two numbers"),
            (
                "nm,dex\nnm,dex\n400,0\n",
                "line 2: \"nm,dex\" is not two numbers",
            ),
            ("50,-1\n500,0\n", "line 1: \"50\" is not a wavelength"),
            ("400,nan\n", "line 1: \"400,nan\" is not two numbers"),
            ("400,-1\n", "at least two rows"),
            ("", "at least two rows"),
        ] {
            let fault = parse_curve(text).unwrap_err();
            assert!(fault.contains(expected), "{text:?} gave {fault:?}");
        }
    }

    #[test]
    fn a_missing_file_names_the_word_probably_meant() {
        let fault = NamedResponse::read("flatt", Path::new("/nonexistent")).unwrap_err();
        assert!(fault.contains("did you mean \"flat\"?"), "{fault}");
    }

    proptest! {
        #[test]
        fn curve_parser_never_panics_and_yields_ascending_points(text in "[0-9.,#a-z \n-]{0,60}") {
            if let Ok(points) = parse_curve(&text) {
                prop_assert!(points.windows(2).all(|pair| pair[0].0 < pair[1].0));
                prop_assert!(points.iter().all(|point| point.1 <= 0.0));
            }
        }
    }
}
