//! One reading against one bound under a decision rule.
//!
//! JCGM 106:2012 clause 8: the guard band `w = k u` lies inside the limit under guarded acceptance
//! (8.3.2), outside it under guarded rejection (8.3.3), and is nothing under simple acceptance
//! (8.2). A value in the guard band is `undecided`; a value on a limit is inside it.

use super::{PartVerdict, conformance_probability};
use crate::diagnostic::Note;
use crate::limits::{Bound, DecisionRule, DecisionRuleKind, Window};
use crate::readings::{Extremes, Reading, Value};
use serde::{Deserialize, Serialize};

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
    /// Probability that the true value lies within the limits (JCGM 106:2012 clause 7), where the
    /// uncertainty is known.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub conformance_probability: Option<f64>,
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

/// The zone of a known value between optional limits.
///
/// `u` is the standard uncertainty; without one a guarded rule cannot decide and answers
/// `Undecided` unless the value is outside the limit itself under guarded acceptance.
pub fn zone(
    value: f64,
    u: Option<f64>,
    lower: Option<f64>,
    upper: Option<f64>,
    rule: &DecisionRule,
) -> PartVerdict {
    let margin = margin(value, lower, upper);
    let guard = u.map(|u| rule.coverage_factor * u);
    match (rule.kind, guard) {
        _ if margin.is_nan() => PartVerdict::Unmeasured,
        (DecisionRuleKind::SimpleAcceptance, _) => {
            if margin >= 0.0 {
                PartVerdict::Conforming
            } else {
                PartVerdict::Nonconforming
            }
        }
        (DecisionRuleKind::GuardedAcceptance, _) if margin < 0.0 => PartVerdict::Nonconforming,
        (DecisionRuleKind::GuardedRejection, _) if margin >= 0.0 => PartVerdict::Conforming,
        (_, None) => PartVerdict::Undecided,
        (DecisionRuleKind::GuardedAcceptance, Some(w)) => {
            if margin >= w {
                PartVerdict::Conforming
            } else {
                PartVerdict::Undecided
            }
        }
        (DecisionRuleKind::GuardedRejection, Some(w)) => {
            if margin >= -w {
                PartVerdict::Undecided
            } else {
                PartVerdict::Nonconforming
            }
        }
    }
}

/// Distance to the nearest limit, negative outside; infinite without limits.
fn margin(value: f64, lower: Option<f64>, upper: Option<f64>) -> f64 {
    if value.is_nan() {
        return f64::NAN;
    }
    let below = lower.map_or(f64::INFINITY, |l| value - l);
    let above = upper.map_or(f64::INFINITY, |u| u - value);
    below.min(above)
}

/// Judges the reading of a bound: of the lowest and the highest value the one that decides.
pub fn judge_reading(extremes: &Extremes, bound: &Bound, rule: &DecisionRule) -> ReadingRecord {
    if extremes.lowest == extremes.highest {
        return against(&extremes.lowest, bound, bound.lower, bound.upper, rule);
    }
    // A bound over a band: the lowest value meets the lower limit, the highest the upper one.
    let low = bound
        .lower
        .map(|l| against(&extremes.lowest, bound, Some(l), None, rule));
    let high = bound
        .upper
        .map(|u| against(&extremes.highest, bound, None, Some(u), rule));
    let mut chosen = match (low, high) {
        (Some(low), Some(high)) => {
            let worst = PartVerdict::of_all([low.verdict, high.verdict]);
            let nearer =
                low.margin.unwrap_or(f64::INFINITY) <= high.margin.unwrap_or(f64::INFINITY);
            if low.verdict == worst && (high.verdict != worst || nearer) {
                low
            } else {
                high
            }
        }
        (Some(one), None) | (None, Some(one)) => one,
        (None, None) => against(&extremes.highest, bound, None, None, rule),
    };
    chosen.lower = bound.lower;
    chosen.upper = bound.upper;
    chosen
}

fn against(
    reading: &Reading,
    bound: &Bound,
    lower: Option<f64>,
    upper: Option<f64>,
    rule: &DecisionRule,
) -> ReadingRecord {
    let mut record = ReadingRecord {
        value: None,
        standard_uncertainty: reading.standard_uncertainty,
        unit: bound.characteristic.unit().to_owned(),
        lower,
        upper,
        margin: None,
        verdict: PartVerdict::Unmeasured,
        conformance_probability: None,
        frequency: reading.frequency,
        above: None,
        below: None,
        as_measured: None,
        warnings: reading.warnings.clone(),
    };
    match reading.value {
        Value::Known(value) => {
            record.value = Some(value);
            record.verdict = zone(value, reading.standard_uncertainty, lower, upper, rule);
            record.conformance_probability = reading
                .standard_uncertainty
                .and_then(|u| conformance_probability(value, u, Window { lower, upper }));
            record.margin = Some(margin(value, lower, upper)).filter(|m| m.is_finite());
            record.conformance_probability = reading
                .standard_uncertainty
                .and_then(|u| conformance_probability(value, u, Window { lower, upper }));
            if reading.standard_uncertainty.is_none()
                && rule.kind != DecisionRuleKind::SimpleAcceptance
            {
                record.warnings.push(Note::new(
                    "uncertainty_unknown",
                    "the station file states no uncertainty (magnitude, phase), so the guarded decision rule cannot decide",
                ));
            }
        }
        Value::Above(least) => {
            record.above = Some(least);
            // The bound proves conformity to a lower limit, or nonconformity to an upper one.
            record.verdict = match (lower, upper) {
                (_, Some(u)) if least >= u => PartVerdict::Nonconforming,
                (Some(l), None) if least >= l => PartVerdict::Conforming,
                _ => PartVerdict::Unmeasured,
            };
        }
        Value::Below(most) => {
            record.below = Some(most);
            record.verdict = match (lower, upper) {
                (Some(l), _) if most <= l => PartVerdict::Nonconforming,
                (None, Some(u)) if most <= u => PartVerdict::Conforming,
                _ => PartVerdict::Unmeasured,
            };
        }
        Value::Missing => {}
    }
    record
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::readings::{Characteristic, Place};

    fn rule(kind: DecisionRuleKind) -> DecisionRule {
        DecisionRule {
            kind,
            coverage_factor: 2.0,
        }
    }

    #[test]
    fn zones_of_a_two_sided_limit() {
        use DecisionRuleKind::*;
        use PartVerdict::*;
        // Limits [9, 11], u = 0.1, k = 2: guard band 0.2. From the definitions of JCGM 106:2012 8.2, 8.3.
        let cases = [
            (8.7, [Nonconforming, Nonconforming, Nonconforming]),
            (8.85, [Nonconforming, Nonconforming, Undecided]),
            (9.0, [Conforming, Undecided, Conforming]),
            (9.1, [Conforming, Undecided, Conforming]),
            (9.25, [Conforming, Conforming, Conforming]),
            (10.0, [Conforming, Conforming, Conforming]),
            (10.9, [Conforming, Undecided, Conforming]),
            (11.0, [Conforming, Undecided, Conforming]),
            (11.1, [Nonconforming, Nonconforming, Undecided]),
            (11.3, [Nonconforming, Nonconforming, Nonconforming]),
        ];
        for (value, expected) in cases {
            for (kind, verdict) in [SimpleAcceptance, GuardedAcceptance, GuardedRejection]
                .into_iter()
                .zip(expected)
            {
                assert_eq!(
                    zone(value, Some(0.1), Some(9.0), Some(11.0), &rule(kind)),
                    verdict,
                    "{value} {kind:?}"
                );
            }
        }
    }

    #[test]
    fn no_uncertainty_never_conforms_under_guarded_acceptance() {
        assert_eq!(
            zone(
                10.0,
                None,
                Some(9.0),
                None,
                &rule(DecisionRuleKind::GuardedAcceptance)
            ),
            PartVerdict::Undecided
        );
        assert_eq!(
            zone(
                f64::NAN,
                Some(0.1),
                Some(9.0),
                None,
                &rule(DecisionRuleKind::SimpleAcceptance)
            ),
            PartVerdict::Unmeasured
        );
    }

    #[test]
    fn a_resonance_above_the_sweep_conforms_to_a_minimum_that_it_proves() {
        let bound = |lower, upper| Bound {
            key: "srf".into(),
            characteristic: Characteristic::Srf,
            place: Place::Anywhere,
            lower,
            upper,
            nominal: None,
            class: "A".into(),
        };
        let reading = Reading {
            value: Value::Above(65e6),
            standard_uncertainty: None,
            frequency: None,
            warnings: vec![],
        };
        let extremes = Extremes {
            lowest: reading.clone(),
            highest: reading,
        };
        let simple = rule(DecisionRuleKind::SimpleAcceptance);
        assert_eq!(
            judge_reading(&extremes, &bound(Some(50e6), None), &simple).verdict,
            PartVerdict::Conforming
        );
        assert_eq!(
            judge_reading(&extremes, &bound(Some(80e6), None), &simple).verdict,
            PartVerdict::Unmeasured
        );
        assert_eq!(
            judge_reading(&extremes, &bound(Some(50e6), Some(90e6)), &simple).verdict,
            PartVerdict::Unmeasured
        );
        assert_eq!(
            judge_reading(&extremes, &bound(None, Some(60e6)), &simple).verdict,
            PartVerdict::Nonconforming
        );
    }
}
