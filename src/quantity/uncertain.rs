//! A value with its uncertainty.

use super::format::{NO_VALUE, engineering, shortest};
use super::rounded::round;
use super::scale::{divide, scale, scaled_unit};

/// Beyond these a value and its uncertainty are not written out in one prefix.
const MOST_DECIMALS: i32 = 20;
const LARGEST_PLAIN: f64 = 1e15;

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
        let exact = format!("± 0 {}", scaled_unit(scale(value, unit).1, unit));
        return format!("{} {}", shortest(value, unit), exact.trim_end());
    }
    in_one_unit(value, uncertainty, unit).unwrap_or_else(|| {
        let value = shortest(value, unit);
        format!("{value} ± {}", engineering(uncertainty, unit, 2))
    })
}

/// Value and uncertainty under one prefix; not where that would take dozens of digits.
fn in_one_unit(value: f64, uncertainty: f64, unit: &str) -> Option<String> {
    let (factor, prefix) = scale(at_place_of(value, uncertainty), unit);
    let (value, uncertainty) = (divide(value, factor), divide(uncertainty, factor));
    let place = round(uncertainty, 2).exponent - 1;
    if place < -MOST_DECIMALS || value.abs().max(uncertainty) > LARGEST_PLAIN {
        return None;
    }
    let unit = match scaled_unit(prefix, unit) {
        unit if unit.is_empty() => unit,
        unit => format!(" {unit}"),
    };
    let (value, uncertainty) = (to_place(value, place), to_place(uncertainty, place));
    Some(format!("{value}{unit} ± {uncertainty}{unit}"))
}

/// The larger of the value, rounded where its uncertainty is, and the uncertainty: what the
/// common prefix has to fit (999.996 Hz ± 0.12 Hz is in kilohertz once rounded to 1000.00 Hz).
fn at_place_of(value: f64, uncertainty: f64) -> f64 {
    let place = round(uncertainty, 2).exponent - 1;
    let digits = usize::try_from(round(value, 17).exponent - place + 1).unwrap_or(0);
    let rounded = if digits == 0 {
        0.0
    } else {
        round(value, digits).scientific().parse().unwrap_or(value)
    };
    f64::abs(rounded).max(uncertainty)
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
