//! Figures as the document prints them: one SI prefix a characteristic, decimals from uncertainty.

use crate::quantity::PREFIXES;
use crate::record::{BoundSection, LotRecord, ReadingRecord};

/// How the values of one characteristic are printed.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Scale {
    /// Multiplies an SI value to the printed one.
    factor: f64,
    /// Unit with its prefix: `µF`, `mΩ`, `%`.
    pub unit: String,
    /// Decimals of a value whose own uncertainty is not known.
    pub decimals: usize,
}

/// En dash: no value.
pub(super) const ABSENT: &str = "–";

/// The engineering exponent (a multiple of three) and prefix for a magnitude.
pub(super) fn prefix(magnitude: f64) -> (i32, &'static str) {
    if !(magnitude.is_finite() && magnitude > 0.0) {
        return (0, "");
    }
    // A hair above, so that 1e-6 stored as 9.999…e-7 still is one micro.
    let exponent = ((magnitude * (1.0 + 1e-9)).log10() / 3.0).floor() * 3.0;
    let wanted = exponent.clamp(-15.0, 12.0);
    PREFIXES
        .iter()
        .copied()
        .find(|(e, _)| (f64::from(*e) - wanted).abs() < 0.5)
        .unwrap_or((0, ""))
}

impl Scale {
    /// The scale for a bounded characteristic of a record: prefix from its limits (from its values
    /// where it has none), decimals from the middle standard uncertainty of its readings.
    pub fn of(record: &LotRecord, bound: &BoundSection) -> Scale {
        let readings = || {
            record
                .parts
                .iter()
                .filter_map(|p| p.readings.get(&bound.key))
        };
        Scale::from(
            bound,
            readings().filter_map(|r| r.value),
            readings().filter_map(|r| r.standard_uncertainty),
        )
    }

    fn from(
        bound: &BoundSection,
        values: impl Iterator<Item = f64>,
        uncertainties: impl Iterator<Item = f64>,
    ) -> Scale {
        let largest = [bound.lower, bound.upper, bound.nominal]
            .into_iter()
            .flatten()
            .map(f64::abs)
            .fold(0.0, f64::max);
        let reference = if largest > 0.0 {
            largest
        } else {
            middle(values.map(f64::abs)).unwrap_or(1.0)
        };
        let (factor, unit) = if bound.unit == "1" {
            (100.0, "%".to_owned())
        } else {
            let (exponent, letter) = prefix(reference);
            (10f64.powi(-exponent), format!("{letter}{}", bound.unit))
        };
        let decimals = match middle(uncertainties).and_then(|u| places(u * factor, 2)) {
            Some(decimals) => decimals,
            None => places(reference * factor, 4).unwrap_or(3),
        };
        Scale {
            factor,
            unit,
            decimals,
        }
    }

    /// The scale for one reading alone.
    pub fn of_bound(bound: &BoundSection, reading: &ReadingRecord) -> Scale {
        let uncertainty = reading.standard_uncertainty.into_iter();
        Scale::from(bound, reading.value.into_iter(), uncertainty)
    }

    /// A value in the printed unit.
    pub fn scaled(&self, value: f64) -> f64 {
        value * self.factor
    }

    /// A value to the scale's decimals.
    pub fn figure(&self, value: f64) -> String {
        fixed(self.scaled(value), self.decimals)
    }

    /// A value to more decimals than a single reading has: a mean of many.
    pub fn finer(&self, value: f64) -> String {
        fixed(self.scaled(value), self.decimals + 1)
    }

    /// A reading, rounded to two significant digits of its standard uncertainty, and that uncertainty.
    pub fn reading(&self, value: f64, uncertainty: Option<f64>) -> String {
        let spread = uncertainty.filter(|u| u.is_finite() && *u > 0.0);
        match spread.and_then(|u| places(u * self.factor, 2).map(|d| (u, d))) {
            Some((u, decimals)) => format!(
                "{} ± {}",
                fixed(self.scaled(value), decimals),
                fixed(u * self.factor, decimals)
            ),
            None => self.figure(value),
        }
    }

    /// A limit or nominal value as written: all its digits (up to nine), no trailing zeros.
    pub fn exact(&self, value: f64) -> String {
        plain(self.scaled(value))
    }

    /// A standard deviation or a margin: three significant digits.
    pub fn spread(&self, value: f64) -> String {
        significant(self.scaled(value), 3)
    }
}

/// Decimals that show `digits` significant digits of a value, at most 7; `None` for zero.
fn places(value: f64, digits: i32) -> Option<usize> {
    if !(value.is_finite() && value.abs() > 0.0) {
        return None;
    }
    // Rounding may carry into the next decade: 0.0996 to two digits is 0.10.
    let rounded: f64 = format!("{:.*e}", usize::try_from(digits - 1).ok()?, value.abs())
        .parse()
        .ok()?;
    let decade = format!("{:.0}", rounded.log10().floor())
        .parse::<i32>()
        .ok()?;
    usize::try_from((digits - 1 - decade).clamp(0, 7)).ok()
}

/// A number to so many decimals with a true minus; one that would show as zero or is very large
/// is written with an exponent, and only zero is ever printed as zero.
pub(super) fn fixed(value: f64, decimals: usize) -> String {
    if !value.is_finite() {
        return ABSENT.to_owned();
    }
    let vanishes = value != 0.0 && value.abs() < 0.5 * 10f64.powi(-as_i32(decimals));
    if vanishes || value.abs() >= 1e7 {
        return minus(&format!("{value:.2e}"));
    }
    minus(&format!("{:.*}", decimals, value + 0.0))
}

/// A number to so many significant digits.
pub(super) fn significant(value: f64, digits: i32) -> String {
    match places(value, digits) {
        Some(decimals) => fixed(value, decimals),
        None => fixed(value, 0),
    }
}

/// A probability or the like: two significant digits; what is below a ten-thousandth is said to be so.
pub(super) fn chance(value: f64) -> String {
    const LEAST: f64 = 1e-4;
    if value > 0.0 && value < LEAST {
        return format!("< {}", plain(LEAST));
    }
    significant(value, 2)
}

/// A number with all its digits up to nine and no trailing zeros.
pub(super) fn plain(value: f64) -> String {
    if !value.is_finite() {
        return ABSENT.to_owned();
    }
    let rounded: f64 = format!("{value:.8e}").parse().unwrap_or(value);
    if rounded != 0.0 && !(1e-4..1e9).contains(&rounded.abs()) {
        return minus(&format!("{rounded:e}"));
    }
    minus(&format!("{rounded}"))
}

fn as_i32(decimals: usize) -> i32 {
    i32::try_from(decimals).unwrap_or(7)
}

fn minus(text: &str) -> String {
    text.replace('-', "−")
}

/// A dimensionless index such as Cpk: two decimals.
pub(super) fn index(value: Option<f64>) -> String {
    value.map_or_else(|| ABSENT.to_owned(), |v| fixed(v, 2))
}

/// The middle value of a set.
fn middle(values: impl Iterator<Item = f64>) -> Option<f64> {
    let mut sorted: Vec<f64> = values.filter(|v| v.is_finite()).collect();
    sorted.sort_by(f64::total_cmp);
    sorted.get(sorted.len() / 2).copied()
}

/// A frequency or impedance at an axis tick or in a sentence: `1 kHz`, `4.7 mΩ`.
pub(super) fn short(value: f64, unit: &str) -> String {
    let (exponent, letter) = prefix(value.abs());
    let scaled = plain_to(value * 10f64.powi(-exponent), 4);
    format!("{scaled} {letter}{unit}")
}

fn plain_to(value: f64, digits: usize) -> String {
    let rounded: f64 = format!("{:.*e}", digits.saturating_sub(1), value)
        .parse()
        .unwrap_or(value);
    minus(&format!("{rounded}"))
}

/// An RFC 3339 instant with a space for the `T`, for people.
pub(super) fn instant(text: &str) -> String {
    match chrono::DateTime::parse_from_rfc3339(text) {
        Ok(t) => t.format("%Y-%m-%d %H:%M:%S %:z").to_string(),
        Err(_) => text.to_owned(),
    }
}

/// A sentence as a document sets it: a capital first, where the first word is a plain one and no
/// name of something, and a full stop.
pub(super) fn sentence(text: &str) -> String {
    let word = text.split(' ').next().unwrap_or_default();
    let plain = word
        .strip_suffix([':', ','])
        .unwrap_or(word)
        .chars()
        .all(|c| c.is_ascii_lowercase());
    let name = matches!(word.trim_end_matches([':', ',']), "srf" | "esr" | "esl");
    let mut out = String::new();
    let mut letters = text.chars();
    if let Some(first) = letters.next() {
        out.push(if plain && !name {
            first.to_ascii_uppercase()
        } else {
            first
        });
    }
    out.extend(letters);
    if !out.is_empty() && !out.ends_with(['.', '!', '?', ':']) {
        out.push('.');
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    fn micro(decimals: usize) -> Scale {
        Scale {
            factor: 1e6,
            unit: "µF".into(),
            decimals,
        }
    }

    #[test]
    fn a_reading_is_rounded_to_two_digits_of_its_uncertainty() {
        assert_eq!(
            micro(3).reading(4.68317e-6, Some(9.9e-9)),
            "4.6832 ± 0.0099"
        );
        assert_eq!(micro(3).reading(4.68317e-6, Some(9.96e-8)), "4.68 ± 0.10");
        assert_eq!(micro(3).reading(4.68317e-6, None), "4.683");
    }

    #[test]
    fn limits_keep_their_digits() {
        assert_eq!(micro(1).exact(4.23e-6), "4.23");
        assert_eq!(micro(1).exact(5.17e-6), "5.17");
        assert_eq!(micro(1).exact(0.0), "0");
        assert_eq!(plain(1.0 / 3.0), "0.333333333");
    }

    #[test]
    fn only_zero_prints_as_zero() {
        assert_eq!(fixed(0.0, 3), "0.000");
        assert_eq!(fixed(0.0001, 3), "1.00e−4");
        assert_eq!(fixed(-0.0004, 3), "−4.00e−4");
        assert_eq!(fixed(f64::NAN, 3), ABSENT);
        assert_eq!(fixed(3.2e9, 1), "3.20e9");
    }

    #[test]
    fn a_sentence_begins_with_a_capital_unless_it_begins_with_a_name() {
        assert_eq!(sentence("class A: 3 of 50"), "Class A: 3 of 50.");
        assert_eq!(sentence("srf: 1 part"), "srf: 1 part.");
        assert_eq!(sentence("esr_minimum is high."), "esr_minimum is high.");
        assert_eq!(sentence("3 of 50"), "3 of 50.");
        assert_eq!(sentence(""), "");
    }

    #[test]
    fn small_chances_are_said_to_be_small() {
        assert_eq!(chance(4.3e-13), "< 0.0001");
        assert_eq!(chance(0.0123), "0.012");
        assert_eq!(chance(0.0), "0");
    }

    #[test]
    fn prefixes_are_engineering_ones() {
        assert_eq!(short(1e3, "Hz"), "1 kHz");
        assert_eq!(short(0.4, "Ω"), "400 mΩ");
        assert_eq!(short(1e-6, "F"), "1 µF");
        assert_eq!(short(2.5e6, "Hz"), "2.5 MHz");
    }
}
