//! One quantity: a number with a unit.

use super::number::{self, Decimal, NumberFault, OutOfRange};
use super::text::{LONGEST, clean, quote};
use super::{Dimension, QuantityError, capacitance_code, shortest, unit};

/// Reads one quantity; the value is finite and in the SI unit of `dimension`.
///
/// A number with a unit, spaced or not (`4.7 µF`, `4.7uF`, `4.7e-6 F`), or an IEC 60062 code with
/// a letter in place of the decimal point (`4u7`, `2R2`, `R47`, `100n`). A ratio may also be a
/// plain number. The sign is the caller's business.
///
/// # Errors
/// No number, no unit, a unit of another dimension, a decimal comma or thousands separators, or a
/// value outside the range of an `f64`.
pub fn parse(text: &str, dimension: Dimension) -> Result<f64, QuantityError> {
    if text.len() > LONGEST {
        return Err(QuantityError::new(text, "is too long", dimension));
    }
    let cleaned = clean(text);
    let (number, unit) =
        number::split(&cleaned).map_err(|fault| number_error(text, fault, dimension))?;
    let scale = if unit.is_empty() {
        (dimension == Dimension::Ratio).then_some(unit::Unit {
            exponent: 0,
            factor: 1.0,
        })
    } else {
        unit::read(&unit, dimension).or_else(|| unit::read_bare_prefix(&unit, dimension))
    };
    match scale {
        Some(scale) => value(&number, scale).map_err(|range| range_error(text, range, dimension)),
        None => Err(unit_error(text, &unit, dimension)),
    }
}

fn value(number: &Decimal, scale: unit::Unit) -> Result<f64, OutOfRange> {
    let value = number.value(scale.exponent)? * scale.factor;
    if !value.is_finite() {
        Err(OutOfRange::TooLarge)
    } else if value == 0.0 && !number.is_zero() {
        Err(OutOfRange::TooSmall)
    } else {
        Ok(value)
    }
}

fn range_error(text: &str, range: OutOfRange, dimension: Dimension) -> QuantityError {
    let fault = match range {
        OutOfRange::TooLarge => "is too large",
        OutOfRange::TooSmall => "is too small",
    };
    QuantityError::new(text, fault, dimension)
}

/// The error for a text that does not begin with a plain number.
pub(super) fn number_error(text: &str, fault: NumberFault, dimension: Dimension) -> QuantityError {
    let (meant, rest) = match fault {
        NumberFault::None => {
            return QuantityError::new(text, "does not begin with a number", dimension);
        }
        NumberFault::Separators(meant, rest) => (meant, rest),
    };
    let fault = "is not written with a decimal point alone";
    let error = QuantityError::new(text, fault, dimension);
    let whole = |number: &String| quote(format!("{number} {rest}").trim());
    match meant.as_slice() {
        [] => error,
        [one] => error.hint(format!("write {}", whole(one))),
        [one, other, ..] => error.hint(format!(
            "write {} or {}, whichever it is",
            whole(one),
            whole(other)
        )),
    }
}

fn unit_error(text: &str, unit: &str, dimension: Dimension) -> QuantityError {
    if unit.is_empty() {
        return no_unit(text, dimension);
    }
    if let Some(advice) = unit::advice(unit, dimension) {
        let fault = format!("has no clear unit ({})", quote(unit));
        return QuantityError::new(text, &fault, dimension).hint(advice);
    }
    match unit::dimension_of(unit) {
        Some(other) => {
            let error = QuantityError::new(text, &format!("is {}", other.a_noun()), dimension);
            let is_code = dimension == Dimension::Capacitance && unit == "R";
            match code_hint(text) {
                Some(hint) if is_code => error.hint(hint),
                _ => error.hint("check the unit, and whether the value stands at the right key"),
            }
        }
        None => {
            let fault = format!("has an unknown unit, {}", quote(unit));
            QuantityError::new(text, &fault, dimension)
        }
    }
}

fn no_unit(text: &str, dimension: Dimension) -> QuantityError {
    let error = QuantityError::new(text, "has no unit", dimension);
    match code_hint(text) {
        Some(hint) if dimension == Dimension::Capacitance => error.hint(hint),
        _ => error.hint(format!(
            "add the unit, `{}` or a multiple of it",
            dimension.unit()
        )),
    }
}

/// What a marking code would mean, for someone who typed the code itself.
fn code_hint(text: &str) -> Option<String> {
    let values: Vec<String> = capacitance_code(text)
        .into_iter()
        .map(|farads| format!("`{}`", shortest(farads, "F")))
        .collect();
    (!values.is_empty()).then(|| format!("as a marking code it is {}", values.join(" or ")))
}
