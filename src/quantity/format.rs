//! Values as text: engineering notation, uncertainties, table columns, record keys.
//!
//! The minus sign is the ASCII hyphen-minus, so that the text survives every terminal and file and
//! reads back. The unit `1` (a ratio) is written as a percentage, `rad` in degrees of arc, `s` in
//! minutes or hours where those are larger than one; `°C` takes no prefix. What is not finite is
//! written [`NO_VALUE`], never as a number.

use std::f64::consts::PI;

/// Stands where a value could not be had.
pub const NO_VALUE: &str = "–";

/// Significant digits at which [`shortest`] stops, so that 4.7 × 0.9 does not end in …999996.
const SHORTEST_DIGITS: usize = 12;

const PREFIXES: [(i32, &str); 10] = [
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

/// A finite number in decimal: `digits` with the point after the first, times 10^`exponent`.
struct Rounded {
    negative: bool,
    digits: String,
    exponent: i32,
}

/// A value in engineering notation with `digits` significant digits (1 to 17): `4.683 µF`,
/// `12.0 mΩ`, `2.50 %`. Zero has no digits to show: `0 F`.
pub fn engineering(value: f64, unit: &str, digits: usize) -> String {
    if !value.is_finite() {
        return NO_VALUE.to_string();
    }
    let (factor, name) = foreign(value, unit).unwrap_or((1.0, unit));
    let rounded = round(divide(value, factor), digits);
    let prefixed = factor == 1.0 && takes_prefix(unit);
    compose(&rounded, name, prefixed)
}

/// A value with no more digits than it has: `4.7 µF`, `1 kHz`, `5 %`; at most 12 significant ones.
pub fn shortest(value: f64, unit: &str) -> String {
    if !value.is_finite() {
        return NO_VALUE.to_string();
    }
    let (factor, name) = foreign(value, unit).unwrap_or((1.0, unit));
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

/// A value and its uncertainty, rounded to two significant digits of the uncertainty and in the
/// same unit: `4.683 µF ± 0.012 µF` (JCGM 100:2008, 7.2.6).
///
/// Where the uncertainty is not known (not finite or negative) a [`NO_VALUE`] stands in its place:
/// a value without one must not look exact.
pub fn with_uncertainty(value: f64, uncertainty: f64, unit: &str) -> String {
    if !value.is_finite() {
        return NO_VALUE.to_string();
    }
    if !uncertainty.is_finite() || uncertainty < 0.0 {
        return format!("{} ± {NO_VALUE}", engineering(value, unit, 4));
    }
    if uncertainty == 0.0 {
        return format!(
            "{} ± 0 {}",
            shortest(value, unit),
            engineering_unit(value, unit)
        );
    }
    let (factor, prefix) = scale(value.abs().max(uncertainty), unit);
    let (value, uncertainty) = (divide(value, factor), divide(uncertainty, factor));
    let place = round(uncertainty, 2).exponent - 1;
    let unit = scaled_unit(prefix, unit);
    let (value, uncertainty) = (to_place(value, place), to_place(uncertainty, place));
    if unit.is_empty() {
        format!("{value} ± {uncertainty}")
    } else {
        format!("{value} {unit} ± {uncertainty} {unit}")
    }
}

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
    let prefix = PREFIXES
        .iter()
        .find(|(e, _)| *e == exponent)
        .map_or("", |(_, p)| *p);
    (format!("1e{exponent}").parse().unwrap_or(1.0), prefix)
}

/// The unit under a prefix from [`scale`]: `µF`; `%` for the unit `1`.
pub fn scaled_unit(prefix: &str, unit: &str) -> String {
    match (prefix, unit) {
        ("%" | "°" | "min" | "h", _) => prefix.to_string(),
        _ => format!("{prefix}{unit}"),
    }
}

/// Units that people read in another unit: what one of those is, and its name.
fn foreign(value: f64, unit: &str) -> Option<(f64, &'static str)> {
    match unit {
        "1" => Some((0.01, "%")),
        "rad" => Some((PI / 180.0, "°")),
        "s" if value.is_finite() && value.abs() >= 3600.0 => Some((3600.0, "h")),
        "s" if value.is_finite() && value.abs() >= 60.0 => Some((60.0, "min")),
        _ => None,
    }
}

/// Division that keeps percentages exact in decimal: 0.07 / 0.01 is 7.
fn divide(value: f64, factor: f64) -> f64 {
    let inverse = (1.0 / factor).round();
    if factor < 1.0 && (inverse * factor - 1.0).abs() < 1e-12 {
        value * inverse
    } else {
        value / factor
    }
}

fn takes_prefix(unit: &str) -> bool {
    !matches!(unit, "°C" | "%" | "°" | "min" | "h")
}

fn engineering_unit(value: f64, unit: &str) -> String {
    let (_, prefix) = scale(value, unit);
    scaled_unit(prefix, unit)
}

/// Rounds to significant digits, exactly and half to even.
fn round(value: f64, digits: usize) -> Rounded {
    let places = digits.clamp(1, 17) - 1;
    parse_scientific(&format!("{value:.places$e}"))
}

/// Takes `-4.683e-6` apart.
fn parse_scientific(text: &str) -> Rounded {
    let (mantissa, exponent) = text.split_once('e').unwrap_or((text, "0"));
    let digits: String = mantissa.chars().filter(char::is_ascii_digit).collect();
    let zero = digits.chars().all(|c| c == '0');
    Rounded {
        negative: mantissa.starts_with('-') && !zero,
        digits: if zero { "0".to_string() } else { digits },
        exponent: exponent.parse().unwrap_or(0),
    }
}

impl Rounded {
    /// Drops trailing zeros.
    fn trim(&mut self) {
        let kept = self.digits.trim_end_matches('0').len().max(1);
        self.digits.truncate(kept);
    }

    /// Plain decimal notation of the number divided by 10^`shift`.
    fn plain(&self, shift: i32) -> String {
        let sign = if self.negative { "-" } else { "" };
        let point = self.exponent - shift + 1;
        let digits = &self.digits;
        match usize::try_from(point) {
            Ok(0) | Err(_) => {
                let zeros = "0".repeat(usize::try_from(-point).unwrap_or(0));
                format!("{sign}0.{zeros}{digits}")
            }
            Ok(point) if point >= digits.len() => {
                format!("{sign}{digits}{}", "0".repeat(point - digits.len()))
            }
            Ok(point) => {
                let (whole, fraction) = digits.split_at(point);
                format!("{sign}{whole}.{fraction}")
            }
        }
    }

    /// `d.ddde-20`.
    fn scientific(&self) -> String {
        format!("{}e{}", self.plain(self.exponent), self.exponent)
    }
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

/// Kilofarads and kiloseconds are not written: `12000 F`.
fn readable(prefix: &str, unit: &str) -> bool {
    let large = matches!(prefix, "k" | "M" | "G" | "T");
    !(large && matches!(unit, "F" | "H" | "s"))
}

/// Rounds to a decimal place: 10^`place`.
fn to_place(value: f64, place: i32) -> String {
    let text = match usize::try_from(-place) {
        Ok(decimals) => format!("{value:.decimals$}"),
        Err(_) => {
            let step = 10f64.powi(place);
            format!("{:.0}", (value / step).round() * step)
        }
    };
    let nothing = !text.contains(|c| matches!(c, '1'..='9'));
    if nothing { text.replace('-', "") } else { text }
}
