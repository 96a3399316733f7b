//! From text to rows of cells: separator, comments, blank lines, quoted cells.
//!
//! The lines are walked once to take out comments and blank lines and to note on which line each
//! record starts; the cells are then split by the `csv` crate.

/// One row of cells.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Record {
    /// Line of the file on which it starts, from 1.
    pub line: usize,
    /// Its cells as written, without quotation marks.
    pub cells: Vec<String>,
}

/// What a text holds.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Records {
    /// `,` `;` or tab; absent if the header has none.
    pub separator: Option<char>,
    /// The header first; rows whose cells are all empty are left out.
    pub rows: Vec<Record>,
    /// Comment lines without the mark.
    pub comments: Vec<String>,
}

/// A quotation mark that is never closed would swallow the rest of the file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct UnclosedQuote {
    /// Line of the record it stands in.
    pub line: usize,
}

const SEPARATORS: [char; 3] = [',', ';', '\t'];

/// Splits a text into records. `recognised` counts how many of a header's cells are known column
/// names; it decides where a header holds several of the separators.
pub fn split(
    text: &str,
    recognised: impl Fn(&[String]) -> usize,
) -> Result<Records, UnclosedQuote> {
    let mut walk = Walk {
        rest: text,
        line: 1,
    };
    let mut records = Records::default();
    let mut joined = String::with_capacity(text.len());
    let mut starts = Vec::new();
    let mut stated = None;
    while !walk.rest.is_empty() {
        let start = walk.line;
        let physical = walk.peek_line();
        if let Some(comment) = comment_text(physical, starts.is_empty()) {
            records.comments.push(comment);
            walk.skip_line();
        } else if physical.trim().is_empty() {
            walk.skip_line();
        } else if let (true, None, Some(sign)) =
            (starts.is_empty(), stated, stated_separator(physical))
        {
            stated = Some(sign);
            walk.skip_line();
        } else {
            if starts.is_empty() {
                records.separator = stated.or_else(|| choose_separator(walk.rest, &recognised));
            }
            let record = walk
                .take_record(records.separator)
                .ok_or(UnclosedQuote { line: start })?;
            joined.push_str(&record);
            joined.push('\n');
            starts.push(start);
        }
    }
    records.rows = parse(&joined, records.separator, &starts);
    Ok(records)
}

/// The text after `#`. Spreadsheets put a comment line that holds a separator between quotation
/// marks and fill it up with separators; above the header such a line is a comment too.
fn comment_text(line: &str, above_header: bool) -> Option<String> {
    let line = line.trim();
    if let Some(text) = line.strip_prefix('#') {
        return Some(text.trim_end_matches(SEPARATORS).trim().to_owned());
    }
    let text = line.strip_prefix("\"#").filter(|_| above_header)?;
    let text = text.trim_end_matches(SEPARATORS).trim();
    Some(
        text.strip_suffix('"')
            .unwrap_or(text)
            .replace("\"\"", "\"")
            .trim()
            .to_owned(),
    )
}

/// The separator of a first line such as `sep=;`.
fn stated_separator(line: &str) -> Option<char> {
    let line = line.trim_matches([' ', '"', '\u{feff}']);
    let sign = line
        .get(..4)
        .filter(|s| s.eq_ignore_ascii_case("sep="))
        .and(line.chars().nth(4))?;
    (SEPARATORS.contains(&sign) && line.chars().count() == 5).then_some(sign)
}

/// The separator in the header outside quotation marks: with several, the one that gives most
/// known columns, then the one met most often.
fn choose_separator(text: &str, recognised: impl Fn(&[String]) -> usize) -> Option<char> {
    let mut counts = [0usize; 3];
    let mut inside = false;
    let mut end = text.len();
    for (at, c) in text.char_indices() {
        match c {
            '"' => inside = !inside,
            '\n' | '\r' if !inside => {
                end = at;
                break;
            }
            _ => {
                if let Some(k) = SEPARATORS.iter().position(|s| *s == c && !inside) {
                    counts[k] += 1;
                }
            }
        }
    }
    let header = text.get(..end).unwrap_or(text);
    let met = SEPARATORS
        .into_iter()
        .zip(counts)
        .filter(|(_, count)| *count > 0);
    met.max_by_key(|(sign, count)| {
        let cells = parse(header, Some(*sign), &[1])
            .pop()
            .map_or(0, |row| recognised(&row.cells));
        (cells, *count)
    })
    .map(|(sign, _)| sign)
}

/// Lets the `csv` crate split records that hold no blank lines and no comments.
fn parse(joined: &str, separator: Option<char>, starts: &[usize]) -> Vec<Record> {
    // NUL occurs in no table that was let in, so with it a record is one cell.
    let delimiter = separator.and_then(|c| u8::try_from(c).ok()).unwrap_or(0);
    let mut reader = csv::ReaderBuilder::new()
        .has_headers(false)
        .flexible(true)
        .delimiter(delimiter)
        .from_reader(joined.as_bytes());
    let rows = reader.records().zip(starts).filter_map(|(record, line)| {
        // A reader over valid UTF-8 in memory, flexible in length, has nothing to fail on.
        let cells: Vec<String> = record.ok()?.iter().map(str::to_owned).collect();
        let blank = cells.iter().all(|cell| cell.trim().is_empty());
        (!blank).then_some(Record { line: *line, cells })
    });
    rows.collect()
}

/// A walk through the lines of a text.
struct Walk<'a> {
    rest: &'a str,
    line: usize,
}

impl<'a> Walk<'a> {
    fn peek_line(&self) -> &'a str {
        self.rest.split(['\n', '\r']).next().unwrap_or_default()
    }

    fn skip_line(&mut self) {
        let length = self.peek_line().len();
        self.rest = self.rest.get(length..).unwrap_or_default();
        self.skip_line_end();
    }

    /// Passes one line end: LF, CRLF or CR.
    fn skip_line_end(&mut self) {
        let after = ["\r\n", "\n", "\r"]
            .iter()
            .find_map(|end| self.rest.strip_prefix(end));
        if let Some(after) = after {
            self.rest = after;
            self.line += 1;
        }
    }

    /// Takes the next record without its line end, or `None` if a quotation mark stays open.
    /// A mark opens a quoted cell only at the start of the cell (blanks before it are dropped);
    /// inside, a line end belongs to the cell and becomes LF.
    fn take_record(&mut self, separator: Option<char>) -> Option<String> {
        let mut record = String::new();
        let (mut inside, mut cell_start) = (false, true);
        while let Some(c) = self.rest.chars().next() {
            if matches!(c, '\n' | '\r') {
                self.skip_line_end();
                if !inside {
                    return Some(record);
                }
                record.push('\n');
                continue;
            }
            if cell_start && c == ' ' && self.rest.trim_start_matches(' ').starts_with('"') {
                self.rest = self.rest.trim_start_matches(' ');
                continue;
            }
            self.rest = self.rest.get(c.len_utf8()..).unwrap_or_default();
            record.push(c);
            let doubled = inside && c == '"' && self.rest.starts_with('"');
            if doubled {
                record.push('"');
                self.rest = self.rest.get(1..).unwrap_or_default();
            } else if c == '"' && (inside || cell_start) {
                inside = !inside;
            }
            cell_start = !inside && Some(c) == separator;
        }
        (!inside).then_some(record)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn cells(text: &str) -> Vec<(usize, Vec<String>)> {
        let records = split(text, |_| 0).unwrap();
        records
            .rows
            .into_iter()
            .map(|row| (row.line, row.cells))
            .collect()
    }

    #[track_caller]
    fn check(text: &str, expected: &[(usize, &[&str])]) {
        let expected: Vec<(usize, Vec<String>)> = expected
            .iter()
            .map(|(line, cells)| (*line, cells.iter().map(|cell| (*cell).to_owned()).collect()))
            .collect();
        assert_eq!(cells(text), expected);
    }

    #[test]
    fn rows_keep_the_line_they_start_on() {
        check(
            "# c\r\n\r\na,b\r\n\r\n1,\"x\r\n\r\n# y\"\r\n , \r\n2,z",
            &[(3, &["a", "b"]), (5, &["1", "x\n\n# y"]), (9, &["2", "z"])],
        );
        check("a;b\r1;2\r", &[(1, &["a", "b"]), (2, &["1", "2"])]);
    }

    #[test]
    fn quotation_marks_open_only_at_the_start_of_a_cell() {
        check(
            "a,b\n5' 3\",x\n \"1,5\",y\n\"a\"\"b\",\"\"\n",
            &[
                (1, &["a", "b"]),
                (2, &["5' 3\"", "x"]),
                (3, &["1,5", "y"]),
                (4, &["a\"b", ""]),
            ],
        );
        assert_eq!(
            split("a,b\n1,\"x\n2,y\n", |_| 0),
            Err(UnclosedQuote { line: 2 })
        );
    }

    #[test]
    fn the_separator_stands_in_the_header_outside_quotation_marks() {
        let separator = |text| split(text, |_| 0).unwrap().separator;
        assert_eq!(separator("\"a,b\";c\n"), Some(';'));
        assert_eq!(separator("a\tb\n1,5\t2\n"), Some('\t'));
        assert_eq!(separator("a\n1,5\n"), None);
        assert_eq!(separator("sep=;\na,b;c\n"), Some(';'));
        check("a\n1,5\n", &[(1, &["a"]), (2, &["1,5"])]);
        // `wavelength_nm` is known, so the comma counts although there are more semicolons.
        let known = |cells: &[String]| cells.iter().filter(|c| *c == "wavelength_nm").count();
        assert_eq!(
            split("wavelength_nm,a;b;c\n", known).unwrap().separator,
            Some(',')
        );
    }

    #[test]
    fn comments_lose_mark_and_filling() {
        let text = "# method\n\"# grating, 600 \"\"lines\"\"\",,\nwavelength_nm,note\n#end,,\n";
        let records = split(text, |_| 0).unwrap();
        assert_eq!(
            records.comments,
            ["method", "grating, 600 \"lines\"", "end"]
        );
        assert_eq!(records.rows.len(), 1);
    }
}
