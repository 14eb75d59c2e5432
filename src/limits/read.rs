//! A limit file from its bytes.

use super::{Limits, acceptance, bound, conditions, lot_rules, stated};
use crate::diagnostic::{Faults, Source, yaml};

/// JSON Schema (draft 2020-12) of a limit file, for editors.
pub const SCHEMA: &str = include_str!("limits.schema.json");

const KEYS: [&str; 10] = [
    "part",
    "revision",
    "description",
    "code",
    "conditions",
    "characteristics",
    "decision_rule",
    "acceptance",
    "lot_rules",
    "retest",
];

/// Reads a limit file.
///
/// `path` is only named in faults; where its folder is called `parts`, the file's stem must be the
/// part. Errors: every fault of the file, with its place.
pub fn read(path: &str, bytes: &[u8]) -> Result<Limits, Faults> {
    let source = Source::new(path, bytes)?;
    let root = yaml::parse(&source)?;
    let mut reader = yaml::Reader::new(&source);
    let limits = limits(&mut reader, &root, path);
    reader.finish(limits)
}

fn limits(reader: &mut yaml::Reader<'_>, root: &yaml::Node, path: &str) -> Option<Limits> {
    let fields = reader.fields(root, "a limit file", &KEYS)?;
    let file = "a limit file";
    let part = reader
        .required(&fields, "part", file, "RG-0475-X7R")
        .and_then(|node| {
            let part = reader.name(node, "`part`")?;
            reader.stem_is(node, path, "parts", &part, "part");
            Some(part)
        });
    let revision = reader
        .required(&fields, "revision", file, "1")
        .and_then(|node| reader.line(node, "`revision`"));
    let description = fields
        .get("description")
        .map(|node| reader.line(node, "`description`"));
    let conditions = conditions::read(reader, fields.get("conditions"));
    let bounded = reader
        .required(
            &fields,
            "characteristics",
            file,
            "{capacitance: {at: 1 kHz, min: 1 µF}}",
        )
        .map(|node| bound::read_all(reader, node))
        .unwrap_or_default();
    let decision_rule = conditions::decision_rule(reader, fields.get("decision_rule"));
    let acceptance = reader
        .required(
            &fields,
            "acceptance",
            file,
            "{fixed: {sample: 32, accept: 0}}",
        )
        .and_then(|node| acceptance::read(reader, node, &bounded));
    let rules = lot_rules::read(reader, fields.get("lot_rules"), &bounded);
    let retest = conditions::retest(reader, fields.get("retest"));
    stated::check(reader, &fields, &bounded.bounds);
    if let Some(conditions) = conditions.as_ref().filter(|_| bounded.complete) {
        conditions::ageing_has_capacitance(reader, &fields, conditions, &bounded.bounds);
        conditions::coefficients_are_of_bounds(reader, &fields, conditions, &bounded.bounds);
    }
    let rules = rules?;
    Some(Limits {
        part: part?,
        revision: revision?,
        description: match description {
            Some(text) => Some(text?),
            None => None,
        },
        conditions: conditions?,
        bounds: bounded.complete.then_some(bounded.bounds)?,
        decision_rule: decision_rule?,
        acceptance: acceptance?,
        capability_rules: rules.capability,
        outlier_rules: rules.outliers,
        mixed_rules: rules.mixed,
        trend_rules: rules.trend,
        reduced_inspection: rules.reduced_inspection,
        retest: retest?,
    })
}
