//! What a scanner types, and the identity of the lot it stands for.
//!
//! A goods label carries an ISO/IEC 15434 message, format 06, whose fields begin with ANSI MH10.8.2
//! data identifiers (`1P` part number of the supplier, `Q` quantity, `1T` lot …), or linear bar
//! codes with one such field each. Scanners that act as a keyboard drop, rewrite or translate the
//! separators (RS, GS, EOT). What can be put right without a choice is put right and noted; where
//! two readings are possible, [`read`] refuses and says what to do.
//!
//! ```
//! let label = reelgate::label::read("[)>{RS}06{GS}PRG-0475-X7R{GS}Q4000{GS}1T26K-0457{RS}{EOT}")?;
//! assert_eq!(label.lot().one(), Some("26K-0457"));
//! assert_eq!(label.quantity().one(), Some(4000));
//! # Ok::<(), reelgate::label::LabelError>(())
//! ```

mod check;
mod compare;
mod date_code;
mod error;
mod fields;
mod identifier;
mod message;
mod separators;

pub use compare::{Expected, Mismatch, compare};
pub use date_code::{Week, weeks};
pub use error::{ErrorKind, LabelError};

use crate::diagnostic::Note;

/// The longest text that is taken for a label, in bytes: several times what the largest QR code
/// holds (4,296 alphanumeric characters, ISO/IEC 18004), because escapes lengthen a scan.
pub const MAX_BYTES: usize = 16 * 1024;

/// A label as read: its fields in their order on the label, repeats kept.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Label {
    /// Data identifier and value, `("1T", "26K-0457")`; empty fields are left out.
    pub fields: Vec<(String, String)>,
    /// What was put right or is worth knowing; decides nothing.
    pub notes: Vec<Note>,
    /// What a person has to confirm before the label may be relied on.
    pub confirm: Vec<Note>,
}

/// What a label says on one point.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Found<T> {
    /// The label has no such field.
    Absent,
    /// One value, or the same value several times.
    One(T),
    /// Several different values, in label order (a reel spliced from two lots).
    Several(Vec<T>),
    /// A field that does not hold what its identifier promises; its text.
    Unreadable(String),
}

impl<T> Found<T> {
    /// The value where there is exactly one.
    pub fn one(self) -> Option<T> {
        match self {
            Found::One(value) => Some(value),
            _ => None,
        }
    }
}

impl Label {
    /// The values of one identifier, in label order.
    pub fn values<'a>(&'a self, identifier: &'a str) -> impl Iterator<Item = &'a str> {
        self.fields
            .iter()
            .filter(move |(id, _)| id == identifier)
            .map(|(_, value)| value.as_str())
    }

    /// Part number: the customer's (`P`), or where there is none the supplier's (`1P`).
    pub fn part(&self) -> Found<&str> {
        self.first_of(&["P", "1P"])
    }

    /// Lot number: the supplier's (`1T`), or where there is none the customer's (`T`).
    pub fn lot(&self) -> Found<&str> {
        self.first_of(&["1T", "T"])
    }

    /// Date code: `10D` (year and week), `11D`, or where there is none `9D` (agreed structure).
    pub fn date_code(&self) -> Found<&str> {
        self.first_of(&["10D", "11D", "9D"])
    }

    /// Supplier: the code given by the customer (`V`), or where there is none the supplier's own (`1V`).
    pub fn supplier(&self) -> Found<&str> {
        self.first_of(&["V", "1V"])
    }

    /// The customer's purchase order (`K`).
    pub fn order(&self) -> Found<&str> {
        self.first_of(&["K"])
    }

    /// Pieces: `Q`, or where there is none `7Q` in pieces or each.
    pub fn quantity(&self) -> Found<u64> {
        let found = match self.first_of(&["Q"]) {
            Found::Absent => self.first_of(&["7Q"]),
            found => found,
        };
        let identifier = if self.values("Q").next().is_some() {
            "Q"
        } else {
            "7Q"
        };
        let pieces = |text: &str| check::pieces(identifier, text);
        match found {
            Found::Absent => Found::Absent,
            Found::One(text) => match pieces(text) {
                Some(n) => Found::One(n),
                None => Found::Unreadable(text.to_owned()),
            },
            Found::Several(texts) => match texts.iter().map(|t| pieces(t)).collect() {
                Some(values) => Found::Several(values),
                None => Found::Unreadable(texts.join(", ")),
            },
            Found::Unreadable(text) => Found::Unreadable(text),
        }
    }

    fn first_of(&self, identifiers: &[&str]) -> Found<&str> {
        for identifier in identifiers {
            let mut different: Vec<&str> = Vec::new();
            for (_, value) in self.fields.iter().filter(|(id, _)| id == identifier) {
                if !different.contains(&value.as_str()) {
                    different.push(value);
                }
            }
            match different.as_slice() {
                [] => {}
                [one] => return Found::One(one),
                _ => return Found::Several(different),
            }
        }
        Found::Absent
    }
}

/// Reads what a scanner typed: a message with its envelope, one without (a Macro 06 symbol that was
/// not expanded), or a single field of a linear bar code.
///
/// # Errors
/// [`ErrorKind::Refused`] where the text cannot be split into fields without a guess, and
/// [`ErrorKind::Ask`] where a single field does not say which field it is.
pub fn read(text: &str) -> Result<Label, LabelError> {
    if text.len() > MAX_BYTES {
        return Err(LabelError::refused(
            "too_long",
            format!(
                "the scan has {} bytes, more than any symbol holds: scan one label",
                text.len()
            ),
        ));
    }
    let scan = separators::normalise(text)?;
    message::read(&scan)
}

/// The message of ISO/IEC 15434 format 06 with these fields.
pub fn write<I: AsRef<str>, V: AsRef<str>>(fields: &[(I, V)]) -> String {
    let body: Vec<String> = fields
        .iter()
        .map(|(id, value)| format!("{}{}", id.as_ref(), value.as_ref()))
        .collect();
    format!(
        "{}{RS}06{GS}{}{RS}{EOT}",
        separators::HEADER,
        body.join("\u{1d}"),
        RS = separators::RS,
        GS = separators::GS,
        EOT = separators::EOT
    )
}
