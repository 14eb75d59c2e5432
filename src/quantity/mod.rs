//! Quantities as people write them (`4.7 µF`, `4u7`, `±10 %`, `18 °C .. 28 °C`) and SI values.
//!
//! One direction each way: text to a finite `f64` in the SI unit of the expected dimension, and a
//! value to text in engineering notation. Nothing here knows what a limit or a capacitor is.

/// What kind of quantity a field holds, and with it the SI unit of the parsed value.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Dimension {
    /// hertz
    Frequency,
    /// farad
    Capacitance,
    /// ohm
    Resistance,
    /// henry
    Inductance,
    /// volt (a trailing `rms` is understood: `1.0 Vrms`)
    Voltage,
    /// ampere
    Current,
    /// second (`12 h`, `30 min`, `1000 h`)
    Time,
    /// degree Celsius
    Temperature,
    /// dimensionless; `5 %` is 0.05, `200 ppm` is 2e-4
    Ratio,
    /// degree of arc in the text (`0.05 °`), radian as the value
    Angle,
}

/// Why a text is not the quantity that was expected.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct QuantityError {
    /// What was found, in words: "`1 µF` is a capacitance".
    pub found: String,
    /// What was expected, in words: "a frequency such as `1 kHz`".
    pub expected: String,
    /// What to do, where there is something better to say than the two above.
    pub hint: Option<String>,
}

/// One side of a tolerance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Deviation {
    /// Of the nominal value: 0.10 for 10 %.
    Relative(f64),
    /// In the SI unit of the quantity.
    Absolute(f64),
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
    /// The absolute limits around a nominal value, in its unit.
    pub fn limits(&self, nominal: f64) -> (f64, f64) {
        let of = |deviation| match deviation {
            Deviation::Relative(ratio) => nominal * (1.0 + ratio),
            Deviation::Absolute(value) => nominal + value,
        };
        (of(self.lower), of(self.upper))
    }
}

/// Reads one quantity; the value is finite and in the SI unit of `dimension`.
pub fn parse(text: &str, dimension: Dimension) -> Result<f64, QuantityError> {
    let _ = (text, dimension);
    unreachable_yet()
}

/// Reads a tolerance (`±10 %`, `+80 % / -20 %`, `±0.25 pF`, an IEC 60062 letter).
///
/// `nominal` in SI decides what the letters B, C, D, F, G mean for capacitance (pF below 10 pF).
pub fn parse_tolerance(
    text: &str,
    dimension: Dimension,
    nominal: Option<f64>,
) -> Result<Tolerance, QuantityError> {
    let _ = (text, dimension, nominal);
    unreachable_yet()
}

/// Reads a window, `18 °C .. 28 °C` or `1.0 Vrms ± 20 %`: lower and upper limit.
pub fn parse_window(text: &str, dimension: Dimension) -> Result<(f64, f64), QuantityError> {
    let _ = (text, dimension);
    unreachable_yet()
}

/// A value in engineering notation with `digits` significant digits: `4.683 µF`, `12.0 mΩ`.
pub fn engineering(value: f64, unit: &str, digits: usize) -> String {
    let _ = (value, unit, digits);
    String::new()
}

/// A frequency as record keys have it: `1kHz`, `2.5MHz`, `120Hz`.
pub fn frequency_key(hertz: f64) -> String {
    let _ = hertz;
    String::new()
}

fn unreachable_yet<T>() -> Result<T, QuantityError> {
    Err(QuantityError {
        found: String::new(),
        expected: String::new(),
        hint: None,
    })
}
