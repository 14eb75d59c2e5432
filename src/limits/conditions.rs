//! How the part must be measured, the decision rule, and the retest rule.

use super::{Ageing, Bound, Conditions, DecisionRule, DecisionRuleKind, Retest, Window};
use crate::diagnostic::yaml::{Fields, Node, Reader, shown};
use crate::quantity::Dimension;
use crate::readings::{Characteristic, Equivalent};

/// The conditions; without the key nothing is demanded and the series equivalent is read.
pub fn read(reader: &mut Reader<'_>, node: Option<&Node>) -> Option<Conditions> {
    let mut conditions = Conditions {
        drive: None,
        temperature: None,
        equivalent: Equivalent::Series,
        ageing: None,
        date_code_age: None,
        temperature_coefficients: Vec::new(),
    };
    let Some(node) = node else {
        return Some(conditions);
    };
    let known = [
        "drive",
        "temperature",
        "equivalent",
        "ageing",
        "date_code_age",
        "temperature_coefficient",
    ];
    let fields = reader.fields(node, "`conditions`", &known)?;
    if let Some(node) = fields.get("drive") {
        let possible = |low: f64, high: f64| low > 0.0 && high <= 1000.0;
        let expected = "a voltage above zero and at most 1000 V";
        conditions.drive = window(
            reader,
            node,
            ("`drive`", Dimension::Voltage),
            possible,
            expected,
        );
    }
    if let Some(node) = fields.get("temperature") {
        let possible = |low: f64, high: f64| low >= -80.0 && high <= 250.0;
        let expected = "temperatures from -80 °C to 250 °C";
        let what = ("`temperature`", Dimension::Temperature);
        conditions.temperature = window(reader, node, what, possible, expected);
    }
    if let Some(node) = fields.get("equivalent") {
        let index = reader.one_of(node, "an equivalent circuit", &["series", "parallel"]);
        if index == Some(1) {
            conditions.equivalent = Equivalent::Parallel;
        }
    }
    if let Some(node) = fields.get("ageing") {
        conditions.ageing = ageing(reader, node);
    }
    if let Some(node) = fields.get("temperature_coefficient") {
        conditions.temperature_coefficients = temperature_coefficients(reader, node);
    }
    if let Some(node) = fields.get("date_code_age") {
        let possible = |v: f64| (604_800.0..=3.2e9).contains(&v);
        let expected = "a time from 1 week to 100 years";
        let what = "`date_code_age`";
        conditions.date_code_age =
            reader.quantity_if(node, what, Dimension::Time, possible, expected);
    }
    Some(conditions)
}

fn window(
    reader: &mut Reader<'_>,
    node: &Node,
    (what, dimension): (&str, Dimension),
    possible: impl Fn(f64, f64) -> bool,
    expected: &str,
) -> Option<Window> {
    let (low, high) = reader.window(node, what, dimension)?;
    if !possible(low, high) {
        let found = format!("{} for {what}", shown(node));
        reader.fault(node.span, "impossible_value", found, expected, None);
        return None;
    }
    Some(Window {
        lower: Some(low),
        upper: Some(high),
    })
}

fn ageing(reader: &mut Reader<'_>, node: &Node) -> Option<Ageing> {
    let what = "`ageing`";
    let fields = reader.fields(node, what, &["per_decade", "refer_to"])?;
    let per_decade = reader
        .required(&fields, "per_decade", what, "2.5 %")
        .and_then(|node| {
            // Class 2 dielectrics lose up to about 7 % a decade; common practice, no source.
            let expected = "a loss above 0 and at most 20 % a decade";
            let possible = |v: f64| v > 0.0 && v <= 0.2;
            reader.share_if(node, "`per_decade`", possible, expected)
        });
    let refer_to = reader
        .required(&fields, "refer_to", what, "1000 h")
        .and_then(|node| {
            let expected = "a time above zero";
            reader.quantity_if(node, "`refer_to`", Dimension::Time, |v| v > 0.0, expected)
        });
    Some(Ageing {
        per_decade: per_decade?,
        refer_to: refer_to?,
    })
}

/// By characteristic, relative per kelvin.
fn temperature_coefficients(reader: &mut Reader<'_>, node: &Node) -> Vec<(Characteristic, f64)> {
    let names = Characteristic::ALL.map(Characteristic::name);
    let Some(fields) = reader.fields(node, "`temperature_coefficient`", &names) else {
        return Vec::new();
    };
    let expected = "a change above 0 and at most 10 % per kelvin, such as `0.1 %/K`";
    let possible = |v: f64| v != 0.0 && v.abs() <= 0.1;
    let mut all = Vec::new();
    for (name, _, value) in fields.iter() {
        let characteristic = Characteristic::ALL.into_iter().find(|c| c.name() == name);
        let what = format!("`{name}`");
        let share = reader.share_per_kelvin_if(value, &what, possible, expected);
        all.extend(characteristic.zip(share));
    }
    all
}

/// A coefficient of what is not bounded would say nothing.
pub fn coefficients_are_of_bounds(
    reader: &mut Reader<'_>,
    fields: &Fields<'_>,
    conditions: &Conditions,
    bounds: &[Bound],
) {
    for (characteristic, _) in &conditions.temperature_coefficients {
        if bounds.iter().any(|b| b.characteristic == *characteristic) {
            continue;
        }
        if let Some(node) = fields.get("conditions") {
            let name = characteristic.name();
            reader.fault(
                node.span,
                "no_effect",
                format!("a `temperature_coefficient` of `{name}`, which the file does not bound"),
                "coefficients of characteristics that are bounded",
                Some(format!("delete it, or bound `{name}`")),
            );
        }
    }
}

/// Ageing refers capacitance; without a bound of it the key would say nothing.
pub fn ageing_has_capacitance(
    reader: &mut Reader<'_>,
    fields: &Fields<'_>,
    conditions: &Conditions,
    bounds: &[Bound],
) {
    let bounded = |b: &Bound| b.characteristic == Characteristic::Capacitance;
    if conditions.ageing.is_none() || bounds.iter().any(bounded) {
        return;
    }
    if let Some(node) = fields.get("conditions") {
        reader.fault(
            node.span,
            "no_effect",
            "`ageing` in a file that does not bound the capacitance",
            "a bound of `capacitance`, which is what ageing refers",
            Some("delete `ageing`, or bound the capacitance".to_owned()),
        );
    }
}

/// The decision rule; simple acceptance where the file names none.
pub fn decision_rule(reader: &mut Reader<'_>, node: Option<&Node>) -> Option<DecisionRule> {
    let simple = DecisionRule {
        kind: DecisionRuleKind::SimpleAcceptance,
        coverage_factor: 2.0,
    };
    let Some(node) = node else {
        return Some(simple);
    };
    let what = "`decision_rule`";
    let fields = reader.fields(node, what, &["kind", "coverage_factor"])?;
    let kinds = [
        "simple_acceptance",
        "guarded_acceptance",
        "guarded_rejection",
    ];
    let kind = reader
        .required(&fields, "kind", what, "guarded_acceptance")
        .and_then(|node| reader.one_of(node, "a decision rule", &kinds))
        .map(|index| match index {
            1 => DecisionRuleKind::GuardedAcceptance,
            2 => DecisionRuleKind::GuardedRejection,
            _ => DecisionRuleKind::SimpleAcceptance,
        });
    let coverage_factor = match fields.entry("coverage_factor") {
        None => Some(simple.coverage_factor),
        Some((key, node)) => {
            if kind == Some(DecisionRuleKind::SimpleAcceptance) {
                reader.fault(
                    key.span,
                    "no_effect",
                    "`coverage_factor` with simple acceptance, which has no guard band",
                    "a guarded rule, or no coverage factor",
                    Some("delete it, or choose `guarded_acceptance`".to_owned()),
                );
            }
            reader.number_within(node, "`coverage_factor`", (0.1, 10.0))
        }
    };
    Some(DecisionRule {
        kind: kind?,
        coverage_factor: coverage_factor?,
    })
}

/// Further tries; none where the file says nothing.
pub fn retest(reader: &mut Reader<'_>, node: Option<&Node>) -> Option<Retest> {
    let mut retest = Retest::default();
    let Some(node) = node else {
        return Some(retest);
    };
    let fields = reader.fields(node, "`retest`", &["unmeasured", "nonconforming"])?;
    let mut complete = true;
    for (key, count) in [
        ("unmeasured", &mut retest.unmeasured),
        ("nonconforming", &mut retest.nonconforming),
    ] {
        if let Some(node) = fields.get(key) {
            let value = reader.integer(node, &format!("`{key}`"), (0, 10));
            let value = value.and_then(|value| u32::try_from(value).ok());
            complete &= value.is_some();
            *count = value.unwrap_or_default();
        }
    }
    complete.then_some(retest)
}
