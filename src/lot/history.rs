//! The lots before this one of the same part and supplier, as far as they bear on it.

use super::{LotSeries, LotVerdict};
use crate::statistics::sampling::Severity;
use indexmap::IndexMap;

/// Earlier lots, oldest first. Whoever fills it takes those recorded before this lot.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct History {
    #[allow(missing_docs)]
    pub lots: Vec<PastLot>,
    /// The latest decision of the responsible authority on the severity, if there is one.
    pub set: Option<SeveritySet>,
}

/// A severity that a person set, for every class: what went before does not count any more.
#[derive(Debug, Clone, PartialEq)]
pub struct SeveritySet {
    /// So many of the lots of the history were before it.
    pub after: usize,
    #[allow(missing_docs)]
    pub severity: Severity,
    /// Why, in the person's words.
    pub reason: String,
}

/// One earlier lot.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct PastLot {
    /// Identity of its record.
    pub record: String,
    pub lot: String,
    /// RFC 3339 with offset.
    pub measured: String,
    pub verdict: LotVerdict,
    /// It was measured as demanded: every condition was met.
    pub conditions_met: bool,
    /// The whole sample was presented and measured.
    pub complete: bool,
    pub classes: IndexMap<String, PastClass>,
    /// By key of the bound; only those with a mean.
    pub characteristics: IndexMap<String, PastCharacteristic>,
    /// The station it was measured on.
    pub station: String,
    /// Of the series circuits of its parts.
    pub series: Option<LotSeries>,
}

/// One class of nonconformity of an earlier lot.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct PastClass {
    pub severity: Option<Severity>,
    /// Percent.
    pub aql: Option<f64>,
    /// After arrows.
    pub code_letter: Option<String>,
    pub n: u64,
    pub ac: u64,
    pub nonconforming: u64,
    pub undecided: u64,
    pub by_variables: bool,
    pub verdict: LotVerdict,
}

/// One characteristic of an earlier lot.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct PastCharacteristic {
    pub n: u64,
    pub mean: f64,
    pub standard_deviation: Option<f64>,
}
