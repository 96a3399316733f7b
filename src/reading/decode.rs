//! From bytes to text: which encoding a table is in.

use encoding_rs::{Encoding, UTF_8, UTF_16BE, UTF_16LE, WINDOWS_1252};

/// Text and the name of its encoding, or why the bytes are no table.
pub fn decode(bytes: &[u8]) -> Result<(String, &'static str), String> {
    if let Some(what) = known_binary(bytes) {
        return Err(format!(
            "this is {what}, not a table (save it as CSV and give that file)"
        ));
    }
    let (text, name) = match Encoding::for_bom(bytes) {
        Some((encoding, mark)) => {
            let name = if encoding == UTF_16LE {
                "UTF-16LE"
            } else if encoding == UTF_16BE {
                "UTF-16BE"
            } else {
                "UTF-8 with BOM"
            };
            (
                strictly(encoding, bytes.get(mark..).unwrap_or_default(), name)?,
                name,
            )
        }
        None => without_mark(bytes)?,
    };
    if text.contains('\0') {
        return Err(
            "the file holds NUL characters and is no text table (save it as CSV in UTF-8)".into(),
        );
    }
    Ok((text, name))
}

fn strictly(encoding: &'static Encoding, bytes: &[u8], name: &str) -> Result<String, String> {
    encoding
        .decode_without_bom_handling_and_without_replacement(bytes)
        .map(|text| text.into_owned())
        .ok_or_else(|| format!("the file begins as {name} but is not valid {name} throughout (save it again as UTF-8)"))
}

/// UTF-8 if it is that, else Windows-1252, which maps every byte: so control characters, which no
/// spreadsheet writes, are taken as the sign of something that is no text at all.
fn without_mark(bytes: &[u8]) -> Result<(String, &'static str), String> {
    if let Some(text) = UTF_8.decode_without_bom_handling_and_without_replacement(bytes) {
        return Ok((text.into_owned(), "UTF-8"));
    }
    let (text, _) = WINDOWS_1252.decode_without_bom_handling(bytes);
    let is_stray = |c: char| c.is_control() && !matches!(c, '\t' | '\n' | '\r' | '\u{1b}');
    if text.contains(is_stray) {
        return Err(
            "the file is no text table in UTF-8, UTF-16 or Windows-1252 (save it as CSV in UTF-8)"
                .into(),
        );
    }
    Ok((text.into_owned(), "Windows-1252"))
}

/// Kinds of file that people give by mistake, by their first bytes.
fn known_binary(bytes: &[u8]) -> Option<&'static str> {
    const KINDS: [(&[u8], &str); 7] = [
        (b"PK\x03\x04", "a workbook or an archive"),
        (b"\xd0\xcf\x11\xe0", "an old workbook"),
        (b"\x89PNG", "a PNG picture"),
        (b"\xff\xd8\xff", "a JPEG picture"),
        (b"%PDF", "a PDF document"),
        (b"\x1f\x8b", "a compressed file"),
        (b"GIF8", "a GIF picture"),
    ];
    KINDS
        .iter()
        .find(|(start, _)| bytes.starts_with(start))
        .map(|(_, what)| *what)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn encodings_are_told_apart() {
        assert_eq!(decode(b"a"), Ok(("a".into(), "UTF-8")));
        assert_eq!(
            decode("\u{feff}Å".as_bytes()),
            Ok(("Å".into(), "UTF-8 with BOM"))
        );
        assert_eq!(decode(b"\xff\xfe\xc5\x00"), Ok(("Å".into(), "UTF-16LE")));
        assert_eq!(decode(b"\xfe\xff\x00\xc5"), Ok(("Å".into(), "UTF-16BE")));
        assert_eq!(decode(b"\xc5 \x80"), Ok(("Å €".into(), "Windows-1252")));
        assert_eq!(decode(b""), Ok((String::new(), "UTF-8")));
    }

    #[test]
    fn what_is_no_text_is_refused() {
        for bytes in [
            &b"a\0b"[..],
            b"\xff\xfea",
            b"\xff\xfe\x00\x00a\x00\x00\x00",
            b"\xef\xbb\xbf\xff",
            b"\x81\x02",
            b"PK\x03\x04",
        ] {
            assert!(decode(bytes).is_err(), "{bytes:?}");
        }
    }
}
