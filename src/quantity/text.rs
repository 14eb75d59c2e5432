//! The many characters that mean the same, and quoting what was found.

/// Longest text that is read as a quantity; anything longer is not one.
pub(super) const LONGEST: usize = 120;

/// Trims, and maps look-alike characters onto one each: `µ` (U+00B5), `Ω` (U+03A9), `°`, ASCII
/// space and hyphen-minus. Zero-width characters and byte-order marks are dropped.
pub(super) fn clean(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for character in text.chars() {
        match character {
            '\u{3BC}' => out.push('\u{B5}'),
            '\u{2126}' => out.push('\u{3A9}'),
            '\u{BA}' | '\u{2DA}' => out.push('\u{B0}'),
            '\u{2103}' => out.push_str("\u{B0}C"),
            '\u{2109}' => out.push_str("\u{B0}F"),
            '\u{2010}'..='\u{2014}' | '\u{2212}' | '\u{FE63}' | '\u{FF0D}' => out.push('-'),
            '\u{200B}'..='\u{200D}' | '\u{2060}' | '\u{FEFF}' => {}
            other if other.is_whitespace() => out.push(' '),
            other => out.push(other),
        }
    }
    out.trim().to_string()
}

/// The text in backticks, control characters escaped, cut to 40 characters.
pub(super) fn quote(text: &str) -> String {
    let mut out = String::from("`");
    for (index, character) in text.trim().chars().enumerate() {
        if index == 40 {
            out.push('…');
            break;
        }
        if character.is_control() {
            out.extend(character.escape_default());
        } else {
            out.push(character);
        }
    }
    out.push('`');
    out
}

/// The text without its spaces.
pub(super) fn without_spaces(text: &str) -> String {
    text.chars().filter(|c| *c != ' ').collect()
}
