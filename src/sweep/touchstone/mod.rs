//! Touchstone files, versions 1.0, 1.1 and 2.0.
//!
//! Source: Touchstone File Format Specification, version 1.1 (2002) and version 2.0 (2009, IBIS
//! Open Forum); several port impedances on the option line as version 2.1 has them. Network
//! data only; noise data are passed over, as are information blocks. Mixed-mode data and hybrid
//! parameters (H, G) are refused.

mod data;
mod keywords;
mod options;
mod tokens;

use super::Network;
use super::cut;
use crate::diagnostic::Note;

/// What was read, with the line each point begins in.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Located {
    pub network: Network,
    pub lines: Vec<u32>,
}

/// Reads a Touchstone file. `ports` is what the file's extension says (`.s2p`); without it, the
/// file's own statement or the length of its first data line decides.
///
/// # Errors
/// Everything that would have to be guessed: broken numbers, rows that are not whole, a missing
/// `[End]`, a number of points other than announced. At least one note.
pub fn read(bytes: &[u8], ports: Option<usize>) -> Result<Network, Vec<Note>> {
    read_located(bytes, ports).map(|located| located.network)
}

pub(super) fn read_located(bytes: &[u8], ports: Option<usize>) -> Result<Located, Vec<Note>> {
    let one = |note: Note| vec![note];
    if bytes.contains(&0) {
        return Err(one(Note::new(
            "not_text",
            "the file holds NUL bytes; Touchstone files are plain ASCII text: export it again",
        )));
    }
    let text = bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(bytes);
    if text.trim_ascii().is_empty() {
        return Err(one(Note::new(
            "file_empty",
            "the file is empty: measure or export the part again",
        )));
    }
    let header = keywords::read(text, ports).map_err(one)?;
    if header.version_one() && cut::ends_mid_number(text, |b| b == b' ' || b == b'\t') {
        return Err(one(Note::new(
            "truncated_line",
            "the file ends in the middle of a number: it was cut off; copy or export it again",
        )));
    }
    data::read(text, &header)
}
