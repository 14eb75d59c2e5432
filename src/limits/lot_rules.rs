//! Rules that turn lot statistics into a hold.

mod of;

use super::bound::Bounded;
use super::{Action, Bound, CapabilityRule, MixedRule, OutlierMethod, OutlierRule, TrendRule};
use crate::diagnostic::yaml::{Fields, Node, Reader, Shape};
use crate::quantity::Dimension;
use of::of;

/// The rules of a file, in its order.
#[derive(Default)]
pub struct Rules {
    pub capability: Vec<CapabilityRule>,
    pub outliers: Vec<OutlierRule>,
    pub mixed: Vec<MixedRule>,
    pub trend: Vec<TrendRule>,
    pub reduced_inspection: bool,
}

/// The lot rules; none where the file says nothing.
///
/// Where the bounds have faults of their own, only rules of what is surely not bounded are faults.
pub fn read(reader: &mut Reader<'_>, node: Option<&Node>, bounded: &Bounded) -> Option<Rules> {
    let Some(node) = node else {
        return Some(Rules::default());
    };
    let before = reader.count();
    let keys = ["capability", "outliers", "mixed", "trend", "switching"];
    let fields = reader.fields(node, "`lot_rules`", &keys)?;
    let rules = Rules {
        capability: each(reader, fields.get("capability"), bounded, capability),
        outliers: each(reader, fields.get("outliers"), bounded, outliers),
        mixed: each(reader, fields.get("mixed"), bounded, mixed),
        trend: each(reader, fields.get("trend"), bounded, trend),
        reduced_inspection: fields
            .get("switching")
            .and_then(|node| reduced(reader, node))
            .unwrap_or(false),
    };
    (reader.count() == before).then_some(rules)
}

type ReadRule<T> = fn(&mut Reader<'_>, &Node, &Bounded) -> Option<T>;

/// Every rule under a key; one that has faults leaves them in the reader.
fn each<T>(
    reader: &mut Reader<'_>,
    node: Option<&Node>,
    bounded: &Bounded,
    read: ReadRule<T>,
) -> Vec<T> {
    items(node)
        .into_iter()
        .filter_map(|item| read(reader, item, bounded))
        .collect()
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
    let names = OutlierMethod::ALL.map(OutlierMethod::name);
    let method = reader
        .required(&fields, "method", what, "generalized_esd")
        .and_then(|node| reader.one_of(node, "an outlier test", &names))
        .and_then(|at| OutlierMethod::ALL.get(at).copied());
    let level = match (method, fields.get("alpha")) {
        (Some(method), Some(node)) if !method.has_alpha() => {
            reader.fault(
                node.span,
                "alpha_without_meaning",
                format!("`alpha` of `{}`, which has fixed limits", method.name()),
                "no `alpha`",
                Some("delete it, or use another method".to_owned()),
            );
            None
        }
        (Some(method), _) if !method.has_alpha() => Some(None),
        _ => alpha(reader, &fields, what).map(Some),
    };
    let allowed = reader
        .required(&fields, "allowed", what, "0")
        .and_then(|node| reader.integer(node, "`allowed`", (0, 1000)));
    let of = of(reader, &fields, what, bounded);
    if let (Some(OutlierMethod::Joint), Some([_])) = (method, of.as_deref()) {
        reader.fault(
            fields.get("of").map_or(fields.span, |node| node.span),
            "joint_of_one",
            "one characteristic",
            "at least two: a joint distance is of several characteristics together",
            Some("name more, or use `generalized_esd`".to_owned()),
        );
    }
    Some(OutlierRule {
        of: of?,
        method: method?,
        alpha: level?,
        allowed: allowed?,
    })
}

fn mixed(reader: &mut Reader<'_>, node: &Node, bounded: &Bounded) -> Option<MixedRule> {
    let what = "`mixed`";
    let fields = reader.fields(node, what, &["of", "alpha"])?;
    let alpha = alpha(reader, &fields, what);
    let of = of(reader, &fields, what, bounded);
    Some(MixedRule {
        of: of?,
        alpha: alpha?,
    })
}

fn trend(reader: &mut Reader<'_>, node: &Node, bounded: &Bounded) -> Option<TrendRule> {
    let what = "`trend`";
    let fields = reader.fields(node, what, &["of", "action"])?;
    let action = reader
        .required(&fields, "action", what, "warn")
        .and_then(|node| reader.one_of(node, "what to do", &Action::ALL.map(Action::name)))
        .and_then(|at| Action::ALL.get(at).copied());
    let of = of(reader, &fields, what, bounded);
    Some(TrendRule {
        of: of?,
        action: action?,
    })
}

/// Whether reduced inspection is wanted.
fn reduced(reader: &mut Reader<'_>, node: &Node) -> Option<bool> {
    let what = "`switching`";
    let fields = reader.fields(node, what, &["reduced"])?;
    let node = reader.required(&fields, "reduced", what, "allowed")?;
    let choices = ["allowed", "not_allowed"];
    let chosen = reader.one_of(node, "whether reduced inspection is wanted", &choices)?;
    Some(chosen == 0)
}

/// A significance level.
fn alpha(reader: &mut Reader<'_>, fields: &Fields<'_>, what: &str) -> Option<f64> {
    let node = reader.required(fields, "alpha", what, "0.01")?;
    let expected = "a significance level above 0 and at most 0.5";
    let possible = |v: f64| v > 0.0 && v <= 0.5;
    reader.quantity_if(node, "`alpha`", Dimension::Ratio, possible, expected)
}
