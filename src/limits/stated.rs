//! The capacitance as code and description state it, against the bounds.

use super::Bound;
use crate::diagnostic::excerpt;
use crate::diagnostic::yaml::{Fields, Node, Reader, Shape};
use crate::quantity::{self, shortest};
use crate::readings::Characteristic;

/// Faults where `code`, or every capacitance in `description`, contradicts the bounds.
pub fn check(reader: &mut Reader<'_>, fields: &Fields<'_>, bounds: &[Bound]) {
    let bound = bounds
        .iter()
        .find(|b| b.characteristic == Characteristic::Capacitance);
    let code = fields.get("code").and_then(|node| code(reader, node));
    let description = fields.get("description");
    let stated = description.map_or_else(Vec::new, |node| match &node.shape {
        Shape::Text { text, .. } => quantity::find_capacitances(text),
        _ => Vec::new(),
    });
    if let (Some(code), Some(bound)) = (&code, bound)
        && !code.values.iter().any(|farad| agrees(bound, *farad))
    {
        let who = format!("the code `{}`", excerpt(&code.text));
        disagreement(reader, code.node, &who, &code.values, bound);
    }
    let Some(description) = description.filter(|_| !stated.is_empty()) else {
        return;
    };
    match (bound, &code) {
        (Some(bound), _) if !stated.iter().any(|farad| agrees(bound, *farad)) => {
            disagreement(reader, description, "the description", &stated, bound);
        }
        (None, Some(code))
            if !stated
                .iter()
                .any(|s| code.values.iter().any(|c| same(*s, *c))) =>
        {
            reader.fault(
                description.span,
                "capacitance_disagrees",
                format!("the description states {}", shown(&stated)),
                format!(
                    "{}, as the code `{}` says",
                    shown(&code.values),
                    excerpt(&code.text)
                ),
                Some("correct the wrong one".to_owned()),
            );
        }
        _ => {}
    }
}

/// A code with the values in farad that it can mean.
struct Code<'n> {
    node: &'n Node,
    text: String,
    values: Vec<f64>,
}

fn code<'n>(reader: &mut Reader<'_>, node: &'n Node) -> Option<Code<'n>> {
    let text = reader.line(node, "`code`")?;
    let values = quantity::capacitance_code(&text);
    if values.is_empty() {
        bad_code(reader, node, &text);
        return None;
    }
    Some(Code { node, text, values })
}

fn bad_code(reader: &mut Reader<'_>, node: &Node, text: &str) {
    reader.fault(
        node.span,
        "bad_capacitance_code",
        format!("`{}` is no capacitance code", excerpt(text)),
        "digits and a multiplier in picofarad (`475` is 4.7 µF), `4R7`, or `4u7`",
        Some("write the code as it is marked on the part, or delete the key".to_owned()),
    );
}

fn disagreement(reader: &mut Reader<'_>, node: &Node, who: &str, farad: &[f64], bound: &Bound) {
    let expected = match bound.nominal {
        Some(nominal) => {
            format!(
                "{}, the nominal value of `{}`",
                shown(&[nominal]),
                bound.key
            )
        }
        None => format!("a value within the limits of `{}`", bound.key),
    };
    reader.fault(
        node.span,
        "capacitance_disagrees",
        format!("{who} states {}", shown(farad)),
        expected,
        Some("correct the wrong one".to_owned()),
    );
}

fn shown(farad: &[f64]) -> String {
    let texts: Vec<String> = farad.iter().map(|value| shortest(*value, "F")).collect();
    texts.join(" or ")
}

fn same(a: f64, b: f64) -> bool {
    (a - b).abs() <= 1e-6 * a.abs().max(b.abs())
}

fn agrees(bound: &Bound, farad: f64) -> bool {
    match bound.nominal {
        Some(nominal) => same(nominal, farad),
        None => bound.lower.is_none_or(|l| farad >= l) && bound.upper.is_none_or(|u| farad <= u),
    }
}
