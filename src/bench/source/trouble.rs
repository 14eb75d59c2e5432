//! What went wrong at a source, for the operator.

use std::fmt;

/// What went wrong and what to do about it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Trouble {
    /// Stable, lower case with underscores.
    pub code: &'static str,
    /// What happened, one sentence without its full stop.
    pub text: String,
    /// What to do, one sentence without its full stop.
    pub remedy: String,
}

impl Trouble {
    /// A trouble with its remedy.
    pub fn new(code: &'static str, text: impl Into<String>, remedy: impl Into<String>) -> Self {
        Trouble {
            code,
            text: text.into(),
            remedy: remedy.into(),
        }
    }
}

impl fmt::Display for Trouble {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: {}", self.text, self.remedy)
    }
}

impl std::error::Error for Trouble {}
