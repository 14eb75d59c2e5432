//! The measuring station: instrument, jig, method, reference, sweep layout, uncertainty.
//!
//! `Station` exists only valid; it is made by parsing a station file.

mod equipment;
mod jig_check;
mod layout;
mod link;
mod read;
mod standards;
mod uncertainty;
mod watch;

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
    /// Standard uncertainty of the part's temperature in K: of the thermometer, and of how well the
    /// part has taken on what it shows.
    pub temperature: Option<f64>,
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

/// The folder in which the analyser's own software saves sweeps.
#[derive(Debug, Clone, PartialEq)]
pub struct Watch {
    /// As written: absolute, or relative to the site's folder.
    pub folder: String,
    /// File names with `*` and `?`, compared without regard to case; empty: every name that a sweep
    /// file can have.
    pub patterns: Vec<String>,
    /// Seconds that a file must not change where nothing else shows that it is complete.
    pub settle: f64,
    /// Points of a whole sweep.
    pub points: Option<u32>,
}

/// Order of the bytes of a binary number.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum ByteOrder {
    Big,
    Little,
}

/// How the numbers of an answer are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Form {
    /// Decimal numbers with commas between them.
    Ascii,
    /// A block of IEEE 488.2 with IEEE 754 numbers of 32 bits.
    Real32(ByteOrder),
    /// A block of IEEE 488.2 with IEEE 754 numbers of 64 bits.
    Real64(ByteOrder),
}

/// A question whose answer holds numbers of the sweep.
#[derive(Debug, Clone, PartialEq)]
pub struct Answer {
    /// What the numbers are, in turn; `None` is passed over. At least one is not.
    pub quantities: Vec<Option<Column>>,
    /// What is sent.
    pub query: String,
    /// How the answer is written.
    pub form: Form,
}

/// How the instrument shows that it is the one meant.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Identity {
    pub query: String,
    /// What stands somewhere in the answer.
    pub contains: String,
}

/// How the instrument shows that a measurement is finished.
#[derive(Debug, Clone, PartialEq)]
pub struct Wait {
    /// What is asked.
    pub query: String,
    /// The answer that says so.
    pub until: String,
    /// Seconds between two questions, where the answer is another one.
    pub every: f64,
    /// Seconds after which it is given up.
    pub longest: f64,
}

/// How the instrument's errors are read.
#[derive(Debug, Clone, PartialEq)]
pub struct ErrorQueue {
    /// What is asked, until the answer is `none`.
    pub query: String,
    /// What the answer begins with where there is no error.
    pub none: String,
}

/// An instrument that measures over TCP: what is sent to it, and what it answers.
///
/// Messages are those of IEEE 488.2 on a raw socket: lines of ASCII, answers that are lines or
/// blocks.
#[derive(Debug, Clone, PartialEq)]
pub struct InstrumentLink {
    /// Name or address.
    pub host: String,
    /// TCP port.
    pub port: u16,
    /// Seconds within which an answer comes.
    pub timeout: f64,
    /// Whether messages end with carriage return and newline, not with newline alone.
    pub carriage_return: bool,
    /// Asked after connecting.
    pub identity: Option<Identity>,
    /// Sent after connecting.
    pub setup: Vec<String>,
    /// Sent for each part.
    pub trigger: Vec<String>,
    /// Asked after the trigger.
    pub wait: Option<Wait>,
    /// Asked after that. Together `frequency` and one complete set, each quantity once.
    pub read: Vec<Answer>,
    /// Sent after that.
    pub finish: Vec<String>,
    /// Asked after each of these steps.
    pub errors: Option<ErrorQueue>,
    /// Sent when a measurement is broken off.
    pub abort: Vec<String>,
    /// Points of a whole sweep.
    pub points: Option<u32>,
}

/// A value of a reference part with its limits, in the SI unit of the characteristic.
#[derive(Debug, Clone, PartialEq)]
pub struct Known {
    /// Name of the characteristic.
    pub characteristic: String,
    /// Hz; there for the characteristics that need one.
    pub at: Option<f64>,
    /// The value.
    pub value: f64,
    /// Lower limit, not above the value.
    pub lower: f64,
    /// Upper limit, not below the value.
    pub upper: f64,
}

/// A part of known values, kept at the bench.
#[derive(Debug, Clone, PartialEq)]
pub struct ReferencePart {
    /// Asset number.
    pub asset: String,
    /// Last day on which its values hold.
    pub due: Option<NaiveDate>,
    /// At least one.
    pub characteristics: Vec<Known>,
}

/// A limit of the magnitude of the empty or shorted jig.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Standing {
    /// Hz
    pub at: f64,
    /// Ω: at least (open), at most (short).
    pub impedance: f64,
}

/// What is measured to see that the jig is still good; at least one of the three is there.
#[derive(Debug, Clone, PartialEq)]
pub struct JigCheck {
    /// Again after so many parts; `None`: before the lot and at its end only.
    pub every: Option<u32>,
    /// A part of known values.
    pub reference_part: Option<ReferencePart>,
    /// The empty jig.
    pub open: Option<Standing>,
    /// The shorted jig.
    pub short: Option<Standing>,
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
    pub watch: Option<Watch>,
    pub instrument_link: Option<InstrumentLink>,
    pub jig_check: Option<JigCheck>,
}
