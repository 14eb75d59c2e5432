//! Scalars: what serde_yaml takes them for, beside their text as it stands in the file.

use super::Shape;
use super::meaning::Meaning;

/// The shape of a scalar, or how the two readings differ.
pub fn shape(
    meaning: Meaning,
    text: String,
    plain: bool,
    absent: bool,
) -> Result<Shape, &'static str> {
    match meaning {
        Meaning::Null if absent || (plain && is_null(&text)) => Ok(Shape::Null),
        Meaning::Bool(value) if plain && text.eq_ignore_ascii_case(word(value)) => {
            Ok(Shape::Bool(text))
        }
        Meaning::Number(value) if plain && looks_like_number(&text) => {
            Ok(Shape::Number(text, value))
        }
        Meaning::Text(read) if read == text && !absent => Ok(Shape::Text {
            text,
            quoted: !plain,
        }),
        Meaning::Text(_) => Err("the text differs"),
        _ => Err("a value of another kind"),
    }
}

fn is_null(text: &str) -> bool {
    matches!(text, "null" | "Null" | "NULL" | "~")
}

fn word(value: bool) -> &'static str {
    if value { "true" } else { "false" }
}

fn looks_like_number(text: &str) -> bool {
    let digits = text.trim_start_matches(['+', '-']);
    digits.starts_with(|c: char| c.is_ascii_digit() || c == '.')
}

/// Whether a number stands as people write it, so that its text is its meaning: digits, perhaps
/// with one point and more digits, without sign, exponent or leading zeros.
pub fn is_plain_decimal(text: &str) -> bool {
    let (whole, fraction) = text.split_once('.').unwrap_or((text, "0"));
    let digits = |part: &str| !part.is_empty() && part.bytes().all(|b| b.is_ascii_digit());
    digits(whole) && digits(fraction) && (whole == "0" || !whole.starts_with('0'))
}

/// Whether a number is decimal at all (`-1.5`, `1e-3`), unlike `0x1F`, `0o17` or `.inf`.
pub fn is_decimal(text: &str) -> bool {
    let digits = text.trim_start_matches(['+', '-']);
    digits
        .bytes()
        .all(|b| b.is_ascii_digit() || matches!(b, b'.' | b'e' | b'E' | b'+' | b'-'))
        && digits.starts_with(|c: char| c.is_ascii_digit())
}

/// Whether other YAML readers take an unquoted text for something else: `no` for false, `010` for
/// eight, `1:30` for ninety, `1_000` for a thousand, `2026-10-05` for a day (YAML 1.1 types).
pub fn is_read_otherwise(text: &str) -> bool {
    let boolean = ["y", "n", "yes", "no", "on", "off", "true", "false"]
        .iter()
        .any(|word| text.eq_ignore_ascii_case(word));
    let made_of = |extra: &[char]| {
        text.starts_with(|c: char| c.is_ascii_digit())
            && text
                .chars()
                .all(|c| c.is_ascii_digit() || extra.contains(&c))
    };
    let zeros = text.len() > 1 && text.starts_with('0') && made_of(&[]);
    let day = text.split('-').count() == 3 && made_of(&['-']);
    boolean || zeros || day || (text.contains([':', '_']) && made_of(&[':', '_', '.']))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn decimals_as_people_write_them() {
        for text in ["3", "0.65", "4000", "3.10", "0"] {
            assert!(is_plain_decimal(text), "{text}");
        }
        for text in [
            "010", "1e3", ".5", "0x1F", "+1", "-1", "1.", "1_000", ".nan", "",
        ] {
            assert!(!is_plain_decimal(text), "{text}");
        }
    }

    #[test]
    fn texts_that_other_readers_take_for_something_else() {
        for text in [
            "no",
            "Y",
            "OFF",
            "010",
            "0238",
            "1:30",
            "1_000",
            "2026-10-05",
        ] {
            assert!(is_read_otherwise(text), "{text}");
        }
        for text in ["nope", "26K-0457", "2638", "0805-X7R", "4-2", "a_b", "12 V"] {
            assert!(!is_read_otherwise(text), "{text}");
        }
    }

    #[test]
    fn a_text_that_differs_is_refused() {
        let shape = shape(Meaning::Text("a".into()), "b".into(), true, false);
        assert_eq!(shape, Err("the text differs"));
    }
}
