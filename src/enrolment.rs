//! A private reference from readings of a known sample, as tables of the library's layout.

use crate::library::{SourceKind, Tables};
use crate::reading::ObservedForm;
use crate::reduction::{ReducedReading, ReducedSample};

/// Scatter of strengths measured on one's own instrument against the next sample of the same
/// kind, decades. Common practice, no source: lamps and flames differ by a factor of two to three.
const OWN_SCATTER_DEX: f64 = 0.4;
/// Scatter where no strengths were read, decades.
const UNKNOWN_SCATTER_DEX: f64 = 1.0;
/// Readings in the middle of the range where no strengths were read, decades.
const UNKNOWN_STRENGTH_DEX: f64 = -0.5;

/// What is to be enrolled.
#[derive(Debug, Clone, PartialEq)]
pub struct Enrolment {
    /// Name for people.
    pub name: String,
    /// Short mark; may be empty.
    pub symbol: String,
    /// Kind of source it was read in.
    pub source: SourceKind,
    /// Keys of the cautions that go with it.
    pub cautions: Vec<String>,
    /// Standard uncertainty of the shift common to all readings, nm.
    pub offset_nm: f64,
    /// Decades below the strongest reading down to which the list is complete.
    pub depth_dex: f64,
    /// Digest of the table of readings, lower-case hex.
    pub digest: String,
    /// Takes the place of an earlier enrolment of the same name.
    pub replace: bool,
}

/// Why something cannot be enrolled.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum EnrolError {
    /// No name can be made of it.
    #[error("{0:?} gives no name for a table (use letters or digits)")]
    NoName(String),
    /// It is there already.
    #[error("{0:?} is enrolled already (choose another name, or replace it with --replace)")]
    Known(String),
    /// Nothing to enrol.
    #[error("no reading lies where the set-up can see (check the range)")]
    Empty,
    /// A table of the folder that cannot be added to.
    #[error("{table}: {reason}")]
    Table {
        /// The table within the folder.
        table: String,
        /// What is wrong with it.
        reason: String,
    },
}

/// Identifier of a name: lower-case letters, digits and hyphens.
pub fn identifier(name: &str) -> Option<String> {
    let folded: String = name
        .chars()
        .map(|c| match c.to_ascii_lowercase() {
            c @ ('a'..='z' | '0'..='9') => c,
            _ => '-',
        })
        .collect();
    let parts: Vec<&str> = folded.split('-').filter(|p| !p.is_empty()).collect();
    (!parts.is_empty()).then(|| parts.join("-"))
}

/// The tables of a folder with the sample added: rows of `substances.csv`, `emitters.csv`,
/// `sources.csv` and a table of features. Tables that do not change are not in the result.
///
/// # Errors
/// See [`EnrolError`].
pub fn enrol(
    sample: &ReducedSample,
    what: &Enrolment,
    folder: &Tables,
) -> Result<Tables, EnrolError> {
    let id = identifier(&what.name).ok_or_else(|| EnrolError::NoName(what.name.clone()))?;
    if sample.readings.is_empty() {
        return Err(EnrolError::Empty);
    }
    let source = format!("own-{id}");
    let [flame, discharge, absorption] = SourceKind::ALL.map(|kind| match kind == what.source {
        true => "usual",
        false => "never",
    });
    let cautions = what.cautions.join(";");
    let note = "Read on one's own instrument and enrolled.";
    let emitter = what.name.trim();
    let substance = [
        &id,
        emitter,
        &what.symbol,
        "lamp",
        "",
        flame,
        discharge,
        absorption,
        "",
        &cautions,
        note,
    ];
    let depth = format!("{:.2}", what.depth_dex.min(0.0));
    let emitted = [
        emitter,
        &id,
        source_word(what.source),
        "phosphor",
        "0.98",
        "0",
        "0",
        &depth,
        "",
        &source,
    ];
    let citation = format!("Own readings, table with SHA-256 {}", what.digest);
    let cited = [&source, citation.as_str(), "-", "-", "measured"];

    let add = |table: &str, header: &[&str], key: usize, own: &str, row: &[&str]| {
        let before = folder.get(table).map_or("", String::as_str);
        with_row(table, before, header, (key, own), row, what).map(|text| (table.to_owned(), text))
    };
    let features = format!("features/{id}.csv");
    if folder.contains_key(&features) && !what.replace {
        return Err(EnrolError::Known(what.name.clone()));
    }
    Ok(Tables::from([
        add("substances.csv", &SUBSTANCES, 0, &id, &substance)?,
        add("emitters.csv", &EMITTERS, 1, &id, &emitted)?,
        add("sources.csv", &SOURCES, 0, &source, &cited)?,
        (features, feature_table(sample, what, emitter, &source)?),
    ]))
}

const SUBSTANCES: [&str; 11] = [
    "id",
    "name",
    "symbol",
    "kind",
    "aliases",
    "prior_flame",
    "prior_discharge",
    "prior_absorption",
    "flame_colour",
    "cautions",
    "note",
];
const EMITTERS: [&str; 10] = [
    "emitter",
    "substance",
    "source_kind",
    "kind",
    "shows",
    "level_dex",
    "level_spread_dex",
    "complete_to_dex",
    "remark",
    "source",
];
const SOURCES: [&str; 5] = ["key", "citation", "version", "licence", "standing"];
const FEATURES: [&str; 18] = [
    "emitter",
    "form",
    "wavelength_air_nm",
    "uncertainty_nm",
    "degrades",
    "width_nm",
    "strength_flame_dex",
    "strength_discharge_dex",
    "strength_absorption_dex",
    "scatter_dex",
    "persistent",
    "transition_rate_per_s",
    "upper_weight",
    "lower_level_cm-1",
    "upper_level_cm-1",
    "source_position",
    "source_strength",
    "note",
];

fn source_word(source: SourceKind) -> &'static str {
    match source {
        SourceKind::Flame => "flame",
        SourceKind::Discharge => "discharge",
        SourceKind::Absorption => "absorption",
    }
}

/// A table with one row more; an earlier row with the same key gives way where that is asked for.
fn with_row(
    table: &str,
    before: &str,
    header: &[&str],
    (column, key): (usize, &str),
    row: &[&str],
    what: &Enrolment,
) -> Result<String, EnrolError> {
    let fault = |reason: String| EnrolError::Table {
        table: table.to_owned(),
        reason,
    };
    let mut rows: Vec<Vec<String>> = Vec::new();
    if !before.trim().is_empty() {
        let mut reader = csv::Reader::from_reader(before.as_bytes());
        let found = reader.headers().map_err(|e| fault(e.to_string()))?;
        if !found.iter().eq(header.iter().copied()) {
            let expected = header.join(",");
            return Err(fault(format!("other columns than expected ({expected})")));
        }
        for record in reader.records() {
            let record = record.map_err(|e| fault(e.to_string()))?;
            rows.push(record.iter().map(str::to_owned).collect());
        }
    }
    if rows.iter().any(|r| r.get(column).is_some_and(|c| c == key)) && !what.replace {
        return Err(EnrolError::Known(what.name.clone()));
    }
    rows.retain(|r| r.get(column).is_none_or(|c| c != key));
    rows.push(row.iter().map(|cell| (*cell).to_owned()).collect());
    written(header, &rows).map_err(fault)
}

fn written(header: &[&str], rows: &[Vec<String>]) -> Result<String, String> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    let mut write = |row: Vec<&str>| writer.write_record(row).map_err(|e| e.to_string());
    write(header.to_vec())?;
    for row in rows {
        write(row.iter().map(String::as_str).collect())?;
    }
    let bytes = writer.into_inner().map_err(|e| e.to_string())?;
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}

fn feature_table(
    sample: &ReducedSample,
    what: &Enrolment,
    emitter: &str,
    source: &str,
) -> Result<String, EnrolError> {
    let above = |r: &ReducedReading| r.strength.as_ref().map(|s| s.above_faintest_dex);
    let strongest = sample
        .readings
        .iter()
        .filter_map(above)
        .max_by(f64::total_cmp);
    let rows: Vec<Vec<String>> = sample
        .readings
        .iter()
        .map(|reading| {
            let relative = above(reading).zip(strongest).map(|(own, top)| own - top);
            let strength = format!("{:.2}", relative.unwrap_or(UNKNOWN_STRENGTH_DEX));
            let own = |kind: SourceKind| match kind == what.source {
                true => strength.clone(),
                false => String::new(),
            };
            let [flame, discharge, absorption] = SourceKind::ALL.map(own);
            let scatter = relative.map_or(UNKNOWN_SCATTER_DEX, |_| OWN_SCATTER_DEX);
            let form = match reading.form {
                Some(ObservedForm::Band) => "band_max",
                _ => "line",
            };
            let width = reading.width_nm.map_or(String::new(), |w| format!("{w}"));
            let uncertainty = reading.uncertainty_nm.hypot(what.offset_nm);
            let mut row = vec![
                emitter.to_owned(),
                form.to_owned(),
                format!("{:.4}", reading.wavelength_nm),
                format!("{uncertainty:.4}"),
                String::new(),
                width,
                flame,
                discharge,
                absorption,
                format!("{scatter}"),
            ];
            row.extend(std::iter::repeat_n(String::new(), 5));
            row.extend([source.to_owned(), source.to_owned(), String::new()]);
            row
        })
        .collect();
    written(&FEATURES, &rows).map_err(|reason| EnrolError::Table {
        table: "features".to_owned(),
        reason,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_become_identifiers() {
        assert_eq!(identifier("Lamp 7, bay 2").as_deref(), Some("lamp-7-bay-2"));
        assert_eq!(identifier("  "), None);
        assert_eq!(identifier("§§"), None);
    }
}
