//! Numbers and names as words: the one place that decides how many digits a reader sees.

/// A probability for a reader: never 0.00 and never 1.00.
///
/// Two decimals between .01 and .99, three outside, `< 0.001` and `> 0.999` beyond.
pub fn probability(p: f64) -> String {
    if !p.is_finite() {
        return "unknown".to_owned();
    }
    if p > 0.999 {
        "> 0.999".to_owned()
    } else if p < 0.001 {
        "< 0.001".to_owned()
    } else if p >= 0.985 {
        // Rounded up this could read as certainty at three decimals; .999 is the most it says.
        format!("{:.3}", p.min(0.999))
    } else if p < 0.0095 {
        format!("{p:.3}")
    } else {
        format!("{p:.2}")
    }
}

/// A bound on a probability: `at most 0.02`, `less than 0.001`.
pub fn at_most(bound: f64) -> String {
    if bound < 0.001 {
        "less than 0.001".to_owned()
    } else {
        format!("at most {}", probability(bound))
    }
}

/// Decimals that a quantity with standard uncertainty `uncertainty` deserves: its uncertainty
/// shows one significant digit, two when the first is a 1.
pub fn decimals(uncertainty: f64) -> usize {
    if !uncertainty.is_finite() || uncertainty <= 0.0 {
        return 3;
    }
    let exponent = uncertainty.log10().floor();
    let leading = uncertainty / 10f64.powf(exponent);
    let digits = -exponent + if leading < 1.95 { 1.0 } else { 0.0 };
    digits.clamp(0.0, 4.0) as usize
}

/// A wavelength with the decimals its standard uncertainty deserves, both in nm, without the unit.
pub fn wavelength(wavelength_nm: f64, uncertainty_nm: f64) -> String {
    format!("{wavelength_nm:.*}", decimals(uncertainty_nm))
}

/// `587.7 ± 0.2`, nm, without the unit.
pub fn wavelength_with_uncertainty(wavelength_nm: f64, uncertainty_nm: f64) -> String {
    let digits = decimals(uncertainty_nm);
    format!("{wavelength_nm:.digits$} ± {uncertainty_nm:.digits$}")
}

/// `a`, `a and b`, `a, b and c`.
pub fn list<S: AsRef<str>>(items: &[S]) -> String {
    joined(items, "and")
}

/// `a`, `a or b`, `a, b or c`.
pub fn alternatives<S: AsRef<str>>(items: &[S]) -> String {
    joined(items, "or")
}

fn joined<S: AsRef<str>>(items: &[S], word: &str) -> String {
    match items {
        [] => String::new(),
        [only] => only.as_ref().to_owned(),
        [first @ .., last] => {
            let first: Vec<&str> = first.iter().map(AsRef::as_ref).collect();
            format!("{} {word} {}", first.join(", "), last.as_ref())
        }
    }
}

/// Rows of a table: `row 3`, `rows 3, 4 and 9`, runs of three and more as `3-9`.
pub fn rows(rows: &[usize]) -> String {
    let mut sorted = rows.to_vec();
    sorted.sort_unstable();
    sorted.dedup();
    let mut runs: Vec<String> = Vec::new();
    let mut rest = sorted.as_slice();
    while let Some(&first) = rest.first() {
        let length = rest
            .iter()
            .zip(first..)
            .take_while(|&(&row, expected)| row == expected)
            .count();
        if length >= 3 {
            runs.push(format!("{first}-{}", first + length - 1));
        } else {
            runs.extend(rest.iter().take(length).map(usize::to_string));
        }
        rest = rest.get(length..).unwrap_or_default();
    }
    let word = if sorted.len() == 1 { "row" } else { "rows" };
    format!("{word} {}", list(&runs))
}

/// The same text with its first letter in upper case, to start a sentence.
pub fn sentence_case(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| {
        first.to_uppercase().chain(letters).collect()
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn probabilities_never_read_as_certainty() {
        let shown = [
            0.0, 0.0004, 0.004, 0.0096, 0.62, 0.984, 0.9855, 0.9949, 0.9991, 1.0,
        ];
        let words: Vec<String> = shown.iter().map(|&p| probability(p)).collect();
        let expected = [
            "< 0.001", "< 0.001", "0.004", "0.01", "0.62", "0.98", "0.986", "0.995", "> 0.999",
            "> 0.999",
        ];
        assert_eq!(words, expected);
        assert_eq!(probability(f64::NAN), "unknown");
    }

    proptest! {
        #[test]
        fn no_probability_reads_as_zero_or_one(p in 0.0..=1.0f64) {
            let shown = probability(p);
            prop_assert!(!["0.00", "0.000", "1.00", "1.000"].contains(&shown.as_str()), "{p} reads {shown}");
            if let Ok(number) = shown.parse::<f64>() {
                prop_assert!((number - p).abs() <= 0.005 + 1e-12, "{p} reads {shown}");
            }
        }
    }

    #[test]
    fn digits_follow_the_uncertainty() {
        assert_eq!(wavelength_with_uncertainty(587.6543, 0.2), "587.7 ± 0.2");
        assert_eq!(wavelength_with_uncertainty(587.6543, 0.15), "587.65 ± 0.15");
        assert_eq!(wavelength_with_uncertainty(588.9, 3.0), "589 ± 3");
        assert_eq!(wavelength_with_uncertainty(588.9, 1.5), "588.9 ± 1.5");
        assert_eq!(wavelength_with_uncertainty(588.9, 12.0), "589 ± 12");
        assert_eq!(wavelength(587.562_1, 0.005), "587.562");
        assert_eq!(wavelength(587.562_1, 0.0), "587.562");
    }

    #[test]
    fn lists_read_as_english() {
        assert_eq!(list::<&str>(&[]), "");
        assert_eq!(list(&["a"]), "a");
        assert_eq!(list(&["a", "b", "c"]), "a, b and c");
        assert_eq!(alternatives(&["a", "b"]), "a or b");
        assert_eq!(rows(&[7]), "row 7");
        assert_eq!(rows(&[9, 2, 3, 4, 5, 9, 11, 12]), "rows 2-5, 9, 11 and 12");
        assert_eq!(sentence_case("ähnlich"), "Ähnlich");
    }
}
