//! Units in column headings: `Frequency (kHz)`, `|Z| [mΩ]`, `Phase / rad`, `f_MHz`.
//!
//! A unit that could mean two things (`mhz`, `MF`) is none: the heading then does not match, and
//! the operator is told.

use crate::station::Column;

/// What a unit does to the numbers under it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Unit {
    /// Factor to hertz, ohm, farad, volt, radian, decibel or 1.
    pub scale: f64,
    /// For voltages: whether the unit says peak or rms.
    pub peak: Option<bool>,
}

const fn plain(scale: f64) -> Unit {
    Unit { scale, peak: None }
}

/// A heading taken apart.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Heading {
    /// The name for comparison: without unit, blanks, quotes; lower case; one kind of µ and Ω.
    pub name: String,
    pub unit: Option<Unit>,
}

/// Takes a heading apart as the heading of `column`; what is no unit of its dimension stays in
/// the name.
pub(super) fn split(heading: &str, column: Column) -> Heading {
    let text = heading.trim();
    for (open, close) in [('(', ')'), ('[', ']'), ('{', '}')] {
        if let Some((name, rest)) = text.rsplit_once(open)
            && let Some(inside) = rest.trim_end().strip_suffix(close)
            && let Some(unit) = parse(inside, column)
        {
            return Heading {
                name: compared(name),
                unit: Some(unit),
            };
        }
    }
    // `f / kHz`, `f in kHz`, `f_kHz`, `f kHz`: the last word, where it is a unit.
    let separator = |c: char| matches!(c, '/' | '_' | ',' | ':') || c.is_whitespace();
    if let Some(at) = text.rfind(separator)
        && let Some(last) = text.get(at..).map(|t| t.trim_start_matches(separator))
        && !last.is_empty()
        && let Some(unit) = parse(last, column)
    {
        let name = text
            .get(..at)
            .unwrap_or_default()
            .trim_end_matches(separator);
        if !name.is_empty() {
            return Heading {
                name: compared(name),
                unit: Some(unit),
            };
        }
    }
    if column == Column::Frequency {
        for suffix in ["kHz", "MHz", "GHz", "Hz"] {
            if let Some(name) = text.strip_suffix(suffix)
                && !name.is_empty()
                && !name.ends_with(['m', 'µ', 'μ'])
            {
                return Heading {
                    name: compared(name),
                    unit: parse(suffix, column),
                };
            }
        }
    }
    Heading {
        name: compared(text),
        unit: None,
    }
}

/// A text as headings are compared.
pub(super) fn compared(text: &str) -> String {
    text.chars()
        .filter(|c| !c.is_whitespace() && *c != '"' && *c != '\u{FEFF}')
        .map(one_spelling)
        .flat_map(char::to_lowercase)
        .collect()
}

/// One spelling of the signs that Unicode has twice or more.
fn one_spelling(c: char) -> char {
    match c {
        '\u{03BC}' => '\u{00B5}',
        '\u{2126}' => '\u{03A9}',
        'º' | '˚' => '°',
        '−' => '-',
        c => c,
    }
}

/// A unit of the column's dimension.
pub(super) fn parse(text: &str, column: Column) -> Option<Unit> {
    let text: String = text
        .chars()
        .filter(|c| !c.is_whitespace())
        .map(one_spelling)
        .collect();
    let text = text.as_str();
    match column {
        Column::Frequency => match text {
            "Hz" | "hz" | "HZ" => Some(plain(1.0)),
            "kHz" | "khz" | "KHz" | "KHZ" => Some(plain(1e3)),
            "MHz" | "MHZ" => Some(plain(1e6)),
            "GHz" | "GHZ" | "ghz" => Some(plain(1e9)),
            _ => None,
        },
        Column::Magnitude | Column::Resistance | Column::Reactance | Column::Esr => {
            let prefix = ["Ω", "ohms", "ohm", "Ohms", "Ohm", "OHMS", "OHM"]
                .iter()
                .find_map(|unit| text.strip_suffix(unit))?;
            // In `MOHM` all is upper case, so the M says nothing.
            if prefix == "M" && (text.ends_with("OHM") || text.ends_with("OHMS")) {
                return None;
            }
            prefixed(prefix)
        }
        Column::Capacitance => match text {
            "PF" | "pf" => Some(plain(1e-12)),
            "NF" | "nf" => Some(plain(1e-9)),
            "UF" | "uf" => Some(plain(1e-6)),
            _ => prefixed(text.strip_suffix('F')?).filter(|unit| unit.scale <= 1.0),
        },
        Column::ARe | Column::AIm | Column::BRe | Column::BIm => {
            let lower = text.to_ascii_lowercase();
            let (length, peak) = [("rms", false), ("pk", true), ("peak", true), ("p", true)]
                .iter()
                .find(|(suffix, _)| lower.ends_with(suffix))
                .map_or((0, None), |(suffix, peak)| (suffix.len(), Some(*peak)));
            let volts = text.get(..text.len() - length)?.trim_end_matches('_');
            let unit = prefixed(volts.strip_suffix(['V', 'v'])?)?;
            (unit.scale <= 1e3).then_some(Unit { peak, ..unit })
        }
        Column::Phase => match text.to_lowercase().as_str() {
            "°" | "deg" | "degree" | "degrees" => Some(plain(std::f64::consts::PI / 180.0)),
            "rad" | "radian" | "radians" => Some(plain(1.0)),
            "mrad" => Some(plain(1e-3)),
            _ => None,
        },
        Column::RatioDb => matches!(text, "dB" | "db" | "DB").then_some(plain(1.0)),
        Column::DissipationFactor => match text {
            "1" => Some(plain(1.0)),
            "%" => Some(plain(1e-2)),
            _ => None,
        },
        Column::Part => None,
    }
}

fn prefixed(prefix: &str) -> Option<Unit> {
    let scale = match prefix {
        "" => 1.0,
        "p" => 1e-12,
        "n" => 1e-9,
        "u" | "µ" => 1e-6,
        "m" => 1e-3,
        "k" | "K" => 1e3,
        "M" => 1e6,
        _ => return None,
    };
    Some(plain(scale))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn scale(heading: &str, column: Column) -> (String, Option<f64>) {
        let heading = split(heading, column);
        (heading.name, heading.unit.map(|unit| unit.scale))
    }

    #[test]
    fn units_are_found_in_every_usual_place() {
        let of = |name: &str, scale| (name.to_owned(), Some(scale));
        for heading in [
            "Frequency (kHz)",
            "Frequency [kHz]",
            "frequency / kHz",
            "Frequency_kHz",
            "FREQUENCYkHz",
        ] {
            assert_eq!(
                scale(heading, Column::Frequency),
                of("frequency", 1e3),
                "{heading}"
            );
        }
        assert_eq!(scale("|Z| [mΩ]", Column::Magnitude), of("|z|", 1e-3));
        assert_eq!(scale("|Z| (m\u{2126})", Column::Magnitude), of("|z|", 1e-3));
        assert_eq!(scale("ESR mOhm", Column::Esr), of("esr", 1e-3));
        assert_eq!(scale("Phase (rad)", Column::Phase), of("phase", 1.0));
        assert_eq!(scale("Cs (\u{03BC}F)", Column::Capacitance), of("cs", 1e-6));
        assert_eq!(scale("D (%)", Column::DissipationFactor), of("d", 1e-2));
        assert_eq!(scale("ChA Re (mV)", Column::ARe), of("chare", 1e-3));
        assert_eq!(
            split("A_re_Vpk", Column::ARe).unit.and_then(|u| u.peak),
            Some(true)
        );
        assert_eq!(
            split("A_re (Vrms)", Column::ARe).unit.and_then(|u| u.peak),
            Some(false)
        );
    }

    #[test]
    fn ambiguous_and_foreign_units_stay_in_the_name() {
        for (heading, column) in [
            ("f (mhz)", Column::Frequency),
            ("f (mHz)", Column::Frequency),
            ("f (s)", Column::Frequency),
            ("Z (MOHM)", Column::Magnitude),
            ("Z (dB)", Column::Magnitude),
            ("C (MF)", Column::Capacitance),
            ("Phase (grad)", Column::Phase),
            ("fmHz", Column::Frequency),
        ] {
            assert_eq!(scale(heading, column).1, None, "{heading}");
        }
    }
}
