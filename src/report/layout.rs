//! Headings, paragraphs and columns of the text report. Every text passes through here and is
//! made harmless on the way.

use crate::report::escape::plain;
use anstyle::{AnsiColor, Style};
use unicode_width::UnicodeWidthStr;

/// Width of the report, columns.
pub(super) const WIDTH: usize = 80;

/// Style of headings and answers.
pub(super) const STRONG: Style = Style::new().bold();

/// Style of what is in order.
pub(super) const GOOD: Style = AnsiColor::Green.on_default();

/// Style of what is open.
pub(super) const OPEN: Style = AnsiColor::Yellow.on_default();

/// Style of what is wrong.
pub(super) const WRONG: Style = AnsiColor::Red.on_default();

/// The text in a style; the words must say the same without it.
pub(super) fn painted(text: &str, style: Style) -> String {
    format!("{style}{text}{style:#}")
}

/// A heading on a line of its own.
pub(super) fn heading(text: &str) -> String {
    format!("{}\n", painted(text, STRONG))
}

/// A paragraph wrapped to the width, with the indents of its first line and of the others.
pub(super) fn paragraph(text: &str, first: &str, others: &str) -> String {
    let options = textwrap::Options::new(WIDTH)
        .initial_indent(first)
        .subsequent_indent(others)
        .word_separator(textwrap::WordSeparator::AsciiSpace)
        .word_splitter(textwrap::WordSplitter::NoHyphenation);
    let mut wrapped = textwrap::wrap(&plain(text), options).join("\n");
    wrapped.push('\n');
    wrapped
}

/// Keys and values in two columns.
pub(super) fn pairs(pairs: &[(String, String)]) -> String {
    let keys = pairs
        .iter()
        .map(|(key, _)| plain(key).width())
        .max()
        .unwrap_or(0);
    let indent = " ".repeat(keys + 4);
    let line = |(key, value): &(String, String)| {
        let key = plain(key);
        let fill = " ".repeat(keys - key.width().min(keys));
        paragraph(value, &format!("  {key}{fill}  "), &indent)
    };
    pairs.iter().map(line).collect()
}

/// How a column stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Align {
    Left,
    Right,
}

/// A cell with the style it is painted in.
#[derive(Debug, Clone)]
pub(super) struct Cell {
    text: String,
    style: Option<Style>,
}

impl Cell {
    pub fn new(text: impl AsRef<str>) -> Self {
        Self {
            text: plain(text.as_ref()),
            style: None,
        }
    }

    pub fn painted(text: impl AsRef<str>, style: Style) -> Self {
        Self {
            text: plain(text.as_ref()),
            style: Some(style),
        }
    }

    fn padded(&self, width: usize, align: Align) -> String {
        let fill = " ".repeat(width.saturating_sub(self.text.width()));
        let text = self
            .style
            .map_or_else(|| self.text.clone(), |style| painted(&self.text, style));
        match align {
            Align::Left => format!("{text}{fill}"),
            Align::Right => format!("{fill}{text}"),
        }
    }
}

/// Rows of cells in columns two blanks apart, indented by two. The last column is wrapped to the
/// width; the others are as wide as their widest cell. `aligns` gives the columns before the last.
pub(super) fn columns(rows: &[Vec<Cell>], aligns: &[Align]) -> String {
    let widths: Vec<usize> = (0..aligns.len())
        .map(|column| {
            rows.iter()
                .filter_map(|row| row.get(column))
                .map(|cell| cell.text.width())
                .max()
        })
        .map(|widest| widest.unwrap_or(0))
        .collect();
    let indent = 2 + widths.iter().map(|width| width + 2).sum::<usize>();
    let room = WIDTH.saturating_sub(indent).max(16);
    let mut text = String::new();
    for row in rows {
        let mut line = "  ".to_owned();
        for ((cell, &width), &align) in row.iter().zip(&widths).zip(aligns) {
            line.push_str(&cell.padded(width, align));
            line.push_str("  ");
        }
        let last = row.get(aligns.len()).map_or("", |cell| cell.text.as_str());
        let wrapped = textwrap::wrap(last, room).join(&format!("\n{}", " ".repeat(indent)));
        text.push_str(format!("{line}{wrapped}").trim_end());
        text.push('\n');
    }
    text
}
