//! The characteristics that a lot rule is of.

use crate::diagnostic::yaml::{Fields, Node, Reader, Shape, nearest};
use crate::diagnostic::{Span, excerpt};
use crate::limits::Bound;
use crate::limits::bound::Bounded;

/// The keys of the bounds that a rule is of: `capacitance` is every bound of it,
/// `capacitance@1kHz` that one.
pub(super) fn of(
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
