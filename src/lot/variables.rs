//! Acceptance by variables: mean and standard deviation of each characteristic against its limits.
//!
//! ISO 3951-1, s-method: Form k for one limit, the estimated share nonconforming for two. It holds
//! for a normally distributed characteristic only, so that the test of Anderson and Darling stands
//! before it.

use super::LotVerdict;
use super::capability::p_value;
use super::sampling::PlanClass;
use crate::judgement::{PartRecord, PartVerdict};
use crate::limits::{Bound, Limits};
use crate::statistics::normality::anderson_darling;
use crate::statistics::variables::{Form, Plan};
use serde::{Deserialize, Serialize};

/// A p-value below this speaks against normality.
const NORMALITY_ALPHA: f64 = 0.05;

/// One characteristic judged by variables.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct VariablesSection {
    /// Key of the bound.
    pub key: String,
    pub n: u64,
    /// `k` (one limit, Q ≥ k) or `M` (two limits, estimated share ≤ M).
    pub form: Option<String>,
    pub k: f64,
    /// A ratio.
    pub m: f64,
    pub mean: Option<f64>,
    pub standard_deviation: Option<f64>,
    pub q_lower: Option<f64>,
    pub q_upper: Option<f64>,
    /// Estimated share nonconforming, a ratio.
    pub estimated_share: Option<f64>,
    /// Estimated shares below the lower and above the upper limit.
    #[serde(default)]
    pub share_lower: Option<f64>,
    #[serde(default)]
    pub share_upper: Option<f64>,
    /// Whether the AQL one step tighter would accept it too, which the switching score asks for.
    #[serde(default)]
    pub accepted_one_step_tighter: Option<bool>,
    /// A² of the test for normality, mean and standard deviation estimated.
    #[serde(default)]
    pub anderson_darling: Option<f64>,
    /// Of the test for normality.
    pub normality_p_value: Option<f64>,
    /// `accept`, `reject`, or `hold` where it could not be judged by variables.
    pub verdict: LotVerdict,
    /// One sentence.
    pub why: String,
}

/// Judges every bound of a class. The sample is the first n parts; each must have a value.
pub(super) fn judge(
    class: &str,
    plan: &PlanClass,
    limits: &Limits,
    parts: &[PartRecord],
) -> Vec<VariablesSection> {
    let tighter = plan.tighter;
    let Some(plan) = plan.variables else {
        return Vec::new();
    };
    limits
        .bounds
        .iter()
        .filter(|b| b.class == class)
        .map(|bound| of_bound(bound, &plan, tighter.as_ref(), parts))
        .collect()
}

/// The class as a whole: rejected by any characteristic, else not decided by any, else accepted.
pub(super) fn verdict(sections: &[VariablesSection]) -> LotVerdict {
    let any = |verdict| sections.iter().any(|s| s.verdict == verdict);
    if any(LotVerdict::Reject) {
        LotVerdict::Reject
    } else if sections.is_empty() || any(LotVerdict::Hold) {
        LotVerdict::Hold
    } else {
        LotVerdict::Accept
    }
}

/// Whether some characteristic is not fit for sampling by variables.
pub(super) fn not_normal(sections: &[VariablesSection]) -> bool {
    sections
        .iter()
        .any(|s| s.normality_p_value.is_none_or(|p| p < NORMALITY_ALPHA))
}

fn of_bound(
    bound: &Bound,
    plan: &Plan,
    tighter: Option<&Plan>,
    parts: &[PartRecord],
) -> VariablesSection {
    let sample = usize::try_from(plan.n)
        .unwrap_or(usize::MAX)
        .min(parts.len());
    let values: Vec<f64> = parts[..sample]
        .iter()
        .filter_map(|p| {
            p.readings
                .get(&bound.key)
                .filter(|r| r.verdict != PartVerdict::Unmeasured)?
                .value
        })
        .collect();
    let mut section = VariablesSection {
        key: bound.key.clone(),
        n: plan.n,
        form: None,
        k: plan.k,
        m: plan.m,
        mean: None,
        standard_deviation: None,
        q_lower: None,
        q_upper: None,
        estimated_share: None,
        share_lower: None,
        share_upper: None,
        accepted_one_step_tighter: None,
        anderson_darling: None,
        normality_p_value: None,
        verdict: LotVerdict::Hold,
        why: String::new(),
    };
    match anderson_darling(&values) {
        Ok(test) => {
            section.anderson_darling = Some(test.statistic);
            section.normality_p_value = Some(test.p_value);
        }
        Err(why) => {
            section.why = format!("normality cannot be tested: {}", why.text());
            return section;
        }
    }
    let outcome = match plan.judge(&values, bound.lower, bound.upper) {
        Ok(outcome) => outcome,
        Err(why) => {
            section.why = format!("not judged by variables: {}", why.text());
            return section;
        }
    };
    let finite = |q: Option<f64>| q.filter(|q| q.is_finite());
    section.mean = Some(outcome.mean);
    section.standard_deviation = Some(outcome.standard_deviation);
    (section.q_lower, section.q_upper) = (finite(outcome.q_lower), finite(outcome.q_upper));
    section.estimated_share = Some(outcome.p());
    section.share_lower = bound.lower.map(|_| outcome.p_lower);
    section.share_upper = bound.upper.map(|_| outcome.p_upper);
    section.form = Some(if outcome.form == Form::K { "k" } else { "M" }.to_owned());
    let p = section.normality_p_value.unwrap_or(0.0);
    if p < NORMALITY_ALPHA {
        section.why = format!(
            "not normally distributed (Anderson-Darling {}): sampling by variables does not hold for it",
            p_value(p)
        );
        return section;
    }
    section.accepted_one_step_tighter = tighter.map(|plan| outcome.accepted_by(plan));
    section.verdict = if outcome.accepted {
        LotVerdict::Accept
    } else {
        LotVerdict::Reject
    };
    let sign =
        |accepted: bool, yes: &'static str, no: &'static str| if accepted { yes } else { no };
    section.why = match outcome.form {
        Form::K => {
            let q = outcome.q_lower.or(outcome.q_upper).unwrap_or(f64::NAN);
            format!(
                "Q {q:.3} {} k {:.3}",
                sign(outcome.accepted, "≥", "<"),
                plan.k
            )
        }
        Form::M => format!(
            "estimated share nonconforming {:.3} % {} M {:.3} %",
            100.0 * outcome.p(),
            sign(outcome.accepted, "≤", ">"),
            100.0 * plan.m
        ),
    };
    section
}
