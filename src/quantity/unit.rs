//! Unit symbols and prefixes (SI Brochure, 9th edition, tables 2, 4, 7 and 8) and the trade's
//! other spellings of them.
//!
//! `m` and `M` are never taken for each other. Where the unit's own letters are in the wrong case
//! (`mhz`, `MOHM`) the case of the prefix proves nothing, and the text is refused with a hint.

use super::Dimension;
use super::unit_table::{prefix_exponent, prefix_word, symbols, whole_units};

/// What to multiply a number by: 10^`exponent` × `factor`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Unit {
    pub exponent: i32,
    pub factor: f64,
}

/// Reads a unit (spaces removed, look-alikes mapped) of this dimension.
pub(super) fn read(text: &str, dimension: Dimension) -> Option<Unit> {
    let whole = whole_units(dimension);
    if let Some((_, exponent, factor)) = whole.iter().find(|(name, _, _)| *name == text) {
        return Some(Unit {
            exponent: *exponent,
            factor: *factor,
        });
    }
    symbols(dimension).iter().find_map(|symbol| {
        let prefix = text.strip_suffix(symbol.text)?;
        if symbol.refuses.contains(&prefix) {
            return None;
        }
        let exponent = prefix_exponent(prefix).or_else(|| prefix_word(prefix))?;
        allows(dimension, exponent).then_some(Unit {
            exponent,
            factor: symbol.factor,
        })
    })
}

/// Reads a prefix standing alone for prefix and unit, as IEC 60062 has it for ohms and farads
/// (`100n`, `4k7`); common practice for henries too.
pub(super) fn read_bare_prefix(text: &str, dimension: Dimension) -> Option<Unit> {
    let by_code = matches!(
        dimension,
        Dimension::Capacitance | Dimension::Resistance | Dimension::Inductance
    );
    if !by_code || text.is_empty() || text == "f" {
        return None;
    }
    let exponent = prefix_exponent(text)?;
    allows(dimension, exponent).then_some(Unit {
        exponent,
        factor: 1.0,
    })
}

/// The dimension that a unit text belongs to.
pub(super) fn dimension_of(text: &str) -> Option<Dimension> {
    Dimension::ALL
        .into_iter()
        .find(|dimension| read(text, *dimension).is_some())
}

/// What to write instead of a unit that could not be read.
pub(super) fn advice(text: &str, dimension: Dimension) -> Option<String> {
    let advice = match (dimension, text) {
        (Dimension::Frequency, "mhz" | "mHZ") => "write `MHz` for mega, `mHz` for milli",
        (Dimension::Resistance, "MOHM" | "mOHM" | "MOHMS" | "mOHMS") => {
            "write `mΩ` for milliohm, `MΩ` for megohm"
        }
        (Dimension::Capacitance, "mf" | "mfarad" | "MF" | "Mf" | "M") => {
            "write `µF` for microfarad, `mF` for millifarad"
        }
        (Dimension::Capacitance, "f") => "write `F` for farad",
        (Dimension::Inductance, "M" | "MH") => "write `µH` for microhenry, `mH` for millihenry",
        (Dimension::Voltage, "Vpp" | "Vp-p" | "Vpk" | "Vp" | "mVpp" | "mVpk") => {
            "give the rms value: of a sine it is peak-to-peak / 2.828, or peak / 1.414"
        }
        (Dimension::Time, "m" | "M") => "write `min` for minutes, `ms` for milliseconds",
        (Dimension::Time, "y" | "yr" | "a" | "year" | "years" | "month" | "months") => {
            "its length varies: give days (`d`) or hours (`h`)"
        }
        (Dimension::Temperature, "K" | "°F" | "°" | "degF") => "give degrees Celsius: `25 °C`",
        (Dimension::Ratio, "dB") => "give the ratio in `%`, `ppm` or as a plain number",
        _ => return bare_prefix_advice(text, dimension),
    };
    Some(advice.to_string())
}

fn bare_prefix_advice(text: &str, dimension: Dimension) -> Option<String> {
    let exponent = prefix_exponent(text).filter(|_| !text.is_empty())?;
    let takes_prefix = !matches!(dimension, Dimension::Temperature | Dimension::Ratio);
    (takes_prefix && allows(dimension, exponent))
        .then(|| format!("a prefix needs its unit: `{text}{}`", dimension.unit()))
}

/// No capacitor has kilofarads, but `MF` is an old way to write microfarad: for farad, henry,
/// second and degree of arc only the prefixes that make smaller.
fn allows(dimension: Dimension, exponent: i32) -> bool {
    match dimension {
        Dimension::Capacitance | Dimension::Inductance | Dimension::Time | Dimension::Angle => {
            exponent <= 0
        }
        _ => true,
    }
}
