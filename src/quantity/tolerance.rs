//! Tolerances around a nominal value.

use super::text::{LONGEST, clean, without_spaces};
use super::{Dimension, QuantityError, number, parse, parse::number_error, unit};

/// One side of a tolerance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Deviation {
    /// Of the nominal value: 0.10 for 10 %.
    Relative(f64),
    /// In the SI unit of the quantity.
    Absolute(f64),
}

impl Deviation {
    const fn size(self) -> f64 {
        match self {
            Self::Relative(value) | Self::Absolute(value) => value,
        }
    }

    const fn negated(self) -> Self {
        match self {
            Self::Relative(value) => Self::Relative(-value),
            Self::Absolute(value) => Self::Absolute(-value),
        }
    }
}

/// A tolerance: signed deviations below and above the nominal value.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tolerance {
    /// Usually negative.
    pub lower: Deviation,
    /// Usually positive.
    pub upper: Deviation,
}

impl Tolerance {
    /// The same deviation both ways.
    pub(super) fn symmetric(deviation: Deviation) -> Self {
        Self {
            lower: deviation.negated(),
            upper: deviation,
        }
    }

    /// The absolute limits around a nominal value, in its unit.
    pub fn limits(&self, nominal: f64) -> (f64, f64) {
        let of = |deviation| match deviation {
            Deviation::Relative(ratio) => nominal * (1.0 + ratio),
            Deviation::Absolute(value) => nominal + value,
        };
        (of(self.lower), of(self.upper))
    }
}

/// Reads a tolerance (`±10 %`, `0.1 %`, `+80 % / -20 %`, `-20/+80 %`, `±0.25 pF`, an IEC 60062
/// letter such as `K`).
///
/// A deviation in `%` or `ppm` is relative to the nominal value, for a ratio too: `±10 %` of a
/// dissipation factor of 5 % is 0.5 %. Deviations of a temperature are absolute. `nominal` in SI
/// decides what the letters B, C, D, F, G mean for capacitance (pF below 10 pF).
///
/// # Errors
/// Anything else; one side only; a tolerance of zero; a letter that IEC 60062 does not define, or
/// whose meaning depends on a nominal value that is not given.
pub fn parse_tolerance(
    text: &str,
    dimension: Dimension,
    nominal: Option<f64>,
) -> Result<Tolerance, QuantityError> {
    if text.len() > LONGEST {
        return Err(wrong(text, "is too long", dimension));
    }
    let body = plus_or_minus(&clean(text));
    if body.len() == 1 && body.chars().all(|c| c.is_ascii_alphabetic()) {
        return super::letter::tolerance(&body, dimension, nominal);
    }
    let read = match (body.strip_prefix('±'), two_sides(&body)) {
        (Some(size), _) => symmetric(text, size, dimension),
        (None, Some((one, other))) => asymmetric(text, one, other, dimension),
        (None, None) => symmetric(text, &body, dimension),
    };
    let expected = || wrong(text, "", dimension).expected;
    let tolerance = read.map_err(|error| QuantityError {
        expected: expected(),
        ..error
    })?;
    if tolerance.lower.size() == 0.0 && tolerance.upper.size() == 0.0 {
        return Err(wrong(text, "leaves no room at all", dimension));
    }
    Ok(tolerance)
}

/// `+/-` and `+-` as `±`.
pub(super) fn plus_or_minus(text: &str) -> String {
    text.replace("+/-", "±")
        .replace("+ / -", "±")
        .replace("+-", "±")
}

pub(super) fn wrong(text: &str, fault: &str, dimension: Dimension) -> QuantityError {
    let example = match dimension {
        Dimension::Temperature => "±5 °C",
        Dimension::Angle => "±0.05 °",
        _ => "±10 %",
    };
    QuantityError::expecting(text, fault, format!("a tolerance such as `{example}`"))
}

fn symmetric(text: &str, size: &str, dimension: Dimension) -> Result<Tolerance, QuantityError> {
    let size = size.trim();
    if size.starts_with(['+', '-']) {
        let other = if size.starts_with('+') { "-" } else { "+" };
        return Err(wrong(text, "is one side only", dimension).hint(format!(
            "give both: `{size} / {other}0 %`, or `±` for the same both ways"
        )));
    }
    deviation(text, size, "", dimension).map(Tolerance::symmetric)
}

/// Splits `+80 % / -20 %`, `-20/+80 %` or `+80 % -20 %` in two.
fn two_sides(body: &str) -> Option<(&str, &str)> {
    if let Some(sides) = body.split_once('/') {
        return Some(sides);
    }
    let (at, _) = body
        .char_indices()
        .skip(1)
        .find(|(at, c)| matches!(c, '+' | '-') && !super::window::in_exponent(body, *at))?;
    let (one, other) = body.split_at(at);
    let one = one.trim_end_matches([' ', ',', ';', '.']);
    one.starts_with(['+', '-']).then_some((one, other))
}

fn asymmetric(
    text: &str,
    one: &str,
    other: &str,
    dimension: Dimension,
) -> Result<Tolerance, QuantityError> {
    let (one, other) = (one.trim(), other.trim());
    let unit = number::split(other)
        .map(|(_, unit)| unit)
        .unwrap_or_default();
    let first = deviation(text, one, &unit, dimension)?;
    let unit = number::split(one).map(|(_, unit)| unit).unwrap_or_default();
    let second = deviation(text, other, &unit, dimension)?;
    let unsigned =
        |side: &str, deviation: Deviation| !side.starts_with(['+', '-']) && deviation.size() != 0.0;
    if unsigned(one, first) || unsigned(other, second) {
        return Err(wrong(text, "does not say which side is which", dimension)
            .hint("sign both sides: `+80 % / -20 %`"));
    }
    let (lower, upper) = order(first, second)
        .ok_or_else(|| wrong(text, "has no lower and upper side", dimension))?;
    Ok(Tolerance { lower, upper })
}

/// The two as lower and upper, where that can be told without a nominal value.
fn order(first: Deviation, second: Deviation) -> Option<(Deviation, Deviation)> {
    let (a, b) = (first.size(), second.size());
    let same_kind = matches!(
        (first, second),
        (Deviation::Relative(_), Deviation::Relative(_))
            | (Deviation::Absolute(_), Deviation::Absolute(_))
    );
    let across_zero = a * b <= 0.0 || a.is_sign_negative() != b.is_sign_negative();
    if a == b && a != 0.0 || !(same_kind || across_zero) {
        None
    } else if a <= b {
        Some((first, second))
    } else {
        Some((second, first))
    }
}

/// One deviation; `other_unit` is understood where it has none of its own.
fn deviation(
    text: &str,
    side: &str,
    other_unit: &str,
    dimension: Dimension,
) -> Result<Deviation, QuantityError> {
    let (_, unit) = number::split(side).map_err(|fault| number_error(side, fault, dimension))?;
    let whole = if unit.is_empty() {
        format!("{side} {other_unit}")
    } else {
        side.to_string()
    };
    let unit = if unit.is_empty() {
        without_spaces(other_unit)
    } else {
        unit
    };
    let relative = unit::read(&unit, Dimension::Ratio).is_some();
    if relative && dimension == Dimension::Temperature {
        return Err(wrong(
            text,
            "is relative, and a temperature has no natural zero here",
            dimension,
        )
        .hint("give the deviation in degrees Celsius"));
    }
    if relative {
        return parse(&whole, Dimension::Ratio).map(Deviation::Relative);
    }
    if unit.is_empty() && dimension != Dimension::Ratio {
        let hint = format!(
            "write `±{} %`, or the deviation in {}",
            side,
            dimension.unit()
        );
        return Err(wrong(text, "has no unit", dimension).hint(hint));
    }
    parse(&whole, dimension).map(Deviation::Absolute)
}
