//! A capability demanded of the lot.

use super::{Judged, Ruled};
use crate::diagnostic::Note;
use crate::limits::{Bound, CapabilityRule};
use crate::lot::Statistics;
use crate::lot::explain::{Step, number, step};

pub(super) fn evaluate(judged: &Judged, ruled: &mut Ruled) {
    for rule in &judged.limits.capability_rules {
        for bound in judged
            .limits
            .bounds
            .iter()
            .filter(|b| rule.of.contains(&b.key))
        {
            let Some(of) = judged.statistics.get(&bound.key) else {
                continue;
            };
            ruled.holds.extend(hold(rule, &bound.key, of));
            ruled.steps.push(explained(rule, bound, of));
        }
    }
}

fn hold(rule: &CapabilityRule, key: &str, of: &Statistics) -> Option<Note> {
    let name = rule.index.to_uppercase();
    match of.index(&rule.index) {
        Some(index) if index >= rule.min => None,
        Some(index) => Some(Note::new(
            "capability_below_min",
            format!(
                "{name} of {key} is {index:.2} from {} parts, at least {} is demanded: a quality engineer decides",
                of.n, rule.min
            ),
        )),
        None => {
            let code = format!("{}_undefined", rule.index);
            let why = of
                .warnings
                .iter()
                .find(|w| w.code == code || w.code == "one_sided")
                .map_or("", |w| w.text.as_str());
            Some(Note::new(
                "capability_not_available",
                format!(
                    "{name} of {key} is demanded and cannot be had ({why}): a quality engineer decides"
                ),
            ))
        }
    }
}

fn explained(rule: &CapabilityRule, bound: &Bound, s: &Statistics) -> Step {
    let (symbol, sigma) = if rule.index.starts_with('c') {
        ("σ within", s.sigma_within)
    } else {
        ("s", s.standard_deviation)
    };
    let formula = match rule.index.as_str() {
        "cp" | "pp" => "(U − L) / 6σ",
        _ => "the smaller of (U − mean) / 3σ and (mean − L) / 3σ",
    };
    let how = how_had(s, &rule.index);
    let result = match s.index(&rule.index) {
        Some(index) if index >= rule.min => format!("{how}{index:.3} ≥ {}", rule.min),
        Some(index) => format!("{how}{index:.3} < {}: holds the lot", rule.min),
        None => "cannot be had: holds the lot".to_owned(),
    };
    step(
        &bound.key,
        &format!(
            "{} = {formula}, at least {}",
            rule.index.to_uppercase(),
            rule.min
        ),
        "ISO 22514-2:2017, 7; σ within by the mean moving range over 1.128 (ISO 7870-2); Anderson-Darling by D'Agostino and Stephens 1986, Table 4.9",
        format!(
            "n {}, L {}, U {}, mean {}, {symbol} {}{}{}{}",
            s.n,
            number(bound.lower, bound),
            number(bound.upper, bound),
            number(s.mean, bound),
            number(sigma, bound),
            normality(s),
            quantiles(s, bound, &rule.index),
            lower_bound(s, &rule.index)
        ),
        result,
    )
}

fn normality(s: &Statistics) -> String {
    s.normality.map_or(String::new(), |test| {
        format!(
            "; Anderson-Darling A² {:.3}, adjusted {:.3}, p {:.4}",
            test.a2, test.a2_adjusted, test.p_value
        )
    })
}

/// What a percentile index is of.
fn quantiles(s: &Statistics, bound: &Bound, index: &str) -> String {
    match (s.percentile, index) {
        (Some(fit), "pp" | "ppk") => {
            let [low, middle, high] = fit.quantiles.map(|x| number(Some(x), bound));
            format!(
                "; Box-Cox λ {:.3} (p {:.3}), quantiles 0.135 % {low}, 50 % {middle}, 99.865 % {high}",
                fit.exponent, fit.p_value
            )
        }
        _ => String::new(),
    }
}

fn lower_bound(s: &Statistics, index: &str) -> String {
    let bound = match index {
        "cpk" => s.cpk_lower_95,
        "ppk" => s.ppk_lower_95,
        _ => None,
    };
    bound.map_or(String::new(), |bound| {
        format!("; lower 95 % confidence bound {bound:.3}")
    })
}

/// Where the index is not the one of the formula as it stands.
fn how_had(s: &Statistics, index: &str) -> &'static str {
    let by_percentiles = match index {
        "pp" => s.pp_percentile,
        "ppk" => s.ppk_percentile,
        _ => None,
    };
    if by_percentiles.is_some() {
        return "not normally distributed, so by the 0.135 %, 50 % and 99.865 % quantiles of the fitted distribution: ";
    }
    match s.at_least.and_then(|at_least| at_least.get(index)) {
        Some(_) => "most of the spread is the measurement's, so at least: ",
        None => "",
    }
}
