//! The text of one file, checked for what no reader of it should meet, with its lines.

use super::printable::is_hidden;
use super::{Fault, Faults, Quote};
use std::ops::Range;

/// Largest file that is read as a limit, station or lot file, in bytes. The longest sensible one
/// has a few kilobytes; the time that two YAML readers take grows faster than the file.
pub const MAX_BYTES: usize = 64 * 1024;

/// A place within one line.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Span {
    /// Counted from 1.
    pub line: usize,
    /// In characters, counted from 1.
    pub column: usize,
    /// Marked characters; 0 marks the place between two characters.
    pub length: usize,
}

/// The text of one file.
#[derive(Debug, Clone)]
pub struct Source {
    path: String,
    text: String,
    /// Byte ranges of the lines without their ends.
    lines: Vec<Range<usize>>,
    hygiene: Vec<Fault>,
}

impl Source {
    /// Takes the bytes of a file as UTF-8 with or without byte-order mark.
    ///
    /// Errors that leave nothing to read come back at once: too large, not UTF-8, control
    /// characters, tabs in the indentation. Others are kept in [`Source::hygiene`].
    pub fn new(path: &str, bytes: &[u8]) -> Result<Self, Faults> {
        if bytes.len() > MAX_BYTES {
            return Err(Faults::of_file(
                path,
                "file_too_large",
                format!("the file has {} bytes", bytes.len()),
                format!("at most {MAX_BYTES} bytes"),
                Some("check that this is the file you meant".to_owned()),
            ));
        }
        let bytes = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes);
        let text =
            std::str::from_utf8(bytes).map_err(|e| not_utf8(path, bytes, e.valid_up_to()))?;
        let mut source = Source {
            path: path.to_owned(),
            text: text.to_owned(),
            lines: lines_of(text),
            hygiene: Vec::new(),
        };
        let (fatal, mendable) = source.forbidden();
        if fatal.is_empty() {
            source.hygiene = mendable;
            source.text = source.text.replace('\t', " ");
            return Ok(source);
        }
        let all = fatal.into_iter().chain(mendable).collect();
        Faults::new(all).map_or(Ok(source), Err)
    }

    /// The file as the caller named it.
    pub fn path(&self) -> &str {
        &self.path
    }

    /// The text without byte-order mark.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// Faults of the text that did not keep it from being read further.
    pub fn hygiene(&self) -> &[Fault] {
        &self.hygiene
    }

    /// A line without its end, counted from 1; empty where there is none.
    pub fn line(&self, line: usize) -> &str {
        let range = self.lines.get(line.saturating_sub(1)).cloned();
        range.and_then(|r| self.text.get(r)).unwrap_or("")
    }

    /// A fault at a place of this file.
    pub fn fault(
        &self,
        span: Span,
        code: &'static str,
        found: impl Into<String>,
        expected: impl Into<String>,
        hint: Option<String>,
    ) -> Fault {
        Fault {
            code,
            path: self.path.clone(),
            line: span.line,
            column: span.column,
            quote: Some(quote(self.line(span.line), span)),
            found: found.into(),
            expected: expected.into(),
            hint,
        }
    }

    /// Characters that have no place in such a file: those that stop the reading, and tabs
    /// outside of the indentation, which do not.
    fn forbidden(&self) -> (Vec<Fault>, Vec<Fault>) {
        let (mut fatal, mut mendable) = (Vec::new(), Vec::new());
        for index in 0..self.lines.len() {
            let line = self.line(index + 1);
            let Some((column, c)) = line
                .chars()
                .enumerate()
                .find(|&(_, c)| c == '\t' || is_hidden(c))
            else {
                continue;
            };
            let span = Span {
                line: index + 1,
                column: column + 1,
                length: 1,
            };
            let indentation = line.chars().take(column).all(|c| c == ' ');
            if c == '\t' {
                let fault = self.tab(span);
                let list = if indentation {
                    &mut fatal
                } else {
                    &mut mendable
                };
                list.push(fault);
            } else {
                fatal.push(self.hidden(span, c));
            }
        }
        (fatal, mendable)
    }

    fn tab(&self, span: Span) -> Fault {
        self.fault(
            span,
            "tab",
            "a tab",
            "spaces: YAML does not allow tabs for indentation",
            Some("replace each tab by two spaces".to_owned()),
        )
    }

    fn hidden(&self, span: Span, c: char) -> Fault {
        self.fault(
            span,
            "hidden_character",
            format!("the invisible character {}", c.escape_unicode()),
            "text that can be seen",
            Some(if c == '\0' {
                "save the file as UTF-8 text".to_owned()
            } else {
                format!(
                    "delete it, or write it as \"{}\" in double quotes",
                    yaml_escape(c)
                )
            }),
        )
    }
}

fn lines_of(text: &str) -> Vec<Range<usize>> {
    let mut start = 0;
    let mut lines = Vec::new();
    for line in text.split('\n') {
        let length = line.strip_suffix('\r').unwrap_or(line).len();
        lines.push(start..start + length);
        start += line.len() + 1;
    }
    lines
}

/// The escape by which a double-quoted YAML scalar holds a character.
fn yaml_escape(c: char) -> String {
    let code = u32::from(c);
    match code {
        0..=0xff => format!("\\x{code:02x}"),
        0x100..=0xffff => format!("\\u{code:04x}"),
        _ => format!("\\U{code:08x}"),
    }
}

fn not_utf8(path: &str, bytes: &[u8], valid: usize) -> Faults {
    let before = bytes.get(..valid).unwrap_or_default();
    let line = before.iter().filter(|&&b| b == b'\n').count() + 1;
    let start = before
        .iter()
        .rposition(|&b| b == b'\n')
        .map_or(0, |i| i + 1);
    let shown = String::from_utf8_lossy(before.get(start..).unwrap_or_default()).into_owned();
    let column = shown.chars().count() + 1;
    let byte = bytes.get(valid).copied().unwrap_or_default();
    let utf16 = bytes.starts_with(b"\xff\xfe") || bytes.starts_with(b"\xfe\xff");
    let span = Span {
        line,
        column,
        length: 1,
    };
    let fault = Fault {
        code: "not_utf8",
        path: path.to_owned(),
        line,
        column,
        quote: Some(quote(&format!("{shown}\u{fffd}"), span)),
        found: format!("byte {} (0x{byte:02X}) is not UTF-8", valid + 1),
        expected: "text encoded as UTF-8".to_owned(),
        hint: Some(if utf16 {
            "the file is UTF-16: save it again as UTF-8".to_owned()
        } else {
            "save the file again with the encoding UTF-8".to_owned()
        }),
    };
    Faults::new(vec![fault]).unwrap_or_else(|| {
        Faults::of_file(path, "not_utf8", "bytes that are not UTF-8", "UTF-8", None)
    })
}

/// The line, or a window of it around the place where it is very long.
fn quote(line: &str, span: Span) -> Quote {
    const BEFORE: usize = 80;
    const AFTER: usize = 160;
    let place = span.column.saturating_sub(1);
    let length = line.chars().count();
    if length <= BEFORE + AFTER {
        let from = place.min(length);
        return Quote {
            text: line.to_owned(),
            from,
            to: from.saturating_add(span.length).min(length).max(from),
        };
    }
    let skip = place.saturating_sub(BEFORE).min(length);
    let head = if skip > 0 { "…" } else { "" };
    let text: String = line.chars().skip(skip).take(BEFORE + AFTER).collect();
    let shown = text.chars().count() + head.chars().count();
    let from = (place.min(length) - skip + head.chars().count()).min(shown);
    let tail = if skip + BEFORE + AFTER < length {
        "…"
    } else {
        ""
    };
    Quote {
        text: format!("{head}{text}{tail}"),
        from,
        to: from.saturating_add(span.length).min(shown).max(from),
    }
}
