//! The report of one sample, in the order in which a reader needs it.

use crate::report::layout::{
    Align, Cell, GOOD, OPEN, STRONG, WRONG, columns, heading, painted, paragraph,
};
use crate::report::picture::picture;
use crate::report::view::{CauseView, CompositionView, ReadingView, SampleView, SubstanceView};
use crate::verdict::thresholds::UNTESTED_BOUNDLESS;
use crate::verdict::wording::{
    at_most, list, probability, wavelength, wavelength_with_uncertainty,
};
use anstyle::Style;

/// Compositions below this are not printed, after the first three.
const COMPOSITION_SHOWN_FROM: f64 = 0.01;

/// So many compositions are printed at most.
const COMPOSITIONS_SHOWN: usize = 10;

/// Substances below this presence are counted only.
const SUBSTANCE_SHOWN_FROM: f64 = 0.01;

/// What stands where nothing is known.
const UNKNOWN: &str = "-";

/// The answering sentence alone.
pub(super) fn answer(sample: &SampleView, several: bool) -> String {
    let sentence = if several {
        format!("{}: {}", sample.sample, lower_first(&sample.sentence))
    } else {
        sample.sentence.clone()
    };
    let style = match sample.decision {
        "decisive" => STRONG.fg_color(GOOD.get_fg_color()),
        "unexplained" => STRONG.fg_color(WRONG.get_fg_color()),
        _ => STRONG.fg_color(OPEN.get_fg_color()),
    };
    let wrapped = paragraph(&sentence, "", "");
    wrapped
        .lines()
        .map(|line| format!("{}\n", painted(line, style)))
        .collect()
}

/// A sentence that follows a colon.
fn lower_first(sentence: &str) -> String {
    let mut letters = sentence.chars();
    letters.next().map_or_else(String::new, |first| {
        first.to_lowercase().chain(letters).collect()
    })
}

/// The full report.
pub(super) fn full(sample: &SampleView, several: bool) -> String {
    let sections = [
        Some(answer(sample, several)),
        compositions(sample),
        without_ubiquitous(sample),
        substances(sample),
        readings(sample),
        pictured(sample),
        missing(sample),
        warnings(sample),
        next_readings(sample),
        cautions(sample),
    ];
    sections
        .into_iter()
        .flatten()
        .collect::<Vec<_>>()
        .join("\n")
}

fn shown(p: Option<f64>) -> String {
    p.map_or_else(|| UNKNOWN.to_owned(), probability)
}

fn compositions(sample: &SampleView) -> Option<String> {
    let mut text = ranking(&sample.compositions, "Compositions")?;
    if let Some(bound) = sample.untested_mass_bound {
        let note = if bound > UNTESTED_BOUNDLESS {
            "Compositions not weighed may hold much of the probability.".to_owned()
        } else {
            format!("Compositions not weighed hold {} together.", at_most(bound))
        };
        text.push_str(&paragraph(&note, "  ", "  "));
    }
    for group in &sample.either_or {
        let note = format!("Cannot be told apart here: {}.", list(group));
        text.push_str(&paragraph(&note, "  ", "  "));
    }
    Some(text)
}

fn without_ubiquitous(sample: &SampleView) -> Option<String> {
    ranking(
        &sample.compositions_without_ubiquitous,
        "Compositions, leaving out of account what is on nearly every sample",
    )
}

fn ranking(compositions: &[CompositionView], title: &str) -> Option<String> {
    if compositions.is_empty() {
        return None;
    }
    let has_evidence = compositions
        .iter()
        .any(|composition| composition.log_evidence.is_some());
    let mut head = vec![Cell::new(""), Cell::new("probability")];
    head.extend(has_evidence.then(|| Cell::new("ln evidence")));
    head.push(Cell::new("composition"));
    let mut rows = vec![head];
    let worth = |composition: &&CompositionView| {
        composition.rank <= 3
            || composition
                .posterior
                .is_none_or(|p| p >= COMPOSITION_SHOWN_FROM)
    };
    for composition in compositions.iter().filter(worth).take(COMPOSITIONS_SHOWN) {
        let mut row = vec![
            Cell::new(composition.rank.to_string()),
            Cell::new(shown(composition.posterior)),
        ];
        if has_evidence {
            let evidence = composition.log_evidence.map(|value| format!("{value:.1}"));
            row.push(Cell::new(evidence.as_deref().unwrap_or(UNKNOWN)));
        }
        row.push(Cell::new(&composition.described));
        rows.push(row);
    }
    let aligns = vec![Align::Right; if has_evidence { 3 } else { 2 }];
    Some(format!("{}{}", heading(title), columns(&rows, &aligns)))
}

fn substances(sample: &SampleView) -> Option<String> {
    if sample.substances.is_empty() {
        return None;
    }
    let leading = sample
        .compositions
        .first()
        .map_or(&[][..], |leader| &leader.substances);
    let worth = |substance: &&SubstanceView| {
        leading.contains(&substance.substance)
            || substance
                .presence_probability
                .is_none_or(|p| p >= SUBSTANCE_SHOWN_FROM)
    };
    let mut rows = vec![
        ["", "seen", "in sample", "would show", "substance"]
            .map(Cell::new)
            .to_vec(),
    ];
    let shown_rows: Vec<&SubstanceView> = sample.substances.iter().filter(worth).collect();
    for substance in &shown_rows {
        let remark = if substance.rests_on_one_line {
            ", rests on one reading"
        } else {
            ""
        };
        rows.push(vec![
            Cell::new(&substance.symbol),
            Cell::new(shown(substance.presence_probability)),
            Cell::new(shown(substance.physical_presence_probability)),
            Cell::new(shown(substance.testable)),
            Cell::new(format!("{}{remark}", substance.name)),
        ]);
    }
    let mut text =
        heading("Substances (chance of a reading from it, of its presence, of its showing)");
    if !shown_rows.is_empty() {
        text.push_str(&columns(
            &rows,
            &[Align::Left, Align::Right, Align::Right, Align::Right],
        ));
    }
    let others = sample.substances.len() - shown_rows.len();
    if others > 0 {
        text.push_str(&format!(
            "  {others} more were weighed, each seen with less than 0.01\n"
        ));
    }
    Some(text)
}

fn readings(sample: &SampleView) -> Option<String> {
    if sample.readings.is_empty() {
        return None;
    }
    let mut rows = vec![
        [
            "row",
            "nm in air",
            "residual/u",
            "standing",
            "best cause, nm",
        ]
        .map(Cell::new)
        .to_vec(),
    ];
    for reading in &sample.readings {
        rows.push(reading_row(reading));
        for note in &reading.notes {
            let mut row = vec![Cell::new(""); 4];
            row.push(Cell::new(format!("note: {note}")));
            rows.push(row);
        }
    }
    let aligns = [Align::Right, Align::Right, Align::Right, Align::Left];
    Some(format!(
        "{}{}",
        heading("Readings"),
        columns(&rows, &aligns)
    ))
}

fn reading_row(reading: &ReadingView) -> Vec<Cell> {
    let row = match reading.rows.as_slice() {
        [] => UNKNOWN.to_owned(),
        [row] => row.to_string(),
        [row, other] => format!("{row}, {other}"),
        [row, others @ ..] => format!("{row} +{}", others.len()),
    };
    let position = match (reading.wavelength_nm, reading.uncertainty_nm) {
        (Some(nm), Some(u)) => wavelength_with_uncertainty(nm, u),
        _ => UNKNOWN.to_owned(),
    };
    let residual = reading
        .cause
        .as_ref()
        .and_then(|cause| cause.residual_sigma);
    vec![
        Cell::new(row),
        Cell::new(position),
        Cell::new(residual.map_or_else(|| UNKNOWN.to_owned(), signed)),
        Cell::painted(reading.standing, standing_style(reading.standing)),
        Cell::new(
            reading
                .cause
                .as_ref()
                .map_or_else(|| UNKNOWN.to_owned(), cause),
        ),
    ]
}

/// One decimal with its sign; what rounds to zero has none.
fn signed(sigma: f64) -> String {
    let shown = format!("{sigma:+.1}");
    if shown.ends_with("0.0") && sigma.abs() < 1.0 {
        "0.0".to_owned()
    } else {
        shown
    }
}

fn standing_style(standing: &str) -> Style {
    match standing {
        "explained" => GOOD,
        "doubtful" => OPEN,
        _ => WRONG,
    }
}

fn cause(cause: &CauseView) -> String {
    let position = match (cause.feature_nm, cause.feature_uncertainty_nm) {
        (Some(nm), Some(u)) => wavelength(nm, u),
        _ => UNKNOWN.to_owned(),
    };
    let chance = shown(cause.probability);
    format!("{}, {} {position} ({chance})", cause.name, cause.emitter)
}

fn pictured(sample: &SampleView) -> Option<String> {
    let lines = picture(sample);
    (!lines.is_empty()).then(|| {
        let lanes: String = lines.iter().map(|line| format!("  {line}\n")).collect();
        format!("{}{lanes}", heading("Picture"))
    })
}

fn missing(sample: &SampleView) -> Option<String> {
    if sample.missing_lines.is_empty() {
        return None;
    }
    let mut rows = vec![
        ["nm in air", "missed by chance", "line"]
            .map(Cell::new)
            .to_vec(),
    ];
    for line in &sample.missing_lines {
        let position = match (line.wavelength_nm, line.uncertainty_nm) {
            (Some(nm), Some(u)) => wavelength(nm, u),
            _ => UNKNOWN.to_owned(),
        };
        rows.push(vec![
            Cell::new(position),
            Cell::new(shown(line.detection_probability.map(|p| 1.0 - p))),
            Cell::new(format!("{}, {}", line.name, line.emitter)),
        ]);
    }
    let table = columns(&rows, &[Align::Right, Align::Right]);
    Some(format!("{}{table}", heading("Expected and not seen")))
}

fn warnings(sample: &SampleView) -> Option<String> {
    if sample.warnings.is_empty() {
        return None;
    }
    let mut text = heading("Warnings");
    for warning in &sample.warnings {
        text.push_str(&paragraph(&warning.message, "  ! ", "    "));
        text.push_str(&paragraph(
            &format!("Next: {}", warning.next_step),
            "    ",
            "    ",
        ));
    }
    Some(text)
}

fn next_readings(sample: &SampleView) -> Option<String> {
    if sample.next_readings.is_empty() {
        return None;
    }
    let mut rows = vec![["nm in air", "bits", "tells apart"].map(Cell::new).to_vec()];
    for next in &sample.next_readings {
        let nm = next.wavelength_nm.map(|nm| format!("{nm:.1}"));
        let bits = next.information_bits.map(|bits| format!("{bits:.2}"));
        rows.push(vec![
            Cell::new(nm.as_deref().unwrap_or(UNKNOWN)),
            Cell::new(bits.as_deref().unwrap_or(UNKNOWN)),
            Cell::new(list(&next.separates)),
        ]);
    }
    let table = columns(&rows, &[Align::Right, Align::Right]);
    Some(format!(
        "{}{table}",
        heading("Where a further reading would tell most")
    ))
}

fn cautions(sample: &SampleView) -> Option<String> {
    if sample.cautions.is_empty() {
        return None;
    }
    let mut text = heading("Cautions (the rules of your own place come first)");
    for caution in &sample.cautions {
        text.push_str(&paragraph(caution, "  * ", "    "));
    }
    Some(text)
}
