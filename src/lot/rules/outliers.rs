//! Outliers allowed in the lot, of each characteristic by itself.

use super::{Judged, Ruled, joint};
use crate::diagnostic::Note;
use crate::limits::{OutlierMethod, OutlierRule};
use crate::lot::conditions::some_parts;
use crate::lot::explain::{Step, number, step};
use crate::lot::outliers::{ALPHA, find, numbers};
use crate::lot::statistics::values;

pub(super) fn evaluate(judged: &Judged, ruled: &mut Ruled) {
    for rule in &judged.limits.outlier_rules {
        if rule.method == OutlierMethod::Joint {
            joint::evaluate(judged, rule, ruled);
        } else {
            for key in &rule.of {
                of_key(judged, rule, key, ruled);
            }
        }
    }
}

fn of_key(judged: &Judged, rule: &OutlierRule, key: &str, ruled: &mut Ruled) {
    let (names, values): (Vec<&str>, Vec<f64>) = values(key, judged.parts).into_iter().unzip();
    let found = find(rule.method, &values, rule.alpha.unwrap_or(ALPHA)).map(|indices| {
        let name = |i: &usize| names.get(*i).copied();
        indices.iter().filter_map(name).collect::<Vec<_>>()
    });
    let result = match &found {
        Ok(parts) if parts.len() as u64 > rule.allowed => {
            ruled.holds.push(Note::new(
                "outliers_found",
                format!(
                    "{key}: {} unlike the rest of the lot ({}, {}), {} allowed: look at these parts",
                    parts.len(),
                    some_parts(parts),
                    test(rule),
                    rule.allowed
                ),
            ));
            format!("{}: holds the lot", parts.join(", "))
        }
        Ok(parts) if parts.is_empty() => "none".to_owned(),
        Ok(parts) => parts.join(", "),
        Err(why) => {
            ruled.holds.push(Note::new(
                "outliers_not_available",
                format!(
                    "outliers of {key} are to be looked for and cannot be (no test for outliers: {}): a quality engineer decides",
                    why.text()
                ),
            ));
            format!("cannot be tested ({}): holds the lot", why.text())
        }
    };
    let bound = judged.limits.bounds.iter().find(|bound| bound.key == key);
    let show = |x: f64| bound.map_or(String::new(), |bound| number(Some(x), bound));
    let alpha = rule.alpha.unwrap_or(ALPHA);
    let found = numbers(rule.method, &values, &names, alpha, &show);
    let step = explained(
        rule,
        key,
        &format!("{} values", values.len()),
        &found,
        result,
    );
    ruled.steps.push(step);
}

/// `significance 0.01`, or the fixed limit of the method.
fn test(rule: &OutlierRule) -> String {
    match rule.alpha {
        Some(alpha) => format!("{}, significance {alpha}", rule.method.words()),
        None => rule.method.words().to_owned(),
    }
}

fn explained(rule: &OutlierRule, key: &str, n: &str, found: &str, result: String) -> Step {
    let (how, source) = match rule.method {
        OutlierMethod::GeneralizedEsd => (
            "by the generalized extreme studentized deviate test",
            "Rosner 1983; NIST/SEMATECH e-Handbook 1.3.5.17.3",
        ),
        OutlierMethod::Grubbs => (
            "by the test of Grubbs: the largest |x − mean| / s",
            "Grubbs 1969; NIST/SEMATECH e-Handbook 1.3.5.17.1",
        ),
        OutlierMethod::ModifiedZ => (
            "with 0.6745 |x − median| / MAD above 3.5",
            "Iglewicz and Hoaglin 1993; NIST/SEMATECH e-Handbook 1.3.5.17",
        ),
        OutlierMethod::PartAverage => (
            "beyond the median ± 6 (Q3 − Q1) / 1.35",
            "AEC-Q001, dynamic part-average limits",
        ),
        OutlierMethod::Joint => ("jointly", "Rousseeuw 1985"),
    };
    let level = rule
        .alpha
        .map_or(String::new(), |alpha| format!(", significance {alpha}"));
    step(
        key,
        &format!("at most {} outliers {how}", rule.allowed),
        source,
        format!("{n}{level}{found}"),
        result,
    )
}
