//! The cells of a row, each to a value or to what is wrong with it.

use super::number::{self, Shape, display, may_be_grouped, remedy, split_unit, suggest};
use super::quote::{quoted, shorten};
use super::unit::Unit;
use super::{ObservedForm, Position, Strength, StrengthWord};

/// Positions that can be readings, nm.
const POSITION_NM: std::ops::RangeInclusive<f64> = 100.0..=2000.0;

/// How the numbers of a file are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Notation {
    /// `.` or `,`.
    pub decimal: char,
    /// The only cells with that sign are strengths such as `1,200`, which may be grouped.
    pub grouping_suspected: bool,
}

pub fn read_position(cell: &str, unit: Unit, notation: Notation) -> Result<Position, String> {
    if cell.is_empty() {
        return Err(
            "the cell is empty (every reading needs a position; delete the row if there was none)"
                .into(),
        );
    }
    let in_range = |value: f64| {
        value > 0.0
            && unit
                .to_nm(value)
                .is_some_and(|nm| POSITION_NM.contains(&nm))
    };
    let value = read_number(cell, Some(unit), notation, in_range)?;
    if value <= 0.0 {
        return Err(format!(
            "{} is not above zero (a position is a positive number)",
            quoted(cell)
        ));
    }
    if !in_range(value) {
        return Err(out_of_range(cell, value, unit, notation.decimal));
    }
    Ok(match unit {
        Unit::Angstrom => Position::Angstrom(value),
        Unit::PerCentimetre => Position::PerCentimetre(value),
        _ => Position::Nanometre(value),
    })
}

/// A position outside the range often is right in another unit.
fn out_of_range(cell: &str, value: f64, unit: Unit, decimal: char) -> String {
    let limits = match unit {
        Unit::Angstrom => "1000-20000 angstrom",
        Unit::PerCentimetre => "5000-100000 cm-1, that is 100-2000 nm",
        _ => "100-2000 nm",
    };
    let fault = format!("{} is outside {limits}", quoted(cell));
    let fits = |nm: &f64| POSITION_NM.contains(nm);
    if may_be_grouped(cell) {
        let whole = cell.replace(['.', ','], "");
        let nm = whole
            .trim()
            .parse()
            .ok()
            .and_then(|value| unit.to_nm(value));
        if nm.as_ref().is_some_and(fits) {
            return format!(
                "{fault} (did you mean {}? thousands are written without a separator)",
                whole.trim()
            );
        }
    }
    // Of several units the one that puts the reading nearest to the visible is the likeliest.
    let other = [
        Unit::Nanometre,
        Unit::Angstrom,
        Unit::PerCentimetre,
        Unit::Micrometre,
    ]
    .into_iter()
    .filter(|other| *other != unit)
    .filter_map(|other| Some((other, other.to_nm(value).filter(fits)?)))
    .min_by(|(_, a), (_, b)| (a / 550.0).ln().abs().total_cmp(&(b / 550.0).ln().abs()));
    match other {
        Some((Unit::Micrometre, nm)) => {
            format!(
                "{fault} (did you mean micrometres? that is {} nm)",
                display(nm, decimal)
            )
        }
        Some((Unit::Nanometre, _)) => {
            format!("{fault} (did you mean nm? then name the column wavelength_nm)")
        }
        Some((Unit::PerCentimetre, _)) => {
            format!("{fault} (did you mean cm-1? then name the column wavenumber_cm-1)")
        }
        Some((other, nm)) => {
            format!(
                "{fault} (did you mean {}? that is {} nm)",
                other.name(),
                display(nm, decimal)
            )
        }
        None => fault,
    }
}

pub fn read_above_zero(cell: &str, unit: Option<Unit>, notation: Notation) -> Result<f64, String> {
    let value = read_number(cell, unit, notation, |value| value > 0.0)?;
    if value > 0.0 {
        return Ok(value);
    }
    Err(format!(
        "{} is not above zero (leave the cell empty if it is not known)",
        quoted(cell)
    ))
}

/// A number in the unit of its column; a unit behind the number must be that one.
pub fn read_number(
    cell: &str,
    unit: Option<Unit>,
    notation: Notation,
    fits: impl Fn(f64) -> bool,
) -> Result<f64, String> {
    let (text, stated) = split_unit(cell);
    if let (Some(stated), Some(unit)) = (stated, unit)
        && stated != unit
    {
        return Err(unit_disagrees(cell, &text, stated, unit, notation.decimal));
    }
    let (fault, meaning) = match number::shape(&text) {
        Shape::Number(value, _) => return Ok(value),
        Shape::NotFinite => return Err(format!("{} is not a finite number", quoted(cell))),
        Shape::BothSigns => (
            "has both decimal signs",
            Some("thousands are written without a separator"),
        ),
        Shape::Grouped => (
            "has its decimal sign twice",
            Some("thousands are written without a separator"),
        ),
        Shape::Other => ("is not a number", None),
    };
    let did_you_mean =
        suggest(&text, notation.decimal, fits).map(|meant| format!("did you mean {meant}?"));
    let hints = [did_you_mean.as_deref(), meaning.or_else(|| remedy(&text))];
    let hints: Vec<&str> = hints.into_iter().flatten().collect();
    Err(match hints.join(" ") {
        hints if hints.is_empty() => format!("{} {fault}", quoted(cell)),
        hints => format!("{} {fault} ({hints})", quoted(cell)),
    })
}

fn unit_disagrees(cell: &str, text: &str, stated: Unit, unit: Unit, decimal: char) -> String {
    let fault = format!(
        "{} is in {} but the column is in {}",
        quoted(cell),
        stated.name(),
        unit.name()
    );
    // Only lengths convert into one another without asking for the medium.
    let per_nm = |unit| match unit {
        Unit::Nanometre => Some(1.0),
        Unit::Angstrom => Some(10.0),
        Unit::Micrometre => Some(1e-3),
        _ => None,
    };
    match (number::shape(text), per_nm(stated), per_nm(unit)) {
        (Shape::Number(value, _), Some(from), Some(to)) => {
            format!(
                "{fault} (did you mean {}?)",
                display(value / from * to, decimal)
            )
        }
        _ => format!("{fault} (use one unit in a file and name it in the header)"),
    }
}

pub fn read_strength(cell: &str, notation: Notation) -> Result<Strength, String> {
    const WORDS: [(&str, StrengthWord); 4] = [
        ("faint", StrengthWord::Faint),
        ("medium", StrengthWord::Medium),
        ("strong", StrengthWord::Strong),
        ("dominant", StrengthWord::Dominant),
    ];
    let lower = cell.to_lowercase();
    if let Some((_, word)) = WORDS.iter().find(|(name, _)| *name == lower) {
        return Ok(Strength::Word(*word));
    }
    if notation.grouping_suspected && may_be_grouped(cell) {
        let whole = cell.replace(notation.decimal, "");
        let with_point = cell.replace(notation.decimal, ".");
        return Err(format!(
            "{} can be read in two ways (write {} or {})",
            quoted(cell),
            shorten(&whole),
            shorten(&with_point),
        ));
    }
    if !cell.contains(|c: char| c.is_ascii_digit()) && number::shape(cell) != Shape::NotFinite {
        let names = WORDS.map(|(name, _)| name);
        return Err(no_such_word(
            cell,
            &names,
            "is neither a number nor faint, medium, strong or dominant",
        ));
    }
    read_above_zero(cell, None, notation).map(Strength::Number)
}

pub fn read_form(cell: &str) -> Result<ObservedForm, String> {
    match cell.to_lowercase().as_str() {
        "line" => Ok(ObservedForm::Line),
        "band" => Ok(ObservedForm::Band),
        _ => Err(no_such_word(
            cell,
            &["line", "band"],
            "is neither line nor band",
        )),
    }
}

pub fn read_yes_no(cell: &str) -> Result<bool, String> {
    match cell.to_lowercase().as_str() {
        "yes" | "y" | "true" | "1" | "ja" | "j" | "x" => Ok(true),
        "no" | "n" | "false" | "0" | "nein" => Ok(false),
        _ => Err(no_such_word(
            cell,
            &["yes", "no", "true", "false"],
            "is neither yes nor no",
        )),
    }
}

pub fn read_order(cell: &str) -> Result<u32, String> {
    if let Some(order) = cell.parse::<u32>().ok().filter(|order| *order > 0) {
        return Ok(order);
    }
    let fault = format!(
        "{} is not a diffraction order (1, 2, 3 and so on)",
        quoted(cell)
    );
    match number::shape(cell) {
        Shape::Number(value, _) if value < 0.0 => Err(format!(
            "{fault}; the side does not matter, leave out the sign"
        )),
        _ => Err(fault),
    }
}

/// A word that is not among those that can stand here, with the nearest of them.
fn no_such_word(cell: &str, words: &[&str], fault: &str) -> String {
    let lower = cell.to_lowercase();
    let nearest = words
        .iter()
        .min_by_key(|word| strsim::osa_distance(word, &lower));
    match nearest.filter(|word| strsim::osa_distance(word, &lower) <= 2) {
        Some(word) => format!("{} {fault} (did you mean {word}?)", quoted(cell)),
        None => format!("{} {fault}", quoted(cell)),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const POINT: Notation = Notation {
        decimal: '.',
        grouping_suspected: false,
    };

    #[track_caller]
    fn fault(result: Result<impl std::fmt::Debug, String>) -> String {
        result.unwrap_err()
    }

    #[test]
    fn positions_out_of_range_name_the_unit_they_fit() {
        let at = |cell, unit| fault(read_position(cell, unit, POINT));
        assert_eq!(
            at("5893", Unit::Nanometre),
            "\"5893\" is outside 100-2000 nm (did you mean angstrom? that is 589.3 nm)"
        );
        assert_eq!(
            at("16978", Unit::Nanometre),
            "\"16978\" is outside 100-2000 nm (did you mean cm-1? then name the column wavenumber_cm-1)"
        );
        assert_eq!(
            at("0.5893", Unit::Nanometre),
            "\"0.5893\" is outside 100-2000 nm (did you mean micrometres? that is 589.3 nm)"
        );
        assert_eq!(
            at("589.3", Unit::Angstrom),
            "\"589.3\" is outside 1000-20000 angstrom (did you mean nm? then name the column wavelength_nm)"
        );
        assert_eq!(
            at("5,893", Unit::Angstrom),
            "\"5,893\" is outside 1000-20000 angstrom (did you mean 5893? thousands are written without a separator)"
        );
        assert_eq!(at("1e9", Unit::Nanometre), "\"1e9\" is outside 100-2000 nm");
        assert_eq!(
            at("99.999", Unit::Nanometre),
            "\"99.999\" is outside 100-2000 nm"
        );
        for (cell, unit) in [
            ("100", Unit::Nanometre),
            ("2000", Unit::Nanometre),
            ("20000", Unit::Angstrom),
            ("5000", Unit::PerCentimetre),
        ] {
            assert!(read_position(cell, unit, POINT).is_ok(), "{cell}");
        }
    }

    #[test]
    fn numbers_that_are_none_say_what_was_meant() {
        let at = |cell| fault(read_position(cell, Unit::Nanometre, POINT));
        assert_eq!(
            at("58 9.0"),
            "\"58 9.0\" is not a number (did you mean 589.0?)"
        );
        assert_eq!(
            at("1.589,3"),
            "\"1.589,3\" has both decimal signs (did you mean 1589.3? thousands are written without a separator)"
        );
        assert_eq!(
            at("589 ± 1"),
            "\"589 ± 1\" is not a number (put the uncertainty in a column of its own)"
        );
        assert_eq!(at("nan"), "\"nan\" is not a finite number");
        assert_eq!(
            at("-589.3"),
            "\"-589.3\" is not above zero (a position is a positive number)"
        );
        assert_eq!(
            at("0"),
            "\"0\" is not above zero (a position is a positive number)"
        );
        assert_eq!(
            at("5893 Å"),
            "\"5893 Å\" is in angstrom but the column is in nm (did you mean 589.3?)"
        );
        assert_eq!(
            at("16978 cm-1"),
            "\"16978 cm-1\" is in cm-1 but the column is in nm (use one unit in a file and name it in the header)"
        );
        assert_eq!(
            read_position("589.3 nm", Unit::Nanometre, POINT),
            Ok(Position::Nanometre(589.3))
        );
    }

    #[test]
    fn words_are_matched_or_corrected() {
        assert_eq!(
            read_strength("Strong", POINT),
            Ok(Strength::Word(StrengthWord::Strong))
        );
        assert_eq!(
            fault(read_strength("meduim", POINT)),
            "\"meduim\" is neither a number nor faint, medium, strong or dominant (did you mean medium?)"
        );
        assert_eq!(
            fault(read_strength("inf", POINT)),
            "\"inf\" is not a finite number"
        );
        assert!(read_strength("0", POINT).is_err());
        assert_eq!(
            fault(read_form("lines")),
            "\"lines\" is neither line nor band (did you mean line?)"
        );
        assert_eq!(read_yes_no("JA"), Ok(true));
        assert_eq!(
            fault(read_yes_no("perhaps")),
            "\"perhaps\" is neither yes nor no"
        );
        assert_eq!(read_order("2"), Ok(2));
        for cell in ["0", "-1", "1.5", "99999999999"] {
            assert!(read_order(cell).is_err(), "{cell}");
        }
    }
}
