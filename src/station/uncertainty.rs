//! The station's stated standard uncertainties.

use super::read::given;
use super::{Repeatability, Uncertainty};
use crate::diagnostic::yaml::{Node, Reader, Shape};
use crate::quantity::Dimension;
use std::f64::consts::FRAC_PI_2;

/// Characteristics whose repeatability a station can state, with the dimension of an absolute one.
pub const REPEATABLE: [(&str, Dimension); 9] = [
    ("capacitance", Dimension::Capacitance),
    ("dissipation_factor", Dimension::Ratio),
    ("esr", Dimension::Resistance),
    ("impedance", Dimension::Resistance),
    ("esr_minimum", Dimension::Resistance),
    ("srf", Dimension::Frequency),
    ("esl", Dimension::Inductance),
    ("c_1khz", Dimension::Capacitance),
    ("r_0", Dimension::Resistance),
];

/// The uncertainties; none stated where the file has no `uncertainty`.
pub fn read(reader: &mut Reader<'_>, node: Option<&Node>) -> Option<Uncertainty> {
    let Some(node) = node else {
        return Some(Uncertainty::default());
    };
    let fields = reader.fields(
        node,
        "`uncertainty`",
        &["magnitude", "phase", "temperature", "repeatability"],
    )?;
    let magnitude = fields
        .get("magnitude")
        .map(|node| ratio(reader, node, "`magnitude`"));
    let phase = fields.get("phase").map(|node| {
        let expected = "an angle above zero and at most 90 °";
        let possible = |v: f64| v > 0.0 && v <= FRAC_PI_2;
        reader.quantity_if(node, "`phase`", Dimension::Angle, possible, expected)
    });
    let temperature = fields.get("temperature").map(|node| {
        let expected = "a standard uncertainty above 0 K and at most 50 K, such as `0.5 K`";
        let possible = |v: f64| v > 0.0 && v <= 50.0;
        reader.temperature_difference_if(node, "`temperature`", possible, expected)
    });
    let repeatability = fields
        .get("repeatability")
        .map(|node| repeatability(reader, node));
    Some(Uncertainty {
        magnitude: given(magnitude)?,
        phase: given(phase)?,
        temperature: given(temperature)?,
        repeatability: given(repeatability)?.unwrap_or_default(),
    })
}

fn ratio(reader: &mut Reader<'_>, node: &Node, what: &str) -> Option<f64> {
    let expected = "a relative standard uncertainty above 0 and at most 100 %";
    let possible = |v: f64| v > 0.0 && v <= 1.0;
    reader.share_if(node, what, possible, expected)
}

fn repeatability(reader: &mut Reader<'_>, node: &Node) -> Option<Vec<(String, Repeatability)>> {
    let names = REPEATABLE.map(|(name, _)| name);
    let fields = reader.fields(node, "`repeatability`", &names)?;
    let mut list = Vec::new();
    let mut complete = true;
    for (name, _, value) in fields.iter() {
        let Some((_, dimension)) = REPEATABLE.iter().find(|(known, _)| *known == name) else {
            complete = false;
            continue;
        };
        match one(reader, value, name, *dimension) {
            Some(repeatability) => list.push((name.to_owned(), repeatability)),
            None => complete = false,
        }
    }
    complete.then_some(list)
}

/// A share of the value where it has `%` or `ppm`, otherwise in the unit of the characteristic.
fn one(
    reader: &mut Reader<'_>,
    node: &Node,
    name: &str,
    dimension: Dimension,
) -> Option<Repeatability> {
    let what = format!("`{name}`");
    let share = |text: &str| text.contains('%') || text.contains("ppm");
    if matches!(&node.shape, Shape::Text { text, .. } if share(text)) {
        return ratio(reader, node, &what).map(Repeatability::Relative);
    }
    let expected = "a standard uncertainty above zero";
    let value = reader.quantity_if(node, &what, dimension, |v| v > 0.0, expected)?;
    Some(Repeatability::Absolute(value))
}
