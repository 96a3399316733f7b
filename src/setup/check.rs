//! What the values of a set-up may be.

use super::words::UnknownWord;
use super::{Candidates, FILTERS, Filter, Setup, SetupOverrides};

/// Wavelengths that may stand in a set-up, nm.
const WAVELENGTHS_NM: std::ops::RangeInclusive<f64> = 100.0..=2000.0;
/// No width, uncertainty or division of a spectrum is larger than this, nm.
const WIDEST_NM: f64 = 100.0;
/// More decades than any instrument here spans.
const MOST_DECADES: f64 = 9.0;

/// What a number must be.
type Rule = fn(f64) -> Result<(), String>;

/// Checks each value by itself: (key as the file spells it, what is wrong).
pub(super) fn check_values(said: &SetupOverrides) -> Vec<(&'static str, String)> {
    let numbers: [(&str, Option<f64>, Rule); 8] = [
        ("instrument.resolution_nm", said.resolution_nm, width),
        ("instrument.uncertainty_nm", said.uncertainty_nm, width),
        ("instrument.offset_nm", said.offset_nm, width_or_zero),
        (
            "instrument.scale_relative",
            said.scale_relative,
            small_share,
        ),
        ("instrument.dynamic_range", said.dynamic_range_dex, decades),
        (
            "instrument.strength_uncertainty_dex",
            said.strength_uncertainty_dex,
            decades,
        ),
        ("instrument.division_nm", said.division_nm, width),
        ("instrument.faintest", said.faintest, positive),
    ];
    let numbers = numbers.map(|(key, value, rule)| (key, value.map_or(Ok(()), rule)));
    let mut blind = said.blind_nm.iter().flatten().copied();
    let mut dim = said.dim_nm.iter().flatten().copied();
    let others = [
        ("instrument.range_nm", said.range_nm.map_or(Ok(()), stretch)),
        ("instrument.blind_nm", blind.try_for_each(stretch)),
        ("instrument.dim_nm", dim.try_for_each(dimmed)),
        (
            "instrument.filter",
            said.filter.as_deref().map_or(Ok(()), filter),
        ),
        (
            "instrument.listed_at_most",
            said.listed_at_most.map_or(Ok(()), at_least_one),
        ),
        (
            "source.always",
            said.always.as_deref().map_or(Ok(()), names),
        ),
        (
            "source.candidates",
            said.candidates.as_ref().map_or(Ok(()), candidates),
        ),
    ];
    let checks = numbers.into_iter().chain(others);
    checks
        .filter_map(|(key, check)| Some((key, check.err()?)))
        .collect()
}

/// Checks values against each other.
pub(super) fn check_together(setup: &Setup) -> Vec<String> {
    let [low, high] = setup.seen_range();
    let [from, to] = setup.range_nm();
    if low >= high {
        return vec![format!(
            "the eye sees nothing between {from} and {to} nm (give another range_nm or response)"
        )];
    }
    let mut faults = Vec::new();
    let blind: f64 = setup
        .blind_stretches()
        .iter()
        .map(|[from, to]| to - from)
        .sum();
    if blind >= high - low {
        faults.push(format!(
            "blind stretches leave nothing of {low} to {high} nm (shorten blind_nm)"
        ));
    }
    if setup.resolution_nm() >= high - low {
        let resolution = setup.resolution_nm();
        faults.push(format!(
            "a resolution of {resolution} nm tells nothing apart in {low} to {high} nm"
        ));
    }
    faults
}

/// Two wavelengths, ascending.
fn stretch([from, to]: [f64; 2]) -> Result<(), String> {
    for nm in [from, to] {
        if !WAVELENGTHS_NM.contains(&nm) {
            return Err(format!("{nm} is not a wavelength between 100 and 2000 nm"));
        }
    }
    match from < to {
        true => Ok(()),
        false => Err(format!(
            "[{from}, {to}] does not ascend (write the smaller first)"
        )),
    }
}

/// A stretch with the decades lost in it.
fn dimmed((from, to, lost): (f64, f64, f64)) -> Result<(), String> {
    stretch([from, to])?;
    match (0.0..=MOST_DECADES).contains(&lost) {
        true => Ok(()),
        false => Err(format!(
            "{lost} is not a number of decades lost between 0 and {MOST_DECADES}"
        )),
    }
}

/// A length on the wavelength scale.
fn width(nm: f64) -> Result<(), String> {
    positive(nm)?;
    width_or_zero(nm)
}

/// A length on the wavelength scale that may vanish.
fn width_or_zero(nm: f64) -> Result<(), String> {
    match (0.0..=WIDEST_NM).contains(&nm) {
        true => Ok(()),
        false => Err(format!("{nm} is not between 0 and {WIDEST_NM} nm")),
    }
}

/// A share that is small.
fn small_share(share: f64) -> Result<(), String> {
    match (0.0..=0.1).contains(&share) {
        true => Ok(()),
        false => Err(format!(
            "{share} is not between 0 and 0.1 (a share: 0.005 is half a per cent)"
        )),
    }
}

/// A number of decades.
fn decades(dex: f64) -> Result<(), String> {
    positive(dex)?;
    match dex <= MOST_DECADES {
        true => Ok(()),
        false => Err(format!(
            "{dex} is more than {MOST_DECADES} decades (a ratio of 100 is 2 decades)"
        )),
    }
}

/// A finite number above zero.
fn positive(value: f64) -> Result<(), String> {
    match value.is_finite() && value > 0.0 {
        true => Ok(()),
        false => Err(format!("{value} is not above zero")),
    }
}

/// A count.
fn at_least_one(count: usize) -> Result<(), String> {
    match count {
        0 => Err(
            "0 is not a number of readings (leave the key out if the list was not cut)".to_owned(),
        ),
        _ => Ok(()),
    }
}

/// A known filter, or none.
fn filter(name: &str) -> Result<(), String> {
    if name == "none" || Filter::named(name).is_some() {
        return Ok(());
    }
    let known: Vec<&str> = FILTERS.iter().map(|filter| filter.name).collect();
    Err(UnknownWord::new("a filter", name, &known).to_string())
}

/// Names that are not blank.
fn names(names: &[String]) -> Result<(), String> {
    match names.iter().any(|name| name.trim().is_empty()) {
        true => Err("a name is blank".to_owned()),
        false => Ok(()),
    }
}

/// A list name or at least one substance.
fn candidates(candidates: &Candidates) -> Result<(), String> {
    match candidates {
        Candidates::Everything => Ok(()),
        Candidates::List(name) => names(std::slice::from_ref(name)),
        Candidates::Named(given) if given.is_empty() => {
            Err("no substance is named (leave the key out to weigh everything)".to_owned())
        }
        Candidates::Named(given) => names(given),
    }
}
