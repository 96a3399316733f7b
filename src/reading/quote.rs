//! Text of unknown origin made safe and short enough to stand in a message.

/// Longest quotation, characters.
const LONGEST: usize = 40;

/// A cell for a message: control and direction characters escaped, at most 40 characters.
pub fn shorten(text: &str) -> String {
    let safe = escape_control(text.trim());
    match safe.char_indices().nth(LONGEST) {
        None => safe,
        Some(_) => safe.chars().take(LONGEST - 1).chain(['…']).collect(),
    }
}

/// `shorten` between quotation marks.
pub fn quoted(text: &str) -> String {
    format!("\"{}\"", shorten(text))
}

/// A name: runs of white space become one space, control and direction characters are escaped.
pub fn clean_name(text: &str) -> String {
    let words: Vec<&str> = text.split_whitespace().collect();
    escape_control(&words.join(" "))
}

/// Control characters, and those that turn the direction of text, as `\u{1b}`.
pub fn escape_control(text: &str) -> String {
    let mut safe = String::with_capacity(text.len());
    for c in text.chars() {
        if c.is_control() || turns_or_hides(c) {
            safe.extend(c.escape_unicode());
        } else {
            safe.push(c);
        }
    }
    safe
}

/// Characters that change the direction of the text after them, or break its lines, unseen.
fn turns_or_hides(c: char) -> bool {
    matches!(
        c,
        '\u{200b}' | '\u{200e}' | '\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{feff}'
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn escape_sequences_do_not_pass() {
        assert_eq!(quoted("\u{1b}[31mred"), "\"\\u{1b}[31mred\"");
        assert_eq!(quoted("a\u{202e}b"), "\"a\\u{202e}b\"");
        assert_eq!(clean_name(" lamp\n 3\u{7} "), "lamp 3\\u{7}");
    }

    #[test]
    fn long_cells_are_cut_at_forty_characters() {
        assert_eq!(shorten(&"é".repeat(40)), "é".repeat(40));
        assert_eq!(shorten(&"é".repeat(41)), format!("{}…", "é".repeat(39)));
    }
}
