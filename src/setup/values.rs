//! Values of a set-up file: each of one kind, or a message that says what was expected and found.

use super::Candidates;
use std::str::FromStr;
use toml::Spanned;
use toml::de::DeValue;

/// What a value is, for messages.
fn found(value: &Spanned<DeValue<'_>>) -> String {
    match value.get_ref() {
        DeValue::String(text) => format!("the text \"{text}\""),
        DeValue::Integer(number) => format!("the number {}", number.as_str()),
        DeValue::Float(number) => format!("the number {}", number.as_str()),
        DeValue::Boolean(truth) => format!("{truth}"),
        DeValue::Datetime(_) => "a date".to_owned(),
        DeValue::Array(items) => format!("a list of {}", items.len()),
        DeValue::Table(_) => "a table".to_owned(),
    }
}

/// A finite number.
pub(super) fn number(value: &Spanned<DeValue<'_>>) -> Result<f64, String> {
    let number = match value.get_ref() {
        DeValue::Float(float) => float.as_str().parse::<f64>().ok(),
        DeValue::Integer(_) => integer(value).map(|whole| whole as f64),
        DeValue::String(text) if text.trim().parse::<f64>().is_ok() => {
            return Err(format!(
                "expected a number, found the text \"{text}\" (take the quotes away)"
            ));
        }
        _ => None,
    };
    number
        .filter(|number| number.is_finite())
        .ok_or_else(|| format!("expected a number, found {}", found(value)))
}

/// A whole number in any notation of TOML.
fn integer(value: &Spanned<DeValue<'_>>) -> Option<i64> {
    match value.get_ref() {
        DeValue::Integer(whole) => i64::from_str_radix(whole.as_str(), whole.radix()).ok(),
        _ => None,
    }
}

/// A whole number, zero or more.
pub(super) fn count(value: &Spanned<DeValue<'_>>) -> Result<usize, String> {
    integer(value)
        .and_then(|whole| usize::try_from(whole).ok())
        .ok_or_else(|| format!("expected a whole number, found {}", found(value)))
}

/// True or false.
pub(super) fn truth(value: &Spanned<DeValue<'_>>) -> Result<bool, String> {
    match value.get_ref() {
        DeValue::Boolean(truth) => Ok(*truth),
        _ => Err(format!("expected true or false, found {}", found(value))),
    }
}

/// A text.
pub(super) fn text<'a>(value: &'a Spanned<DeValue<'_>>) -> Result<&'a str, String> {
    match value.get_ref() {
        DeValue::String(text) => Ok(text),
        _ => Err(format!("expected a text in quotes, found {}", found(value))),
    }
}

/// One of a few known words.
pub(super) fn word<T: FromStr<Err: ToString>>(value: &Spanned<DeValue<'_>>) -> Result<T, String> {
    text(value)?
        .parse()
        .map_err(|unknown: T::Err| unknown.to_string())
}

/// Every item of a list.
pub(super) fn each<'a, T>(
    value: &'a Spanned<DeValue<'a>>,
    item: impl Fn(&'a Spanned<DeValue<'a>>) -> Result<T, String>,
) -> Result<Vec<T>, String> {
    match value.get_ref() {
        DeValue::Array(items) => items.iter().map(item).collect(),
        _ => Err(format!(
            "expected a list in brackets, found {}",
            found(value)
        )),
    }
}

/// A list of exactly N numbers.
pub(super) fn numbers<const N: usize>(value: &Spanned<DeValue<'_>>) -> Result<[f64; N], String> {
    let wrong = || format!("expected a list of {N} numbers, found {}", found(value));
    match value.get_ref() {
        DeValue::Array(items) if items.len() == N => {
            let numbers = items
                .iter()
                .map(number)
                .collect::<Result<Vec<f64>, String>>()?;
            numbers.try_into().map_err(|_| wrong())
        }
        _ => Err(wrong()),
    }
}

/// A list of the library by name, or substances.
pub(super) fn candidates(value: &Spanned<DeValue<'_>>) -> Result<Candidates, String> {
    match value.get_ref() {
        DeValue::String(text) => Ok(Candidates::from_text(text)),
        DeValue::Array(_) => Ok(Candidates::Named(each(value, |value| {
            text(value).map(str::to_owned)
        })?)),
        _ => Err(format!(
            "expected the name of a list or a list of substances, found {}",
            found(value)
        )),
    }
}
