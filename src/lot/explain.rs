//! The chain from numbers to verdict: each rule with its source, what went in, what came out, so
//! that a person with a calculator can follow.

use super::{
    ChangeSection, ClassSection, ClassState, ConditionSection, LotVerdict, Plan, PlanClass,
    Sampling, VariablesSection,
};
use crate::limits::{Bound, DecisionRuleKind, Limits};
use crate::quantity::engineering;
use crate::statistics::operating_characteristic::{
    acceptance_probability_of_lot, nonconforming_at_limit,
};
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
    /// Codes of every reason, most important first.
    pub(super) reasons: Vec<String>,
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
        steps.extend(operating_characteristic(decided.plan, name, class));
        steps.extend(count(decided, name));
        steps.extend(share(decided, name));
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

/// Each change after the lots in view, then where that leads.
fn switching(plan: &Plan) -> Vec<Step> {
    let classes = plan.switching.iter().flat_map(|s| &s.classes);
    classes
        .flat_map(|(name, state)| {
            let about = format!("class {name}");
            let mut steps: Vec<Step> = state
                .changes
                .iter()
                .map(|change| changed(&about, change))
                .collect();
            steps.push(in_force(&about, state));
            steps
        })
        .collect()
}

fn changed(about: &str, change: &ChangeSection) -> Step {
    let numbers = match (change.lots.as_slice(), &change.after) {
        ([], _) => "a decision, not a count".to_owned(),
        (lots, Some(after)) => format!("{}; the last is {after}", lots.join(", ")),
        (lots, None) => lots.join(", "),
    };
    step(
        about,
        &change.rule,
        &format!("ISO 2859-1:1999, {}", change.clause),
        numbers,
        format!("{} → {}", change.from, change.to),
    )
}

fn in_force(about: &str, state: &ClassState) -> Step {
    let result = if state.discontinued {
        "discontinued: holds the lot".to_owned()
    } else {
        format!("{} inspection", state.severity)
    };
    let since = state
        .lots_since_not_accepted
        .map_or("none not accepted in view".to_owned(), |lots| {
            format!("{lots} since the last one not accepted")
        });
    let counts = match state.severity.as_str() {
        "tightened" => format!(
            "{} accepted in a row of 5, {} not accepted of 5",
            state.accepted_in_row, state.not_accepted
        ),
        "reduced" => "every one accepted".to_owned(),
        _ => format!("switching score {} of 30, {since}", state.score),
    };
    step(
        about,
        "the lots before give the severity of inspection: the score grows by 3 where Ac ≥ 2 and the lot would pass the next tighter AQL, by 2 where Ac ≤ 1 and the lot is accepted, else it falls to 0",
        "ISO 2859-1:1999, 9.3 and 9.4",
        format!("{} lots count; {counts}; {}", state.lots, state.cause),
        result,
    )
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
        _ => match plan.quality_limit {
            Some(limit) => zero_acceptance(plan, name, class, limit),
            None => step(
                &format!("class {name}"),
                "the limit file gives the plan",
                &plan.source,
                format!("lot size {}", plan.lot_size),
                result,
            ),
        },
    }
}

/// The smallest n with Ac 0 that keeps the consumer's risk at the quality limit.
fn zero_acceptance(plan: &Plan, name: &str, class: &PlanClass, (limit, risk): (f64, f64)) -> Step {
    let bad = nonconforming_at_limit(plan.lot_size, limit);
    let at = |n: u64| acceptance_probability_of_lot(plan.lot_size, bad, n, 0);
    let less = class.n.saturating_sub(1);
    step(
        &format!("class {name}"),
        "the smallest n with Ac 0 for which C(N − D, n) / C(N, n), the probability that a lot with D nonconforming parts is accepted, is at most the consumer's risk",
        &plan.source,
        format!(
            "N {}, quality limit {} %, D = {bad}, consumer's risk {} %",
            plan.lot_size,
            percent(limit),
            percent(risk)
        ),
        format!(
            "n {}, Ac 0: probability {:.4}; with n {less} it would be {:.4}",
            class.n,
            at(class.n),
            at(less)
        ),
    )
}

fn percent(ratio: f64) -> f64 {
    (ratio * 1e8).round() / 1e6
}

fn operating_characteristic(plan: &Plan, name: &str, class: &PlanClass) -> Option<Step> {
    let curve = plan.curve(class)?;
    let numbers = match class.variables {
        Some(v) => format!("n {}, k {:.3}", v.n, v.k),
        None => format!("n {}, Ac {}, lot size {}", class.n, class.ac, plan.lot_size),
    };
    Some(step(
        &format!("class {name}"),
        "what the plan protects from: the share nonconforming that is accepted with 95 %, and that with 10 %",
        match curve.law.as_str() {
            "binomial" => "ISO 2859-1:1999, 12 and Table 10: binomial law",
            "hypergeometric" => "hypergeometric law, exact for the lot size",
            _ => "noncentral t law of Form k with one limit (Resnikoff and Lieberman 1957)",
        },
        numbers,
        format!(
            "{:.3} % and {:.3} %",
            100.0 * curve.producers_risk_quality,
            100.0 * curve.consumers_risk_quality
        ),
    ))
}

/// The share of nonconforming parts in the lot that the sample leaves possible.
fn share(decided: &Decided, name: &str) -> Option<Step> {
    let class = decided.sampling.classes.get(name)?;
    let (share, upper) = (
        class.share_nonconforming?,
        class.share_nonconforming_upper_95?,
    );
    let lower = class
        .share_nonconforming_lower_95
        .map_or(String::new(), |lower| {
            format!(", lower bound {:.3} %", 100.0 * lower)
        });
    Some(step(
        &format!("class {name}"),
        "bounds of the share nonconforming in the lot: the most (fewest) nonconforming parts in the lot with which so few (many) in the sample have a probability above 5 %; decides nothing",
        "hypergeometric law, exact for the lot size (Clopper and Pearson 1934 for lots)",
        format!(
            "N {}, n {}, d {}, e {}",
            decided.plan.lot_size, class.n, class.nonconforming, class.undecided
        ),
        format!(
            "{:.3} % in the sample{lower}, upper bound {:.3} %",
            100.0 * share,
            100.0 * upper
        ),
    ))
}

/// One characteristic by variables, so that Q and the estimated share can be followed.
fn by_variables(limits: &Limits, of: &VariablesSection) -> Step {
    let bound = limits.bounds.iter().find(|bound| bound.key == of.key);
    let show = |x: Option<f64>| bound.map_or(String::new(), |bound| number(x, bound));
    let three = |x: Option<f64>| x.map_or("–".to_owned(), |x| format!("{x:.4}"));
    let share = |x: Option<f64>| x.map_or("–".to_owned(), |x| format!("{:.4} %", 100.0 * x));
    let limit =
        |lower: bool| show(bound.and_then(|bound| if lower { bound.lower } else { bound.upper }));
    step(
        &of.key,
        "Q = (U − mean) / s and (mean − L) / s; one limit: Q at least k; two: estimated share p = p_L + p_U at most M, p of each = I_B(n/2 − 1, n/2 − 1) with B = (1 − Q √n / (n − 1)) / 2, at least 0; for normally distributed characteristics: Anderson-Darling p at least 0.05",
        "ISO 3951-1, s-method; MIL-STD-414 tables B-1, B-3, B-5; Lieberman and Resnikoff 1955; D'Agostino and Stephens 1986, Table 4.9",
        format!(
            "n {}, mean {}, s {}, L {}, U {}, Q_L {}, Q_U {}, p_L {}, p_U {}, k {:.3}, M {:.3} %; A² {}, p {}",
            of.n,
            show(of.mean),
            show(of.standard_deviation),
            limit(true),
            limit(false),
            three(of.q_lower),
            three(of.q_upper),
            share(of.share_lower),
            share(of.share_upper),
            of.k,
            100.0 * of.m,
            three(of.anderson_darling),
            three(of.normality_p_value)
        ),
        format!("{}: {}", of.why, of.verdict.name()),
    )
}

fn count(decided: &Decided, name: &str) -> Vec<Step> {
    let Some(class) = decided.sampling.classes.get(name) else {
        return Vec::new();
    };
    let mut steps: Vec<Step> = class
        .variables
        .iter()
        .map(|of| by_variables(decided.limits, of))
        .collect();
    steps.push(if class.by_variables {
        let each: Vec<String> = class
            .variables
            .iter()
            .map(|v| format!("{} {}", v.key, v.verdict.name()))
            .collect();
        step(
            &format!("class {name}"),
            "rejected where any characteristic is, not decided where any is not, else accepted",
            "ISO 3951-1, s-method, each characteristic by itself",
            each.join(", "),
            class.verdict.name().to_owned(),
        )
    } else {
        by_attributes(name, class)
    });
    steps
}

fn by_attributes(name: &str, class: &ClassSection) -> Step {
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
    step(
        &format!("class {name}"),
        "d nonconforming and e undecided parts of the first n: reject from d ≥ Re, accept up to d + e ≤ Ac",
        "ISO 2859-1:1999, 11.1.1; undecided parts counted both ways",
        format!("n {}, d {d}, e {e}", class.n),
        result,
    )
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
        format!(
            "{unmet} conditions not met; {}; reasons: {}",
            classes.join(", "),
            decided.reasons.join(", ")
        ),
        decided.verdict.name().to_owned(),
    )
}
