//! The prefix, or the other unit, that people read a value in.

use super::rounded::round;
use std::f64::consts::PI;

/// Significant digits at which [`shortest`] stops, so that 4.7 × 0.9 does not end in …999996.
pub(super) const SHORTEST_DIGITS: usize = 12;

/// SI prefixes and their exponents, ascending by three.
pub(crate) const PREFIXES: [(i32, &str); 10] = [
    (-15, "f"),
    (-12, "p"),
    (-9, "n"),
    (-6, "µ"),
    (-3, "m"),
    (0, ""),
    (3, "k"),
    (6, "M"),
    (9, "G"),
    (12, "T"),
];

/// What to divide values like `value` by, and the prefix that says so, for a table column or an
/// axis in one unit: `(1e-6, "µ")`. The head of the column is [`scaled_unit`].
///
/// For the unit `1` this is `(0.01, "%")`, for `rad` degrees, for long times minutes or hours.
pub fn scale(value: f64, unit: &str) -> (f64, &'static str) {
    if let Some(foreign) = foreign(value, unit) {
        return foreign;
    }
    if !value.is_finite() || value == 0.0 || !takes_prefix(unit) {
        return (1.0, "");
    }
    let exponent = round(value, SHORTEST_DIGITS).exponent.div_euclid(3) * 3;
    let exponent = exponent.clamp(-15, 12);
    match PREFIXES.iter().find(|(e, _)| *e == exponent) {
        Some((_, prefix)) if readable(prefix, unit) => {
            (format!("1e{exponent}").parse().unwrap_or(1.0), prefix)
        }
        _ => (1.0, ""),
    }
}

/// The unit under a prefix from [`scale`]: `µF`; `%` for the unit `1`.
pub fn scaled_unit(prefix: &str, unit: &str) -> String {
    match (prefix, unit) {
        ("%" | "°" | "min" | "h", _) => prefix.to_string(),
        _ => format!("{prefix}{}", own_name(unit)),
    }
}

/// The unit as it is written without a prefix: the unit `1` is not.
pub(super) fn own_name(unit: &str) -> &str {
    if unit == "1" { "" } else { unit }
}

/// Units that people read in another unit: what one of those is, and its name. Not where the
/// value in that unit would leave the range of numbers.
pub(super) fn foreign(value: f64, unit: &str) -> Option<(f64, &'static str)> {
    match unit {
        "1" | "rad" if value.abs() > 1e300 => None,
        "1" => Some((0.01, "%")),
        "rad" => Some((PI / 180.0, "°")),
        "s" if value.is_finite() && value.abs() >= 3600.0 => Some((3600.0, "h")),
        "s" if value.is_finite() && value.abs() >= 60.0 => Some((60.0, "min")),
        _ => None,
    }
}

/// Division that keeps percentages exact in decimal: 0.07 / 0.01 is 7.
pub(super) fn divide(value: f64, factor: f64) -> f64 {
    let inverse = (1.0 / factor).round();
    if factor < 1.0 && (inverse * factor - 1.0).abs() < 1e-12 {
        value * inverse
    } else {
        value / factor
    }
}

pub(super) fn takes_prefix(unit: &str) -> bool {
    !matches!(unit, "1" | "°C" | "%" | "°" | "min" | "h")
}

/// Kilofarads and kiloseconds are not written: `12000 F`.
pub(super) fn readable(prefix: &str, unit: &str) -> bool {
    let large = matches!(prefix, "k" | "M" | "G" | "T");
    !(large && matches!(unit, "F" | "H" | "s"))
}
