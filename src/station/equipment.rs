//! Instrument and jig: what they are and how long their checks hold.

use super::read::given;
use super::{Instrument, Jig};
use crate::diagnostic::yaml::{Node, Reader, shown};
use crate::quantity::Dimension;

/// The instrument and the days of its calibration.
pub fn instrument(reader: &mut Reader<'_>, node: &Node) -> Option<Instrument> {
    let what = "`instrument`";
    let fields = reader.fields(node, what, &["asset", "calibrated", "due"])?;
    let asset = reader
        .required(&fields, "asset", what, "FA-0112")
        .and_then(|node| reader.line(node, "`asset`"));
    let calibrated = fields
        .get("calibrated")
        .map(|node| reader.date(node, "`calibrated`"));
    let due = fields.get("due").map(|node| reader.date(node, "`due`"));
    if let (Some(Some(from)), Some(Some(to)), Some(node)) = (calibrated, due, fields.get("due"))
        && to < from
    {
        reader.fault(
            node.span,
            "reversed",
            format!("`due` {} before `calibrated`", shown(node)),
            "a calibration that is due after it was made",
            Some("check the two days".to_owned()),
        );
    }
    Some(Instrument {
        asset: asset?,
        calibrated: given(calibrated)?,
        due: given(due)?,
    })
}

/// The jig and its last check.
pub fn jig(reader: &mut Reader<'_>, node: &Node) -> Option<Jig> {
    let what = "`jig`";
    let fields = reader.fields(node, what, &["asset", "checked", "valid_for"])?;
    let asset = reader
        .required(&fields, "asset", what, "JG-07")
        .and_then(|node| reader.line(node, "`asset`"));
    let checked = fields
        .get("checked")
        .map(|node| reader.moment(node, "`checked`"));
    let valid_for = fields.get("valid_for").map(|node| {
        let possible = |v: f64| v > 0.0;
        reader.quantity_if(
            node,
            "`valid_for`",
            Dimension::Time,
            possible,
            "a time above zero",
        )
    });
    if let (Some((key, _)), None) = (fields.entry("valid_for"), fields.get("checked")) {
        reader.fault(
            key.span,
            "no_effect",
            "`valid_for` without `checked`",
            "when the jig was last checked",
            Some("add for example `checked: 2026-10-05T07:50:00+02:00`".to_owned()),
        );
    }
    Some(Jig {
        asset: asset?,
        checked: given(checked)?,
        valid_for: given(valid_for)?,
    })
}
