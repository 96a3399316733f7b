//! The columns that are known, and the one a misspelt name stands for.

use super::unit::Unit;

/// What a known column holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Column {
    Position(Unit),
    Uncertainty(Unit),
    Strength,
    StrengthUncertainty,
    Form,
    Width,
    Saturated,
    Order,
    RepeatOf,
    Observer,
    Sample,
    Label,
    Note,
    /// Known, but of use to another command only.
    Unused,
}

/// Every column by name.
pub const KNOWN: [(&str, Column); 21] = [
    ("wavelength_nm", Column::Position(Unit::Nanometre)),
    ("wavelength_angstrom", Column::Position(Unit::Angstrom)),
    ("wavenumber_cm-1", Column::Position(Unit::PerCentimetre)),
    ("uncertainty_nm", Column::Uncertainty(Unit::Nanometre)),
    ("uncertainty_angstrom", Column::Uncertainty(Unit::Angstrom)),
    ("uncertainty_cm-1", Column::Uncertainty(Unit::PerCentimetre)),
    ("strength", Column::Strength),
    ("strength_uncertainty_dex", Column::StrengthUncertainty),
    ("form", Column::Form),
    ("width_nm", Column::Width),
    ("saturated", Column::Saturated),
    ("order", Column::Order),
    ("repeat_of", Column::RepeatOf),
    ("observer", Column::Observer),
    ("sample", Column::Sample),
    ("label", Column::Label),
    ("note", Column::Note),
    ("lot", Column::Unused),
    ("serial", Column::Unused),
    ("hours", Column::Unused),
    ("warm_up_s", Column::Unused),
];

/// Names people give to a wavelength column, normalised.
pub const WAVELENGTH_WORDS: [&str; 9] = [
    "wavelength",
    "lambda",
    "λ",
    "wl",
    "nm",
    "wave",
    "position",
    "peak",
    "line",
];

/// Lower case without white space, `_` and `-`.
pub fn normalise(name: &str) -> String {
    name.chars()
        .filter(|c| !c.is_whitespace() && !matches!(c, '_' | '-' | '\u{2212}' | '\u{feff}'))
        .flat_map(char::to_lowercase)
        .collect()
}

pub fn known(key: &str) -> Option<Column> {
    KNOWN
        .iter()
        .find(|(name, _)| normalise(name) == key)
        .map(|(_, column)| *column)
}

/// The known column that an unknown name resembles. Of equally near ones that in the unit of the
/// position wins.
pub fn likely(key: &str, unit: Option<Unit>) -> Option<(&'static str, Column)> {
    // Two letters of unit decide between names that are otherwise alike.
    for (stem, name) in [
        ("wavelength", "wavelength_angstrom"),
        ("uncertainty", "uncertainty_angstrom"),
    ] {
        let rest = key.strip_prefix(stem).unwrap_or_default();
        if ["a", "å", "ang", "ångström", "angstroms"].contains(&rest) {
            return known(&normalise(name)).map(|column| (name, column));
        }
    }
    let distance = |name: &str| {
        let name = normalise(name);
        let longer = name.chars().count().max(key.chars().count());
        let allowed = match longer {
            0..=5 => 1,
            6..=8 => 2,
            _ => 3,
        };
        let distance = strsim::osa_distance(&name, key);
        (distance <= allowed).then_some(distance)
    };
    let in_unit = |column: Column| match (column, unit) {
        (Column::Uncertainty(own), Some(unit)) => own == unit,
        _ => true,
    };
    if key == "uncertainty" || key == "error" {
        return KNOWN
            .iter()
            .copied()
            .find(|(_, c)| matches!(c, Column::Uncertainty(_)) && in_unit(*c));
    }
    KNOWN
        .iter()
        .filter_map(|(name, column)| Some((distance(name)?, !in_unit(*column), *name, *column)))
        .min_by_key(|(distance, other_unit, _, _)| (*distance, *other_unit))
        .map(|(_, _, name, column)| (name, column))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn misspelt_names_name_the_likely_one() {
        for (name, meant) in [
            ("wavelenght_nm", "wavelength_nm"),
            ("wavelength", "wavelength_nm"),
            ("Wavelength (nm)", "wavelength_nm"),
            ("wavelength_Å", "wavelength_angstrom"),
            ("wavenumber", "wavenumber_cm-1"),
            ("samples", "sample"),
            ("strenght", "strength"),
        ] {
            assert_eq!(
                likely(&normalise(name), None).map(|(name, _)| name),
                Some(meant),
                "{name}"
            );
        }
        let angstrom = Some(Unit::Angstrom);
        assert_eq!(
            likely("uncertainty", angstrom).map(|(name, _)| name),
            Some("uncertainty_angstrom")
        );
        for name in [
            "colour",
            "date",
            "time",
            "name",
            "lamp",
            "intensity",
            "x",
            "left",
            "angle",
            "scale",
            "pixel",
        ] {
            assert_eq!(likely(name, None), None, "{name}");
        }
    }

    #[test]
    fn a_known_name_is_unique_once_normalised() {
        for (name, column) in KNOWN {
            assert_eq!(known(&normalise(name)), Some(column), "{name}");
        }
    }
}
