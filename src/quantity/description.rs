//! Capacitances written out in a description.

use super::free_text::{before, digits_at, readable, starts_word};
use super::{Dimension, number, unit};

/// The capacitances written out in a description, in farad, in the order of the text: the 4.7e-6
/// of `4.7 µF ±10 % 25 V X7R` (and not its tolerance, were that in picofarads).
pub fn find_capacitances(text: &str) -> Vec<f64> {
    let characters = readable(text);
    let mut found = Vec::new();
    let mut at = 0;
    while at < characters.len() {
        let length = written_length(&characters, at);
        if length == 0 {
            at += 1;
            continue;
        }
        if starts_word(&characters, at) && !follows_sign(&characters, at) {
            let words: String = characters.iter().skip(at).take(length).collect();
            found.extend(written(&words));
        }
        at += length;
    }
    found
}

/// Length of a number with the letters that follow it, at most one space between; 0 if none.
fn written_length(characters: &[char], at: usize) -> usize {
    let rest = || characters.iter().skip(at);
    let number = rest()
        .take_while(|c| c.is_ascii_digit() || matches!(c, '.' | ','))
        .count();
    let first = rest().next().copied();
    let point_first = first == Some('.') && digits_at(characters, at + 1) > 0;
    if !first.is_some_and(char::is_alphanumeric) && !point_first {
        return 0;
    }
    let space = usize::from(number > 0 && rest().nth(number) == Some(&' '));
    let word = rest()
        .skip(number + space)
        .take_while(|c| c.is_alphanumeric())
        .count();
    if word == 0 {
        number
    } else {
        number + space + word
    }
}

/// Whether a tolerance sign stands before.
fn follows_sign(characters: &[char], at: usize) -> bool {
    let mut earlier = characters.iter().take(at).rev().filter(|c| **c != ' ');
    let sign = earlier.next();
    let adjacent = before(characters, at) != Some(' ');
    matches!(sign, Some('±' | '+'))
        || (sign == Some(&'-') && adjacent && {
            // `+/-`, `+80/-20`; but in `C1-4.7uF` the hyphen only separates.
            matches!(earlier.next(), Some('/' | '+') | None)
        })
}

/// The value of a number with its unit, `4.7uF`, `4u7` or `100n`.
fn written(words: &str) -> Option<f64> {
    let words = words.trim_end_matches(['.', ',']);
    let point = words.replacen(',', ".", 1);
    let (decimal, unit) = number::split(&point).ok()?;
    let coded = !words.contains(' ') && unit.chars().all(|c| matches!(c, 'p' | 'n' | 'u' | 'µ'));
    let bare = || unit::read_bare_prefix(&unit, Dimension::Capacitance).filter(|_| coded);
    let scale = unit::read(&unit, Dimension::Capacitance).or_else(bare)?;
    decimal.value(scale.exponent).ok().filter(|v| *v > 0.0)
}
