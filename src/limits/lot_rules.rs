//! Rules that turn lot statistics into a hold.

use super::bound::Bounded;
use super::{Bound, CapabilityRule, OutlierRule};
use crate::diagnostic::yaml::{Fields, Node, Reader, Shape, nearest};
use crate::diagnostic::{Span, excerpt};
use crate::quantity::Dimension;

type Rules = (Vec<CapabilityRule>, Vec<OutlierRule>);

/// Capability and outlier rules; none where the file says nothing.
///
/// Where the bounds have faults of their own, only rules of what is surely not bounded are faults.
pub fn read(reader: &mut Reader<'_>, node: Option<&Node>, bounded: &Bounded) -> Option<Rules> {
    let Some(node) = node else {
        return Some((Vec::new(), Vec::new()));
    };
    let before = reader.count();
    let fields = reader.fields(node, "`lot_rules`", &["capability", "outliers"])?;
    let mut rules: Rules = (Vec::new(), Vec::new());
    let mut complete = true;
    for item in items(fields.get("capability")) {
        let rule = capability(reader, item, bounded);
        complete &= rule.is_some();
        rules.0.extend(rule);
    }
    for item in items(fields.get("outliers")) {
        let rule = outliers(reader, item, bounded);
        complete &= rule.is_some();
        rules.1.extend(rule);
    }
    (complete && reader.count() == before).then_some(rules)
}

/// One rule, or a list of them.
fn items(node: Option<&Node>) -> Vec<&Node> {
    match node.map(|node| &node.shape) {
        None => Vec::new(),
        Some(Shape::List(list)) => list.iter().collect(),
        Some(_) => node.into_iter().collect(),
    }
}

fn capability(reader: &mut Reader<'_>, node: &Node, bounded: &Bounded) -> Option<CapabilityRule> {
    let what = "`capability`";
    let fields = reader.fields(node, what, &["of", "index", "min"])?;
    let indices = ["cp", "cpk", "pp", "ppk"];
    let index = reader
        .required(&fields, "index", what, "cpk")
        .and_then(|node| reader.one_of(node, "a capability index", &indices))
        .and_then(|at| indices.get(at).copied());
    let min = reader
        .required(&fields, "min", what, "1.33")
        .and_then(|node| reader.number_within(node, "`min`", (0.1, 10.0)));
    let of = of(reader, &fields, what, bounded);
    if let (Some(index @ ("cp" | "pp")), Some(of)) = (index, &of) {
        two_sided(reader, &fields, index, of, &bounded.bounds);
    }
    Some(CapabilityRule {
        of: of?,
        index: index?.to_owned(),
        min: min?,
    })
}

/// Cp and Pp compare the spread with the distance between two limits.
fn two_sided(
    reader: &mut Reader<'_>,
    fields: &Fields<'_>,
    index: &str,
    of: &[String],
    bounds: &[Bound],
) {
    let one_sided = |b: &&Bound| of.contains(&b.key) && (b.lower.is_none() || b.upper.is_none());
    if let Some(bound) = bounds.iter().find(one_sided) {
        reader.fault(
            fields.get("index").map_or(fields.span, |node| node.span),
            "index_needs_two_limits",
            format!("`{index}` of `{}`, which has one limit", bound.key),
            format!("a bound with two limits: `{index}` does not exist with one"),
            Some(format!("use `{index}k`")),
        );
    }
}

fn outliers(reader: &mut Reader<'_>, node: &Node, bounded: &Bounded) -> Option<OutlierRule> {
    let what = "`outliers`";
    let fields = reader.fields(node, what, &["of", "method", "alpha", "allowed"])?;
    let method = reader
        .required(&fields, "method", what, "generalized_esd")
        .and_then(|node| reader.one_of(node, "an outlier test", &["generalized_esd"]));
    let alpha = reader
        .required(&fields, "alpha", what, "0.01")
        .and_then(|node| {
            let expected = "a significance level above 0 and at most 0.5";
            let possible = |v: f64| v > 0.0 && v <= 0.5;
            reader.quantity_if(node, "`alpha`", Dimension::Ratio, possible, expected)
        });
    let allowed = reader
        .required(&fields, "allowed", what, "0")
        .and_then(|node| reader.integer(node, "`allowed`", (0, 1000)));
    let of = of(reader, &fields, what, bounded);
    method?;
    Some(OutlierRule {
        of: of?,
        alpha: alpha?,
        allowed: allowed?,
    })
}

/// The keys of the bounds that a rule is of: `capacitance` is every bound of it,
/// `capacitance@1kHz` that one.
fn of(
    reader: &mut Reader<'_>,
    fields: &Fields<'_>,
    what: &str,
    bounded: &Bounded,
) -> Option<Vec<String>> {
    let node = reader.required(fields, "of", what, "capacitance")?;
    let names: Vec<&Node> = match &node.shape {
        Shape::List(list) if list.is_empty() => {
            let found = format!("{what} of nothing");
            reader.fault(
                node.span,
                "empty_list",
                found,
                "at least one characteristic",
                None,
            );
            return None;
        }
        Shape::List(list) => list.iter().collect(),
        _ => vec![node],
    };
    let before = reader.count();
    let mut keys: Vec<String> = Vec::new();
    for node in names {
        let Some(name) = reader.line(node, "a characteristic") else {
            continue;
        };
        let matching = resolve(&name, &bounded.bounds);
        if matching.is_empty() && !may_be_bounded(&name, bounded) {
            not_bounded(reader, node.span, &name, &bounded.bounds);
        }
        for key in matching {
            if keys.contains(&key) {
                let found = format!("`{key}` a second time");
                reader.fault(node.span, "duplicate_entry", found, "each once", None);
            } else {
                keys.push(key);
            }
        }
    }
    (reader.count() == before).then_some(keys)
}

/// Whether a bound with faults, or under a misspelt name, may be the one meant.
fn may_be_bounded(name: &str, bounded: &Bounded) -> bool {
    let name = name.split('@').next().unwrap_or(name);
    let near = |other: &String| other == name || nearest(other, &[name]).is_some();
    !bounded.complete && bounded.names.iter().any(near)
}

fn resolve(name: &str, bounds: &[Bound]) -> Vec<String> {
    let named = |b: &&Bound| b.key == name || b.characteristic.name() == name;
    bounds.iter().filter(named).map(|b| b.key.clone()).collect()
}

fn not_bounded(reader: &mut Reader<'_>, span: Span, name: &str, bounds: &[Bound]) {
    let mut known: Vec<&str> = Vec::new();
    for bound in bounds {
        for text in [bound.characteristic.name(), bound.key.as_str()] {
            if !known.contains(&text) {
                known.push(text);
            }
        }
    }
    if crate::readings::Characteristic::ALL
        .iter()
        .any(|c| c.name() == name)
    {
        reader.fault(
            span,
            "rule_without_bound",
            format!("`{name}`, which this file does not bound"),
            "a characteristic that is bounded",
            Some(format!(
                "bound `{name}` under `characteristics`, or take it out here"
            )),
        );
        return;
    }
    let is = "no characteristic that this file bounds";
    reader.unknown(span, "rule_without_bound", &excerpt(name), is, &known);
}
