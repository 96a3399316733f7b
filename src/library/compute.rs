//! Strengths that follow from other columns of their row, by the rule the row names.

use super::load::{LibraryFault, Tables};
use std::collections::BTreeMap;
use std::f64::consts::LN_10;
use std::ops::Range;

/// k/hc, cm⁻¹ K⁻¹ (CODATA 2018, exact, rounded).
const BOLTZMANN_PER_CM_K: f64 = 0.695_034_800;
/// Temperature of a salt flame in a gas burner, K (library/README.md).
const FLAME_K: f64 = 2200.0;
/// Temperature of the light that daylight passes through, K.
const DAYLIGHT_K: f64 = 5000.0;
/// gf = 1.49919e-16 λ² g A with λ in angstrom and A in s⁻¹ (NIST, Atomic Spectroscopy, section 6).
const OSCILLATOR: f64 = 1.499_19e-16;
/// Peak optical depth in a visibly coloured flame, and the emitters that colour it most.
const PEAK_DEPTH: f64 = 30.0;
const PEAK_DEPTH_ALKALI: f64 = 1000.0;
const ALKALI: [&str; 5] = ["Li I", "Na I", "K I", "Rb I", "Cs I"];
/// Strengths have two decimals, and rates three figures.
const ROUNDING_DEX: f64 = 0.011;

const FLAME_THERMAL: &str = "flame-thermal-2200K";
const FLAME_GROWTH: &str = "flame-growth";
const ABSORPTION: [(&str, f64); 2] = [
    ("absorption-thermal-2200K", FLAME_K),
    ("absorption-thermal-5000K", DAYLIGHT_K),
];
const HANDBOOK: &str = "handbook-discharge";
/// Rules that go beyond the published intensity; what they gave cannot be had from the row alone.
const BEYOND: [&str; 4] = [
    "published-thermal-mean",
    "recorded-lamps",
    "discharge-thermal-growth",
    "handbook-regressed",
];

/// A strength that is not what its rule gives.
#[derive(Debug, Clone, PartialEq)]
pub struct Difference {
    /// Table within the folder.
    pub table: String,
    /// Line of the file, counted from 1.
    pub row: usize,
    /// Emitter and wavelength as they stand.
    pub feature: String,
    /// Column of the strength.
    pub column: &'static str,
    /// What stands there; may be empty.
    pub stands: String,
    /// What the rule gives, decades.
    pub follows_dex: f64,
}

/// What came of computing the strengths of a folder.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Computation {
    /// Strengths that are what their rules give, to the two decimals they have.
    pub agree: usize,
    /// Those that are not, in order of table and row.
    pub differ: Vec<Difference>,
    /// The tables that hold them, with the computed values put in.
    pub tables: Tables,
}

/// Computes every strength that follows by a rule named in its row: thermal and curve-of-growth
/// strengths in flames, thermal dark lines, published intensities in discharges.
///
/// # Errors
/// Every row that names a rule without having the values that the rule needs.
pub fn compute(tables: &Tables) -> Result<Computation, Vec<LibraryFault>> {
    let mut faults = Vec::new();
    let mut all = Computation::default();
    let features = tables.iter().filter(|(n, _)| n.starts_with("features/"));
    for (name, text) in features {
        let rows = match read(text) {
            Ok(rows) => rows,
            Err(error) => {
                faults.push(LibraryFault::of_file(name, &error.to_string()));
                continue;
            }
        };
        let mut found: Vec<(&Row, &'static str, f64)> = Vec::new();
        for rows in by_emitter(&rows).values() {
            for row in rows {
                match follows(row, rows) {
                    Ok(strengths) => {
                        found.extend(
                            strengths
                                .into_iter()
                                .map(|(column, dex)| (*row, column, dex)),
                        );
                    }
                    Err(column) => faults.push(LibraryFault {
                        row: Some(row.line),
                        column: Some(column.to_owned()),
                        ..LibraryFault::of_file(name, "is needed by a rule that the row names")
                    }),
                }
            }
        }
        found.sort_by_key(|(row, column, _)| (row.line, *column));
        let before = all.differ.len();
        for (row, column, dex) in found {
            let stands = row.text(column);
            if stands
                .parse()
                .is_ok_and(|s: f64| (s - dex).abs() < ROUNDING_DEX)
            {
                all.agree += 1;
                continue;
            }
            all.differ.push(Difference {
                table: name.clone(),
                row: row.line,
                feature: format!("{} {}", row.text("emitter"), row.text("wavelength_air_nm")),
                column,
                stands: stands.to_owned(),
                follows_dex: dex,
            });
        }
        if let Some(differ) = all.differ.get(before..).filter(|d| !d.is_empty()) {
            all.tables.insert(name.clone(), put_in(text, &rows, differ));
        }
    }
    match faults.is_empty() {
        true => Ok(all),
        false => Err(faults),
    }
}

/// A row of a table of features.
struct Row {
    line: usize,
    /// Its bytes in the text, without the line break.
    span: Range<usize>,
    cells: Vec<(String, String)>,
}

impl Row {
    fn text(&self, column: &str) -> &str {
        let cell = self.cells.iter().find(|(name, _)| name == column);
        cell.map_or("", |(_, text)| text.trim())
    }

    /// A number, or the column in which it is missing.
    fn number(&self, column: &'static str) -> Result<f64, &'static str> {
        let number = self.text(column).parse::<f64>().ok();
        number.filter(|n| n.is_finite()).ok_or(column)
    }

    fn names(&self, rule: &str) -> bool {
        self.text("source_strength")
            .split(';')
            .any(|r| r.trim() == rule)
    }

    /// log10(g A/λ) − E/(kT ln 10) with λ in nm and the upper level E: a thin flame.
    fn thermal_dex(&self) -> Result<f64, &'static str> {
        let (weight, rate) = (
            self.number("upper_weight")?,
            self.number("transition_rate_per_s")?,
        );
        let level = self.number("upper_level_cm-1")?;
        let nm = self.number("wavelength_air_nm")?;
        Ok((weight * rate / nm).log10() - level / (BOLTZMANN_PER_CM_K * FLAME_K * LN_10))
    }

    /// log10(gf λ) − E/(kT ln 10) with λ in nm and the lower level E: optical depth on a scale of
    /// the emitter.
    fn depth_dex(&self, temperature_k: f64) -> Result<f64, &'static str> {
        let (weight, rate) = (
            self.number("upper_weight")?,
            self.number("transition_rate_per_s")?,
        );
        let level = self.number("lower_level_cm-1")?;
        let nm = self.number("wavelength_air_nm")?;
        let gf = OSCILLATOR * (10.0 * nm).powi(2) * weight * rate;
        Ok((gf * nm).log10() - level / (BOLTZMANN_PER_CM_K * temperature_k * LN_10))
    }
}

/// Columns and strengths that follow for a row, from it and the others of its emitter; or the
/// column that is missing.
fn follows(row: &Row, emitter: &[&Row]) -> Result<Vec<(&'static str, f64)>, &'static str> {
    let mut found = Vec::new();
    if row.names(FLAME_THERMAL) {
        let growth = match row.names(FLAME_GROWTH) {
            true => 0.5 * excess_depth_dex(row, emitter)?,
            false => 0.0,
        };
        found.push(("strength_flame_dex", row.thermal_dex()? - growth));
    }
    for (rule, temperature_k) in ABSORPTION {
        if row.names(rule) {
            found.push(("strength_absorption_dex", row.depth_dex(temperature_k)?));
        }
    }
    if is_plain_handbook(row) && row.number("published_intensity").is_ok() {
        let level = handbook_level_dex(emitter);
        let intensity = row.number("published_intensity")?;
        found.push(("strength_discharge_dex", intensity.log10() + level));
    }
    Ok(found)
}

/// Decades by which the optical depth of a line exceeds one, when the deepest line of the emitter
/// has the depth of a visibly coloured flame.
fn excess_depth_dex(row: &Row, emitter: &[&Row]) -> Result<f64, &'static str> {
    let name = row.text("emitter");
    let peak: f64 = match ALKALI.contains(&name) {
        true => PEAK_DEPTH_ALKALI,
        false => PEAK_DEPTH,
    };
    let depths = emitter.iter().filter_map(|r| r.depth_dex(FLAME_K).ok());
    let deepest = depths.fold(f64::NEG_INFINITY, f64::max);
    Ok((row.depth_dex(FLAME_K)? - deepest + peak.log10()).max(0.0))
}

fn is_plain_handbook(row: &Row) -> bool {
    row.names(HANDBOOK) && !BEYOND.iter().any(|rule| row.names(rule))
}

/// Strength of a line of intensity one: the median of what stands, as an emitter's strengths share
/// a scale with those of other rules; the strongest at zero where nothing stands yet.
fn handbook_level_dex(emitter: &[&Row]) -> f64 {
    let plain = emitter.iter().filter(|row| is_plain_handbook(row));
    let published: Vec<(f64, Option<f64>)> = plain
        .filter_map(|row| {
            let intensity_dex = row.number("published_intensity").ok()?.log10();
            Some((intensity_dex, row.number("strength_discharge_dex").ok()))
        })
        .collect();
    let mut levels: Vec<f64> = (published.iter())
        .filter_map(|(intensity_dex, strength)| Some(strength.as_ref()? - intensity_dex))
        .collect();
    levels.sort_by(f64::total_cmp);
    levels.get(levels.len() / 2).copied().unwrap_or_else(|| {
        -published
            .iter()
            .map(|p| p.0)
            .fold(f64::NEG_INFINITY, f64::max)
    })
}

fn by_emitter(rows: &[Row]) -> BTreeMap<&str, Vec<&Row>> {
    let mut emitters: BTreeMap<&str, Vec<&Row>> = BTreeMap::new();
    for row in rows {
        emitters.entry(row.text("emitter")).or_default().push(row);
    }
    emitters
}

fn read(text: &str) -> Result<Vec<Row>, csv::Error> {
    let mut reader = csv::ReaderBuilder::new()
        .comment(Some(b'#'))
        .flexible(true)
        .from_reader(text.as_bytes());
    let header = reader.headers()?.clone();
    let header: Vec<&str> = header
        .iter()
        .map(|h| h.trim_start_matches('\u{feff}').trim())
        .collect();
    let mut rows = Vec::new();
    let mut record = csv::StringRecord::new();
    while reader.read_record(&mut record)? {
        let end = reader.position().byte() as usize;
        let from = record.position().map_or(0, |p| p.byte() as usize);
        let span = trimmed(text, from..end.min(text.len()));
        rows.push(Row {
            line: 1 + text
                .get(..span.start)
                .map_or(0, |t| t.matches('\n').count()),
            span,
            cells: (header.iter().zip(record.iter()))
                .map(|(name, cell)| ((*name).to_owned(), cell.to_owned()))
                .collect(),
        });
    }
    Ok(rows)
}

/// A span of a record without the blank lines and comments before it and the line break after it.
fn trimmed(text: &str, span: Range<usize>) -> Range<usize> {
    let (mut start, end) = (span.start, span.end);
    loop {
        let rest = text.get(start..end).unwrap_or("");
        if rest.starts_with('#') {
            start += rest.find('\n').map_or(rest.len(), |at| at + 1);
        } else if rest.starts_with(['\n', '\r']) {
            start += 1;
        } else {
            return start..start + rest.trim_end_matches(['\n', '\r']).len();
        }
    }
}

/// The text with computed strengths in the place of those that stand; nothing else changes.
fn put_in(text: &str, rows: &[Row], differ: &[Difference]) -> String {
    let mut out = String::with_capacity(text.len());
    let mut done = 0;
    for row in rows {
        let mut cells: Vec<&str> = row.cells.iter().map(|(_, cell)| cell.as_str()).collect();
        let own: Vec<(usize, String)> = differ
            .iter()
            .filter(|d| d.row == row.line)
            .filter_map(|d| {
                let at = row.cells.iter().position(|(name, _)| name == d.column)?;
                Some((at, format!("{:.2}", d.follows_dex)))
            })
            .collect();
        if own.is_empty() {
            continue;
        }
        for (at, value) in &own {
            cells[*at] = value;
        }
        out.push_str(&text[done..row.span.start]);
        out.push_str(&line(&cells));
        done = row.span.end;
    }
    out.push_str(&text[done..]);
    out
}

/// Cells as a line of a table.
fn line(cells: &[&str]) -> String {
    let quoted = |cell: &&str| match cell.contains([',', '"', '\n', '\r']) {
        true => format!("\"{}\"", cell.replace('"', "\"\"")),
        false => (*cell).to_owned(),
    };
    cells.iter().map(quoted).collect::<Vec<_>>().join(",")
}

#[cfg(test)]
mod tests {
    use super::*;

    const HEADER: &str = "emitter,wavelength_air_nm,strength_flame_dex,strength_discharge_dex,\
                          transition_rate_per_s,upper_weight,lower_level_cm-1,upper_level_cm-1,\
                          published_intensity,source_strength,note\n";

    fn tables(rows: &str) -> Tables {
        Tables::from([("features/x.csv".to_owned(), format!("{HEADER}{rows}"))])
    }

    /// Sodium 330.237 nm: A 2.75e6, g 4, level 30272.58 cm⁻¹ (NIST ASD, from memory);
    /// log10(4·2.75e6/330.237) = 4.5226, 30272.58/(0.695035·2200·2.302585) = 8.5982.
    #[test]
    fn a_thermal_strength_is_that_of_the_formula() {
        let row = "Na I,330.237,,,2.75e6,4,0,30272.58,,flame-thermal-2200K,\n";
        let found = compute(&tables(row)).expect("computed");
        assert_eq!(found.differ.len(), 1);
        assert!((found.differ[0].follows_dex - (4.5226 - 8.5982)).abs() < 2e-4);
        let filled = "Na I,330.237,-4.08,,2.75e6,4,0,30272.58,,flame-thermal-2200K,\n";
        assert_eq!(found.tables, tables(filled));
        let again = compute(&found.tables).expect("computed");
        assert_eq!((again.agree, again.differ.len()), (1, 0));
    }

    /// The only line of an emitter is its deepest: it loses half of log10 30 (or 1000 for sodium).
    #[test]
    fn growth_takes_half_the_decades_above_depth_one() {
        for (emitter, depth) in [("Ca I", 30.0_f64), ("Na I", 1000.0)] {
            let row = |rules: &str| format!("{emitter},400,,,1e8,3,0,25000,,{rules},\n");
            let dex = |rules: &str| {
                let found = compute(&tables(&row(rules))).expect("computed");
                found.differ[0].follows_dex
            };
            let lost = dex("flame-thermal-2200K") - dex("flame-thermal-2200K;flame-growth");
            assert!((lost - 0.5 * depth.log10()).abs() < 1e-12);
        }
    }

    #[test]
    fn intensities_keep_the_scale_of_the_emitter() {
        let rows = "Ar I,400,,-1.00,,,,,100,x;handbook-discharge,\n\
                    Ar I,500,,,,,,,1000,x;handbook-discharge,\n\
                    Ar I,600,,-2,,,,,500,handbook-discharge;recorded-lamps,\n";
        let found = compute(&tables(rows)).expect("computed");
        assert_eq!(found.agree, 1);
        assert_eq!(found.differ.len(), 1);
        assert!(found.differ[0].follows_dex.abs() < 1e-12);
    }

    #[test]
    fn the_rest_of_a_table_is_left_as_it_is() {
        let rows = "# a remark, kept\r\n\r\n\"Na I\",330.237,9,,2.75e6,4,0,30272.58,,flame-thermal-2200K,\"said, \"\"twice\"\"\"\r\nK I,400,,,,,,,,x,\r\n";
        let expected = rows.replace("\"Na I\",330.237,9", "Na I,330.237,-4.08");
        let found = compute(&tables(rows)).expect("computed");
        assert_eq!(found.tables, tables(&expected));
        assert_eq!(found.differ[0].row, 4);
    }

    #[test]
    fn a_rule_without_its_values_is_a_fault_with_a_place() {
        let faults = compute(&tables("Na I,330,,,2e6,4,0,,,flame-thermal-2200K,\n"));
        let faults = faults.expect_err("a fault");
        assert_eq!(
            faults[0].to_string(),
            "features/x.csv: row 2, column upper_level_cm-1: is needed by a rule that the row names"
        );
    }
}
