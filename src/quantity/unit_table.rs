//! The tables of units and prefixes.

use super::Dimension;
use std::f64::consts::PI;

/// Exponent of a prefix symbol. `K`, `U`, `N` and `P` are how upper-case-only systems print
/// kilo, micro, nano and pico (common practice, no source).
pub(super) fn prefix_exponent(prefix: &str) -> Option<i32> {
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

pub(super) fn prefix_word(prefix: &str) -> Option<i32> {
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

/// A unit that takes prefixes, and those it refuses because the case of its letters is wrong.
pub(super) struct Symbol {
    pub text: &'static str,
    pub factor: f64,
    pub refuses: &'static [&'static str],
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

pub(super) fn symbols(dimension: Dimension) -> &'static [Symbol] {
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
pub(super) fn whole_units(dimension: Dimension) -> &'static [(&'static str, i32, f64)] {
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
