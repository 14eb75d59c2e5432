//! Unit symbols and prefixes (SI Brochure, 9th edition, tables 2, 4, 7 and 8) and the trade's
//! other spellings of them.
//!
//! `m` and `M` are never taken for each other. Where the unit's own letters are in the wrong case
//! (`mhz`, `MOHM`) the case of the prefix proves nothing, and the text is refused with a hint.

use super::Dimension;
use std::f64::consts::PI;

/// What to multiply a number by: 10^`exponent` × `factor`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Unit {
    pub exponent: i32,
    pub factor: f64,
}

const fn ten_to(exponent: i32) -> Unit {
    Unit {
        exponent,
        factor: 1.0,
    }
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
    allows(dimension, exponent).then(|| ten_to(exponent))
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

/// Exponent of a prefix symbol. `K`, `U`, `N` and `P` are how upper-case-only systems print
/// kilo, micro, nano and pico (common practice, no source).
fn prefix_exponent(prefix: &str) -> Option<i32> {
    Some(match prefix {
        "" => 0,
        "f" => -15,
        "p" | "P" => -12,
        "n" | "N" => -9,
        "µ" | "u" | "U" => -6,
        "m" => -3,
        "k" | "K" => 3,
        "M" => 6,
        "G" => 9,
        "T" => 12,
        _ => return None,
    })
}

fn prefix_word(prefix: &str) -> Option<i32> {
    Some(match prefix {
        "femto" => -15,
        "pico" => -12,
        "nano" => -9,
        "micro" => -6,
        "milli" => -3,
        "kilo" => 3,
        "mega" => 6,
        "giga" => 9,
        _ => return None,
    })
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

/// A unit that takes prefixes, and those it refuses because the case of its letters is wrong.
struct Symbol {
    text: &'static str,
    factor: f64,
    refuses: &'static [&'static str],
}

const fn symbol(text: &'static str) -> Symbol {
    refusing(text, &[])
}

const fn refusing(text: &'static str, refuses: &'static [&'static str]) -> Symbol {
    Symbol {
        text,
        factor: 1.0,
        refuses,
    }
}

const fn degree(text: &'static str) -> Symbol {
    Symbol {
        text,
        factor: PI / 180.0,
        refuses: &[],
    }
}

fn symbols(dimension: Dimension) -> &'static [Symbol] {
    const FREQUENCY: &[Symbol] = &[
        symbol("Hz"),
        symbol("hertz"),
        refusing("hz", &["m"]),
        refusing("HZ", &["m"]),
    ];
    const CAPACITANCE: &[Symbol] = &[
        symbol("F"),
        symbol("farad"),
        symbol("farads"),
        refusing("f", &["", "m"]),
    ];
    const RESISTANCE: &[Symbol] = &[
        symbol("Ω"),
        symbol("ohm"),
        symbol("ohms"),
        symbol("Ohm"),
        symbol("Ohms"),
        symbol("R"),
        refusing("OHM", &["m", "M"]),
        refusing("OHMS", &["m", "M"]),
    ];
    const INDUCTANCE: &[Symbol] = &[symbol("H"), symbol("henry"), symbol("henries")];
    const VOLTAGE: &[Symbol] = &[
        symbol("V"),
        symbol("Vrms"),
        symbol("VRMS"),
        symbol("V(rms)"),
        symbol("Vac"),
        symbol("VAC"),
        symbol("Vdc"),
        symbol("VDC"),
        symbol("volt"),
        symbol("volts"),
    ];
    const CURRENT: &[Symbol] = &[
        symbol("A"),
        symbol("Arms"),
        symbol("ARMS"),
        symbol("A(rms)"),
        symbol("amp"),
        symbol("amps"),
        symbol("ampere"),
        symbol("amperes"),
    ];
    const TIME: &[Symbol] = &[
        symbol("s"),
        symbol("sec"),
        symbol("second"),
        symbol("seconds"),
    ];
    const ANGLE: &[Symbol] = &[
        symbol("rad"),
        degree("°"),
        degree("deg"),
        degree("degree"),
        degree("degrees"),
    ];
    match dimension {
        Dimension::Frequency => FREQUENCY,
        Dimension::Capacitance => CAPACITANCE,
        Dimension::Resistance => RESISTANCE,
        Dimension::Inductance => INDUCTANCE,
        Dimension::Voltage => VOLTAGE,
        Dimension::Current => CURRENT,
        Dimension::Time => TIME,
        Dimension::Angle => ANGLE,
        Dimension::Temperature | Dimension::Ratio => &[],
    }
}

/// Units that take no prefix.
fn whole_units(dimension: Dimension) -> &'static [(&'static str, i32, f64)] {
    match dimension {
        Dimension::Capacitance => &[
            ("mfd", -6, 1.0),
            ("MFD", -6, 1.0),
            ("mmfd", -12, 1.0),
            ("MMFD", -12, 1.0),
        ],
        Dimension::Resistance => &[("megohm", 6, 1.0), ("kilohm", 3, 1.0)],
        Dimension::Time => &[
            ("min", 0, 60.0),
            ("minute", 0, 60.0),
            ("minutes", 0, 60.0),
            ("h", 0, 3600.0),
            ("hr", 0, 3600.0),
            ("hrs", 0, 3600.0),
            ("hour", 0, 3600.0),
            ("hours", 0, 3600.0),
            ("d", 0, 86_400.0),
            ("day", 0, 86_400.0),
            ("days", 0, 86_400.0),
            ("week", 0, 604_800.0),
            ("weeks", 0, 604_800.0),
        ],
        Dimension::Temperature => &[
            ("°C", 0, 1.0),
            ("C", 0, 1.0),
            ("degC", 0, 1.0),
            ("celsius", 0, 1.0),
            ("Celsius", 0, 1.0),
        ],
        Dimension::Ratio => RATIO,
        _ => &[],
    }
}

const RATIO: &[(&str, i32, f64)] = &[
    ("%", -2, 1.0),
    ("percent", -2, 1.0),
    ("%RH", -2, 1.0),
    ("%rh", -2, 1.0),
    ("‰", -3, 1.0),
    ("ppm", -6, 1.0),
    ("ppb", -9, 1.0),
];
