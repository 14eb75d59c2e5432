//! The lot: its identity as `lot.yaml` states it, and its judgement from parts, plan and statistics.
//!
//! No files, no clock: what a lot comes to depends on the arguments alone.

mod bench_run;
mod capability;
mod conditions;
mod curve;
mod explain;
mod history;
mod outliers;
mod rules;
mod sampling;
mod statistics;
mod switching;
mod variables;
mod verdict;

pub use bench_run::{Aside, BenchRun, SEED_MAX, SetAside};
pub use capability::{Indices, NormalitySection, PercentileSection, ToleranceSection};
pub use conditions::ConditionSection;
pub use curve::OperatingCharacteristic;
pub use explain::Step;
pub use history::{History, PastCharacteristic, PastClass, PastLot, SeveritySet};
pub use rules::{
    ChartedLot, Common, CommonShift, Findings, GroupSection, JointOutlier, JointSection, LotChart,
    LotSeries, MixedSection, Shift, TrendSection, common_shift,
};
pub use sampling::{ClassSection, Plan, PlanClass, Sampling, plan, plan_in_state};
pub use statistics::{Statistics, statistics};
pub use switching::{ChangeSection, ClassState, SetSection, Switching, severity_state};
pub use variables::VariablesSection;
pub use verdict::{LotJudgement, LotVerdict, NOT_APPROVED, judge};

mod file;

pub use file::{SCHEMA, read};

use chrono::{DateTime, FixedOffset, NaiveDateTime};

/// A lot as its `lot.yaml` describes it.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Lot {
    pub lot: String,
    pub part: String,
    pub supplier: Option<String>,
    /// Parts on the reel, at least 1.
    pub quantity: u64,
    pub date_code: Option<String>,
    pub order: Option<String>,
    /// The scan as typed by the scanner.
    pub label: Option<String>,
    pub operator: Option<String>,
    pub station: String,
    pub measured: DateTime<FixedOffset>,
    /// °C
    pub temperature: Option<f64>,
    /// Ratio, 0 to 1.
    pub humidity: Option<f64>,
    /// V rms as set by the operator.
    pub drive: Option<f64>,
    /// When the parts were last heated above the Curie range; a bare date is its midnight.
    pub last_heat: Option<NaiveDateTime>,
    /// A folder or a file, relative to the lot folder.
    pub sweeps: String,
    /// What the operator's run says.
    pub run: BenchRun,
}

impl Lot {
    /// Hours from last heat to the measurement, where last heat is known. Both are read on the
    /// clock of the place of measurement.
    pub fn age_hours(&self) -> Option<f64> {
        let heat = self.last_heat?;
        let age = self.measured.naive_local().signed_duration_since(heat);
        Some(age.num_milliseconds() as f64 / 3.6e6)
    }
}
