//! The lot record: plain values, one JSON form, stable keys.
//!
//! Everything that the terminal, the PDF and the ledger show is in it. Values are SI and unrounded;
//! a value that could not be had is `null`, with a warning that says why.

use crate::diagnostic::Note;
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};

/// The version of the record's shape.
pub const SCHEMA: u32 = 1;

/// Verdict on a lot.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
#[allow(missing_docs)]
pub enum LotVerdict {
    Accept,
    Reject,
    Hold,
}

/// Verdict on a part, a try or a reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
#[allow(missing_docs)]
pub enum PartVerdict {
    Conforming,
    Nonconforming,
    Undecided,
    Unmeasured,
}

/// A lot record. Field order is the order in the JSON file.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct LotRecord {
    pub schema: u32,
    /// The record's identity: the lot's number and a digest of everything the verdict rests on.
    pub record: String,
    /// When the record was made, RFC 3339 with offset.
    pub issued: String,
    pub program: Program,
    pub lot: LotSection,
    pub limits: LimitsSection,
    pub station: StationSection,
    pub verdict: LotVerdict,
    /// Why, most important first. An accepted lot has one reason too: what it satisfied.
    pub reasons: Vec<Note>,
    /// What a reader should know though it decided nothing.
    pub warnings: Vec<Note>,
    pub sampling: Sampling,
    /// By characteristic key, in the order of the limit file.
    pub statistics: IndexMap<String, Statistics>,
    /// In measuring order.
    pub parts: Vec<PartRecord>,
}

#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct Program {
    pub name: String,
    pub version: String,
}

/// The lot as `lot.yaml` states it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct LotSection {
    pub lot: String,
    pub part: String,
    pub supplier: Option<String>,
    pub quantity: u64,
    pub date_code: Option<String>,
    pub order: Option<String>,
    pub label: Option<String>,
    pub operator: Option<String>,
    pub measured: String,
    /// °C
    pub temperature: Option<f64>,
    /// Ratio.
    pub humidity: Option<f64>,
    /// V rms as set.
    pub drive: Option<f64>,
    pub last_heat: Option<String>,
    pub sweeps: String,
    /// Of lot.yaml.
    pub sha256: String,
}

/// The limit file in force.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct LimitsSection {
    pub part: String,
    pub revision: String,
    pub description: Option<String>,
    pub sha256: String,
    pub decision_rule: String,
    pub coverage_factor: f64,
    /// Sampling plan in words, as `attributes, level II, AQL A 0.65, B 1.5`.
    pub acceptance: String,
    pub characteristics: Vec<BoundSection>,
    pub conditions: Vec<ConditionSection>,
}

/// One bound as resolved to absolute limits.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct BoundSection {
    pub key: String,
    /// For people: `capacitance at 1 kHz`.
    pub name: String,
    /// `F`, `Ω`, `Hz`, `H`, `1`.
    pub unit: String,
    pub class: String,
    pub lower: Option<f64>,
    pub upper: Option<f64>,
    pub nominal: Option<f64>,
    /// Hz; one of `at` and `between`, or neither.
    pub at: Option<f64>,
    pub between: Option<[f64; 2]>,
}

/// A condition that the limit file or the station demands, and what was found.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ConditionSection {
    /// `drive`, `temperature`, `calibration`, `jig check`, `label`, `ageing`.
    pub name: String,
    pub demanded: String,
    pub found: String,
    pub met: bool,
}

/// The station in use.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct StationSection {
    pub station: String,
    pub sha256: String,
    /// `series_reference` …
    pub method: String,
    /// Reference impedance in words, where the method has one.
    pub reference: Option<String>,
    pub instrument: Option<String>,
    pub instrument_calibrated: Option<String>,
    pub instrument_due: Option<String>,
    pub jig: Option<String>,
    pub jig_checked: Option<String>,
    /// Seconds.
    pub jig_valid_for: Option<f64>,
    /// `open, short, load` as used; empty where none.
    pub compensation: Vec<String>,
    /// Stated uncertainties in words, one an entry.
    pub uncertainty: Vec<String>,
}

/// The sampling plan and the counts against it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct Sampling {
    /// `attributes`, `variables`, `zero_acceptance`, `fixed`.
    pub scheme: String,
    pub level: Option<String>,
    /// Of the lot size and level, before arrows.
    pub code_letter: Option<String>,
    pub severity: Option<String>,
    /// Source of the plan, with table or clause.
    pub source: String,
    /// Parts the plan demands: the largest n of its classes.
    pub required: u64,
    /// Parts with a sweep file.
    pub presented: u64,
    /// Parts with a verdict other than `unmeasured`.
    pub measured: u64,
    pub nonconforming: u64,
    pub undecided: u64,
    pub unmeasured: u64,
    /// Nonconforming parts beyond the first `required`.
    pub nonconforming_beyond_sample: u64,
    /// By class; for `fixed` the class `all`.
    pub classes: IndexMap<String, ClassSection>,
}

/// One class of nonconformity against its plan.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ClassSection {
    /// Percent; `null` where the plan has none.
    pub aql: Option<f64>,
    /// After arrows.
    pub code_letter: Option<String>,
    pub n: u64,
    pub ac: u64,
    pub re: u64,
    /// Nonconforming parts within the first n.
    pub nonconforming: u64,
    /// Undecided parts within the first n.
    pub undecided: u64,
    /// `accept`, `reject` or `hold` by this class alone.
    pub verdict: LotVerdict,
}

/// One part.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct PartRecord {
    pub part: String,
    pub verdict: PartVerdict,
    /// Of the most serious nonconformity, where nonconforming.
    pub class: Option<String>,
    /// Every try in order; the part's verdict and readings are of the try marked `counts`.
    pub attempts: Vec<AttemptRecord>,
    pub readings: IndexMap<String, ReadingRecord>,
    pub faults: Vec<Note>,
    pub warnings: Vec<Note>,
}

/// One try at a part.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct AttemptRecord {
    pub attempt: u32,
    pub file: String,
    pub sha256: String,
    pub verdict: PartVerdict,
    pub counts: bool,
    /// What was found out on reading the file.
    pub notes: Vec<Note>,
    pub faults: Vec<Note>,
}

/// One reading against its limits.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ReadingRecord {
    pub value: Option<f64>,
    pub standard_uncertainty: Option<f64>,
    pub unit: String,
    pub lower: Option<f64>,
    pub upper: Option<f64>,
    /// Distance to the nearest limit in the unit of the value, negative outside.
    pub margin: Option<f64>,
    pub verdict: PartVerdict,
    /// Hz: where `esr_minimum` lies, or where in a band the value nearest its limit is.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub frequency: Option<f64>,
    /// The value is known only to lie above this (a self-resonance beyond the sweep).
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub above: Option<f64>,
    /// The value is known only to lie below this.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub below: Option<f64>,
    /// Before referral to the referee time.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub as_measured: Option<f64>,
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub warnings: Vec<Note>,
}

/// Statistics of one characteristic over all parts that have a value.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct Statistics {
    pub n: u64,
    pub mean: Option<f64>,
    /// Divisor n − 1.
    pub standard_deviation: Option<f64>,
    pub minimum: Option<f64>,
    pub maximum: Option<f64>,
    pub median: Option<f64>,
    /// Within-lot sigma: mean moving range / d2, in measuring order.
    pub sigma_within: Option<f64>,
    pub cp: Option<f64>,
    pub cpk: Option<f64>,
    pub pp: Option<f64>,
    pub ppk: Option<f64>,
    pub cpk_lower_95: Option<f64>,
    pub ppk_lower_95: Option<f64>,
    /// Part numbers.
    pub outliers: Vec<String>,
    pub nonconforming: u64,
    pub undecided: u64,
    /// Why a value above is null.
    pub warnings: Vec<Note>,
}
