//! Lot statistics of a characteristic over the parts that have a value.

use crate::diagnostic::Note;
use crate::judgement::{PartRecord, PartVerdict};
use crate::limits::{Bound, Limits};
use crate::statistics::Undefined;
use crate::statistics::capability::{Capability, cpk_lower_bound};
use crate::statistics::outliers::generalized_esd;
use crate::statistics::summary::{Summary, moving_range_degrees_of_freedom, moving_range_sigma};
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};

/// Confidence of the lower bounds of capability indices, one-sided.
const CONFIDENCE: f64 = 0.95;
/// Significance of the outlier test where no lot rule names one.
const ALPHA: f64 = 0.01;
/// The most outliers looked for in one characteristic.
const OUTLIERS_MAX: usize = 10;

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

impl Statistics {
    /// A capability index by its name, `cp`, `cpk`, `pp` or `ppk`.
    pub fn index(&self, name: &str) -> Option<f64> {
        match name {
            "cp" => self.cp,
            "cpk" => self.cpk,
            "pp" => self.pp,
            "ppk" => self.ppk,
            _ => None,
        }
    }
}

/// The statistics of every bound, in the order of the limit file; parts in measuring order.
pub fn statistics(limits: &Limits, parts: &[PartRecord]) -> IndexMap<String, Statistics> {
    limits
        .bounds
        .iter()
        .map(|bound| (bound.key.clone(), of_bound(bound, limits, parts)))
        .collect()
}

fn of_bound(bound: &Bound, limits: &Limits, parts: &[PartRecord]) -> Statistics {
    let readings = || {
        parts
            .iter()
            .filter_map(|p| p.readings.get(&bound.key).map(|r| (p, r)))
    };
    let valid = || readings().filter(|(_, r)| r.verdict != PartVerdict::Unmeasured);
    let (names, values): (Vec<&str>, Vec<f64>) = valid()
        .filter_map(|(p, r)| r.value.map(|v| (p.part.as_str(), v)))
        .unzip();
    let with = |verdict| readings().filter(|(_, r)| r.verdict == verdict).count() as u64;
    let mut warnings = Vec::new();
    let bounded = valid()
        .filter(|(_, r)| r.above.is_some() || r.below.is_some())
        .count();
    if bounded > 0 {
        warnings.push(Note::new(
            "bounds_left_out",
            format!("{bounded} parts are known only to lie beyond the sweep; the statistics are of the other {}", values.len()),
        ));
    }
    let mut keep = |name: &str, value: Result<f64, Undefined>| match value {
        Ok(value) => Some(value),
        // Said once, below: with one limit there is no width to compare the spread with.
        Err(Undefined::OneSided) => None,
        Err(why) => {
            warnings.push(Note::new(
                &format!("{name}_undefined"),
                format!("no {name}: {}", why.text()),
            ));
            None
        }
    };
    let summary = Summary::of(&values).ok();
    let sigma_within = keep("sigma_within", moving_range_sigma(&values));
    let capability = Capability::of(&values, bound.lower, bound.upper);
    let [cp, cpk, pp, ppk] = [
        ("cp", capability.cp),
        ("cpk", capability.cpk),
        ("pp", capability.pp),
        ("ppk", capability.ppk),
    ]
    .map(|(name, value)| keep(name, value));
    if bound.lower.is_none() || bound.upper.is_none() {
        warnings.push(Note::new(
            "one_sided",
            format!("no cp, no pp: {}", Undefined::OneSided.text()),
        ));
    }
    let n = values.len();
    let lower = |index: Option<f64>, freedom: f64| {
        index.and_then(|index| cpk_lower_bound(index, n as u64, freedom, CONFIDENCE).ok())
    };
    let cpk_lower_95 = moving_range_degrees_of_freedom(n as u64)
        .ok()
        .and_then(|nu| lower(cpk, nu));
    let ppk_lower_95 = lower(ppk, n.saturating_sub(1) as f64);
    let outliers = match generalized_esd(&values, OUTLIERS_MAX.min(n / 4), alpha(bound, limits)) {
        Ok(found) => found
            .outliers
            .iter()
            .map(|i| names[*i].to_owned())
            .collect(),
        Err(why) => {
            warnings.push(Note::new(
                "outliers_undefined",
                format!("no test for outliers: {}", why.text()),
            ));
            Vec::new()
        }
    };
    Statistics {
        n: n as u64,
        mean: summary.as_ref().map(|s| s.mean),
        standard_deviation: summary.as_ref().and_then(|s| s.standard_deviation.ok()),
        minimum: summary.as_ref().map(|s| s.minimum),
        maximum: summary.as_ref().map(|s| s.maximum),
        median: summary.as_ref().map(|s| s.median),
        sigma_within,
        cp,
        cpk,
        pp,
        ppk,
        cpk_lower_95,
        ppk_lower_95,
        outliers,
        nonconforming: with(PartVerdict::Nonconforming),
        undecided: with(PartVerdict::Undecided),
        warnings,
    }
}

/// The significance of the lot rule that names this bound, or the usual one.
fn alpha(bound: &Bound, limits: &Limits) -> f64 {
    limits
        .outlier_rules
        .iter()
        .find(|rule| rule.of.contains(&bound.key))
        .map_or(ALPHA, |rule| rule.alpha)
}
