//! What kind of quantity a field holds.

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

impl Dimension {
    /// Every dimension, in the order of declaration.
    pub const ALL: [Self; 10] = [
        Self::Frequency,
        Self::Capacitance,
        Self::Resistance,
        Self::Inductance,
        Self::Voltage,
        Self::Current,
        Self::Time,
        Self::Temperature,
        Self::Ratio,
        Self::Angle,
    ];

    /// The unit of a parsed value: `Hz`, `F`, `Ω`, `H`, `V`, `A`, `s`, `°C`, `1`, `rad`.
    pub const fn unit(self) -> &'static str {
        match self {
            Self::Frequency => "Hz",
            Self::Capacitance => "F",
            Self::Resistance => "Ω",
            Self::Inductance => "H",
            Self::Voltage => "V",
            Self::Current => "A",
            Self::Time => "s",
            Self::Temperature => "°C",
            Self::Ratio => "1",
            Self::Angle => "rad",
        }
    }

    /// What it is called: `capacitance`.
    pub const fn noun(self) -> &'static str {
        match self {
            Self::Frequency => "frequency",
            Self::Capacitance => "capacitance",
            Self::Resistance => "resistance",
            Self::Inductance => "inductance",
            Self::Voltage => "voltage",
            Self::Current => "current",
            Self::Time => "time",
            Self::Temperature => "temperature",
            Self::Ratio => "ratio",
            Self::Angle => "angle",
        }
    }

    /// The noun with its article: `a capacitance`, `an inductance`.
    pub fn a_noun(self) -> String {
        let article = match self {
            Self::Inductance | Self::Angle => "an",
            _ => "a",
        };
        format!("{article} {}", self.noun())
    }

    /// One of its kind as people write it: `4.7 µF`.
    pub const fn example(self) -> &'static str {
        match self {
            Self::Frequency => "1 kHz",
            Self::Capacitance => "4.7 µF",
            Self::Resistance => "6 mΩ",
            Self::Inductance => "0.8 nH",
            Self::Voltage => "1.0 Vrms",
            Self::Current => "1.5 A",
            Self::Time => "12 h",
            Self::Temperature => "25 °C",
            Self::Ratio => "5 %",
            Self::Angle => "0.05 °",
        }
    }
}
