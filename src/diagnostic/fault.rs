//! Faults of one file, each with its place, what was found, what was expected and what to do.

use serde::Serialize;
use std::fmt;

/// At most this many faults of one file are kept; the rest are counted.
const MAX_FAULTS: usize = 100;

/// The faulty line as it is shown, with the place that the caret marks.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Quote {
    /// The line, or a window of a very long one.
    pub text: String,
    /// First marked character of `text`, counted from 0.
    pub from: usize,
    /// One past the last marked character.
    pub to: usize,
}

/// One thing that is wrong in a file.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Fault {
    /// Stable, lower case with underscores; programs may rely on it.
    pub code: &'static str,
    /// The file as the caller named it.
    pub path: String,
    /// Counted from 1; 0 where the fault is of the file as a whole.
    pub line: usize,
    /// In characters, counted from 1; 0 where the fault is of the file as a whole.
    pub column: usize,
    /// The line with the place marked, where there is a line.
    pub quote: Option<Quote>,
    /// What was found, in words.
    pub found: String,
    /// What was expected, in words.
    pub expected: String,
    /// What to do.
    pub hint: Option<String>,
}

/// Every fault of one file, in the order of the file; at least one.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Faults {
    faults: Vec<Fault>,
    more: usize,
}

impl Faults {
    /// Faults in the order of the file; `None` where there are none.
    pub fn new(mut faults: Vec<Fault>) -> Option<Self> {
        if faults.is_empty() {
            return None;
        }
        faults.sort_by_key(|fault| (fault.line, fault.column));
        faults.dedup();
        let more = faults.len().saturating_sub(MAX_FAULTS);
        faults.truncate(MAX_FAULTS);
        Some(Faults { faults, more })
    }

    /// One fault of a file as a whole: it cannot be opened, has no known kind …
    pub fn of_file(
        path: &str,
        code: &'static str,
        found: impl Into<String>,
        expected: impl Into<String>,
        hint: Option<String>,
    ) -> Self {
        Faults {
            faults: vec![Fault {
                code,
                path: path.to_owned(),
                line: 0,
                column: 0,
                quote: None,
                found: found.into(),
                expected: expected.into(),
                hint,
            }],
            more: 0,
        }
    }

    /// The faults kept, in the order of the file.
    pub fn iter(&self) -> std::slice::Iter<'_, Fault> {
        self.faults.iter()
    }

    /// The faults for a terminal, styled with ANSI sequences, which an output stream strips where
    /// there is no terminal. `to_string()` has them plain.
    pub fn render(&self) -> String {
        super::render(self, true)
    }

    /// How many further faults were found and not kept.
    pub fn more(&self) -> usize {
        self.more
    }

    /// How many faults were found altogether.
    pub fn count(&self) -> usize {
        self.faults.len().saturating_add(self.more)
    }
}

impl<'a> IntoIterator for &'a Faults {
    type Item = &'a Fault;
    type IntoIter = std::slice::Iter<'a, Fault>;

    fn into_iter(self) -> Self::IntoIter {
        self.iter()
    }
}

impl fmt::Display for Faults {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&super::render(self, false))
    }
}

impl std::error::Error for Faults {}
