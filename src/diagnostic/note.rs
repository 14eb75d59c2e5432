//! Coded sentences that travel with values and verdicts.

use serde::{Deserialize, Serialize};

/// A finding with a stable code and a sentence that an operator can act on: a reason of a
/// verdict, a fault of a part, a warning beside a value.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Note {
    /// Stable, lower case with underscores; programs may rely on it.
    pub code: String,
    /// One sentence for people: what was found and what to do.
    pub text: String,
}

impl Note {
    /// A note from its code and sentence.
    pub fn new(code: &str, text: impl Into<String>) -> Self {
        Note {
            code: code.to_owned(),
            text: text.into(),
        }
    }
}
