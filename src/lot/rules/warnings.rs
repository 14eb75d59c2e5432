//! What lot rules say though it decides nothing.

use super::mixed::MixedSection;
use crate::diagnostic::Note;

/// The mixture describes the lot better, and the test for a single peak is not significant.
pub(super) fn mixed_possible(found: &MixedSection, words: &str) -> Note {
    Note::new(
        "mixed_possible",
        format!(
            "{}: two populations describe the lot better than one, and a single peak cannot be ruled out (dip p {:.3}): {words}",
            found.of,
            found.dip_p_value.unwrap_or(1.0)
        ),
    )
}

/// A rule compares with the lots before, and there are too few.
pub(super) fn no_history(key: &str, found: usize, needed: usize) -> Note {
    let lots = match found {
        0 => "no accepted lots of this part and supplier".to_owned(),
        1 => "one accepted lot of this part and supplier".to_owned(),
        many => format!("{many} accepted lots of this part and supplier"),
    };
    Note::new(
        "no_history",
        format!("{key}: {lots} before this one, {needed} are needed to compare it with"),
    )
}

/// Capacitance and ESR of the whole lot are scaled by one factor.
pub(super) fn impedance_scaled(text: String) -> Note {
    Note::new("impedance_scaled", text)
}

/// The ESL of the whole lot has shifted.
pub(super) fn esl_shifted(text: String) -> Note {
    Note::new("esl_shifted", text)
}

/// A rule that warns.
pub(super) fn lot_unlike_previous(text: String) -> Note {
    Note::new("lot_unlike_previous", text)
}
