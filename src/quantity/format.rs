//! Values as text: engineering notation, uncertainties, table columns, record keys.
//!
//! The minus sign is the ASCII hyphen-minus, so that the text survives every terminal and file and
//! reads back. The unit `1` (a ratio) is written as a percentage, `rad` in degrees of arc, `s` in
//! minutes or hours where those are larger than one; `°C` takes no prefix. What is not finite is
//! written [`NO_VALUE`], never as a number.

use super::rounded::{Rounded, parse_scientific, round};
use super::scale::{PREFIXES, SHORTEST_DIGITS, divide, foreign, own_name, readable, takes_prefix};

/// Stands where a value could not be had.
pub const NO_VALUE: &str = "–";

/// A value in engineering notation with `digits` significant digits (1 to 17): `4.683 µF`,
/// `12.0 mΩ`, `2.50 %`. Zero has no digits to show: `0 F`.
pub fn engineering(value: f64, unit: &str, digits: usize) -> String {
    if !value.is_finite() {
        return NO_VALUE.to_string();
    }
    let (factor, name) = foreign(value, unit).unwrap_or((1.0, own_name(unit)));
    let rounded = round(divide(value, factor), digits);
    let prefixed = factor == 1.0 && takes_prefix(unit);
    compose(&rounded, name, prefixed)
}

/// A value with no more digits than it has: `4.7 µF`, `1 kHz`, `5 %`; at most 12 significant ones.
pub fn shortest(value: f64, unit: &str) -> String {
    if !value.is_finite() {
        return NO_VALUE.to_string();
    }
    let (factor, name) = foreign(value, unit).unwrap_or((1.0, own_name(unit)));
    let mut rounded = round(divide(value, factor), SHORTEST_DIGITS);
    rounded.trim();
    let prefixed = factor == 1.0 && takes_prefix(unit);
    compose(&rounded, name, prefixed)
}

/// A frequency as record keys have it: `1kHz`, `2.5MHz`, `120Hz`.
///
/// Every digit that tells one frequency from another is there: no two frequencies share a key.
pub fn frequency_key(hertz: f64) -> String {
    if !hertz.is_finite() {
        return NO_VALUE.to_string();
    }
    let rounded = parse_scientific(&format!("{hertz:e}"));
    compose(&rounded, "Hz", true).replace(' ', "")
}

fn compose(rounded: &Rounded, unit: &str, prefixed: bool) -> String {
    let zero = rounded.digits == "0";
    let exponent = rounded.exponent.div_euclid(3) * 3;
    let prefix = PREFIXES.iter().find(|(e, _)| *e == exponent);
    let (number, prefix) = match prefix {
        _ if zero => ("0".to_string(), ""),
        Some((exponent, prefix)) if prefixed && readable(prefix, unit) => {
            (rounded.plain(*exponent), *prefix)
        }
        _ if (-4..15).contains(&rounded.exponent) => (rounded.plain(0), ""),
        _ => (rounded.scientific(), ""),
    };
    let unit = format!("{prefix}{unit}");
    if unit.is_empty() {
        number
    } else {
        format!("{number} {unit}")
    }
}
