//! Bytes to text: which encoding a file is in.
//!
//! A byte-order mark decides; without one, what is valid UTF-8 is UTF-8 and the rest is
//! Windows-1252 (WHATWG Encoding Standard, names and tables as in `encoding_rs`).

use crate::diagnostic::Note;
use encoding_rs::{UTF_8, UTF_16BE, UTF_16LE, WINDOWS_1252};
use std::borrow::Cow;

/// A file's text without byte-order mark, and what was found out about its encoding.
pub(super) struct Text<'a> {
    pub text: Cow<'a, str>,
    pub note: Option<Note>,
}

/// Decodes a file; text that is cut off within a character or holds NUL is a fault.
pub(super) fn decode(bytes: &[u8]) -> Result<Text<'_>, Note> {
    if !bytes.starts_with(b"\xEF\xBB\xBF")
        && let Ok(text) = std::str::from_utf8(bytes)
    {
        return without_nul(Cow::Borrowed(text), None);
    }
    let (rest, encoding, note) = match bytes {
        [0xEF, 0xBB, 0xBF, rest @ ..] => (
            rest,
            UTF_8,
            ("encoding_utf8_bom", "UTF-8 with a byte-order mark"),
        ),
        [0xFF, 0xFE, rest @ ..] => (
            rest,
            UTF_16LE,
            ("encoding_utf16le", "UTF-16, little-endian"),
        ),
        [0xFE, 0xFF, rest @ ..] => (rest, UTF_16BE, ("encoding_utf16be", "UTF-16, big-endian")),
        _ => (
            bytes,
            WINDOWS_1252,
            ("encoding_windows_1252", "Windows-1252"),
        ),
    };
    let (text, malformed) = encoding.decode_without_bom_handling(rest);
    if malformed {
        return Err(Note::new(
            "encoding_broken",
            "the file begins like Unicode text but holds broken characters: it was cut off or damaged; export it again",
        ));
    }
    without_nul(text, Some(note))
}

fn without_nul<'a>(text: Cow<'a, str>, note: Option<(&str, &str)>) -> Result<Text<'a>, Note> {
    if text.as_bytes().contains(&0) {
        return Err(Note::new(
            "not_text",
            "the file holds NUL bytes, so it is no sweep as text: export it as CSV or Touchstone",
        ));
    }
    Ok(Text {
        text,
        note: note.map(|(code, name)| Note::new(code, format!("the file is encoded as {name}"))),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn code(bytes: &[u8]) -> (String, String) {
        match decode(bytes) {
            Ok(text) => (
                text.text.into_owned(),
                text.note.map_or(String::new(), |n| n.code),
            ),
            Err(note) => (String::new(), note.code),
        }
    }

    #[test]
    fn encodings_are_found_out() {
        let pair = |a: &str, b: &str| (a.to_owned(), b.to_owned());
        assert_eq!(code("µΩ".as_bytes()), pair("µΩ", ""));
        assert_eq!(code(b"\xEF\xBB\xBFf"), pair("f", "encoding_utf8_bom"));
        assert_eq!(code(b"\xFF\xFEf\0"), pair("f", "encoding_utf16le"));
        assert_eq!(code(b"\xFE\xFF\0f"), pair("f", "encoding_utf16be"));
        assert_eq!(code(b"\xB5F"), pair("µF", "encoding_windows_1252"));
        assert_eq!(code(b"\xFF\xFEf\0g"), pair("", "encoding_broken"));
        assert_eq!(code(b"f\0g\0"), pair("", "not_text"));
    }
}
