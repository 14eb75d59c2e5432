//! Fields: identifier and value, in label order.

use super::error::LabelError;
use super::{check, identifier};
use crate::diagnostic::Note;

/// Fields as split, and what is to be said about them.
pub(super) struct Fields {
    pub list: Vec<(String, String)>,
    pub notes: Vec<Note>,
    pub confirm: Vec<Note>,
}

impl Fields {
    fn new() -> Self {
        Fields {
            list: Vec::new(),
            notes: Vec::new(),
            confirm: Vec::new(),
        }
    }
}

/// The fields of a format 06 envelope.
pub(super) fn all(body: &str) -> Result<Fields, LabelError> {
    let mut fields = Fields::new();
    let mut empty = 0_usize;
    let inverted = case_inverted(body);
    for field in split(body) {
        let upper = inverted.then(|| upper_identifier(field));
        let Some((id, value)) = identifier::split(upper.as_deref().unwrap_or(field)) else {
            if field.is_empty() {
                empty += 1;
                continue;
            }
            return Err(not_a_field(field));
        };
        if value.is_empty() {
            empty += 1;
            continue;
        }
        fields.list.push((id.to_owned(), value.to_owned()));
    }
    if fields.list.is_empty() {
        return Err(LabelError::refused(
            "empty",
            "the label holds no field: scan the label",
        ));
    }
    if empty > 0 {
        fields.notes.push(Note::new(
            "empty_field",
            format!("{empty} empty field(s) were left out"),
        ));
    }
    if inverted {
        fields.confirm.push(Note::new(
            "case_inverted",
            "every data identifier arrived in lower case: switch Caps Lock off and scan again; \
             the case of the values is not known",
        ));
    }
    Ok(fields)
}

/// Fields without a header: every one must begin with a known identifier.
pub(super) fn bare(body: &str) -> Result<Fields, LabelError> {
    let fields = all(body)?;
    match fields.list.iter().find(|(id, _)| !identifier::known(id)) {
        None => Ok(fields),
        Some((id, value)) => Err(no_known_identifier(&format!("{id}{value}"))),
    }
}

/// The single field of a linear bar code.
pub(super) fn alone(text: &str) -> Result<Fields, LabelError> {
    match identifier::split(text) {
        Some((id, value))
            if identifier::stands_alone(id) && !value.is_empty() && check::fits(id, value) =>
        {
            let mut fields = Fields::new();
            fields.list.push((id.to_owned(), value.to_owned()));
            Ok(fields)
        }
        _ => Err(no_known_identifier(text)),
    }
}

fn split(body: &str) -> impl Iterator<Item = &str> {
    body.split(super::separators::GS)
}

/// Caps Lock on the host: every field begins with an identifier in lower case.
fn case_inverted(body: &str) -> bool {
    let mut any = false;
    for field in split(body).filter(|field| !field.is_empty()) {
        let upper = upper_identifier(field);
        if upper == field || identifier::split(&upper).is_none() {
            return false;
        }
        any = true;
    }
    any
}

/// The field with its first letter in upper case.
fn upper_identifier(field: &str) -> String {
    let mut done = false;
    field
        .chars()
        .map(|c| {
            if done || c.is_ascii_digit() {
                return c;
            }
            done = true;
            c.to_ascii_uppercase()
        })
        .collect()
}

fn not_a_field(field: &str) -> LabelError {
    LabelError::refused(
        "not_an_identifier",
        format!(
            "the field {:?} does not begin with a data identifier (none to three digits and a \
             capital letter): scan again, or type the values in",
            excerpt(field)
        ),
    )
}

fn no_known_identifier(text: &str) -> LabelError {
    LabelError::ask(
        "no_known_di",
        format!(
            "{:?} does not begin with a data identifier that can be relied on: say which field it \
             is (part, lot, quantity …)",
            excerpt(text)
        ),
    )
}

fn excerpt(text: &str) -> String {
    text.chars().take(40).collect()
}
