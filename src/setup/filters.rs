//! Named filters: what a coloured glass in the beam takes away.

use super::response::interpolate;

/// A coloured glass held before the slit.
#[derive(Debug, PartialEq)]
pub struct Filter {
    /// Name used in set-up files.
    pub name: &'static str,
    /// Where nothing useful passes, nm: a feature there is never missing.
    pub blind_nm: &'static [[f64; 2]],
    /// (nm, decades ≤ 0), ascending; constant outside.
    curve: &'static [(f64, f64)],
}

impl Filter {
    /// The filter of that name.
    pub fn named(name: &str) -> Option<&'static Filter> {
        FILTERS.iter().find(|filter| filter.name == name)
    }

    /// Decades lost (≤ 0) at a wavelength, nm.
    pub fn decades(&self, wavelength_nm: f64) -> f64 {
        interpolate(self.curve, wavelength_nm)
    }
}

/// The filters known, by name. All curves from memory; glass differs by half a decade from piece to piece.
///
/// Each glass is held to keep out the flood of sodium light. What still comes through there
/// depends on the thickness of the piece, so that stretch counts as blind: a dim stretch
/// alone would still let the model expect sodium of a substance whose other lines lie out of range.
#[rustfmt::skip]
pub static FILTERS: [Filter; 2] = [
    // Passes violet, blue and deep red; three dark bands near 535, 590 and 645 nm.
    Filter {
        name: "cobalt-glass",
        blind_nm: &[[575.0, 610.0]],
        curve: &[
            (380.0, -0.2), (400.0, -0.1), (450.0, -0.1), (470.0, -0.3), (480.0, -0.6),
            (500.0, -1.5), (530.0, -2.3), (545.0, -2.1), (560.0, -1.6), (575.0, -2.1),
            (590.0, -2.6), (605.0, -2.5), (620.0, -2.2), (645.0, -2.6), (660.0, -2.2),
            (675.0, -1.3), (690.0, -0.6), (710.0, -0.15), (780.0, -0.1),
        ],
    },
    // A narrow dark band at the sodium lines, weaker ones near 525 and 745 nm.
    Filter {
        name: "didymium-glass",
        blind_nm: &[[577.0, 595.0]],
        curve: &[
            (400.0, -0.1), (470.0, -0.3), (500.0, -0.2), (513.0, -0.5), (525.0, -0.9),
            (535.0, -0.4), (550.0, -0.1), (565.0, -0.3), (573.0, -1.5), (580.0, -2.6),
            (588.0, -2.5), (595.0, -1.2), (605.0, -0.3), (650.0, -0.05), (680.0, -0.15),
            (725.0, -0.2), (745.0, -0.9), (760.0, -0.2), (780.0, -0.1),
        ],
    },
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn filters_are_well_formed() {
        for filter in &FILTERS {
            assert!(
                filter.curve.windows(2).all(|pair| pair[0].0 < pair[1].0),
                "{}",
                filter.name
            );
            assert!(
                filter.curve.iter().all(|point| point.1 <= 0.0),
                "{}",
                filter.name
            );
            assert_eq!(Filter::named(filter.name), Some(filter));
        }
    }

    #[test]
    fn cobalt_glass_hides_sodium_and_shows_potassium() {
        let glass = Filter::named("cobalt-glass").unwrap();
        // The classroom use of the glass: potassium's violet and deep red pass, sodium's yellow does not.
        assert!(glass.decades(404.4) > -0.3 && glass.decades(766.5) > -0.3);
        assert!(glass.decades(589.3) < -2.0);
        assert!(
            glass
                .blind_nm
                .iter()
                .any(|[from, to]| (*from..=*to).contains(&589.3))
        );
    }
}
