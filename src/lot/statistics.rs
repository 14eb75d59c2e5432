//! Lot statistics of a characteristic over the parts that have a value.

use super::capability::{
    self, Factor, Indices, NormalitySection, PercentileSection, ToleranceSection,
};
use super::outliers;
use crate::diagnostic::Note;
use crate::judgement::{PartRecord, PartVerdict, Risks, acceptance_window, global_risks};
use crate::limits::{Bound, Limits, Window};
use crate::station::Station;
use crate::statistics::summary::Summary;
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};

/// Statistics of one characteristic over all parts that have a value.
#[derive(Debug, Clone, PartialEq, Default, Serialize, Deserialize)]
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
    /// Where most of the spread is the measurement's, so that the indices are null: what they are
    /// at least.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub at_least: Option<Indices>,
    /// By percentiles (ISO 22514-2), where the values are not normally distributed.
    #[serde(default)]
    pub pp_percentile: Option<f64>,
    #[serde(default)]
    pub ppk_percentile: Option<f64>,
    /// What the percentile indices are of.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub percentile: Option<PercentileSection>,
    /// Of the test of Anderson and Darling.
    #[serde(default)]
    pub normality_p_value: Option<f64>,
    /// The whole of that test.
    #[serde(default)]
    pub normality: Option<NormalitySection>,
    /// Holds at least 95 % of the parts with a confidence of 95 %.
    #[serde(default)]
    pub tolerance_95_95: Option<[f64; 2]>,
    /// Other contents and confidences.
    #[serde(default)]
    pub tolerance: ToleranceSection,
    /// Probability that a part of such a lot does not conform and is accepted by the decision rule
    /// (JCGM 106:2012, 9.5.2), parts and readings taken as normally distributed.
    #[serde(default)]
    pub consumers_risk: Option<f64>,
    /// Probability that a part of such a lot conforms and is not accepted by the decision rule.
    #[serde(default)]
    pub producers_risk: Option<f64>,
    /// Part numbers.
    pub outliers: Vec<String>,
    pub nonconforming: u64,
    pub undecided: u64,
    /// Why a value above is null.
    pub warnings: Vec<Note>,
}

impl Statistics {
    /// The index that a rule of this name (`cp`, `cpk`, `pp`, `ppk`) is held against: of values
    /// that are not normally distributed, Pp and Ppk by percentiles where they can be had (ISO
    /// 22514-2); what the index is at least, where noise dominates the spread.
    pub fn index(&self, name: &str) -> Option<f64> {
        let by_percentiles = match name {
            "pp" => self.pp_percentile,
            "ppk" => self.ppk_percentile,
            _ => None,
        };
        by_percentiles
            .or_else(|| self.indices().get(name))
            .or_else(|| self.at_least?.get(name))
    }

    fn indices(&self) -> Indices {
        Indices {
            cp: self.cp,
            cpk: self.cpk,
            pp: self.pp,
            ppk: self.ppk,
        }
    }
}

/// The statistics of every bound, in the order of the limit file; parts in measuring order.
pub fn statistics(
    limits: &Limits,
    station: &Station,
    parts: &[PartRecord],
) -> IndexMap<String, Statistics> {
    let mut factor = Factor::default();
    limits
        .bounds
        .iter()
        .map(|bound| {
            (
                bound.key.clone(),
                of_bound(bound, limits, station, parts, &mut factor),
            )
        })
        .collect()
}

fn of_bound(
    bound: &Bound,
    limits: &Limits,
    station: &Station,
    parts: &[PartRecord],
    factor: &mut Factor,
) -> Statistics {
    let readings = || {
        parts
            .iter()
            .filter_map(|p| p.readings.get(&bound.key).map(|r| (p, r)))
    };
    let valid = || readings().filter(|(_, r)| r.verdict != PartVerdict::Unmeasured);
    let (names, values): (Vec<&str>, Vec<f64>) = values(&bound.key, parts).into_iter().unzip();
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
    let summary = Summary::of(&values).ok();
    let mean = summary.as_ref().map(|s| s.mean);
    let standard_deviation = summary.as_ref().and_then(|s| s.standard_deviation.ok());
    let noise = capability::repeatability(station, bound, mean);
    let stated = capability::of(&values, mean, standard_deviation, bound, noise, factor);
    warnings.extend(stated.warnings);
    let outliers = match outliers::of_bound(bound, limits, &values) {
        Ok(found) => {
            let name = |i: &usize| names.get(*i).map(|name| (*name).to_owned());
            found.iter().filter_map(name).collect()
        }
        Err(why) => {
            warnings.push(Note::new(
                "outliers_undefined",
                format!("no test for outliers: {}", why.text()),
            ));
            Vec::new()
        }
    };
    let uncertainties = valid().filter_map(|(_, r)| r.standard_uncertainty);
    let risks = risks(
        bound,
        limits,
        mean.zip(standard_deviation),
        mean_of(uncertainties),
    );
    Statistics {
        n: values.len() as u64,
        mean,
        standard_deviation,
        minimum: summary.as_ref().map(|s| s.minimum),
        maximum: summary.as_ref().map(|s| s.maximum),
        median: summary.as_ref().map(|s| s.median),
        sigma_within: stated.sigma_within,
        cp: stated.indices.cp,
        cpk: stated.indices.cpk,
        pp: stated.indices.pp,
        ppk: stated.indices.ppk,
        cpk_lower_95: stated.cpk_lower_95,
        ppk_lower_95: stated.ppk_lower_95,
        at_least: stated.at_least,
        pp_percentile: stated.pp_percentile,
        ppk_percentile: stated.ppk_percentile,
        percentile: stated.percentile,
        normality_p_value: stated.normality.map(|test| test.p_value),
        normality: stated.normality,
        tolerance_95_95: stated.tolerance_95_95,
        tolerance: stated.tolerance,
        consumers_risk: risks.map(|r| r.consumer),
        producers_risk: risks.map(|r| r.producer),
        outliers,
        nonconforming: with(PartVerdict::Nonconforming),
        undecided: with(PartVerdict::Undecided),
        warnings,
    }
}

/// Parts that have a valid value, with it, in measuring order.
pub(super) fn values<'a>(key: &str, parts: &'a [PartRecord]) -> Vec<(&'a str, f64)> {
    parts
        .iter()
        .filter_map(|part| {
            let reading = part.readings.get(key)?;
            let valid = reading.verdict != PartVerdict::Unmeasured;
            Some((part.part.as_str(), reading.value.filter(|_| valid)?))
        })
        .collect()
}

fn mean_of(values: impl Iterator<Item = f64>) -> Option<f64> {
    let (n, sum) = values.fold((0.0, 0.0), |(n, sum), value| (n + 1.0, sum + value));
    (n > 0.0).then(|| sum / n)
}

/// Risks of the decision rule for a lot of that mean and spread. The spread seen stands for that of
/// the parts: it holds some of the measurement's own, which errs on the side of larger risks.
fn risks(
    bound: &Bound,
    limits: &Limits,
    process: Option<(f64, f64)>,
    u: Option<f64>,
) -> Option<Risks> {
    let tolerance = Window {
        lower: bound.lower,
        upper: bound.upper,
    };
    let (process, u) = process.zip(u)?;
    let acceptance = acceptance_window(tolerance, u, &limits.decision_rule)?;
    global_risks(process, u, tolerance, acceptance)
}
