//! What is measured to see that the jig is still good: a reference part, the empty jig, a short.

use super::read::given;
use super::{JigCheck, Known, REPEATABLE, ReferencePart, Standing};
use crate::diagnostic::yaml::{Fields, Node, Reader, Shape, shown};
use crate::quantity::{Dimension, Tolerance};

/// Most parts between two checks.
const MOST_PARTS: u64 = 100_000;

/// Characteristics that have a value at each frequency, and therefore need `at`.
const AT_A_FREQUENCY: [&str; 4] = ["capacitance", "dissipation_factor", "esr", "impedance"];

/// The check: at least one of reference part, open and short.
pub fn read(reader: &mut Reader<'_>, node: &Node) -> Option<JigCheck> {
    let what = "`jig_check`";
    let keys = ["every", "reference_part", "open", "short"];
    let fields = reader.fields(node, what, &keys)?;
    let every = fields.get("every").map(|node| parts(reader, node));
    let part = fields
        .get("reference_part")
        .map(|node| reference_part(reader, node));
    let open = fields
        .get("open")
        .map(|node| standing(reader, node, "`open`", "min", "10 MΩ"));
    let short = fields
        .get("short")
        .map(|node| standing(reader, node, "`short`", "max", "30 mΩ"));
    if part.is_none() && open.is_none() && short.is_none() {
        let example = "{asset: REF-03, characteristics: {capacitance: {at: 1 kHz, value: 100 nF, \
                       tolerance: ±0.5 %}}}";
        reader.required(&fields, "reference_part", what, example);
    }
    Some(JigCheck {
        every: given(every)?,
        reference_part: given(part)?,
        open: given(open)?,
        short: given(short)?,
    })
}

/// `25 parts`, or the number alone.
fn parts(reader: &mut Reader<'_>, node: &Node) -> Option<u32> {
    let text = reader.scalar(node, "`every`")?.trim();
    let number = ["parts", "part"]
        .iter()
        .find_map(|unit| text.strip_suffix(unit))
        .unwrap_or(text)
        .trim_end();
    let plain = !number.is_empty() && number.bytes().all(|b| b.is_ascii_digit());
    let value = number
        .parse::<u64>()
        .ok()
        .filter(|value| plain && (1..=MOST_PARTS).contains(value));
    if value.is_none() {
        reader.fault(
            node.span,
            "out_of_range",
            format!("{} for `every`", shown(node)),
            format!("a number of parts from 1 to {MOST_PARTS}"),
            Some("write for example `every: 25 parts`".to_owned()),
        );
    }
    value.and_then(|value| u32::try_from(value).ok())
}

fn reference_part(reader: &mut Reader<'_>, node: &Node) -> Option<ReferencePart> {
    let what = "`reference_part`";
    let fields = reader.fields(node, what, &["asset", "due", "characteristics"])?;
    let asset = reader
        .required(&fields, "asset", what, "REF-03")
        .and_then(|node| reader.line(node, "`asset`"));
    let due = fields.get("due").map(|node| reader.date(node, "`due`"));
    let example = "{capacitance: {at: 1 kHz, value: 100 nF, tolerance: ±0.5 %}}";
    let characteristics = reader
        .required(&fields, "characteristics", what, example)
        .and_then(|node| characteristics(reader, node));
    Some(ReferencePart {
        asset: asset?,
        due: given(due)?,
        characteristics: characteristics?,
    })
}

/// What is known of the reference part: at least one value.
fn characteristics(reader: &mut Reader<'_>, node: &Node) -> Option<Vec<Known>> {
    let names = REPEATABLE.map(|(name, _)| name);
    let before = reader.count();
    let fields = reader.fields(node, "`characteristics`", &names)?;
    let mut all: Vec<Known> = Vec::new();
    for (name, _, value) in fields.iter() {
        let Some((_, dimension)) = REPEATABLE.iter().find(|(known, _)| *known == name) else {
            continue;
        };
        let items: Vec<&Node> = match &value.shape {
            Shape::List(list) => list.iter().collect(),
            _ => vec![value],
        };
        for item in items {
            let Some(known) = known(reader, item, name, *dimension) else {
                continue;
            };
            let same = |other: &Known| other.characteristic == name && other.at == known.at;
            if all.iter().any(same) {
                let found = format!("`{name}` a second time at one frequency");
                let expected = "each value of the reference part once";
                reader.fault(item.span, "duplicate_bound", found, expected, None);
            }
            all.push(known);
        }
    }
    if all.is_empty() && reader.count() == before {
        reader.fault(
            node.span,
            "missing_value",
            "a reference part of which nothing is known",
            "at least one value with its tolerance",
            Some("add for example `esr_minimum: {value: 4 mΩ, tolerance: ±1 mΩ}`".to_owned()),
        );
    }
    (reader.count() == before).then_some(all)
}

fn known(reader: &mut Reader<'_>, node: &Node, name: &str, dimension: Dimension) -> Option<Known> {
    let what = format!("`{name}`");
    let fields = reader.fields(node, &what, &["at", "value", "tolerance"])?;
    let needs = AT_A_FREQUENCY.contains(&name);
    let at = if needs {
        frequency(reader, &fields, &what).map(Some)
    } else {
        if let Some((key, _)) = fields.entry("at") {
            let found = format!("`at` of {what}");
            let expected = format!("no `at`: {what} has one value for the whole sweep");
            let hint = Some("delete it".to_owned());
            reader.fault(key.span, "no_effect", found, expected, hint);
        }
        Some(None)
    };
    let value = reader
        .required(&fields, "value", &what, "100.0 nF")
        .and_then(|node| {
            let expected = "a value above zero";
            reader.quantity_if(node, "`value`", dimension, |v| v > 0.0, expected)
        });
    let tolerance = reader
        .required(&fields, "tolerance", &what, "±0.5 %")
        .and_then(|node| limits(reader, node, dimension, value));
    let (value, (lower, upper)) = (value?, tolerance?);
    Some(Known {
        characteristic: name.to_owned(),
        at: at?,
        value,
        lower,
        upper,
    })
}

/// The limits around a value; they hold it between them.
fn limits(
    reader: &mut Reader<'_>,
    node: &Node,
    dimension: Dimension,
    value: Option<f64>,
) -> Option<(f64, f64)> {
    let tolerance: Tolerance = reader.tolerance(node, dimension, value)?;
    let value = value?;
    let (lower, upper) = tolerance.limits(value);
    if lower <= value && value <= upper && lower < upper {
        return Some((lower, upper));
    }
    reader.fault(
        node.span,
        "impossible_value",
        format!("{} for `tolerance`", shown(node)),
        "limits that hold the value between them",
        Some("write for example `±0.5 %`".to_owned()),
    );
    None
}

fn frequency(reader: &mut Reader<'_>, fields: &Fields<'_>, what: &str) -> Option<f64> {
    let node = reader.required(fields, "at", what, "1 kHz")?;
    let expected = "a frequency above zero";
    reader.quantity_if(node, "`at`", Dimension::Frequency, |v| v > 0.0, expected)
}

/// The magnitude of the empty or shorted jig at one frequency, and its limit.
fn standing(
    reader: &mut Reader<'_>,
    node: &Node,
    what: &str,
    side: &str,
    example: &str,
) -> Option<Standing> {
    let fields = reader.fields(node, what, &["at", side])?;
    let at = frequency(reader, &fields, what);
    let impedance = reader
        .required(&fields, side, what, example)
        .and_then(|node| {
            let label = format!("`{side}`");
            let expected = "an impedance above zero";
            reader.quantity_if(node, &label, Dimension::Resistance, |v| v > 0.0, expected)
        });
    Some(Standing {
        at: at?,
        impedance: impedance?,
    })
}
