//! Compensation standards: their sweeps and what they truly are.

use super::read::given;
use super::{Compensation, Standard};
use crate::diagnostic::yaml::{Node, Reader, Shape};
use crate::quantity::Dimension;

/// The sweeps of the standards; none where the file has no `compensation`.
pub fn read(reader: &mut Reader<'_>, node: Option<&Node>) -> Option<Compensation> {
    let Some(node) = node else {
        return Some(Compensation::default());
    };
    let fields = reader.fields(node, "`compensation`", &["open", "short", "load"])?;
    let open = fields
        .get("open")
        .map(|node| standard(reader, node, "open", &["capacitance"]));
    let keys = ["resistance", "inductance"];
    let short = fields
        .get("short")
        .map(|node| standard(reader, node, "short", &keys));
    let load = fields
        .get("load")
        .map(|node| standard(reader, node, "load", &keys));
    if fields.iter().next().is_none() {
        let found = "an empty `compensation`";
        reader.fault(
            node.span,
            "missing_key",
            found,
            "`open`, `short` or `load`",
            None,
        );
    }
    Some(Compensation {
        open: given(open)?,
        short: given(short)?,
        load: given(load)?,
    })
}

/// A standard: the path of its sweep alone, or with its values. A load needs its resistance.
fn standard(reader: &mut Reader<'_>, node: &Node, name: &str, values: &[&str]) -> Option<Standard> {
    let what = format!("`{name}`");
    if !matches!(node.shape, Shape::Map(_)) {
        let sweep = reader.path(node, &what)?;
        if name == "load" {
            reader.fault(
                node.span,
                "missing_key",
                "`load` without its resistance",
                "the sweep and the true resistance of the load",
                Some(format!("write `{{sweep: {sweep}, resistance: 1.000 Ω}}`")),
            );
            return None;
        }
        return Some(Standard {
            sweep,
            resistance: 0.0,
            inductance: 0.0,
            capacitance: 0.0,
        });
    }
    let known: Vec<&str> = ["sweep"].iter().chain(values).copied().collect();
    let fields = reader.fields(node, &what, &known)?;
    let sweep = reader
        .required(&fields, "sweep", &what, &format!("compensation/{name}.csv"))
        .and_then(|node| reader.path(node, "`sweep`"));
    if name == "load" {
        reader.required(&fields, "resistance", &what, "1.000 Ω")?;
    }
    let mut value = |key: &str, dimension: Dimension| -> Option<f64> {
        let label = format!("`{key}`");
        match fields.get(key).filter(|_| values.contains(&key)) {
            None => Some(0.0),
            Some(node) if name == "load" && key == "resistance" => {
                let expected = "a resistance above zero";
                reader.quantity_if(node, &label, dimension, |v| v > 0.0, expected)
            }
            Some(node) => not_negative(reader, node, &label, dimension),
        }
    };
    let resistance = value("resistance", Dimension::Resistance);
    let inductance = value("inductance", Dimension::Inductance);
    let capacitance = value("capacitance", Dimension::Capacitance);
    Some(Standard {
        sweep: sweep?,
        resistance: resistance?,
        inductance: inductance?,
        capacitance: capacitance?,
    })
}

/// A quantity that is zero or more.
pub fn not_negative(
    reader: &mut Reader<'_>,
    node: &Node,
    what: &str,
    dimension: Dimension,
) -> Option<f64> {
    reader.quantity_if(
        node,
        what,
        dimension,
        |v| v >= 0.0,
        "zero or a positive value",
    )
}
