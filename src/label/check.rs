//! Whether a value holds what its identifier promises.

use super::date_code::{self, Dates};
use super::fields::Fields;
use super::{Label, identifier};
use crate::diagnostic::Note;
use std::collections::BTreeSet;

/// Looks every field over and makes the label.
pub(super) fn finish(mut fields: Fields, notes: Vec<Note>) -> Label {
    let list = fields.list;
    let mut notes = notes;
    notes.append(&mut fields.notes);
    note_unknown(&list, &mut notes);
    note_repeats(&list, &mut notes);
    let mut confirm = fields.confirm;
    for (id, value) in &list {
        check_quantity(id, value, &mut confirm);
        check_date(id, value, &mut notes, &mut confirm);
        check_characters(id, value, &mut confirm);
    }
    Label {
        fields: list,
        notes,
        confirm,
    }
}

fn note_unknown(list: &[(String, String)], notes: &mut Vec<Note>) {
    for (id, _) in list.iter().filter(|(id, _)| !identifier::known(id)) {
        notes.push(Note::new(
            "unknown_di",
            format!("the data identifier {id} is not known here; its field is kept"),
        ));
    }
}

fn note_repeats(list: &[(String, String)], notes: &mut Vec<Note>) {
    let mut seen = BTreeSet::new();
    let mut said = BTreeSet::new();
    let repeated = list.iter().map(|(id, _)| id.as_str());
    let names: Vec<&str> = repeated
        .filter(|id| !seen.insert(*id) && said.insert(*id))
        .collect();
    if !names.is_empty() {
        notes.push(Note::new(
            "repeated_di",
            format!("{} stand(s) on the label more than once", names.join(", ")),
        ));
    }
}

fn check_quantity(id: &str, value: &str, confirm: &mut Vec<Note>) {
    if !matches!(id, "Q" | "7Q") {
        return;
    }
    match pieces(id, value) {
        Some(0) => confirm.push(Note::new(
            "quantity_zero",
            "the label says a quantity of zero: count, or ask the supplier",
        )),
        Some(_) => {}
        None => confirm.push(Note::new(
            "quantity_not_numeric",
            format!("the quantity {value:?} is not a number of pieces: read the printed label"),
        )),
    }
}

fn check_date(id: &str, value: &str, notes: &mut Vec<Note>, confirm: &mut Vec<Note>) {
    match date_code::dates(id, value) {
        Dates::None | Dates::Clear => {}
        Dates::OnlyReading => notes.push(Note::new(
            "date_ambiguous",
            format!("{id} {value} fits two layouts, but is a date in one of them only"),
        )),
        Dates::Ambiguous => confirm.push(Note::new(
            "date_ambiguous",
            format!("{id} {value} is year and week, or year, month and day: ask the supplier"),
        )),
        Dates::Invalid => confirm.push(Note::new(
            "date_invalid",
            format!("{id} {value} is no date: read the printed label"),
        )),
    }
}

/// Labels of this kind hold ASCII; anything else smells of a keyboard layout that differs.
fn check_characters(id: &str, value: &str, confirm: &mut Vec<Note>) {
    if !value.is_ascii() {
        confirm.push(Note::new(
            "unexpected_character",
            format!(
                "{id} {value:?} holds characters that labels seldom hold: compare with the print"
            ),
        ));
    }
}

/// Pieces in a `Q` or `7Q` field; `None` where it holds no number of pieces.
///
/// `7Q` ends in a two-character unit of ANSI X12.3 data element 355; `PC` and `EA` are pieces.
pub(super) fn pieces(identifier: &str, value: &str) -> Option<u64> {
    let number = match identifier {
        "7Q" => value
            .strip_suffix("PC")
            .or_else(|| value.strip_suffix("EA"))?,
        _ => value,
    };
    let digits = !number.is_empty() && number.bytes().all(|b| b.is_ascii_digit());
    digits.then(|| number.parse().ok()).flatten()
}

/// Whether a value alone could be that of the identifier.
pub(super) fn fits(identifier: &str, value: &str) -> bool {
    match identifier {
        "Q" | "7Q" => pieces(identifier, value).is_some(),
        "9D" => value.bytes().take(4).filter(u8::is_ascii_digit).count() == 4,
        "10D" | "11D" | "12D" | "14D" | "16D" => value.bytes().all(|b| b.is_ascii_digit()),
        "4L" => value.len() == 2 && value.bytes().all(|b| b.is_ascii_uppercase()),
        _ => true,
    }
}
