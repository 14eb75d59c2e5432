//! Free text as characters, for finding values and codes in it.

use super::text::clean;

/// Characters read; a longer text is not a part number or a description.
const READ: usize = 1000;

/// The characters of the text, cleaned, with dielectric codes of EIA-198 (`X7R`) blanked: their
/// digit and letter would be taken for part of a value.
pub(super) fn readable(text: &str) -> Vec<char> {
    let text: String = text.chars().take(READ).collect();
    let mut characters: Vec<char> = clean(&text).chars().collect();
    for at in 0..characters.len() {
        if let Some([low, digit, high]) = characters.get(at..at + 3) {
            let class_2 = "XYZ".contains(*low) && "2456789".contains(*digit);
            if class_2 && "ABCDEFLPRSTUV".contains(*high) {
                characters
                    .iter_mut()
                    .skip(at)
                    .take(3)
                    .for_each(|c| *c = ' ');
            }
        }
    }
    characters
}

pub(super) fn digits_at(characters: &[char], at: usize) -> usize {
    let rest = characters.iter().skip(at);
    rest.take_while(|c| c.is_ascii_digit()).count()
}

pub(super) fn before(characters: &[char], at: usize) -> Option<char> {
    at.checked_sub(1).and_then(|i| characters.get(i)).copied()
}

/// Whether nothing before `at` belongs to what begins there: no letter or digit, no decimal mark.
pub(super) fn starts_word(characters: &[char], at: usize) -> bool {
    match before(characters, at) {
        Some('.' | ',') => !before(characters, at - 1).is_some_and(|c| c.is_ascii_digit()),
        Some(other) => !other.is_alphanumeric(),
        None => true,
    }
}
