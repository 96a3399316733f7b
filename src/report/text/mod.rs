//! The text report: 80 columns, plain characters, colour as a help only.

mod sample;

use super::escape::plain;
use super::view::{IdentifyView, InputView, RefusalView};
use crate::report::layout::{WIDTH, heading, pairs, paragraph};

/// How much of a report is wanted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Detail {
    /// Everything.
    Full,
    /// The answering sentences and what was refused.
    Answers,
}

/// The report as text, with ANSI styles; whoever prints it strips them where they are not wanted.
pub fn identify_text(view: &IdentifyView, detail: Detail) -> String {
    let several = view.samples.len() > 1;
    let mut blocks: Vec<String> = Vec::new();
    for sample in &view.samples {
        blocks.push(match detail {
            Detail::Full => sample::full(sample, several),
            Detail::Answers => sample::answer(sample, several),
        });
    }
    let rule = format!("\n{}\n\n", "-".repeat(WIDTH));
    let mut text = blocks.join(if detail == Detail::Full { &rule } else { "" });
    let mut closing = Vec::new();
    closing.extend(refused(&view.refused));
    if detail == Detail::Full {
        closing.extend(inputs(&view.inputs));
        closing.push(format!(
            "{}{}",
            heading("Set-up used"),
            pairs(&view.setup_described)
        ));
        closing.push(versions(view));
    }
    if !text.is_empty() && !closing.is_empty() {
        text.push_str(if several && detail == Detail::Full {
            &rule
        } else {
            "\n"
        });
    }
    text.push_str(&closing.join("\n"));
    text
}

fn refused(refused: &[RefusalView]) -> Option<String> {
    if refused.is_empty() {
        return None;
    }
    let mut text = heading("Refused");
    for refusal in refused {
        text.push_str(&paragraph(&located(refusal), "  ", "    "));
    }
    Some(text)
}

/// A refusal on one line: where, what, and what to try.
fn located(refusal: &RefusalView) -> String {
    let place = [
        refusal
            .sample
            .as_ref()
            .map(|sample| format!("sample {sample}")),
        refusal.row.map(|row| format!("row {row}")),
        refusal
            .column
            .as_ref()
            .map(|column| format!("column {column}")),
    ];
    let place: Vec<String> = place.into_iter().flatten().collect();
    let mut text = format!("{}:", refusal.input);
    if !place.is_empty() {
        text.push_str(&format!(" {}:", place.join(", ")));
    }
    if let Some(typed) = &refusal.text {
        text.push_str(&format!(" \"{typed}\""));
    }
    format!("{text} {}", refusal.message)
}

fn inputs(inputs: &[InputView]) -> Option<String> {
    if inputs.is_empty() {
        return None;
    }
    let mut text = heading("Read");
    for input in inputs {
        let separator = match input.separator {
            None => "one column",
            Some('\t') => "columns parted by tabs",
            Some(';') => "columns parted by semicolons",
            Some(_) => "columns parted by commas",
        };
        let sign = if input.decimal_sign == ',' {
            "comma"
        } else {
            "point"
        };
        let how = format!(
            "{}: {}, {separator}, decimal {sign}",
            input.path, input.encoding
        );
        text.push_str(&paragraph(&how, "  ", "    "));
        text.push_str(&format!("    sha256 {}\n", plain(&input.sha256)));
        for comment in &input.comments {
            text.push_str(&paragraph(
                &format!("# {}", comment.trim()),
                "    ",
                "      ",
            ));
        }
        for warning in &input.warnings {
            text.push_str(&paragraph(
                &format!("{} {}", warning.message, warning.next_step),
                "    ",
                "      ",
            ));
        }
    }
    Some(text)
}

fn versions(view: &IdentifyView) -> String {
    let library = format!(
        "library of {} substances, sha256 {}",
        view.library.substances, view.library.sha256
    );
    format!(
        "{}{}",
        paragraph(&format!("linstock {}", view.version), "", ""),
        paragraph(&library, "", "  ")
    )
}
