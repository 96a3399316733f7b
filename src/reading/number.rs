//! Numbers as people and spreadsheets write them: either decimal sign, an exponent, a unit behind.

use super::unit::Unit;

/// What a cell that should hold a number holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Shape {
    /// A finite number, and the decimal sign it was written with, if any.
    Number(f64, Option<char>),
    /// Point and comma in one cell.
    BothSigns,
    /// The same sign twice, so it groups thousands.
    Grouped,
    /// Infinite, not a number, or beyond what a double holds.
    NotFinite,
    /// Something else.
    Other,
}

/// The shape of a text without unit. Grammar: sign, digits with at most one `.` or `,`, exponent.
pub fn shape(text: &str) -> Shape {
    let text = normalise(text);
    let unsigned = text.strip_prefix(['+', '-']).unwrap_or(&text);
    if ["nan", "inf", "infinity", "∞"].contains(&unsigned.to_lowercase().as_str()) {
        return Shape::NotFinite;
    }
    let (mantissa, exponent) = match unsigned.split_once(['e', 'E']) {
        Some((mantissa, exponent)) => (mantissa, Some(exponent)),
        None => (unsigned, None),
    };
    let of_digits = |part: &str| part.bytes().all(|b| b.is_ascii_digit());
    let exponent_is_well_formed = exponent.is_none_or(|exponent| {
        let digits = exponent.strip_prefix(['+', '-']).unwrap_or(exponent);
        !digits.is_empty() && of_digits(digits)
    });
    let digits: String = mantissa
        .chars()
        .filter(|c| !matches!(c, '.' | ','))
        .collect();
    if digits.is_empty() || !of_digits(&digits) || !exponent_is_well_formed {
        return Shape::Other;
    }
    let (points, commas) = (mantissa.matches('.').count(), mantissa.matches(',').count());
    match (points, commas) {
        (1.., 1..) => return Shape::BothSigns,
        (2.., _) | (_, 2..) => return Shape::Grouped,
        _ => {}
    }
    let sign = if points == 1 {
        Some('.')
    } else {
        (commas == 1).then_some(',')
    };
    match text.replace(',', ".").parse::<f64>() {
        Ok(value) if value.is_finite() => Shape::Number(value, sign),
        Ok(_) => Shape::NotFinite,
        Err(_) => Shape::Other,
    }
}

/// Trims white space of every width and writes the typographic minus as a hyphen.
fn normalise(text: &str) -> String {
    let is_space = |c: char| c.is_whitespace() || matches!(c, '\u{200b}' | '\u{feff}' | '\u{2060}');
    text.trim_matches(is_space)
        .replace(['\u{2212}', '\u{2013}'], "-")
}

/// One to three digits, a sign, three digits: a grouped thousand or a number with three decimals.
pub fn may_be_grouped(text: &str) -> bool {
    let text = normalise(text);
    text.split_once(['.', ',']).is_some_and(|(head, tail)| {
        let digits = |s: &str| s.bytes().all(|b| b.is_ascii_digit());
        (1..=3).contains(&head.len())
            && !head.starts_with('0')
            && tail.len() == 3
            && digits(head)
            && digits(tail)
    })
}

/// Splits `589.3 nm` into its number and its unit. A text without a known unit comes back whole.
pub fn split_unit(text: &str) -> (String, Option<Unit>) {
    let text = normalise(text).to_lowercase();
    for (alias, unit) in UNIT_WORDS {
        let Some(number) = text.strip_suffix(alias) else {
            continue;
        };
        // Without a blank `16971/cm` could lose its last digit.
        if *alias == "1/cm" && !number.ends_with(char::is_whitespace) {
            continue;
        }
        let number = number.trim_end();
        if number.ends_with(|c: char| c.is_ascii_digit() || matches!(c, '.' | ',')) {
            return (number.to_owned(), Some(*unit));
        }
    }
    (text, None)
}

/// Ways to write a unit, lower case; a word stands before those it ends with.
const UNIT_WORDS: &[(&str, Unit)] = &[
    ("nanometres", Unit::Nanometre),
    ("nanometers", Unit::Nanometre),
    ("nanometre", Unit::Nanometre),
    ("nanometer", Unit::Nanometre),
    ("nm", Unit::Nanometre),
    ("angstroms", Unit::Angstrom),
    ("angstrom", Unit::Angstrom),
    ("ångström", Unit::Angstrom),
    ("å", Unit::Angstrom),
    ("a\u{30a}", Unit::Angstrom),
    ("a", Unit::Angstrom),
    ("cm^-1", Unit::PerCentimetre),
    ("cm⁻¹", Unit::PerCentimetre),
    ("cm-1", Unit::PerCentimetre),
    ("1/cm", Unit::PerCentimetre),
    ("/cm", Unit::PerCentimetre),
    ("µm", Unit::Micrometre),
    ("μm", Unit::Micrometre),
    ("um", Unit::Micrometre),
    ("microns", Unit::Micrometre),
    ("pm", Unit::Other("picometres")),
    ("mm", Unit::Other("millimetres")),
    ("cm", Unit::Other("centimetres")),
    ("thz", Unit::Other("terahertz")),
    ("ev", Unit::Other("electronvolts")),
    ("%", Unit::Other("per cent")),
    ("dex", Unit::Decade),
];

/// What was probably meant by a text that is no number: the first plain repair that gives a value
/// which `fits`, written with the decimal sign of the file.
pub fn suggest(text: &str, decimal: char, fits: impl Fn(f64) -> bool) -> Option<String> {
    let text = normalise(text);
    let joined: String = text
        .chars()
        .filter(|c| !c.is_whitespace() && !matches!(c, '\'' | '’' | '_'))
        .collect();
    let digits_for_letters = joined
        .replace(['O', 'o'], "0")
        .replace(['l', 'I', 'i'], "1");
    let bare = joined.trim_matches(|c: char| !c.is_ascii_digit() && !matches!(c, '.' | ','));
    // With both signs the last is the decimal one; a sign met twice only groups.
    let decimal_at = joined
        .rfind(['.', ','])
        .filter(|_| joined.contains('.') && joined.contains(','));
    let ungrouped: String = joined
        .char_indices()
        .filter(|(at, c)| !matches!(c, '.' | ',') || Some(*at) == decimal_at)
        .map(|(_, c)| c)
        .collect();
    let repairs = [
        joined.clone(),
        digits_for_letters,
        bare.to_owned(),
        ungrouped,
    ];
    repairs
        .into_iter()
        .filter(|repair| *repair != text)
        .find_map(|repair| match shape(&repair) {
            Shape::Number(value, _) if fits(value) => {
                Some(repair.replace(['.', ','], &decimal.to_string()))
            }
            _ => None,
        })
}

/// A number for a message: at most four decimals, no trailing zeros, the decimal sign of the file.
pub fn display(value: f64, decimal: char) -> String {
    let text = format!("{value:.4}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    text.replace('.', &decimal.to_string())
}

/// Why a text is no number, as far as its form tells; empty if it does not.
pub fn remedy(text: &str) -> Option<&'static str> {
    let text = normalise(text);
    if text.contains('±') || text.contains("+/-") {
        return Some("put the uncertainty in a column of its own");
    }
    if text.contains([';', '\t']) {
        return Some("separate the header as the rows are separated");
    }
    let halves = text.split_once('-').or_else(|| text.split_once(".."));
    let is_number = |part: &str| matches!(shape(part), Shape::Number(..));
    halves
        .is_some_and(|(a, b)| is_number(a) && is_number(b))
        .then_some("give one value a row")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_in_every_accepted_form() {
        for (text, value, sign) in [
            ("589", 589.0, None),
            ("589.3", 589.3, Some('.')),
            ("589,3", 589.3, Some(',')),
            (" \u{a0}589,3\u{202f}\u{2009}", 589.3, Some(',')),
            ("5,893E+02", 589.3, Some(',')),
            ("5.893e2", 589.3, Some('.')),
            ("+589.", 589.0, Some('.')),
            (".5", 0.5, Some('.')),
            ("\u{2212}3", -3.0, None),
            ("1e\u{2212}3", 1e-3, None),
        ] {
            assert_eq!(shape(text), Shape::Number(value, sign), "{text}");
        }
    }

    #[test]
    fn what_is_no_number() {
        for text in [
            "", ".", "58 9.0", "0x24d", "589.3.", "e5", "5e", "5e1.5", "１２", "--5", "#DIV/0!",
        ] {
            assert!(!matches!(shape(text), Shape::Number(..)), "{text}");
        }
        for text in ["nan", "-inf", "Infinity", "1e999", "∞"] {
            assert_eq!(shape(text), Shape::NotFinite, "{text}");
        }
        assert_eq!(shape("5.893,2"), Shape::BothSigns);
        assert_eq!(shape("1,234,567"), Shape::Grouped);
    }

    #[test]
    fn units_are_split_off() {
        for (text, number, unit) in [
            ("589.3 nm", "589.3", Some(Unit::Nanometre)),
            ("5893Å", "5893", Some(Unit::Angstrom)),
            ("5893 \u{212b}", "5893", Some(Unit::Angstrom)),
            ("16978 cm-1", "16978", Some(Unit::PerCentimetre)),
            ("16978 cm\u{2212}1", "16978", Some(Unit::PerCentimetre)),
            ("16971/cm", "16971", Some(Unit::PerCentimetre)),
            ("16978 1/cm", "16978", Some(Unit::PerCentimetre)),
            ("0.5893 µm", "0.5893", Some(Unit::Micrometre)),
            ("589.3", "589.3", None),
            ("nm", "nm", None),
        ] {
            assert_eq!(split_unit(text), (number.to_owned(), unit), "{text}");
        }
    }

    #[test]
    fn suggestions_are_plain_repairs_that_fit() {
        let nm = |value: f64| (100.0..=2000.0).contains(&value);
        let suggest_nm = |text| suggest(text, '.', nm);
        assert_eq!(suggest_nm("58 9.0").as_deref(), Some("589.0"));
        assert_eq!(suggest_nm("589.O").as_deref(), Some("589.0"));
        assert_eq!(suggest_nm("~589,3?").as_deref(), Some("589.3"));
        assert_eq!(suggest_nm("1,589.3").as_deref(), Some("1589.3"));
        assert_eq!(suggest_nm("yellow"), None);
        assert_eq!(
            suggest("1,234,567.8", '.', |v| v > 0.0).as_deref(),
            Some("1234567.8")
        );
        assert_eq!(
            suggest("1,234,567", '.', |v| v > 0.0).as_deref(),
            Some("1234567")
        );
        assert_eq!(
            suggest("5'893", ',', |v| v > 1000.0).as_deref(),
            Some("5893")
        );
        assert_eq!(
            suggest("5,893", '.', |v| v > 1000.0).as_deref(),
            Some("5893")
        );
        assert_eq!(
            remedy("589.3 ± 0.2"),
            Some("put the uncertainty in a column of its own")
        );
        assert_eq!(remedy("589–590"), Some("give one value a row"));
        assert_eq!(remedy("-5"), None);
    }
}
