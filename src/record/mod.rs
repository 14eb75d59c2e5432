//! The lot record: plain values, one JSON form, stable keys.
//!
//! Everything that the terminal, the PDF and the ledger show is in it. Values are SI and unrounded;
//! a value that could not be had is `null`, with a warning that says why.

mod approvals;
mod assemble;
mod canonical;
mod circuit;
mod make;
mod past;

pub use crate::judgement::{AttemptRecord, PartRecord, PartVerdict, ReadingRecord};
pub use crate::lot::{
    ChangeSection, ChartedLot, ClassSection, ClassState, CommonShift, ConditionSection, Findings,
    GroupSection, JointOutlier, JointSection, LotChart, LotVerdict, MixedSection,
    OperatingCharacteristic, Sampling, SetAside, SetSection, Statistics, Step, Switching,
    TrendSection, VariablesSection,
};
pub use approvals::{ApprovalSection, Approvals, SignedNote};
pub use assemble::{Digests, Inputs, method, sha256};
pub use canonical::{from_bytes, to_bytes};
pub use circuit::{CircuitSection, ParameterSection};
pub use make::{Made, Occasion, PartSweep, Refusal, Sources, make};

use crate::diagnostic::Note;
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};

/// The version of the record's shape.
pub const SCHEMA: u32 = 1;

/// A lot record. Field order is the order in the JSON file.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct LotRecord {
    pub schema: u32,
    /// The record's identity: the lot's number and a digest of everything the verdict rests on.
    pub record: String,
    /// When the record was made, RFC 3339 with offset.
    pub issued: String,
    /// The record of the same lot that was made before this one, from other inputs.
    #[serde(default)]
    pub supersedes: Option<String>,
    pub program: Program,
    /// Where the site has a site file.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub site: Option<SiteSection>,
    /// Approvals in force of the files that the lot was judged by.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub approvals: Vec<ApprovalSection>,
    pub lot: LotSection,
    pub limits: LimitsSection,
    pub station: StationSection,
    pub verdict: LotVerdict,
    /// Why, most important first. An accepted lot has one reason too: what it satisfied.
    pub reasons: Vec<Note>,
    /// What a reader should know though it decided nothing.
    pub warnings: Vec<Note>,
    /// The chain from numbers to verdict: rule, source, numbers, result.
    #[serde(default)]
    pub explanation: Vec<Step>,
    pub sampling: Sampling,
    /// By characteristic key, in the order of the limit file.
    pub statistics: IndexMap<String, Statistics>,
    /// The equivalent circuit of the lot's median part, where there is one.
    #[serde(default)]
    pub circuit: Option<CircuitSection>,
    /// What lot rules found beside.
    #[serde(default, skip_serializing_if = "Findings::is_empty")]
    pub findings: Findings,
    /// In measuring order.
    pub parts: Vec<PartRecord>,
}

#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct Program {
    pub name: String,
    pub version: String,
}

/// The site file in force.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct SiteSection {
    /// Its name.
    pub site: String,
    /// Whether it demands approvals: `required`, `optional`.
    pub approval: String,
    pub sha256: String,
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
    /// What the operator's run says, where there was one.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub run: Option<RunSection>,
    /// Of lot.yaml.
    pub sha256: String,
}

/// What the operator's run says of the lot.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct RunSection {
    /// The seed that the positions along the reel were drawn with.
    pub seed: Option<u64>,
    /// Every scan as typed, where the label came in more than one.
    pub scans: Vec<String>,
    /// Everybody who measured, in order.
    pub operators: Vec<String>,
    /// The last good check of the jig.
    pub jig_checked: Option<String>,
    pub set_aside: Vec<SetAside>,
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
