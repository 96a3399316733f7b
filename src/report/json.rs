//! Reports as JSON.

use super::escape::acts;
use super::view::IdentifyView;

/// The report as JSON, indented, with a final line feed.
///
/// # Errors
/// None that the views can cause; the signature is that of the writer.
pub fn identify_json(view: &IdentifyView) -> Result<String, serde_json::Error> {
    let json = serde_json::to_string_pretty(view)?;
    Ok(format!("{}\n", guarded(&json)))
}

/// Writes characters that would act on a terminal as `\uXXXX`, which reads back as the same text.
/// They occur in strings only: JSON has no other place for them but line feeds.
pub(super) fn guarded(json: &str) -> String {
    let mut shown = String::with_capacity(json.len());
    for letter in json.chars() {
        if letter != '\n' && acts(letter) {
            let mut units = [0u16; 2];
            for unit in letter.encode_utf16(&mut units) {
                shown.push_str(&format!("\\u{unit:04x}"));
            }
        } else {
            shown.push(letter);
        }
    }
    shown
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn guarded_json_reads_back(text in "[\\x00-\\x{2fff}\\x{e0000}-\\x{e00ff}]*") {
            let json = serde_json::to_string_pretty(&[&text]).unwrap_or_default();
            let shown = guarded(&json);
            prop_assert!(!shown.chars().any(|letter| letter != '\n' && acts(letter)));
            prop_assert_eq!(serde_json::from_str::<Vec<String>>(&shown).ok(), Some(vec![text]));
        }
    }
}
