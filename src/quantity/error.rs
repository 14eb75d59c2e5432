//! Why a text is not the quantity that was expected.

use super::Dimension;
use super::text::quote;
use std::fmt;

/// Why a text is not the quantity that was expected.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct QuantityError {
    /// What was found, in words: "`1 µF` is a capacitance".
    pub found: String,
    /// What was expected, in words: "a frequency such as `1 kHz`".
    pub expected: String,
    /// What to do, where there is something better to say than the two above.
    pub hint: Option<String>,
}

impl QuantityError {
    /// `text` followed by what is wrong with it, where a value of `dimension` was expected.
    pub(super) fn new(text: &str, fault: &str, dimension: Dimension) -> Self {
        let expected = format!("{} such as `{}`", dimension.a_noun(), dimension.example());
        Self::expecting(text, fault, expected)
    }

    pub(super) fn expecting(text: &str, fault: &str, expected: String) -> Self {
        let found = if text.trim().is_empty() {
            "nothing".to_string()
        } else {
            format!("{} {fault}", quote(text))
        };
        Self {
            found,
            expected,
            hint: None,
        }
    }

    pub(super) fn hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into());
        self
    }
}

impl fmt::Display for QuantityError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}; expected {}", self.found, self.expected)?;
        match &self.hint {
            Some(hint) => write!(f, " ({hint})"),
            None => Ok(()),
        }
    }
}

impl std::error::Error for QuantityError {}
