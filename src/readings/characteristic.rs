//! What may be bounded, and where in frequency. Names and units only; no numbers are read here.

/// What a limit may bound (ISO 3534-2: characteristic).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Characteristic {
    /// Capacitance in F at a frequency, series or parallel equivalent.
    Capacitance,
    /// Dissipation factor tan δ = R/|X| at a frequency.
    DissipationFactor,
    /// Equivalent series resistance Re Z in Ω at a frequency or over a band.
    Esr,
    /// |Z| in Ω at a frequency or over a band.
    Impedance,
    /// Smallest Re Z in Ω of the sweep or of a band.
    EsrMinimum,
    /// Self-resonant frequency in Hz: reactance from capacitive to inductive.
    Srf,
    /// Equivalent series inductance in H.
    Esl,
    /// Series capacitance in F at 1 kHz of the fitted equivalent circuit's capacitive branch.
    FittedCapacitance,
    /// Frequency-independent series resistance R0 in Ω of the fitted equivalent circuit.
    FittedResistance,
}

/// Where in frequency a characteristic is read.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Place {
    /// At one frequency, Hz.
    At(f64),
    /// Over a band, Hz to Hz.
    Between(f64, f64),
    /// Wherever the sweep has it.
    Anywhere,
}

/// Which equivalent circuit capacitance refers to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Equivalent {
    Series,
    Parallel,
}

impl Characteristic {
    /// The characteristics in the order documents list them.
    pub const ALL: [Characteristic; 9] = [
        Characteristic::Capacitance,
        Characteristic::DissipationFactor,
        Characteristic::Esr,
        Characteristic::Impedance,
        Characteristic::EsrMinimum,
        Characteristic::Srf,
        Characteristic::Esl,
        Characteristic::FittedCapacitance,
        Characteristic::FittedResistance,
    ];

    /// The name in files: `capacitance`, `esr_minimum` …
    pub fn name(self) -> &'static str {
        match self {
            Characteristic::Capacitance => "capacitance",
            Characteristic::DissipationFactor => "dissipation_factor",
            Characteristic::Esr => "esr",
            Characteristic::Impedance => "impedance",
            Characteristic::EsrMinimum => "esr_minimum",
            Characteristic::Srf => "srf",
            Characteristic::Esl => "esl",
            Characteristic::FittedCapacitance => "c_1khz",
            Characteristic::FittedResistance => "r_0",
        }
    }

    /// The name in documents: `dissipation factor`, `ESR minimum`, `SRF` …
    pub fn title(self) -> &'static str {
        match self {
            Characteristic::Capacitance => "capacitance",
            Characteristic::DissipationFactor => "dissipation factor",
            Characteristic::Esr => "ESR",
            Characteristic::Impedance => "impedance",
            Characteristic::EsrMinimum => "ESR minimum",
            Characteristic::Srf => "SRF",
            Characteristic::Esl => "ESL",
            Characteristic::FittedCapacitance => "fitted capacitance at 1 kHz",
            Characteristic::FittedResistance => "fitted series resistance",
        }
    }

    /// The SI unit of a reading: `F`, `Ω`, `Hz`, `H`, or `1` for a ratio.
    pub fn unit(self) -> &'static str {
        match self {
            Characteristic::Capacitance | Characteristic::FittedCapacitance => "F",
            Characteristic::DissipationFactor => "1",
            Characteristic::Esr
            | Characteristic::Impedance
            | Characteristic::EsrMinimum
            | Characteristic::FittedResistance => "Ω",
            Characteristic::Srf => "Hz",
            Characteristic::Esl => "H",
        }
    }

    /// Whether the value is chiefly an angle of Z, so that without a stated uncertainty of the phase
    /// nothing is known of its own.
    pub(super) fn is_phase(self) -> bool {
        matches!(
            self,
            Characteristic::DissipationFactor
                | Characteristic::Esr
                | Characteristic::EsrMinimum
                | Characteristic::Srf
                | Characteristic::FittedResistance
        )
    }

    /// Whether the value is a loss of a passive part: above 0, and small beside |Z|.
    pub(super) fn is_loss(self) -> bool {
        matches!(
            self,
            Characteristic::DissipationFactor | Characteristic::Esr | Characteristic::EsrMinimum
        )
    }
}
