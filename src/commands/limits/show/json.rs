//! A limit file resolved, for programs. Values are SI.

use crate::limits::{Acceptance, Bound, Limits, Window};
use crate::readings::{Equivalent, Place};
use serde_json::{Value, json};

/// The limits as an object.
pub fn object(limits: &Limits) -> Value {
    json!({
        "part": limits.part,
        "revision": limits.revision,
        "description": limits.description,
        "conditions": conditions(limits),
        "bounds": limits.bounds.iter().map(bound).collect::<Vec<_>>(),
        "decision_rule": {
            "kind": super::text::rule_name(limits.decision_rule.kind),
            "coverage_factor": limits.decision_rule.coverage_factor,
        },
        "acceptance": acceptance(&limits.acceptance),
        "lot_rules": {
            "capability": limits.capability_rules.iter().map(|rule| json!({
                "of": rule.of, "index": rule.index, "min": rule.min,
            })).collect::<Vec<_>>(),
            "outliers": limits.outlier_rules.iter().map(|rule| json!({
                "of": rule.of, "method": rule.method.name(), "alpha": rule.alpha,
                "allowed": rule.allowed,
            })).collect::<Vec<_>>(),
            "mixed": limits.mixed_rules.iter().map(|rule| json!({
                "of": rule.of, "alpha": rule.alpha,
            })).collect::<Vec<_>>(),
            "trend": limits.trend_rules.iter().map(|rule| json!({
                "of": rule.of, "action": rule.action.name(),
            })).collect::<Vec<_>>(),
            "switching": {"reduced": if limits.reduced_inspection { "allowed" } else { "not_allowed" }},
        },
        "retest": {
            "unmeasured": limits.retest.unmeasured,
            "nonconforming": limits.retest.nonconforming,
        },
    })
}

fn conditions(limits: &Limits) -> Value {
    let conditions = &limits.conditions;
    let window = |w: Option<Window>| w.map(|w| json!({"lower": w.lower, "upper": w.upper}));
    json!({
        "drive": window(conditions.drive),
        "temperature": window(conditions.temperature),
        "equivalent": match conditions.equivalent {
            Equivalent::Series => "series",
            Equivalent::Parallel => "parallel",
        },
        "ageing": conditions.ageing.map(|a| json!({
            "per_decade": a.per_decade, "refer_to": a.refer_to,
        })),
        "temperature_coefficient": conditions.temperature_coefficients.iter()
            .map(|(of, share)| (of.name().to_owned(), json!(share)))
            .collect::<serde_json::Map<_, _>>(),
    })
}

fn bound(bound: &Bound) -> Value {
    let (at, between) = match bound.place {
        Place::At(frequency) => (Some(frequency), None),
        Place::Between(from, to) => (None, Some([from, to])),
        Place::Anywhere => (None, None),
    };
    json!({
        "key": bound.key,
        "characteristic": bound.characteristic.name(),
        "at": at,
        "between": between,
        "unit": bound.characteristic.unit(),
        "lower": bound.lower,
        "upper": bound.upper,
        "nominal": bound.nominal,
        "class": bound.class,
    })
}

fn acceptance(acceptance: &Acceptance) -> Value {
    let by_class = |aql: &[(String, f64)]| -> Value {
        let pairs = aql.iter().map(|(class, aql)| (class.clone(), json!(aql)));
        Value::Object(pairs.collect())
    };
    match acceptance {
        Acceptance::Attributes { level, aql } => {
            json!({"attributes": {"level": level, "aql": by_class(aql)}})
        }
        Acceptance::Variables {
            level,
            aql,
            not_normal,
        } => {
            json!({"variables": {"level": level, "aql": by_class(aql), "not_normal": not_normal.name()}})
        }
        Acceptance::ZeroAcceptance {
            quality_limit,
            consumers_risk,
        } => json!({
            "zero_acceptance": {"quality_limit": quality_limit, "consumers_risk": consumers_risk}
        }),
        Acceptance::Fixed { sample, accept } => {
            json!({"fixed": {"sample": sample, "accept": accept}})
        }
    }
}
