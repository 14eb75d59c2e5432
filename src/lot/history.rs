//! The lots before this one of the same part and supplier, as far as they bear on it.

use super::{ClassState, LotSeries, LotVerdict};
use crate::statistics::sampling::Severity;
use indexmap::IndexMap;

/// Earlier lots, oldest first. Whoever fills it takes those recorded before this lot.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct History {
    #[allow(missing_docs)]
    pub lots: Vec<PastLot>,
    /// Decisions of the responsible authority on the severity, oldest first.
    pub set: Vec<SeveritySet>,
}

/// A severity that a person set: what went before does not count any more (ISO 2859-1:1999, 9.1 and,
/// after discontinuation, 9.4).
#[derive(Debug, Clone, PartialEq)]
pub struct SeveritySet {
    /// So many of the lots of the history were before it.
    pub after: usize,
    /// For one class; `None` for every one.
    pub class: Option<String>,
    #[allow(missing_docs)]
    pub severity: Severity,
    /// Why, in the person's words.
    pub reason: String,
    /// The code that the site uses for the person.
    pub by: Option<String>,
    /// RFC 3339 with offset.
    pub time: String,
    /// Index of its entry in the ledger.
    pub entry: u64,
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
    /// By variables: every characteristic would have been accepted with the AQL one step tighter too.
    pub accepted_one_step_tighter: bool,
    pub verdict: LotVerdict,
    /// Where the switching rules stood before this lot, as its record has it.
    pub before: Option<ClassState>,
}

/// One characteristic of an earlier lot.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct PastCharacteristic {
    pub n: u64,
    pub mean: f64,
    pub standard_deviation: Option<f64>,
}
