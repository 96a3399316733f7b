//! What the library holds, for people and for programs: the list of substances, one substance in
//! full, and every line and band head.

mod colour;
mod page;
mod text;
mod view;

pub use colour::colour_word;
pub use page::{PageView, substance_page};
pub use text::{cautions_text, computation_text, lines_text, list_text, page_text};
pub use view::{FeatureView, ListedView, Within, features, listed};

use super::json::guarded;
use serde::Serialize;

/// Rows as JSON, indented, with a final line feed.
///
/// # Errors
/// None that the views can cause; the signature is that of the writer.
pub fn catalogue_json<T: Serialize>(view: &T) -> Result<String, serde_json::Error> {
    let json = serde_json::to_string_pretty(view)?;
    Ok(format!("{}\n", guarded(&json)))
}

/// Features as comma-separated text: emitter, substance, form, wavelength_air_nm, uncertainty_nm
/// and the source of the position.
///
/// # Errors
/// None that the views can cause; the signature is that of the writer.
pub fn lines_csv(features: &[FeatureView]) -> Result<String, csv::Error> {
    let header = [
        "emitter",
        "substance",
        "form",
        "wavelength_air_nm",
        "uncertainty_nm",
        "source",
    ];
    let rows = features.iter().map(|f| {
        [
            f.emitter.clone(),
            f.substance.clone(),
            f.form.to_owned(),
            f.wavelength_air_nm.to_string(),
            f.uncertainty_nm.to_string(),
            f.source.join(";"),
        ]
    });
    table(header, rows)
}

/// Substances as comma-separated text.
///
/// # Errors
/// None that the views can cause; the signature is that of the writer.
pub fn list_csv(substances: &[ListedView]) -> Result<String, csv::Error> {
    let header = [
        "substance",
        "name",
        "symbol",
        "kind",
        "emitters",
        "features",
        "prior_flame",
        "prior_discharge",
        "prior_absorption",
    ];
    let rows = substances.iter().map(|s| {
        let [flame, discharge, absorption] = s.prior.clone();
        [
            s.substance.clone(),
            s.name.clone(),
            s.symbol.clone(),
            s.kind.clone(),
            s.emitters.join(";"),
            s.features.to_string(),
            flame,
            discharge,
            absorption,
        ]
    });
    table(header, rows)
}

fn table<const N: usize>(
    header: [&str; N],
    rows: impl Iterator<Item = [String; N]>,
) -> Result<String, csv::Error> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    writer.write_record(header)?;
    for row in rows {
        writer.write_record(row)?;
    }
    let bytes = writer
        .into_inner()
        .map_err(csv::IntoInnerError::into_error)?;
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}
