//! The chain from numbers to verdict: each rule with its source, what went in, what came out, so
//! that a person with a calculator can follow.

use super::{ConditionSection, LotVerdict, Plan, PlanClass, Sampling};
use crate::limits::{Bound, DecisionRuleKind, Limits};
use crate::quantity::engineering;
use serde::{Deserialize, Serialize};

/// One step of the chain.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct Step {
    /// What is decided: `code letter`, `class A`, `capacitance@1kHz` …
    pub about: String,
    pub rule: String,
    /// Document and clause or table.
    pub source: String,
    /// What went in.
    pub numbers: String,
    /// What came out.
    pub result: String,
}

pub(super) fn step(about: &str, rule: &str, source: &str, numbers: String, result: String) -> Step {
    Step {
        about: about.to_owned(),
        rule: rule.to_owned(),
        source: source.to_owned(),
        numbers,
        result,
    }
}

/// What the chain is made from.
pub(super) struct Decided<'a> {
    pub(super) limits: &'a Limits,
    pub(super) plan: &'a Plan,
    pub(super) sampling: &'a Sampling,
    /// Of the lot rules.
    pub(super) rules: Vec<Step>,
    pub(super) conditions: &'a [ConditionSection],
    pub(super) verdict: LotVerdict,
}

/// The chain, in the order in which the lot is judged.
pub(super) fn explain(decided: &Decided) -> Vec<Step> {
    let mut steps = conditions(decided.conditions);
    steps.push(decision_rule(decided.limits));
    steps.extend(switching(decided.plan));
    steps.extend(code_letter(decided.plan));
    for (name, class) in &decided.plan.classes {
        steps.push(plan_of(decided.plan, name, class));
        steps.extend(count(decided.sampling, name));
    }
    steps.extend(decided.rules.iter().cloned());
    steps.push(precedence(decided));
    steps
}

fn conditions(conditions: &[ConditionSection]) -> Vec<Step> {
    conditions
        .iter()
        .map(|c| {
            let result = if c.met {
                "met"
            } else {
                "not met: holds the lot"
            };
            step(
                &c.name,
                "the measurement is as demanded",
                "limit file, station file",
                format!("demanded: {}; found: {}", c.demanded, c.found),
                result.to_owned(),
            )
        })
        .collect()
}

fn decision_rule(limits: &Limits) -> Step {
    let k = limits.decision_rule.coverage_factor;
    let (rule, source, result) = match limits.decision_rule.kind {
        DecisionRuleKind::SimpleAcceptance => (
            "a reading conforms inside its limits",
            "JCGM 106:2012, 8.2",
            "no guard band".to_owned(),
        ),
        DecisionRuleKind::GuardedAcceptance => (
            "a reading conforms at least k u inside its limits, is undecided nearer to them",
            "JCGM 106:2012, 8.3.2",
            format!("guard band of {k} standard uncertainties inside each limit"),
        ),
        DecisionRuleKind::GuardedRejection => (
            "a reading is nonconforming more than k u outside its limits, undecided up to there",
            "JCGM 106:2012, 8.3.3",
            format!("guard band of {k} standard uncertainties outside each limit"),
        ),
    };
    step("each part", rule, source, format!("k = {k}"), result)
}

fn switching(plan: &Plan) -> Vec<Step> {
    let classes = plan.switching.iter().flat_map(|s| &s.classes);
    classes
        .map(|(name, state)| {
            let result = if state.discontinued {
                "discontinued: holds the lot".to_owned()
            } else {
                format!("{} inspection", state.severity)
            };
            step(
                &format!("class {name}"),
                "the lots before give the severity of inspection",
                "ISO 2859-1:1999, 9.3 and 9.4",
                state.why.clone(),
                result,
            )
        })
        .collect()
}

fn code_letter(plan: &Plan) -> Option<Step> {
    let letter = plan.code_letter.as_ref()?;
    let level = plan.level.as_deref().unwrap_or("II");
    Some(step(
        "code letter",
        "lot size and inspection level give the code letter",
        "ISO 2859-1:1999, Table 1",
        format!("lot size {}, level {level}", plan.lot_size),
        letter.clone(),
    ))
}

fn plan_of(plan: &Plan, name: &str, class: &PlanClass) -> Step {
    let result = match class.variables {
        Some(v) => format!("n {}, k {:.3}, M {:.3} %", v.n, v.k, 100.0 * v.m),
        None => format!("n {}, Ac {}, Re {}", class.n, class.ac, class.re),
    };
    match (class.aql, &class.code_letter, &plan.code_letter) {
        (Some(aql), Some(used), Some(letter)) => {
            let arrow = if used == letter {
                String::new()
            } else {
                format!(", by the arrow to letter {used}")
            };
            let whole = if class.n >= plan.lot_size {
                ": the whole lot"
            } else {
                ""
            };
            step(
                &format!("class {name}"),
                "code letter, AQL and severity give the plan",
                class
                    .severity
                    .map_or(&plan.source, |severity| severity.table()),
                format!("letter {letter}{arrow}, AQL {aql} %"),
                format!("{result}{whole}"),
            )
        }
        _ => step(
            &format!("class {name}"),
            "the limit file gives the plan",
            &plan.source,
            format!("lot size {}", plan.lot_size),
            result,
        ),
    }
}

fn count(sampling: &Sampling, name: &str) -> Option<Step> {
    let class = sampling.classes.get(name)?;
    if class.by_variables {
        let each: Vec<String> = class
            .variables
            .iter()
            .map(|v| format!("{}: {}", v.key, v.why))
            .collect();
        return Some(step(
            &format!("class {name}"),
            "each characteristic: Q = (distance of the mean to its limit) / s at least k, or the estimated share nonconforming at most M",
            "ISO 3951-1, s-method; normality by Anderson-Darling, p at least 0.05",
            format!("n {}", class.n),
            format!("{}: {}", each.join("; "), class.verdict.name()),
        ));
    }
    let (d, e) = (class.nonconforming, class.undecided);
    let result = match class.verdict {
        LotVerdict::Reject => format!("d {d} ≥ Re {}: reject", class.re),
        LotVerdict::Accept => format!("d + e {} ≤ Ac {}: accept", d + e, class.ac),
        LotVerdict::Hold => format!(
            "d {d} < Re {}, d + e {} > Ac {}: not decided",
            class.re,
            d + e,
            class.ac
        ),
    };
    Some(step(
        &format!("class {name}"),
        "d nonconforming and e undecided parts of the first n: reject from d ≥ Re, accept up to d + e ≤ Ac",
        "ISO 2859-1:1999, 11.1.1; undecided parts counted both ways",
        format!("n {}, d {d}, e {e}", class.n),
        result,
    ))
}

pub(super) fn number(value: Option<f64>, bound: &Bound) -> String {
    value.map_or("–".to_owned(), |v| {
        engineering(v, bound.characteristic.unit(), 5)
    })
}

fn precedence(decided: &Decided) -> Step {
    let unmet = decided.conditions.iter().filter(|c| !c.met).count();
    let classes: Vec<String> = decided
        .sampling
        .classes
        .iter()
        .map(|(name, c)| format!("class {name} {}", c.verdict.name()))
        .collect();
    step(
        "the lot",
        "a condition not met holds; otherwise a class that rejects, rejects; otherwise any other reason holds; otherwise accepted",
        "this program's rule, docs/operator.md",
        format!("{unmet} conditions not met; {}", classes.join(", ")),
        decided.verdict.name().to_owned(),
    )
}
