//! Limit files: text to validated `Limits`.
//!
//! `Limits` exists only valid; `read` makes it, or lists every fault of the file. One file for
//! each part of a limit file: `bound`, `conditions`, `acceptance`, `lot_rules`; `stated` compares
//! the nominal value with what code and description say.

mod acceptance;
mod bound;
mod conditions;
mod lot_rules;
mod read;
mod stated;

pub use acceptance::aql_text;
pub use bound::{HIGHEST_FREQUENCY, LOWEST_FREQUENCY};
pub use read::{SCHEMA, read};

use crate::readings::{Characteristic, Equivalent, Place};

/// One bound: what is bounded, where, and the absolute window.
#[derive(Debug, Clone, PartialEq)]
pub struct Bound {
    /// Stable key: `capacitance@1kHz`, `esr_minimum`, `impedance@700kHz..4MHz`.
    pub key: String,
    #[allow(missing_docs)]
    pub characteristic: Characteristic,
    /// Where it is read.
    pub place: Place,
    /// Lower limit in SI units, inclusive.
    pub lower: Option<f64>,
    /// Upper limit in SI units, inclusive. At least one of the two is there.
    pub upper: Option<f64>,
    /// Nominal value, where the file gives one.
    pub nominal: Option<f64>,
    /// Nonconformity class, `A` where the file names none.
    pub class: String,
}

/// A closed window; either side may be open.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct Window {
    pub lower: Option<f64>,
    pub upper: Option<f64>,
}

impl Window {
    /// In words: `0.80 V to 1.20 V`, `at least 18 °C`.
    pub fn words(&self, unit: &str) -> String {
        let text = |value: f64| crate::quantity::engineering(value, unit, 3);
        match (self.lower, self.upper) {
            (Some(l), Some(u)) => format!("{} to {}", text(l), text(u)),
            (Some(l), None) => format!("at least {}", text(l)),
            (None, Some(u)) => format!("at most {}", text(u)),
            (None, None) => "anything".to_owned(),
        }
    }

    /// The same, a millionth of the window's ends counting as inside: levels are printed rounded.
    pub fn contains_nearly(&self, value: f64) -> bool {
        let slack = |limit: f64| 1e-6 * limit.abs();
        self.lower.is_none_or(|l| value >= l - slack(l))
            && self.upper.is_none_or(|u| value <= u + slack(u))
    }

    /// Whether a value lies in the closed window.
    pub fn contains(&self, value: f64) -> bool {
        self.lower.is_none_or(|l| value >= l) && self.upper.is_none_or(|u| value <= u)
    }
}

/// Referral of class 2 capacitance to a referee time since last heat.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Ageing {
    /// Relative loss per decade of hours (0.025 for 2.5 %).
    pub per_decade: f64,
    /// Referee time in seconds.
    pub refer_to: f64,
}

/// How the part must be measured.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Conditions {
    /// V rms across the part at the test frequency.
    pub drive: Option<Window>,
    /// °C
    pub temperature: Option<Window>,
    pub equivalent: Equivalent,
    pub ageing: Option<Ageing>,
    /// Greatest age of the date code at measurement, in seconds.
    pub date_code_age: Option<f64>,
    /// Relative change per kelvin of a characteristic that is bounded: what the uncertainty of the
    /// part's temperature makes of it. Nothing is corrected by it.
    pub temperature_coefficients: Vec<(Characteristic, f64)>,
}

/// Decision rule with measurement uncertainty (JCGM 106:2012 clause 8).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DecisionRule {
    #[allow(missing_docs)]
    pub kind: DecisionRuleKind,
    /// Guard band = coverage factor × standard uncertainty; 2 where the file names none.
    pub coverage_factor: f64,
}

/// The kinds of decision rule.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum DecisionRuleKind {
    SimpleAcceptance,
    GuardedAcceptance,
    GuardedRejection,
}

/// What is done with a class sampled by variables where a characteristic is not normal.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum NotNormal {
    /// A person decides.
    #[default]
    Hold,
    /// The class is judged by attributes, level and AQL unchanged.
    Attributes,
}

impl NotNormal {
    /// As limit files spell it.
    pub fn name(self) -> &'static str {
        match self {
            NotNormal::Hold => "hold",
            NotNormal::Attributes => "attributes",
        }
    }
}

/// How the lot is accepted from its sample.
#[derive(Debug, Clone, PartialEq)]
pub enum Acceptance {
    /// ISO 2859-1 single sampling: inspection level (`S-1`…`S-4`, `I`, `II`, `III`) and AQL in percent by class, in file order.
    #[allow(missing_docs)]
    Attributes {
        level: String,
        aql: Vec<(String, f64)>,
    },
    /// ISO 3951-1, s-method; and what is done where a characteristic is not normally distributed.
    #[allow(missing_docs)]
    Variables {
        level: String,
        aql: Vec<(String, f64)>,
        not_normal: NotNormal,
    },
    /// Sample for zero acceptance: quality limit and consumer's risk as ratios.
    #[allow(missing_docs)]
    ZeroAcceptance {
        quality_limit: f64,
        consumers_risk: f64,
    },
    /// A fixed sample and acceptance number over all classes.
    #[allow(missing_docs)]
    Fixed { sample: u64, accept: u64 },
}

/// A capability demanded of the lot.
#[derive(Debug, Clone, PartialEq)]
pub struct CapabilityRule {
    /// Keys of the bounds it applies to.
    pub of: Vec<String>,
    /// `cp`, `cpk`, `pp` or `ppk`.
    pub index: String,
    #[allow(missing_docs)]
    pub min: f64,
}

/// A test for outliers.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum OutlierMethod {
    /// Several at once (Rosner 1983).
    GeneralizedEsd,
    /// A single one (Grubbs 1969).
    Grubbs,
    /// Beyond 3.5 in units of the median deviation (Iglewicz & Hoaglin 1993).
    ModifiedZ,
    /// Beyond the median ± 6 robust sigmas.
    PartAverage,
    /// By several characteristics together: robust Mahalanobis distance.
    Joint,
}

impl OutlierMethod {
    /// In the order of the documentation.
    pub const ALL: [OutlierMethod; 5] = [
        OutlierMethod::GeneralizedEsd,
        OutlierMethod::Grubbs,
        OutlierMethod::ModifiedZ,
        OutlierMethod::PartAverage,
        OutlierMethod::Joint,
    ];

    /// As limit files spell it.
    pub fn name(self) -> &'static str {
        match self {
            OutlierMethod::GeneralizedEsd => "generalized_esd",
            OutlierMethod::Grubbs => "grubbs",
            OutlierMethod::ModifiedZ => "modified_z",
            OutlierMethod::PartAverage => "part_average",
            OutlierMethod::Joint => "joint",
        }
    }

    /// In words, for a sentence.
    pub fn words(self) -> &'static str {
        match self {
            OutlierMethod::GeneralizedEsd => "generalized ESD",
            OutlierMethod::Grubbs => "Grubbs",
            OutlierMethod::ModifiedZ => "modified z-score above 3.5",
            OutlierMethod::PartAverage => "part-average limits",
            OutlierMethod::Joint => "joint robust distance",
        }
    }

    /// Whether it has a significance level.
    pub fn has_alpha(self) -> bool {
        !matches!(self, OutlierMethod::ModifiedZ | OutlierMethod::PartAverage)
    }
}

/// Outliers allowed in the lot.
#[derive(Debug, Clone, PartialEq)]
pub struct OutlierRule {
    /// Keys of the bounds it applies to: of each by itself, or of all together where joint.
    pub of: Vec<String>,
    #[allow(missing_docs)]
    pub method: OutlierMethod,
    /// Significance level, where the method has one.
    pub alpha: Option<f64>,
    /// How many outliers are allowed for each characteristic; together where joint.
    pub allowed: u64,
}

/// A lot of two populations is held.
#[derive(Debug, Clone, PartialEq)]
pub struct MixedRule {
    /// Keys of the bounds it applies to.
    pub of: Vec<String>,
    /// Significance level of the test for a single peak.
    pub alpha: f64,
}

/// What is done where a rule finds something.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Action {
    Warn,
    Hold,
}

impl Action {
    #[allow(missing_docs)]
    pub const ALL: [Action; 2] = [Action::Warn, Action::Hold];

    /// As limit files spell it.
    pub fn name(self) -> &'static str {
        match self {
            Action::Warn => "warn",
            Action::Hold => "hold",
        }
    }
}

/// A lot unlike the accepted lots before it.
#[derive(Debug, Clone, PartialEq)]
pub struct TrendRule {
    /// Keys of the bounds it applies to.
    pub of: Vec<String>,
    #[allow(missing_docs)]
    pub action: Action,
}

/// How many further tries are allowed after a try with that outcome.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
#[allow(missing_docs)]
pub struct Retest {
    pub unmeasured: u32,
    pub nonconforming: u32,
}

/// A valid limit file.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Limits {
    pub part: String,
    pub revision: String,
    pub description: Option<String>,
    pub conditions: Conditions,
    /// In file order, at least one, keys unique.
    pub bounds: Vec<Bound>,
    pub decision_rule: DecisionRule,
    pub acceptance: Acceptance,
    pub capability_rules: Vec<CapabilityRule>,
    pub outlier_rules: Vec<OutlierRule>,
    pub mixed_rules: Vec<MixedRule>,
    pub trend_rules: Vec<TrendRule>,
    /// Reduced inspection is wanted where the switching rules allow it (ISO 2859-1 9.3.3.1 c).
    pub reduced_inspection: bool,
    pub retest: Retest,
}
