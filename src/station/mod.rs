//! The measuring station: instrument, jig, method, reference, sweep layout, uncertainty.
//!
//! `Station` exists only valid; it is made by parsing a station file.

mod equipment;
mod layout;
mod read;
mod standards;
mod uncertainty;

pub use read::{SCHEMA, read};
pub use uncertainty::REPEATABLE;

use chrono::{DateTime, FixedOffset, NaiveDate};

/// How the impedance is had from what the instrument delivers.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Method {
    /// The sweep holds the impedance itself.
    Direct,
    /// Two voltage channels across a series reference: `Z = Zref B/(A-B)`.
    SeriesReference,
    /// Part in shunt between two analyser ports.
    ShuntThrough,
    /// Part in series between two analyser ports.
    SeriesThrough,
    /// Part terminating one analyser port.
    Reflection,
}

/// The reference impedance in series with the part: `Zref = R + jωL`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Reference {
    /// Ω, positive.
    pub resistance: f64,
    /// Relative half-width of the resistance (rectangular), 0 where not stated.
    pub tolerance: f64,
    /// H, 0 where not stated.
    pub inductance: f64,
}

/// The measuring instrument and its calibration.
#[derive(Debug, Clone, PartialEq)]
pub struct Instrument {
    /// Asset number.
    pub asset: String,
    /// Day of the last calibration.
    pub calibrated: Option<NaiveDate>,
    /// Last day on which the calibration is valid.
    pub due: Option<NaiveDate>,
}

/// The jig and its last check.
#[derive(Debug, Clone, PartialEq)]
pub struct Jig {
    /// Asset number.
    pub asset: String,
    /// When the jig was last checked.
    pub checked: Option<DateTime<FixedOffset>>,
    /// How long a check holds, in seconds.
    pub valid_for: Option<f64>,
}

/// A column of a sweep file, by what it holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
#[allow(missing_docs)]
pub enum Column {
    Frequency,
    Magnitude,
    Phase,
    Resistance,
    Reactance,
    ARe,
    AIm,
    BRe,
    BIm,
    RatioDb,
    Capacitance,
    Esr,
    DissipationFactor,
    /// The part number in a long table; the heading is `part` unless the layout names another.
    Part,
}

/// How this station's delimited sweep files look: which heading holds which quantity.
#[derive(Debug, Clone, PartialEq)]
pub struct Layout {
    /// Quantity and heading as the file has it; always contains `Frequency` and one complete set.
    pub columns: Vec<(Column, String)>,
    /// True where the station file says the channels are peak values; a level is then divided by √2.
    pub peak: bool,
}

/// One compensation standard as measured on this jig, with what it truly is.
#[derive(Debug, Clone, PartialEq)]
pub struct Standard {
    /// Sweep file, relative to the station file's folder.
    pub sweep: String,
    /// True series resistance in Ω (open: not used).
    pub resistance: f64,
    /// True series inductance in H.
    pub inductance: f64,
    /// True capacitance in F of the open standard; 0 is an ideal open.
    pub capacitance: f64,
}

/// Sweeps of the standards on this jig.
#[derive(Debug, Clone, PartialEq, Default)]
#[allow(missing_docs)]
pub struct Compensation {
    pub open: Option<Standard>,
    pub short: Option<Standard>,
    pub load: Option<Standard>,
}

/// The station's stated standard uncertainties.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Uncertainty {
    /// Relative standard uncertainty of |Z|; `None` where the file states none.
    pub magnitude: Option<f64>,
    /// Standard uncertainty of the phase in radians.
    pub phase: Option<f64>,
    /// Repeatability by characteristic name: standard uncertainty, relative or in the SI unit.
    pub repeatability: Vec<(String, Repeatability)>,
}

/// A repeatability: relative to the value, or absolute in the characteristic's SI unit.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub enum Repeatability {
    Relative(f64),
    Absolute(f64),
}

/// A measuring station as its file describes it.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Station {
    pub name: String,
    pub instrument: Option<Instrument>,
    pub jig: Option<Jig>,
    pub method: Method,
    /// Always present with `Method::SeriesReference`, never otherwise.
    pub reference: Option<Reference>,
    pub layout: Option<Layout>,
    pub compensation: Compensation,
    pub uncertainty: Uncertainty,
}
