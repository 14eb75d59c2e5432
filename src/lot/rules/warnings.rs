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
