//! Capacitance in free text: marking codes in part numbers, values in descriptions.
//!
//! Both give candidates for a plausibility check, never a value to calculate with: a part number
//! owes nobody to contain a code, and one code can mean two values a million apart.

use super::text::clean;
use super::{Dimension, number, unit};

/// Characters read; a longer text is not a part number or a description.
const READ: usize = 1000;

/// Chip sizes (inch and metric names) that look like codes of four digits.
const CHIP_SIZES: [&str; 16] = [
    "0201", "0402", "0603", "0805", "1005", "1008", "1206", "1210", "1608", "1808", "1812", "1825",
    "2012", "2220", "2225", "3216",
];

/// Largest value given a microfarad reading of a code; only electrolytics are coded so.
const LARGEST_MICROFARAD_CODE: f64 = 0.01;

/// The values in farad that marking codes in a part number or text could mean, ascending.
///
/// Three digits (two figures and the power of ten in pF: `475`; IEC 60062), four (`1001`, or a
/// leading zero: `0475`), and a letter for the decimal point (`4u7`, `p47`, `4R7`). With `R`, and
/// with three digits, also the value in microfarad that electrolytic part numbers mean (common
/// practice, no source). Figures not in a usual series (IEC 60063 E24, E96 for four digits) are
/// taken for something else, as are chip sizes and numbers with another unit.
pub fn capacitance_code(text: &str) -> Vec<f64> {
    let characters = readable(text);
    let mut found = Vec::new();
    let mut at = 0;
    while at < characters.len() {
        let run = digits_at(&characters, at);
        if run == 0 {
            if starts_word(&characters, at) {
                found.extend(point_letter(&characters, at, 0));
            }
            at += 1;
            continue;
        }
        found.extend(point_letter(&characters, at, run));
        if is_code(&characters, at, run) {
            let digits: String = characters.iter().skip(at).take(run).collect();
            found.extend(digit_code(&digits));
        }
        at += run;
    }
    found.sort_by(f64::total_cmp);
    found.dedup();
    found
}

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

/// The characters of the text, cleaned, with dielectric codes of EIA-198 (`X7R`) blanked: their
/// digit and letter would be taken for part of a value.
fn readable(text: &str) -> Vec<char> {
    let text: String = text.chars().take(READ).collect();
    let mut characters: Vec<char> = clean(&text).chars().collect();
    for at in 0..characters.len() {
        if let Some([low, digit, high]) = characters.get(at..at + 3) {
            let class_2 = "XYZ".contains(*low) && "245678".contains(*digit);
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

fn digits_at(characters: &[char], at: usize) -> usize {
    let rest = characters.iter().skip(at);
    rest.take_while(|c| c.is_ascii_digit()).count()
}

fn before(characters: &[char], at: usize) -> Option<char> {
    at.checked_sub(1).and_then(|i| characters.get(i)).copied()
}

fn starts_word(characters: &[char], at: usize) -> bool {
    !before(characters, at).is_some_and(|c| c.is_alphanumeric() || c == '.' || c == ',')
}

/// Whether a run of digits can be a code: not part of a decimal number, and without a unit.
fn is_code(characters: &[char], at: usize, run: usize) -> bool {
    let decimal = matches!(before(characters, at), Some('.' | ','));
    let tail: String = characters.iter().skip(at + run).take(8).collect();
    let decimal_follows =
        tail.starts_with(['.', ',']) && tail.chars().nth(1).is_some_and(|c| c.is_ascii_digit());
    let unit: String = tail
        .trim_start()
        .chars()
        .take_while(|c| !" ,;/-".contains(*c))
        .collect();
    let measured = Dimension::ALL
        .into_iter()
        .filter(|d| *d != Dimension::Temperature)
        .any(|dimension| unit::read(&unit, dimension).is_some());
    let letter = tail.starts_with("F") || tail.starts_with("R");
    let other = matches!(unit.as_str(), "mm" | "°C" | "WV" | "pcs");
    !decimal && !decimal_follows && !other && (letter || !measured)
}

/// Three or four digits as picofarads, and three as microfarads.
fn digit_code(digits: &str) -> Vec<f64> {
    let short = match digits.len() {
        3 => digits,
        4 if CHIP_SIZES.contains(&digits) => return Vec::new(),
        4 => match digits.strip_prefix('0') {
            Some(short) => short,
            None => return four_digits(digits),
        },
        _ => return Vec::new(),
    };
    let (figures, power) = short.split_at(2);
    let (Ok(figures), Ok(power)) = (figures.parse::<u32>(), power.parse::<i32>()) else {
        return Vec::new();
    };
    if !in_e24(figures) {
        return Vec::new();
    }
    let picofarads = match power {
        9 => vec![-1],
        8 => vec![-2, 8],
        _ => vec![power],
    };
    let mut values: Vec<f64> = picofarads
        .into_iter()
        .filter_map(|power| value(&figures.to_string(), power - 12))
        .collect();
    let microfarads = value(&figures.to_string(), power - 6);
    values.extend(microfarads.filter(|v| *v <= LARGEST_MICROFARAD_CODE));
    values
}

fn four_digits(digits: &str) -> Vec<f64> {
    let (figures, power) = digits.split_at(3);
    let (Ok(number), Ok(power)) = (figures.parse::<u32>(), power.parse::<i32>()) else {
        return Vec::new();
    };
    let usual = in_e96(number) || number.is_multiple_of(10) && in_e24(number / 10);
    let power = if power == 9 { -1 } else { power };
    if usual {
        value(figures, power - 12).into_iter().collect()
    } else {
        Vec::new()
    }
}

/// Figures of two digits in the E24 series of IEC 60063, or round (10, 20 … 90, and 25), which
/// small and large capacitors also come in. A leading zero is one figure.
fn in_e24(figures: u32) -> bool {
    const E24: [u32; 24] = [
        10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82,
        91,
    ];
    E24.contains(&figures)
        || figures == 25
        || figures > 0 && figures.is_multiple_of(10)
        || (1..10).contains(&figures)
}

/// Figures of three digits in the E96 series of IEC 60063, which is the rounded power law.
fn in_e96(figures: u32) -> bool {
    (0..96).any(|i| (100.0 * 10f64.powf(f64::from(i) / 96.0)).round() == f64::from(figures))
}

fn value(figures: &str, exponent: i32) -> Option<f64> {
    format!("{figures}e{exponent}")
        .parse()
        .ok()
        .filter(|v: &f64| v.is_finite())
}

/// A code with a letter for the decimal point, whose whole part is the `run` digits at `at`.
fn point_letter(characters: &[char], at: usize, run: usize) -> Vec<f64> {
    if before(characters, at).is_some_and(|c| c == '.' || c == ',') || run > 4 {
        return Vec::new();
    }
    let Some(letter) = characters.get(at + run) else {
        return Vec::new();
    };
    let decimals = digits_at(characters, at + run + 1);
    let next = characters.get(at + run + 1 + decimals).copied();
    let whole: String = characters.iter().skip(at).take(run).collect();
    let fraction: String = characters
        .iter()
        .skip(at + run + 1)
        .take(decimals)
        .collect();
    let exponents: &[i32] = match letter {
        'p' | 'P' => &[-12],
        'n' | 'N' => &[-9],
        'µ' | 'u' | 'U' => &[-6],
        'm' if decimals > 0 => &[-3],
        'F' if decimals > 0 && run > 0 && starts_word(characters, at) => &[0],
        'R' if decimals > 0 => &[-12, -6],
        _ => return Vec::new(),
    };
    let ends = match decimals {
        0 => {
            run > 0
                && letter.is_lowercase()
                && !next.is_some_and(|c| c.is_alphanumeric() && c != 'F')
        }
        1 | 2 => true,
        _ => false,
    };
    let number = format!("0{whole}.{fraction}0");
    let values = exponents
        .iter()
        .filter(|_| ends)
        .filter_map(|e| value(&number, *e));
    values.filter(|v| *v > 0.0).collect()
}

/// Length of a number with the letters that follow it, at most one space between; 0 if none.
fn written_length(characters: &[char], at: usize) -> usize {
    let rest = || characters.iter().skip(at);
    let number = rest()
        .take_while(|c| c.is_ascii_digit() || matches!(c, '.' | ','))
        .count();
    let first_is_letter = rest().next().is_some_and(|c| c.is_alphabetic());
    if number == 0 && !first_is_letter {
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
