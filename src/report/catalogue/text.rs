//! Library rows for people, 80 columns wide.

use super::page::{EmitterView, PageView};
use super::view::{FeatureView, ListedView};
use crate::library::{Computation, SourceKind};
use crate::report::layout::{Align, Cell, columns, heading, paragraph};
use crate::verdict::wording::wavelength;

const CAUTIONS: &str = "Cautions (the rules of your own place come first)";

/// Cautions, with an empty line after them; nothing if there are none.
pub fn cautions_text(cautions: &[&str]) -> String {
    if cautions.is_empty() {
        return String::new();
    }
    let cautions: Vec<String> = cautions.iter().map(|text| (*text).to_owned()).collect();
    format!("{}{}\n", heading(CAUTIONS), bullets(&cautions))
}

/// The substances of a library.
pub fn list_text(substances: &[ListedView]) -> String {
    let mut rows = vec![cells(["", "flame", "discharge", "absorption", "substance"])];
    rows.extend(substances.iter().map(|s| {
        let [flame, discharge, absorption] = &s.prior;
        let emitters = s.emitters.join(", ");
        let name = format!("{}: {emitters} ({} features)", s.name, s.features);
        cells([&s.symbol, flame, discharge, absorption, &name])
    }));
    format!(
        "{}{}",
        heading(&format!("{} substances", substances.len())),
        columns(&rows, &[Align::Left; 4])
    )
}

/// Strengths that follow from their rules, and those that do not.
pub fn computation_text(folder: &str, found: &Computation, written: bool) -> String {
    let differ = found.differ.len();
    let end = match (differ, written) {
        (0, _) => "every other one is stated on its own".to_owned(),
        (_, true) => format!("{differ} did not and were put in"),
        (1, false) => "1 does not (--write puts the computed value in)".to_owned(),
        (_, false) => format!("{differ} do not (--write puts the computed values in)"),
    };
    let sum = format!(
        "{folder}: {} strengths follow from the rules their rows name; {end}.",
        found.agree
    );
    let mut text = paragraph(&sum, "", "");
    if differ > 0 {
        let mut rows = vec![cells(["table", "row", "stands", "follows", "feature"])];
        rows.extend(found.differ.iter().map(|d| {
            let (row, follows) = (d.row.to_string(), format!("{:.2}", d.follows_dex));
            let kind = d
                .column
                .trim_start_matches("strength_")
                .trim_end_matches("_dex");
            let feature = format!("{}, {kind}", d.feature);
            cells([&d.table, &row, &d.stands, &follows, &feature])
        }));
        let right = Align::Right;
        text.push_str(&columns(&rows, &[Align::Left, right, right, right]));
    }
    text
}

/// Lines and band heads.
pub fn lines_text(features: &[FeatureView]) -> String {
    if features.is_empty() {
        return "No line or band of the library lies there.\n".to_owned();
    }
    let count = match features.len() {
        1 => "1 line or band".to_owned(),
        n => format!("{n} lines and bands"),
    };
    format!(
        "{}{}",
        heading(&format!("{count} (strengths in decades)")),
        feature_table(features, true)
    )
}

fn feature_table(features: &[FeatureView], with_substance: bool) -> String {
    let mut rows = vec![cells([
        "nm in air",
        "flame",
        "disch.",
        "absorp.",
        "colour",
        "form",
        "emitter",
    ])];
    rows.extend(features.iter().map(|f| {
        let [flame, discharge, absorption] = SourceKind::ALL.map(|s| strength(f.strength_dex(s)));
        let emitter = if with_substance {
            format!("{}, {}", f.substance, f.emitter)
        } else {
            f.emitter.clone()
        };
        cells([
            &wavelength(f.wavelength_air_nm, f.uncertainty_nm),
            &flame,
            &discharge,
            &absorption,
            f.colour,
            &f.form.replace('_', " "),
            &emitter,
        ])
    }));
    let (left, right) = (Align::Left, Align::Right);
    columns(&rows, &[right, right, right, right, left, left])
}

fn strength(dex: Option<f64>) -> String {
    // Adding zero takes the sign off a zero.
    dex.map_or_else(
        || "-".to_owned(),
        |dex| format!("{:.1}", (dex * 10.0).round() / 10.0 + 0.0),
    )
}

/// One substance in full.
pub fn page_text(page: &PageView) -> String {
    let mut text = title(page);
    text.push_str(&section("What to look for", &look_for(page)));
    let emitters = emitter_table(&page.emitters);
    text.push_str(&section("Emitters by kind of source", &emitters));
    let listed = format!(
        "Lines and bands within 1.5 decades of the strongest ({} of {})",
        page.features.len(),
        page.features_in_all
    );
    text.push_str(&section(&listed, &feature_table(&page.features, false)));
    let beside = format!("Others within {} nm of its strongest", page.within_nm);
    text.push_str(&section(&beside, &near(page)));
    text.push_str(&section(CAUTIONS, &bullets(&page.cautions)));
    let sources: Vec<String> = page
        .sources
        .iter()
        .map(|s| format!("{}: {} [{}]", s.key, s.citation, s.standing))
        .collect();
    text.push_str(&section("Sources", &bullets(&sources)));
    text
}

fn title(page: &PageView) -> String {
    let symbol = match page.symbol.as_str() {
        "" => String::new(),
        symbol => format!(" ({symbol})"),
    };
    let mut text = heading(&format!("{}{symbol}, {}", page.name, page.kind));
    let mut line = |what: &str, value: &str| {
        if !value.is_empty() {
            text.push_str(&paragraph(&format!("{what}{value}"), "  ", "    "));
        }
    };
    line("Also: ", &page.aliases.join(", "));
    line("Flame colour: ", &page.flame_colour);
    let met: Vec<String> = page
        .met
        .iter()
        .map(|met| format!("{} {}", met.source, met.class))
        .collect();
    line("Met: ", &met.join(", "));
    line("", &page.note);
    text
}

fn section(title: &str, body: &str) -> String {
    if body.is_empty() {
        return String::new();
    }
    format!("\n{}{body}", heading(title))
}

fn bullets(items: &[String]) -> String {
    items
        .iter()
        .map(|item| paragraph(item, "  * ", "    "))
        .collect()
}

/// Instruments that should look for the same lines share a row.
fn look_for(page: &PageView) -> String {
    let mut rows: Vec<(&str, Vec<&str>, String)> = Vec::new();
    for row in &page.look_for {
        let lines: Vec<String> = row
            .wavelengths_nm
            .iter()
            .zip(&row.what)
            .map(|(nm, what)| format!("{nm:.1} ({what})"))
            .collect();
        let lines = match lines.is_empty() {
            true => "nothing in its range".to_owned(),
            false => lines.join("; "),
        };
        match rows.iter_mut().find(|r| r.0 == row.source && r.2 == lines) {
            Some(same) => same.1.push(&row.instrument),
            None => rows.push((&row.source, vec![&row.instrument], lines)),
        }
    }
    rows.iter()
        .map(|(source, instruments, lines)| {
            let who = format!("{source}, {}: ", instruments.join(", "));
            paragraph(&format!("{who}{lines}"), "  ", "    ")
        })
        .collect()
}

fn emitter_table(emitters: &[EmitterView]) -> String {
    let mut rows = vec![cells([
        "source", "shows", "level", "spread", "deep to", "emitter",
    ])];
    rows.extend(emitters.iter().map(|e| {
        let emitter = match e.remark.as_str() {
            "" => e.emitter.clone(),
            remark => format!("{}: {remark}", e.emitter),
        };
        cells([
            &e.source,
            &format!("{:.2}", e.shows),
            &format!("{:.1}", e.level_dex),
            &format!("{:.1}", e.level_spread_dex),
            &format!("{:.1}", e.complete_to_dex),
            &emitter,
        ])
    }));
    let (left, right) = (Align::Left, Align::Right);
    columns(&rows, &[left, right, right, right, right])
}

fn near(page: &PageView) -> String {
    let rows: Vec<Vec<Cell>> = page
        .near
        .iter()
        .map(|near| {
            cells([
                &format!("{:.2}", near.wavelength_air_nm),
                &format!("{:+.2}", near.other_nm - near.wavelength_air_nm),
                &format!("{}, {} {:.2}", near.substance, near.emitter, near.other_nm),
            ])
        })
        .collect();
    columns(&rows, &[Align::Right; 2])
}

fn cells<const N: usize>(texts: [&str; N]) -> Vec<Cell> {
    texts.into_iter().map(Cell::new).collect()
}
