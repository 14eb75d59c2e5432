//! The option line, `# <unit> <parameter> <format> R <n>`, its items in any order.

use super::tokens::{number, words};
use crate::diagnostic::Note;
use crate::sweep::Parameter;
use crate::sweep::faults::quoted;
use num_complex::Complex64;

/// How a complex number is written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Format {
    /// Real and imaginary part.
    RealImaginary,
    /// Magnitude and angle in degrees.
    MagnitudeAngle,
    /// 20 log₁₀ of the magnitude and angle in degrees.
    DecibelAngle,
}

impl Format {
    pub fn complex(self, first: f64, second: f64) -> Complex64 {
        match self {
            Format::RealImaginary => Complex64::new(first, second),
            Format::MagnitudeAngle => Complex64::from_polar(first, second.to_radians()),
            Format::DecibelAngle => {
                Complex64::from_polar(10f64.powf(first / 20.0), second.to_radians())
            }
        }
    }
}

/// What the option line says.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Options {
    /// Hz of the frequency unit.
    pub hertz: f64,
    pub parameter: Parameter,
    pub format: Format,
    /// Ω; one value, or one a port.
    pub reference: Vec<f64>,
}

impl Default for Options {
    /// `# GHz S MA R 50`, as the format's specification fixes it.
    fn default() -> Self {
        Options {
            hertz: 1e9,
            parameter: Parameter::Scattering,
            format: Format::MagnitudeAngle,
            reference: vec![50.0],
        }
    }
}

/// Reads an option line from behind its `#`.
pub(super) fn read(text: &[u8], line: u32) -> Result<Options, Note> {
    let mut options = Options::default();
    let mut words = words(text).peekable();
    let fault = |found: &[u8], expected: &str| {
        Note::new(
            "option_line",
            format!(
                "line {line}: the option line holds {}, expected {expected}",
                quoted(found)
            ),
        )
    };
    while let Some(word) = words.next() {
        match word.to_ascii_uppercase().as_slice() {
            b"HZ" => options.hertz = 1.0,
            b"KHZ" => options.hertz = 1e3,
            b"MHZ" => options.hertz = 1e6,
            b"GHZ" => options.hertz = 1e9,
            b"S" => options.parameter = Parameter::Scattering,
            b"Y" => options.parameter = Parameter::Admittance,
            b"Z" => options.parameter = Parameter::Impedance,
            b"H" | b"G" => {
                return Err(fault(
                    word,
                    "S, Y or Z parameters (hybrid parameters are not read)",
                ));
            }
            b"RI" => options.format = Format::RealImaginary,
            b"MA" => options.format = Format::MagnitudeAngle,
            b"DB" => options.format = Format::DecibelAngle,
            b"R" => {
                options.reference.clear();
                while let Some(value) = words.peek().and_then(|w| number(w)) {
                    words.next();
                    if value <= 0.0 {
                        return Err(fault(word, "a positive port impedance after R"));
                    }
                    options.reference.push(value);
                }
                if options.reference.is_empty() {
                    return Err(fault(word, "a port impedance in ohm after R"));
                }
            }
            _ => {
                return Err(fault(
                    word,
                    "a frequency unit (Hz, kHz, MHz, GHz), S, Y or Z, a format (RI, MA, DB) and R with the port impedance",
                ));
            }
        }
    }
    Ok(options)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn items_stand_in_any_order_and_have_defaults() {
        assert_eq!(read(b"", 1).expect("valid"), Options::default());
        let options = read(b" r 75 ri z khz", 1).expect("valid");
        assert_eq!(options.hertz, 1e3);
        assert_eq!(options.parameter, Parameter::Impedance);
        assert_eq!(options.format, Format::RealImaginary);
        assert_eq!(options.reference, [75.0]);
        assert_eq!(read(b"R 50 75", 1).expect("valid").reference, [50.0, 75.0]);
    }

    #[test]
    fn what_is_unknown_is_a_fault() {
        for text in ["THz", "R", "R -50", "H", "S RI R fifty"] {
            assert_eq!(
                read(text.as_bytes(), 3).expect_err(text).code,
                "option_line"
            );
        }
    }
}
