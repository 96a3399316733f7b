//! Text of the user's on a terminal: nothing in it may act.

/// The text with everything that could act on a terminal made visible: control characters, ANSI
/// sequences (they start with one), marks that turn the direction of writing, and marks that
/// cannot be seen. Each becomes `\u{…}`.
pub fn plain(text: &str) -> String {
    let mut shown = String::with_capacity(text.len());
    for letter in text.chars() {
        if acts(letter) {
            shown.extend(letter.escape_unicode());
        } else {
            shown.push(letter);
        }
    }
    shown
}

/// Whether a character acts on what is around it instead of being shown.
pub(super) fn acts(letter: char) -> bool {
    letter.is_control()
        || matches!(letter,
            '\u{061c}' | '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{2069}'
            | '\u{feff}' | '\u{fff9}'..='\u{fffb}' | '\u{e0000}'..='\u{e007f}')
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn nothing_acts() {
        assert_eq!(plain("Löwe, 589 nm"), "Löwe, 589 nm");
        assert_eq!(
            plain("a\u{1b}[31mred\u{7}\n"),
            "a\\u{1b}[31mred\\u{7}\\u{a}"
        );
        assert_eq!(plain("abc\u{202e}fed\u{2066}"), "abc\\u{202e}fed\\u{2066}");
        assert_eq!(plain("\u{9b}31m"), "\\u{9b}31m");
    }

    proptest! {
        #[test]
        fn no_text_acts(text in "\\PC*|[\\x00-\\x{2fff}]*") {
            prop_assert!(!plain(&text).chars().any(acts));
        }
    }
}
