//! The capacitance as code and description state it, against the bounds.

use super::Bound;
use crate::diagnostic::excerpt;
use crate::diagnostic::yaml::{Fields, Node, Reader};
use crate::quantity::{self, Dimension, engineering};
use crate::readings::Characteristic;

/// Faults where `code`, or every capacitance in `description`, contradicts the bounds.
pub fn check(reader: &mut Reader<'_>, fields: &Fields<'_>, bounds: &[Bound]) {
    let bound = bounds
        .iter()
        .find(|b| b.characteristic == Characteristic::Capacitance);
    let code = fields.get("code").and_then(|node| {
        let text = reader.line(node, "`code`: a capacitance code")?;
        let farad = capacitance_code(&text);
        if farad.is_none() {
            bad_code(reader, node, &text);
        }
        farad.map(|farad| (node, text, farad))
    });
    let description = fields.get("description");
    let stated = description.map_or_else(Vec::new, |node| match &node.shape {
        crate::diagnostic::yaml::Shape::Text { text, .. } => capacitances(text),
        _ => Vec::new(),
    });
    if let (Some((node, text, farad)), Some(bound)) = (&code, bound) {
        if !agrees(bound, *farad) {
            disagreement(reader, node, &format!("the code `{}`", excerpt(text)), *farad, bound);
        }
    }
    let Some(description) = description else { return };
    let Some(first) = stated.first().copied() else { return };
    match (bound, &code) {
        (Some(bound), _) if !stated.iter().any(|farad| agrees(bound, *farad)) => {
            disagreement(reader, description, "the description", first, bound);
        }
        (None, Some((_, text, farad))) if !stated.iter().any(|s| same(*s, *farad)) => {
            reader.fault(
                description.span,
                "capacitance_disagrees",
                format!("the description states {}", shown(first)),
                format!("{}, as the code `{}` says", shown(*farad), excerpt(text)),
                Some("correct the wrong one".to_owned()),
            );
        }
        _ => {}
    }
}

fn bad_code(reader: &mut Reader<'_>, node: &Node, text: &str) {
    reader.fault(
        node.span,
        "bad_capacitance_code",
        format!("`{}` is no capacitance code", excerpt(text)),
        "digits and a multiplier in picofarad (`475` is 4.7 µF), `4R7`, or `4u7`",
        Some("write the code alone, without the letter of the tolerance".to_owned()),
    );
}

fn disagreement(reader: &mut Reader<'_>, node: &Node, who: &str, farad: f64, bound: &Bound) {
    let expected = match bound.nominal {
        Some(nominal) => format!("{}, the nominal value of `{}`", shown(nominal), bound.key),
        None => format!("a value within the limits of `{}`", bound.key),
    };
    reader.fault(
        node.span,
        "capacitance_disagrees",
        format!("{who} states {}", shown(farad)),
        expected,
        Some("correct the wrong one".to_owned()),
    );
}

fn shown(farad: f64) -> String {
    engineering(farad, "F", 3)
}

fn same(a: f64, b: f64) -> bool {
    (a - b).abs() <= 1e-6 * a.abs().max(b.abs())
}

fn agrees(bound: &Bound, farad: f64) -> bool {
    match bound.nominal {
        Some(nominal) => same(nominal, farad),
        None => {
            bound.lower.is_none_or(|l| farad >= l) && bound.upper.is_none_or(|u| farad <= u)
        }
    }
}

/// The capacitance in farad of a marking code: two or three digits and the power of ten in
/// picofarad (`475`, `4704`), `R` for the point of picofarads (`4R7`), or a letter of the
/// prefix for the point (`4u7`, `p33`). IEC 60062 (code letters; from memory); a last digit 8
/// or 9 means 0.01 or 0.1, as makers of chips use it (common practice, no source).
fn capacitance_code(text: &str) -> Option<f64> {
    if !text.is_ascii() || text.len() > 5 || text.len() < 2 {
        return None;
    }
    if text.bytes().all(|b| b.is_ascii_digit()) {
        return digits_code(text);
    }
    let (at, letter) = text.char_indices().find(|(_, c)| !c.is_ascii_digit())?;
    let exponent = match letter {
        'R' | 'r' | 'p' | 'P' => -12,
        'n' | 'N' => -9,
        'u' | 'U' => -6,
        'm' => -3,
        _ => return None,
    };
    let whole = text.get(..at)?;
    let fraction = text.get(at + 1..)?;
    let digits = |part: &str| part.bytes().all(|b| b.is_ascii_digit());
    if !digits(whole) || !digits(fraction) {
        return None;
    }
    positive(format!("0{whole}.{fraction}0e{exponent}").parse().ok()?)
}

fn digits_code(text: &str) -> Option<f64> {
    if !(3..=4).contains(&text.len()) || text.starts_with('0') {
        return None;
    }
    let (mantissa, power) = text.split_at(text.len() - 1);
    let power = match power.parse::<i32>().ok()? {
        9 => -1,
        8 => -2,
        power => power,
    };
    positive(format!("{mantissa}e{}", power - 12).parse().ok()?)
}

fn positive(value: f64) -> Option<f64> {
    (value.is_finite() && value > 0.0).then_some(value)
}

/// Every capacitance that a description states: `4.7 µF`, `100nF`, `4u7`.
fn capacitances(text: &str) -> Vec<f64> {
    let chars: Vec<char> = text.chars().collect();
    let mut found = Vec::new();
    let mut at = 0;
    while at < chars.len() {
        let before = at.checked_sub(1).and_then(|i| chars.get(i));
        let fresh = before.is_none_or(|c| !c.is_alphanumeric() && !matches!(c, '.' | ',' | '-'));
        let end = if fresh { capacitance_end(&chars, at) } else { None };
        let piece = end.and_then(|end| chars.get(at..end));
        let value = piece.and_then(|piece| {
            let piece: String = piece.iter().collect();
            quantity::parse(&piece, Dimension::Capacitance).ok()
        });
        found.extend(value);
        at = end.unwrap_or(at + 1);
    }
    found
}

/// One past the end of a capacitance that begins at `start`, where one does.
fn capacitance_end(chars: &[char], start: usize) -> Option<usize> {
    let prefix = |c: char| matches!(c, 'p' | 'n' | 'u' | 'µ' | 'μ' | 'm');
    let skip = |mut at: usize, test: &dyn Fn(char) -> bool| {
        while chars.get(at).is_some_and(|c| test(*c)) {
            at += 1;
        }
        at
    };
    let ends = |at: usize| chars.get(at).is_none_or(|c| !c.is_alphanumeric());
    let digit = |c: char| c.is_ascii_digit();
    let whole = skip(start, &digit);
    if whole == start {
        return None;
    }
    let letter = chars.get(whole).copied();
    if letter.is_some_and(|c| prefix(c) && c != 'm') {
        let fraction = skip(whole + 1, &digit);
        if fraction > whole + 1 {
            return ends(fraction).then_some(fraction);
        }
    }
    let number = skip(whole, &|c| c.is_ascii_digit() || c == '.');
    let unit = skip(number, &|c| matches!(c, ' ' | '\u{a0}' | '\u{202f}'));
    let farad = if chars.get(unit).is_some_and(|c| prefix(*c)) {
        unit + 1
    } else {
        unit
    };
    (chars.get(farad) == Some(&'F') && ends(farad + 1)).then_some(farad + 1)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn codes_as_they_are_marked() {
        for (code, farad) in [
            ("475", 4.7e-6),
            ("104", 100e-9),
            ("4704", 4.7e-6),
            ("229", 2.2e-12),
            ("4R7", 4.7e-12),
            ("4u7", 4.7e-6),
            ("p33", 0.33e-12),
            ("100", 10e-12),
        ] {
            let read = capacitance_code(code);
            assert!(read.is_some_and(|v| same(v, farad)), "{code}: {read:?}");
        }
        for code in ["475K", "", "4", "047", "4.7", "4R7R", "µ47", "123456", "R"] {
            assert_eq!(capacitance_code(code), None, "{code}");
        }
    }
}
