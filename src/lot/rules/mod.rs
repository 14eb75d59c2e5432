//! The lot rules of a limit file: what each finds, why it holds the lot, and how that came about.

mod capability;
mod common_shift;
mod joint;
mod lot_chart;
mod mixed;
mod outliers;
mod trend;
mod warnings;

pub use common_shift::{Common, CommonShift, LotSeries, Shift, common_shift};
pub use joint::{JointOutlier, JointSection};
pub use lot_chart::{ChartedLot, LotChart};
pub use mixed::{GroupSection, MixedSection};
pub use trend::TrendSection;

use super::explain::Step;
use super::{History, Statistics};
use crate::diagnostic::Note;
use crate::judgement::PartRecord;
use crate::limits::Limits;
use crate::station::Station;
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};

/// Seed of every pseudo-random number of the lot rules: the same parts, the same record.
const SEED: u64 = 20_250_101;

/// What lot rules found that is more than a statistic of one characteristic.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
pub struct Findings {
    /// Outliers by several characteristics together, one a rule.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub joint: Vec<JointSection>,
    /// Two populations, one a characteristic that a rule names.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub mixed: Vec<MixedSection>,
    /// Against the accepted lots before, one a characteristic that a rule names.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub trend: Vec<TrendSection>,
    /// Capacitance and self-resonant frequency together, where no rule looks at them: decides nothing.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub scatter: Option<JointSection>,
    /// Lot means, one chart a characteristic, where accepted lots went before: decide nothing.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub lots: Vec<LotChart>,
    /// The lot against the lots before it on the same station, where its parts have a series circuit.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub common_shift: Option<CommonShift>,
}

impl Findings {
    /// Whether there is nothing to say.
    pub fn is_empty(&self) -> bool {
        *self == Findings::default()
    }
}

/// The outcome of all rules.
#[derive(Debug, Clone, Default)]
pub(super) struct Ruled {
    pub(super) holds: Vec<Note>,
    pub(super) warnings: Vec<Note>,
    pub(super) steps: Vec<Step>,
    pub(super) findings: Findings,
}

/// What the rules look at.
pub(super) struct Judged<'a> {
    /// The lot's number.
    pub(super) lot: &'a str,
    pub(super) limits: &'a Limits,
    pub(super) station: &'a Station,
    pub(super) parts: &'a [PartRecord],
    pub(super) statistics: &'a IndexMap<String, Statistics>,
    pub(super) history: &'a History,
}

/// Every rule, in the order of the documentation.
pub(super) fn evaluate(judged: &Judged) -> Ruled {
    let mut ruled = Ruled::default();
    capability::evaluate(judged, &mut ruled);
    outliers::evaluate(judged, &mut ruled);
    mixed::evaluate(judged, &mut ruled);
    trend::evaluate(judged, &mut ruled);
    ruled.findings.scatter = joint::beside(judged, &ruled.findings.joint);
    ruled.findings.lots = lot_chart::charts(judged);
    common_shift::evaluate(judged, &mut ruled);
    ruled
}
