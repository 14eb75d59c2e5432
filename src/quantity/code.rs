//! Marking codes in part numbers and free text.
//!
//! They give candidates for a plausibility check, never a value to calculate with: a part number
//! owes nobody to contain a code, and one code can mean two values a million apart.

use super::free_text::{before, digits_at, readable, starts_word};
use super::{Dimension, unit};

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

/// Whether a code without decimals ends at `at`: `47n`, `47nF`, or with its tolerance letter `47nK`.
fn ends_word(characters: &[char], at: usize) -> bool {
    let is_word = |at: usize| characters.get(at).is_some_and(|c| c.is_alphanumeric());
    let letter = characters.get(at).is_some_and(|c| c.is_ascii_uppercase());
    !is_word(at) || letter && !is_word(at + 1)
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
        0 => run > 0 && letter.is_lowercase() && ends_word(characters, at + run + 1),
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
