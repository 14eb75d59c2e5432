//! Why a scan is not a label.

use crate::diagnostic::Note;
use std::fmt;

/// What the person at the bench is to do.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ErrorKind {
    /// The scan cannot be used: put its cause right and scan again, or type the values in.
    Refused,
    /// The scan is whole, but does not say which field it is: ask.
    Ask,
}

/// A scan that was not taken for a label, with every reason found.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct LabelError {
    pub kind: ErrorKind,
    /// At least one.
    pub notes: Vec<Note>,
}

impl LabelError {
    pub(super) fn refused(code: &str, text: impl Into<String>) -> Self {
        LabelError {
            kind: ErrorKind::Refused,
            notes: vec![Note::new(code, text)],
        }
    }

    pub(super) fn ask(code: &str, text: impl Into<String>) -> Self {
        LabelError {
            kind: ErrorKind::Ask,
            notes: vec![Note::new(code, text)],
        }
    }

    pub(super) fn and(mut self, code: &str, text: impl Into<String>) -> Self {
        self.notes.push(Note::new(code, text));
        self
    }
}

impl fmt::Display for LabelError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for (k, note) in self.notes.iter().enumerate() {
            let gap = if k > 0 { "; " } else { "" };
            write!(f, "{gap}{}", note.text)?;
        }
        Ok(())
    }
}

impl std::error::Error for LabelError {}
