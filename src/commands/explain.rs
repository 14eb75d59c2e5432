//! The chain from numbers to verdict on the terminal.

use super::text::wrapped;
use crate::diagnostic::printable;
use crate::quantity::{engineering, shortest};
use crate::record::{LotRecord, PartRecord, ReadingRecord};
use std::fmt::Write;

/// The chain of the lot, and that of one part where one is named.
pub fn screen(record: &LotRecord, part: &str) -> String {
    let mut out = String::from("\nHow it was decided\n");
    for step in &record.explanation {
        let _ = writeln!(out, "  {}", printable(&step.about));
        for (name, text) in [
            ("rule", &step.rule),
            ("source", &step.source),
            ("in", &step.numbers),
            ("out", &step.result),
        ] {
            out.push_str(&wrapped(text, &format!("    {name:<7}"), "           "));
        }
    }
    if !part.is_empty() {
        match record.parts.iter().find(|p| p.part == part) {
            Some(part) => of_part(&mut out, record, part),
            None => {
                out.push_str(&wrapped(
                    &format!("The lot has no part `{part}`."),
                    "\n",
                    "",
                ));
            }
        }
    }
    out
}

fn of_part(out: &mut String, record: &LotRecord, part: &PartRecord) {
    let _ = writeln!(
        out,
        "\nPart {}: {}",
        printable(&part.part),
        part.verdict.name()
    );
    for attempt in &part.attempts {
        let counts = if attempt.counts {
            "counts"
        } else {
            "does not count"
        };
        out.push_str(&wrapped(
            &format!(
                "try {}: {}, {}, {counts}",
                attempt.attempt,
                attempt.file,
                attempt.verdict.name()
            ),
            "  ",
            "    ",
        ));
    }
    for fault in &part.faults {
        out.push_str(&wrapped(&fault.text, "  ", "    "));
    }
    for bound in &record.limits.characteristics {
        let Some(reading) = part.readings.get(&bound.key) else {
            continue;
        };
        let _ = writeln!(out, "  {}", printable(&bound.name));
        let (rule, source) = rule(record);
        out.push_str(&wrapped(rule, "    rule   ", "           "));
        out.push_str(&wrapped(source, "    source ", "           "));
        out.push_str(&wrapped(
            &in_numbers(record, reading),
            "    in     ",
            "           ",
        ));
        out.push_str(&wrapped(
            reading.verdict.name(),
            "    out    ",
            "           ",
        ));
    }
}

/// How a reading is held against its limits, with the clause.
fn rule(record: &LotRecord) -> (&'static str, &'static str) {
    match record.limits.decision_rule.as_str() {
        "guarded_acceptance" => (
            "conforming where L + k u ≤ value ≤ U − k u, nonconforming where the value is outside the limits, else undecided",
            "JCGM 106:2012, 8.3.2",
        ),
        "guarded_rejection" => (
            "nonconforming where the value is below L − k u or above U + k u, conforming where it is inside the limits, else undecided",
            "JCGM 106:2012, 8.3.3",
        ),
        _ => (
            "conforming where L ≤ value ≤ U, else nonconforming",
            "JCGM 106:2012, 8.2",
        ),
    }
}

/// Value, uncertainty, guard band and limits.
fn in_numbers(record: &LotRecord, reading: &ReadingRecord) -> String {
    let unit = &reading.unit;
    let mut words = Vec::new();
    match (reading.value, reading.above, reading.below) {
        (Some(value), ..) => words.push(format!("value {}", engineering(value, unit, 6))),
        (None, Some(least), _) => words.push(format!("above {}", engineering(least, unit, 6))),
        (None, None, Some(most)) => words.push(format!("below {}", engineering(most, unit, 6))),
        (None, None, None) => words.extend(reading.warnings.iter().map(|w| w.text.clone())),
    }
    if let Some(measured) = reading.as_measured {
        words.push(format!("as measured {}", engineering(measured, unit, 6)));
    }
    if let Some(u) = reading.standard_uncertainty {
        let k = record.limits.coverage_factor;
        words.push(format!(
            "u {}, k u {}",
            engineering(u, unit, 3),
            engineering(k * u, unit, 3)
        ));
    }
    let limit =
        |name: &str, value: Option<f64>| value.map(|v| format!("{name} {}", shortest(v, unit)));
    words.extend(limit("L", reading.lower));
    words.extend(limit("U", reading.upper));
    if let Some(p) = reading.conformance_probability {
        words.push(format!("probability of conformity {:.4}", p));
    }
    if let Some(margin) = reading.margin {
        words.push(format!("margin {}", engineering(margin, unit, 3)));
    }
    words.join(", ")
}
