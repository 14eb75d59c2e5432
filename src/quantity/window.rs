//! Windows: a lower and an upper limit in one text.

use super::text::{LONGEST, clean, without_spaces};
use super::tolerance::plus_or_minus;
use super::{Dimension, QuantityError, number, parse, parse_tolerance, unit};

/// Reads a window: lower and upper limit in the SI unit of `dimension`, the lower below the upper.
///
/// `18 °C .. 28 °C`, `18 .. 28 °C`, `0.8 V to 1.2 V`, `18–28 °C`, `1.0 Vrms ± 20 %`,
/// `(23 ± 5) °C`. The first number may leave its unit to the second.
///
/// # Errors
/// Neither of these forms; an end that is not a quantity of `dimension`; ends the wrong way round.
pub fn parse_window(text: &str, dimension: Dimension) -> Result<(f64, f64), QuantityError> {
    if text.len() > LONGEST {
        return Err(wrong(text, "is too long", dimension));
    }
    let body = plus_or_minus(&without_brackets(&clean(text)));
    let (lower, upper) = if let Some(at) = tolerance_start(&body) {
        let (nominal, tolerance) = body.split_at(at);
        around(nominal.trim(), tolerance, dimension)?
    } else if let Some((lower, upper)) = two_ends(&body) {
        let unit = unit_of(upper);
        let lower = parse(&with_unit(lower, &unit), dimension)?;
        (lower, parse(upper, dimension)?)
    } else {
        return Err(wrong(text, "has no lower and upper limit", dimension));
    };
    match lower.partial_cmp(&upper) {
        Some(std::cmp::Ordering::Less) if lower.is_finite() && upper.is_finite() => {
            Ok((lower, upper))
        }
        Some(std::cmp::Ordering::Greater) => {
            Err(wrong(text, "ends before it begins", dimension).hint("put the lower limit first"))
        }
        Some(std::cmp::Ordering::Equal) => Err(wrong(text, "leaves no room at all", dimension)),
        _ => Err(wrong(text, "is too large", dimension)),
    }
}

fn wrong(text: &str, fault: &str, dimension: Dimension) -> QuantityError {
    let example = match dimension {
        Dimension::Temperature => "18 °C .. 28 °C",
        Dimension::Voltage => "1.0 Vrms ± 20 %",
        Dimension::Frequency => "1 kHz .. 10 MHz",
        Dimension::Ratio => "40 % .. 60 %",
        _ => {
            let (noun, example) = (dimension.noun(), dimension.example());
            let expected = format!("a {noun} window such as `{example} ± 10 %`");
            return QuantityError::expecting(text, fault, expected);
        }
    };
    let expected = format!("a {} window such as `{example}`", dimension.noun());
    QuantityError::expecting(text, fault, expected)
}

/// Lower and upper limit of a nominal value with its tolerance.
fn around(
    nominal: &str,
    tolerance: &str,
    dimension: Dimension,
) -> Result<(f64, f64), QuantityError> {
    let deviation = tolerance.trim_start_matches('±').trim();
    let unit = unit_of(deviation);
    let relative = unit::read(&unit, Dimension::Ratio).is_some();
    // `23 ± 5 °C` leaves the unit to the deviation; `1.0 ± 20 %` has no unit at all.
    let understood = if relative { "" } else { unit.as_str() };
    let nominal = parse(&with_unit(nominal, understood), dimension)?;
    Ok(parse_tolerance(tolerance, dimension, Some(nominal))?.limits(nominal))
}

/// `(23 ± 5) °C` as `23 ± 5 °C` (the form of the SI Brochure, 5.4.5).
fn without_brackets(text: &str) -> String {
    match text.strip_prefix('(').and_then(|rest| rest.split_once(')')) {
        Some((inside, unit)) => format!("{inside} {}", unit.trim()),
        None => text.to_string(),
    }
}

/// Where a nominal value ends and its tolerance begins.
fn tolerance_start(body: &str) -> Option<usize> {
    let spaced_plus = || body.find(" +").filter(|at| *at > 0);
    body.find('±').filter(|at| *at > 0).or_else(spaced_plus)
}

fn two_ends(body: &str) -> Option<(&str, &str)> {
    for separator in ["...", "…", "..", " to "] {
        if let Some((lower, upper)) = body.split_once(separator) {
            return Some((lower.trim(), upper.trim()));
        }
    }
    let (at, dash) = body
        .char_indices()
        .skip(1)
        .find(|(at, c)| *c == '-' && !in_exponent(body, *at))?;
    let (lower, upper) = body.split_at(at);
    Some((
        lower.trim(),
        upper.trim_start_matches(' ').strip_prefix(dash)?.trim(),
    ))
}

/// Whether the sign at byte `at` belongs to an exponent: `1e-3`.
pub(super) fn in_exponent(text: &str, at: usize) -> bool {
    let before = text.get(..at).unwrap_or_default();
    let Some(number) = before.strip_suffix(['e', 'E']) else {
        return false;
    };
    let digit = |c: Option<char>| c.is_some_and(|c| c.is_ascii_digit() || c == '.');
    let after = text.get(at + 1..).unwrap_or_default();
    digit(number.chars().next_back()) && digit(after.chars().next())
}

fn unit_of(text: &str) -> String {
    number::split(text)
        .map(|(_, unit)| without_spaces(&unit))
        .unwrap_or_default()
}

fn with_unit(text: &str, unit: &str) -> String {
    match number::split(text) {
        Ok((_, own)) if own.is_empty() => format!("{text} {unit}"),
        _ => text.to_string(),
    }
}
