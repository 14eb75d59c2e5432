//! Envelopes: ISO/IEC 15434 messages, their formats, and what arrives without an envelope.

use super::error::LabelError;
use super::fields::{self, Fields};
use super::separators::{EOT, GS, HEADER, MISSING, RS, Scan};
use super::{Label, check};
use crate::diagnostic::Note;

/// Reads the one label in a scan.
pub(super) fn read(scan: &Scan) -> Result<Label, LabelError> {
    let text = scan.text.as_str();
    if !text.contains([GS, RS, EOT]) && !text.contains(HEADER) {
        return alone(text, scan.notes.clone());
    }
    let mut messages = Messages::split(text).into_iter();
    let Some(first) = messages.next() else {
        return Err(LabelError::refused(
            "empty",
            "the scan holds no field: scan the label",
        ));
    };
    let mut notes = scan.notes.clone();
    let fields = first.read(&mut notes)?;
    for other in messages {
        if other.read(&mut Vec::new())?.list != fields.list {
            return Err(LabelError::refused(
                "two_labels",
                "the scan holds two labels that differ: scan one label at a time",
            ));
        }
        notes.push(Note::new(
            "second_message_ignored",
            "the label arrived twice, the same both times",
        ));
    }
    Ok(check::finish(fields, notes))
}

/// A linear bar code: one field, its identifier first.
fn alone(text: &str, notes: Vec<Note>) -> Result<Label, LabelError> {
    // Code 39 start and stop characters, printed through by some scanners.
    let inner = text
        .strip_prefix('*')
        .and_then(|t| t.strip_suffix('*'))
        .unwrap_or(text);
    fields::alone(inner).map(|fields| check::finish(fields, notes))
}

/// One message of a scan.
struct Message<'a> {
    /// After the header, before the trailer.
    body: &'a str,
    header: Header,
    /// Whether it ended in EOT.
    ended: bool,
}

#[derive(Clone, Copy, PartialEq)]
enum Header {
    Standard,
    /// A `>` before it.
    Nonstandard,
    Missing,
}

struct Messages;

impl Messages {
    fn split(text: &str) -> Vec<Message<'_>> {
        let mut out = Vec::new();
        for piece in text.split_inclusive(EOT) {
            let ended = piece.ends_with(EOT);
            let piece = piece.trim_matches([EOT, '\r', '\n']);
            Self::split_piece(piece, ended, &mut out);
        }
        out
    }

    /// Without trailers a second message begins at its header.
    fn split_piece<'a>(piece: &'a str, ended: bool, out: &mut Vec<Message<'a>>) {
        let mut header = Header::Missing;
        let mut parts = piece.split(HEADER).peekable();
        while let Some(part) = parts.next() {
            let last = parts.peek().is_none();
            let (body, arrow) = match part.strip_suffix('>') {
                Some(body) if !last => (body, true),
                _ => (part, false),
            };
            if !body.is_empty() || header != Header::Missing {
                out.push(Message {
                    body,
                    header,
                    ended: ended && last,
                });
            }
            header = if arrow {
                Header::Nonstandard
            } else {
                Header::Standard
            };
        }
    }
}

impl Message<'_> {
    fn read(&self, notes: &mut Vec<Note>) -> Result<Fields, LabelError> {
        let fields = match self.header {
            Header::Missing => {
                notes.push(Note::new(
                    "header_missing",
                    "the message header did not arrive; every field begins with a data identifier",
                ));
                let body = self.body.trim_end_matches(RS);
                if body.contains(RS) {
                    return Err(LabelError::refused(
                        "control_character",
                        "a record separator stands among the fields, and no header that says \
                         which of them belong together: scan again",
                    ));
                }
                fields::bare(body)?
            }
            header => self.enveloped(header, notes)?,
        };
        if !self.ended {
            notes.push(Note::new(
                "trailer_missing",
                "the message trailer did not arrive, so nothing proves that the last field is whole",
            ));
        }
        Ok(fields)
    }

    fn enveloped(&self, header: Header, notes: &mut Vec<Note>) -> Result<Fields, LabelError> {
        let (body, standard) = match self.body.strip_prefix(RS) {
            Some(body) => (body, header == Header::Standard),
            None => (self.body, false),
        };
        if !standard {
            notes.push(Note::new(
                "header_nonstandard",
                "the message header is not that of ISO/IEC 15434, but can be taken for nothing else",
            ));
        }
        let (mut found, mut others) = (Vec::new(), Vec::new());
        for format in body.split(RS).filter(|format| !format.is_empty()) {
            match format.strip_prefix("06") {
                Some(fields) => match fields.strip_prefix(GS) {
                    Some(fields) => found.push(fields),
                    None => return Err(LabelError::refused("separators_missing", MISSING)),
                },
                None => others.push(format.chars().take(2).collect::<String>()),
            }
        }
        if found.is_empty() {
            return Err(not_format_06(&others));
        }
        if !others.is_empty() {
            notes.push(Note::new(
                "other_format_ignored",
                format!("the message also holds format {others:?}, which is not used"),
            ));
        }
        fields::all(&found.join("\u{1d}"))
    }
}

fn not_format_06(others: &[String]) -> LabelError {
    let numbered =
        |format: &String| format.len() == 2 && format.bytes().all(|b| b.is_ascii_digit());
    if !others.iter().all(numbered) {
        return LabelError::refused("separators_missing", MISSING);
    }
    LabelError::refused(
        "format_not_06",
        format!(
            "the message holds format {others:?} and no format 06 (data identifiers): scan the \
             code whose fields begin with 1P, Q, 1T"
        ),
    )
}
