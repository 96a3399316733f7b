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

    /// The values used, in the order of a set-up file: (key, value with its unit).
    /// Keys without a value are left out.
    pub fn describe(&self) -> Vec<(String, String)> {
        let view = self.view();
        let nm = |value: f64| format!("{value} nm");
        let stretch = |[from, to]: [f64; 2]| format!("{from} to {to} nm");
        let stretches = |list: &[[f64; 2]]| {
            list.iter()
                .map(|s| stretch(*s))
                .collect::<Vec<_>>()
                .join(", ")
        };
        let dims = view
            .dim
            .iter()
            .map(|d| format!("{} to {} nm: {} decades", d.from_nm, d.to_nm, d.lost_dex));
        let shift = format!(
            "{} nm (taken as {} nm)",
            view.offset_nm, view.common_shift_nm
        );
        let range = match view.range_nm == view.seen_range_nm {
            true => stretch(view.range_nm),
            false => format!(
                "{} (the eye sees {})",
                stretch(view.range_nm),
                stretch(view.seen_range_nm)
            ),
        };
        let rows = [
            ("instrument", Some(view.instrument.to_owned())),
            ("range", Some(range)),
            ("blind", some(stretches(&view.blind_nm))),
            ("resolution", Some(nm(view.resolution_nm))),
            ("uncertainty", Some(nm(view.uncertainty_nm))),
            ("division", view.division_nm.map(nm)),
            ("offset", Some(shift)),
            ("scale", Some(format!("{} relative", view.scale_relative))),
            (
                "dynamic range",
                Some(format!("{} decades", view.dynamic_range_dex)),
            ),
            (
                "strength uncertainty",
                Some(format!("{} decades", view.strength_uncertainty_dex)),
            ),
            (
                "faintest",
                view.faintest
                    .map(|faintest| format!("{faintest} on the scale of the table")),
            ),
            (
                "listed at most",
                view.listed_at_most.map(|count| format!("{count} readings")),
            ),
            ("medium", Some(view.medium.to_owned())),
            ("response", Some(view.response.clone())),
            ("filter", view.filter.map(str::to_owned)),
            ("dimmed", some(dims.collect::<Vec<_>>().join(", "))),
            (
                "orders filtered",
                Some(if view.orders_filtered { "yes" } else { "no" }.to_owned()),
            ),
            ("source", Some(view.source.to_owned())),
            ("always", some(view.always.join(", "))),
            (
                "candidates",
                Some(match view.candidates {
                    CandidatesView::Text(text) => text,
                    CandidatesView::Names(names) => names.join(", "),
                }),
            ),
            ("library", view.library),
        ];
        rows.into_iter()
            .filter_map(|(key, value)| Some((key.to_owned(), value?)))
            .collect()
    }

    /// The set-up as a set-up file that reads back to the same set-up.
    pub fn to_toml(&self) -> String {
        let view = self.view();
        let list = |names: &[String]| {
            names
                .iter()
                .map(|name| quoted(name))
                .collect::<Vec<_>>()
                .join(", ")
        };
        let dims: Vec<[f64; 3]> = self
            .dim_nm
            .iter()
            .map(|&(from, to, lost)| [from, to, lost])
            .collect();
        let instrument = [
            ("kind", Some(quoted(view.instrument))),
            ("range_nm", Some(format!("{:?}", view.range_nm))),
            ("resolution_nm", Some(format!("{:?}", view.resolution_nm))),
            ("uncertainty_nm", Some(format!("{:?}", view.uncertainty_nm))),
            ("offset_nm", Some(format!("{:?}", view.offset_nm))),
            ("scale_relative", Some(format!("{:?}", view.scale_relative))),
            (
                "dynamic_range",
                Some(format!("{:?}", view.dynamic_range_dex)),
            ),
            (
                "strength_uncertainty_dex",
                Some(format!("{:?}", view.strength_uncertainty_dex)),
            ),
            ("medium", Some(quoted(view.medium))),
            ("division_nm", view.division_nm.map(|nm| format!("{nm:?}"))),
            (
                "blind_nm",
                Some(format!("{:?}", self.blind_nm)).filter(|_| !self.blind_nm.is_empty()),
            ),
            ("filter", view.filter.map(quoted)),
            (
                "dim_nm",
                Some(format!("{dims:?}")).filter(|_| !dims.is_empty()),
            ),
            ("orders_filtered", Some(view.orders_filtered.to_string())),
            (
                "faintest",
                view.faintest.map(|faintest| format!("{faintest:?}")),
            ),
            (
                "listed_at_most",
                view.listed_at_most.map(|count| count.to_string()),
            ),
            ("response", Some(quoted(&view.response))),
        ];
        let source = [
            ("kind", Some(quoted(view.source))),
            ("always", Some(format!("[{}]", list(&view.always)))),
            (
                "candidates",
                Some(match &view.candidates {
                    CandidatesView::Text(text) => quoted(text),
                    CandidatesView::Names(names) => format!("[{}]", list(names)),
                }),
            ),
            ("library", view.library.as_deref().map(quoted)),
        ];
        format!(
            "[instrument]\n{}\n[source]\n{}",
            lines(&instrument),
            lines(&source)
        )
    }
}

/// A text unless it is empty.
fn some(text: String) -> Option<String> {
    Some(text).filter(|text| !text.is_empty())
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
fn lines(rows: &[(&str, Option<String>)]) -> String {
    let stated = rows
        .iter()
        .filter_map(|(key, value)| Some((key, value.as_ref()?)));
    stated
        .map(|(key, value)| format!("{key} = {value}\n"))
        .collect()
}
