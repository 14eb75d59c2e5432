//! The witness file: checkpoints one after the other, on another machine or share.
//!
//! Whoever rewrites the ledger would have to rewrite the witness file too. It only ever grows; each
//! note is followed by an empty line.

use super::error::LedgerError;
use std::fs::OpenOptions;
use std::io::{ErrorKind, Write};
use std::path::Path;

/// Appends a checkpoint and waits until it is on the medium.
///
/// # Errors
/// What the file system says; the ledger's entry stands all the same.
pub fn append(path: &Path, checkpoint: &str) -> Result<(), LedgerError> {
    let at = |doing| move |e| LedgerError::io(doing, path, e);
    let mut file = OpenOptions::new()
        .create(true)
        .append(true)
        .open(path)
        .map_err(at("opening the witness file"))?;
    file.write_all(format!("{checkpoint}\n").as_bytes())
        .map_err(at("writing the witness file"))?;
    file.sync_all().map_err(at("syncing the witness file"))
}

/// The checkpoints of a witness file, oldest first; none where there is no file.
///
/// # Errors
/// A file that cannot be read, or that is not such a file.
pub fn read(path: &Path) -> Result<Vec<String>, LedgerError> {
    match std::fs::read_to_string(path) {
        Ok(text) => split(&text).ok_or_else(|| {
            let what = format!("witness file {}", path.display());
            LedgerError::damaged(what, "not a row of signed checkpoints")
        }),
        Err(error) if error.kind() == ErrorKind::NotFound => Ok(Vec::new()),
        Err(error) => Err(LedgerError::io("reading the witness file", path, error)),
    }
}

/// Text block, signature block, text block …, with empty lines between.
fn split(text: &str) -> Option<Vec<String>> {
    let blocks: Vec<&str> = text
        .split("\n\n")
        .map(|block| block.trim_matches('\n'))
        .filter(|block| !block.is_empty())
        .collect();
    let (pairs, rest) = blocks.as_chunks::<2>();
    let notes = pairs
        .iter()
        .map(|[text, lines]| format!("{text}\n\n{lines}\n"));
    rest.is_empty().then(|| notes.collect())
}
