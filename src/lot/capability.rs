//! Capability of one characteristic as the record states it, or why it states none.

use crate::diagnostic::Note;
use crate::limits::Bound;
use crate::station::{Repeatability, Station};
use crate::statistics::Undefined;
use crate::statistics::capability::{
    Capability, cpk_lower_bound, one_sided_lower_bound, worth_stating,
};
use crate::statistics::normality::anderson_darling;
use crate::statistics::percentile::box_cox;
use crate::statistics::summary::moving_range_degrees_of_freedom;
use crate::statistics::tolerance::{distribution_free_size, two_sided_factors};
use serde::{Deserialize, Serialize};

/// Confidence of bounds and of the tolerance interval, one-sided.
const CONFIDENCE: f64 = 0.95;
/// Share of the parts in the tolerance interval that is shown first.
const CONTENT: f64 = 0.95;
/// Content and confidence of the tolerance intervals.
const INTERVALS: [(f64, f64); 3] = [(CONTENT, CONFIDENCE), (0.95, 0.99), (0.99, 0.95)];
/// A p-value below this speaks against a normal distribution.
const NORMALITY_ALPHA: f64 = 0.05;

/// The four indices.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct Indices {
    pub cp: Option<f64>,
    pub cpk: Option<f64>,
    pub pp: Option<f64>,
    pub ppk: Option<f64>,
}

impl Indices {
    /// An index by its name, `cp`, `cpk`, `pp` or `ppk`.
    pub fn get(&self, name: &str) -> Option<f64> {
        match name {
            "cp" => self.cp,
            "cpk" => self.cpk,
            "pp" => self.pp,
            "ppk" => self.ppk,
            _ => None,
        }
    }
}

/// The test for normality of one characteristic, mean and standard deviation estimated.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct NormalitySection {
    /// Values tested.
    pub n: u64,
    /// A² of Anderson and Darling.
    pub a2: f64,
    /// A² (1 + 0.75/n + 2.25/n²), from which the p-value is (D'Agostino and Stephens 1986, Table 4.9).
    pub a2_adjusted: f64,
    #[allow(missing_docs)]
    pub p_value: f64,
}

/// Quantiles of a normal distribution after a Box-Cox transformation, which the percentile indices are of.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct PercentileSection {
    /// λ of y = (x^λ − 1)/λ, or ln x at 0.
    pub exponent: f64,
    /// p-value of the test for normality of the transformed values.
    pub p_value: f64,
    /// 0.135 %, 50 % and 99.865 %.
    pub quantiles: [f64; 3],
}

/// Tolerance intervals: each holds at least that share of the parts with that confidence.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize, Deserialize)]
pub struct ToleranceSection {
    /// Content 95 %, confidence 99 %.
    pub of_95_with_99: Option<[f64; 2]>,
    /// Content 99 %, confidence 95 %.
    pub of_99_with_95: Option<[f64; 2]>,
    /// Factors k of x̄ ± k s: content and confidence 95/95, 95/99, 99/95; null where not by k s.
    pub factors: Option<[f64; 3]>,
}

/// The factors of the tolerance intervals, solved once for the characteristics of a lot that have
/// as many values: they take longer than all the rest of them.
#[derive(Debug, Default)]
pub(super) struct Factor(Option<(u64, Option<[f64; 3]>)>);

impl Factor {
    fn of(&mut self, n: u64) -> Option<[f64; 3]> {
        match self.0 {
            Some((known, factors)) if known == n => factors,
            _ => {
                let factors = two_sided_factors(n, &INTERVALS).ok();
                let factors = factors.and_then(|all| <[f64; 3]>::try_from(all).ok());
                self.0 = Some((n, factors));
                factors
            }
        }
    }
}

/// All that is said of the capability of a characteristic.
#[derive(Debug, Clone, Default)]
pub(super) struct Stated {
    pub(super) sigma_within: Option<f64>,
    pub(super) indices: Indices,
    pub(super) at_least: Option<Indices>,
    pub(super) cpk_lower_95: Option<f64>,
    pub(super) ppk_lower_95: Option<f64>,
    pub(super) pp_percentile: Option<f64>,
    pub(super) ppk_percentile: Option<f64>,
    pub(super) normality: Option<NormalitySection>,
    pub(super) percentile: Option<PercentileSection>,
    pub(super) tolerance_95_95: Option<[f64; 2]>,
    pub(super) tolerance: ToleranceSection,
    pub(super) warnings: Vec<Note>,
}

/// The standard deviation of repeated readings that a station states of a characteristic, at the
/// mean of the lot; `None` where it states none.
pub(super) fn repeatability(station: &Station, bound: &Bound, mean: Option<f64>) -> Option<f64> {
    let of = |(name, _): &&(String, Repeatability)| name == bound.characteristic.name();
    let (_, stated) = station.uncertainty.repeatability.iter().find(of)?;
    match stated {
        Repeatability::Relative(ratio) => mean.map(|mean| ratio * mean.abs()),
        Repeatability::Absolute(value) => Some(*value),
    }
}

/// The capability of values in measuring order.
///
/// An index is given where it is worth stating (see [`worth_stating`]) and null with a warning
/// where not. `mean` and `s` are those of the values; `noise` is the standard deviation of repeated readings.
pub(super) fn of(
    values: &[f64],
    mean: Option<f64>,
    s: Option<f64>,
    bound: &Bound,
    noise: Option<f64>,
    factor: &mut Factor,
) -> Stated {
    let n = values.len() as u64;
    let all = Capability::of(values, bound.lower, bound.upper);
    let mut stated = Stated::default();
    stated.sigma_within = keep(&mut stated.warnings, "sigma_within", all.sigma_within);
    let checked = |sigma: Result<f64, Undefined>, index: Result<f64, Undefined>| {
        let worth = sigma.and_then(|sigma| worth_stating(n, sigma, noise));
        index.and_then(|index| worth.map(|()| index))
    };
    let [cp, cpk, pp, ppk] = [
        ("cp", all.sigma_within, all.cp),
        ("cpk", all.sigma_within, all.cpk),
        ("pp", all.sigma_overall, all.pp),
        ("ppk", all.sigma_overall, all.ppk),
    ]
    .map(|(name, sigma, index)| keep(&mut stated.warnings, name, checked(sigma, index)));
    stated.indices = Indices { cp, cpk, pp, ppk };
    stated.at_least = at_least(&all, n, noise);
    if bound.lower.is_none() || bound.upper.is_none() {
        let why = Undefined::OneSided.text();
        let note = Note::new("one_sided", format!("no cp, no pp: {why}"));
        stated.warnings.push(note);
    }
    stated.cpk_lower_95 = moving_range_degrees_of_freedom(n)
        .ok()
        .zip(cpk)
        .and_then(|(nu, cpk)| cpk_lower_bound(cpk, n, nu, CONFIDENCE).ok());
    stated.ppk_lower_95 = ppk.and_then(|ppk| ppk_lower(ppk, n, bound));
    distribution(&mut stated, values, mean.zip(s), bound, factor);
    stated
}

/// Exact for one limit (noncentral t law); with two, the approximation of Bissell (1990).
fn ppk_lower(ppk: f64, n: u64, bound: &Bound) -> Option<f64> {
    if bound.lower.is_some() && bound.upper.is_some() {
        return cpk_lower_bound(ppk, n, n.saturating_sub(1) as f64, CONFIDENCE).ok();
    }
    one_sided_lower_bound(ppk, n, CONFIDENCE).ok()
}

/// Noise only widens the spread that is seen: where it dominates, the true indices are at least
/// those of the spread that is seen, sampling apart.
fn at_least(all: &Capability, n: u64, noise: Option<f64>) -> Option<Indices> {
    let dominated = |sigma: Result<f64, Undefined>| {
        let worth = sigma.and_then(|sigma| worth_stating(n, sigma, noise));
        matches!(worth, Err(Undefined::MeasurementDominates { .. }))
    };
    let (within, overall) = (dominated(all.sigma_within), dominated(all.sigma_overall));
    let when = |dominated: bool, index: Result<f64, Undefined>| index.ok().filter(|_| dominated);
    (within || overall).then(|| Indices {
        cp: when(within, all.cp),
        cpk: when(within, all.cpk),
        pp: when(overall, all.pp),
        ppk: when(overall, all.ppk),
    })
}

/// What depends on whether the values are normally distributed: the percentile indices and the
/// tolerance interval.
fn distribution(
    stated: &mut Stated,
    values: &[f64],
    moments: Option<(f64, f64)>,
    bound: &Bound,
    factor: &mut Factor,
) {
    let n = values.len() as u64;
    let p = match anderson_darling(values) {
        Ok(test) => {
            stated.normality = Some(NormalitySection {
                n,
                a2: test.statistic,
                a2_adjusted: test.adjusted,
                p_value: test.p_value,
            });
            test.p_value
        }
        Err(why) => {
            let text = format!(
                "no test for normality, no tolerance interval: {}",
                why.text()
            );
            let note = Note::new("normality_undefined", text);
            stated.warnings.push(note);
            return;
        }
    };
    if p >= NORMALITY_ALPHA {
        if let Some((factors, (mean, s))) = factor.of(n).zip(moments) {
            let [first, second, third] = factors.map(|k| [mean - k * s, mean + k * s]);
            stated.tolerance_95_95 = Some(first);
            stated.tolerance = ToleranceSection {
                of_95_with_99: Some(second),
                of_99_with_95: Some(third),
                factors: Some(factors),
            };
        }
        return;
    }
    let low = values.iter().copied().fold(f64::INFINITY, f64::min);
    let high = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let [first, second, third] = INTERVALS.map(|(content, confidence)| {
        let needed = distribution_free_size(content, confidence, true);
        (n >= needed.unwrap_or(u64::MAX)).then_some([low, high])
    });
    stated.tolerance_95_95 = first;
    stated.tolerance = ToleranceSection {
        of_95_with_99: second,
        of_99_with_95: third,
        factors: None,
    };
    let needed = distribution_free_size(CONTENT, CONFIDENCE, true).unwrap_or(u64::MAX);
    let interval = if n >= needed {
        "the tolerance interval is from the smallest to the largest value".to_owned()
    } else {
        format!("no tolerance interval, it would need {needed} values")
    };
    let indices = if stated.indices == Indices::default() {
        String::new()
    } else {
        match percentile(stated, values, bound) {
            Ok(()) => "; pp_percentile and ppk_percentile hold for it better".to_owned(),
            Err(why) => format!("; no indices by percentiles either: {why}"),
        }
    };
    stated.warnings.push(Note::new(
        "not_normal",
        format!(
            "not normally distributed (Anderson-Darling {}), which cp, cpk, pp and ppk assume{indices}; {interval}",
            p_value(p)
        ),
    ));
}

/// Indices by percentiles of a normal distribution after a Box-Cox transformation, if that fits.
fn percentile(stated: &mut Stated, values: &[f64], bound: &Bound) -> Result<(), String> {
    let fit = box_cox(values).map_err(|why| why.text())?;
    if fit.normality.p_value < NORMALITY_ALPHA {
        return Err(format!(
            "no power makes the values normal ({} with the best)",
            p_value(fit.normality.p_value)
        ));
    }
    stated.percentile = Some(PercentileSection {
        exponent: fit.exponent,
        p_value: fit.normality.p_value,
        quantiles: [fit.quantiles.low, fit.quantiles.middle, fit.quantiles.high],
    });
    let indices = fit.quantiles.capability(bound.lower, bound.upper);
    stated.ppk_percentile = Some(indices.ppk.map_err(|why| why.text())?);
    stated.pp_percentile = indices.pp.ok();
    Ok(())
}

fn keep(warnings: &mut Vec<Note>, name: &str, value: Result<f64, Undefined>) -> Option<f64> {
    match value {
        Ok(value) => Some(value),
        // Said once for both: with one limit there is no width to compare the spread with.
        Err(Undefined::OneSided) => None,
        Err(why) => {
            let code = format!("{name}_undefined");
            warnings.push(Note::new(&code, format!("no {name}: {}", why.text())));
            None
        }
    }
}

/// A p-value below a thousandth is said to be so, and not rounded to nothing.
pub(super) fn p_value(p: f64) -> String {
    if p < 1e-3 {
        "p < 0.001".to_owned()
    } else {
        format!("p {p:.3}")
    }
}
