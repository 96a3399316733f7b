//! A set-up as it is shown: for the JSON, for the text report, and as a set-up file.

use super::words::source_name;
use super::{Candidates, Setup};
use serde::Serialize;

/// The set-up actually used, every number with its unit in the key.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SetupView {
    /// Kind of instrument.
    pub instrument: &'static str,
    /// Range as stated.
    pub range_nm: [f64; 2],
    /// Range less what the eye cannot see.
    pub seen_range_nm: [f64; 2],
    /// Blind stretches inside it, those of the filter included.
    pub blind_nm: Vec<[f64; 2]>,
    /// Full width at half maximum.
    pub resolution_nm: f64,
    /// Standard uncertainty of readings that state none.
    pub uncertainty_nm: f64,
    /// Standard uncertainty of the common shift, as stated.
    pub offset_nm: f64,
    /// Standard deviation taken for the common shift.
    pub common_shift_nm: f64,
    /// Standard uncertainty of a common stretch.
    pub scale_relative: f64,
    /// Decades between the strongest and the weakest feature noticed, before looking at the readings.
    pub dynamic_range_dex: f64,
    /// Standard uncertainty of numeric strengths.
    pub strength_uncertainty_dex: f64,
    /// Medium of wavelengths in the table.
    pub medium: &'static str,
    /// Scale division read to.
    pub division_nm: Option<f64>,
    /// Filter in the beam.
    pub filter: Option<&'static str>,
    /// Dimmed stretches.
    pub dim: Vec<DimView>,
    /// No overlapping orders can appear.
    pub orders_filtered: bool,
    /// Smallest strength that would have been recorded, on the scale of the table.
    pub faintest: Option<f64>,
    /// The list was cut at this many readings.
    pub listed_at_most: Option<usize>,
    /// Response by name.
    pub response: String,
    /// Kind of source.
    pub source: &'static str,
    /// Traces to expect on any sample here.
    pub always: Vec<String>,
    /// `everything`, the name of a list, or names.
    pub candidates: CandidatesView,
    /// Folder of a library of one's own.
    pub library: Option<String>,
}

/// A dimmed stretch.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct DimView {
    /// Lower end.
    pub from_nm: f64,
    /// Upper end.
    pub to_nm: f64,
    /// Decades lost.
    pub lost_dex: f64,
}

/// Candidates: one text or a list of names.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
#[serde(untagged)]
pub enum CandidatesView {
    /// `everything` or the name of a list.
    Text(String),
    /// Names.
    Names(Vec<String>),
}

impl Setup {
    /// The set-up for a JSON report.
    pub fn view(&self) -> SetupView {
        let dim = self
            .dim_nm
            .iter()
            .map(|&(from_nm, to_nm, lost_dex)| DimView {
                from_nm,
                to_nm,
                lost_dex,
            });
        SetupView {
            instrument: self.instrument.name(),
            range_nm: self.range_nm,
            seen_range_nm: self.seen_range(),
            blind_nm: self.blind_stretches(),
            resolution_nm: self.resolution_nm,
            uncertainty_nm: self.uncertainty_nm,
            offset_nm: self.offset_nm,
            common_shift_nm: round(self.common_shift_nm()),
            scale_relative: self.scale_relative,
            dynamic_range_dex: self.dynamic_range_dex,
            strength_uncertainty_dex: self.strength_uncertainty_dex,
            medium: self.medium.name(),
            division_nm: self.division_nm,
            filter: self.filter.map(|filter| filter.name),
            dim: dim.collect(),
            orders_filtered: self.orders_filtered,
            faintest: self.faintest,
            listed_at_most: self.listed_at_most,
            response: self.response.name.clone(),
            source: source_name(self.source),
            always: self.always.clone(),
            candidates: match &self.candidates {
                Candidates::Everything => CandidatesView::Text("everything".to_owned()),
                Candidates::List(name) => CandidatesView::Text(name.clone()),
                Candidates::Named(names) => CandidatesView::Names(names.clone()),
            },
            library: self.library.as_ref().map(|path| path.display().to_string()),
        }
    }

    /// The values used, in the order of a set-up file: (name, value with its unit).
    /// What has no value is left out.
    pub fn describe(&self) -> Vec<(String, String)> {
        let view = self.view();
        let rows = view
            .optics()
            .into_iter()
            .chain(view.strengths())
            .chain(view.surroundings());
        rows.filter_map(|(name, value)| Some((name.to_owned(), value?)))
            .collect()
    }

    /// The set-up as a set-up file that reads back to the same set-up from the working folder.
    pub fn to_toml(&self) -> String {
        let instrument = lines(self.instrument_keys());
        let source = lines(self.source_keys());
        format!("[instrument]\n{instrument}\n[source]\n{source}")
    }

    /// The keys of `[instrument]` with their values in TOML.
    fn instrument_keys(&self) -> Vec<Row> {
        let number = |value: f64| format!("{value:?}");
        let dims = self.dim_nm.iter().map(|&(from, to, lost)| [from, to, lost]);
        let dims: Vec<[f64; 3]> = dims.collect();
        vec![
            ("kind", Some(quoted(self.instrument.name()))),
            ("range_nm", Some(format!("{:?}", self.range_nm))),
            ("resolution_nm", Some(number(self.resolution_nm))),
            ("uncertainty_nm", Some(number(self.uncertainty_nm))),
            ("offset_nm", Some(number(self.offset_nm))),
            ("scale_relative", Some(number(self.scale_relative))),
            ("dynamic_range", Some(number(self.dynamic_range_dex))),
            (
                "strength_uncertainty_dex",
                Some(number(self.strength_uncertainty_dex)),
            ),
            ("medium", Some(quoted(self.medium.name()))),
            ("division_nm", self.division_nm.map(number)),
            (
                "blind_nm",
                (!self.blind_nm.is_empty()).then(|| format!("{:?}", self.blind_nm)),
            ),
            ("filter", self.filter.map(|filter| quoted(filter.name))),
            ("dim_nm", (!dims.is_empty()).then(|| format!("{dims:?}"))),
            ("orders_filtered", Some(self.orders_filtered.to_string())),
            ("faintest", self.faintest.map(number)),
            (
                "listed_at_most",
                self.listed_at_most.map(|count| count.to_string()),
            ),
            ("response", Some(quoted(&self.response.name))),
        ]
    }

    /// The keys of `[source]` with their values in TOML.
    fn source_keys(&self) -> Vec<Row> {
        let list = |names: &[String]| {
            let names: Vec<String> = names.iter().map(|name| quoted(name)).collect();
            format!("[{}]", names.join(", "))
        };
        let candidates = match &self.candidates {
            Candidates::Everything => quoted("everything"),
            Candidates::List(name) => quoted(name),
            Candidates::Named(names) => list(names),
        };
        vec![
            ("kind", Some(quoted(source_name(self.source)))),
            ("always", Some(list(&self.always))),
            ("candidates", Some(candidates)),
            (
                "library",
                self.library
                    .as_ref()
                    .map(|path| quoted(&path.display().to_string())),
            ),
        ]
    }
}

/// A name and a value, if there is one.
type Row = (&'static str, Option<String>);

impl SetupView {
    /// Everything on the wavelength scale.
    fn optics(&self) -> Vec<Row> {
        let nm = |value: f64| format!("{value} nm");
        let stretch = |[from, to]: [f64; 2]| format!("{from} to {to} nm");
        let blind: Vec<String> = self.blind_nm.iter().copied().map(stretch).collect();
        let range = match self.range_nm == self.seen_range_nm {
            true => stretch(self.range_nm),
            false => {
                let (stated, seen) = (stretch(self.range_nm), stretch(self.seen_range_nm));
                format!("{stated} (the eye sees {seen})")
            }
        };
        let shift = format!(
            "{} nm (taken as {} nm)",
            self.offset_nm, self.common_shift_nm
        );
        vec![
            ("instrument", Some(self.instrument.to_owned())),
            ("range", Some(range)),
            ("blind", unless_empty(blind.join(", "))),
            ("resolution", Some(nm(self.resolution_nm))),
            ("uncertainty", Some(nm(self.uncertainty_nm))),
            ("division", self.division_nm.map(nm)),
            ("offset", Some(shift)),
            ("scale", Some(format!("{} relative", self.scale_relative))),
            ("medium", Some(self.medium.to_owned())),
        ]
    }

    /// Everything on the scale of strengths.
    fn strengths(&self) -> Vec<Row> {
        let decades = |value: f64| format!("{value} decades");
        let dimmed = |dim: &DimView| {
            format!(
                "{} to {} nm by {}",
                dim.from_nm,
                dim.to_nm,
                decades(dim.lost_dex)
            )
        };
        let dims: Vec<String> = self.dim.iter().map(dimmed).collect();
        let faintest = self
            .faintest
            .map(|number| format!("{number} on the scale of the table"));
        vec![
            ("dynamic range", Some(decades(self.dynamic_range_dex))),
            (
                "strength uncertainty",
                Some(decades(self.strength_uncertainty_dex)),
            ),
            ("faintest", faintest),
            (
                "listed at most",
                self.listed_at_most.map(|count| format!("{count} readings")),
            ),
            ("response", Some(self.response.clone())),
            ("filter", self.filter.map(str::to_owned)),
            ("dimmed", unless_empty(dims.join(", "))),
        ]
    }

    /// Orders, source and what is weighed.
    fn surroundings(&self) -> Vec<Row> {
        let orders = if self.orders_filtered {
            "filtered"
        } else {
            "can overlap"
        };
        let candidates = match &self.candidates {
            CandidatesView::Text(text) => text.clone(),
            CandidatesView::Names(names) => names.join(", "),
        };
        vec![
            ("orders", Some(orders.to_owned())),
            ("source", Some(self.source.to_owned())),
            ("always", unless_empty(self.always.join(", "))),
            ("candidates", Some(candidates)),
            ("library", self.library.clone()),
        ]
    }
}

/// A text, if there is something in it.
fn unless_empty(text: String) -> Option<String> {
    (!text.is_empty()).then_some(text)
}

/// A product of two short decimals without the dust of binary fractions.
fn round(value: f64) -> f64 {
    (value * 1e6).round() / 1e6
}

/// A text in the quotes of TOML.
fn quoted(text: &str) -> String {
    toml::Value::String(text.to_owned()).to_string()
}

/// One `key = value` a line.
fn lines(rows: Vec<Row>) -> String {
    let stated = rows
        .into_iter()
        .filter_map(|(key, value)| Some((key, value?)));
    stated
        .map(|(key, value)| format!("{key} = {value}\n"))
        .collect()
}
