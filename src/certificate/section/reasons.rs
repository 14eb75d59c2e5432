//! Reasons of the verdict, parts that are not conforming, warnings, conditions.

use super::{characteristics, part_anchor, part_ink, part_mark, part_word};
use crate::certificate::canvas::Area;
use crate::certificate::figures::{ABSENT, sentence};
use crate::certificate::flow::{BODY, BODY_LEADING, Flow, SMALL};
use crate::certificate::ink::{ACCEPT, NONCONFORMING, QUIET};
use crate::certificate::structure::Role;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use crate::certificate::text::width;
use crate::diagnostic::Note;
use crate::record::{LotRecord, PartRecord, PartVerdict};
use std::collections::BTreeSet;

/// Most parts listed here; the parts table has them all.
const LISTED: usize = 60;

pub(in crate::certificate) fn reasons(flow: &mut Flow, record: &LotRecord) {
    flow.heading("Reasons", 60.0);
    flow.anchor("reasons");
    let names: BTreeSet<&str> = record.parts.iter().map(|p| p.part.as_str()).collect();
    for reason in &record.reasons {
        note(flow, reason, &names);
    }
    not_conforming(flow, record);
    chain(flow, record);
    if !record.warnings.is_empty() {
        flow.subheading("Warnings that decided nothing", 30.0);
        for warning in &record.warnings {
            note(flow, warning, &names);
        }
    }
    conditions(flow, record);
}

/// A sentence, its code below, and links to the parts that it names.
fn note(flow: &mut Flow, note: &Note, names: &BTreeSet<&str>) {
    flow.need(30.0);
    flow.paragraph_of(&sentence(&note.text), BODY, BODY_LEADING);
    let area = flow.take(12.0);
    let before = flow.enter(Role::Paragraph);
    let mut x = area.left;
    x += flow.page().text((x, area.top + 8.5), SMALL, &note.code) + 10.0;
    for part in named_parts(&note.text, names) {
        let text = format!("→ part {part}");
        let style = SMALL.ink(ACCEPT);
        let wide = width(&text, style);
        if x + wide > area.right {
            break;
        }
        flow.page().text((x, area.top + 8.5), style, &text);
        let target = Area {
            left: x,
            right: x + wide,
            ..area
        };
        flow.page().link(target, &part_anchor(part));
        x += wide + 10.0;
    }
    flow.leave(before);
    flow.y += 5.0;
}

/// The parts that a sentence names: known part numbers that follow the word part or parts, as long
/// as only part numbers, commas and "and" come between.
fn named_parts<'n>(text: &str, names: &BTreeSet<&'n str>) -> Vec<&'n str> {
    let mut out = Vec::new();
    let mut listing = false;
    for word in text.split_whitespace() {
        let bare = word.trim_matches([',', '.', ';', ':', '(', ')', '`']);
        let known = names.get(bare).copied();
        listing = match (bare, known) {
            ("part" | "parts" | "Part" | "Parts", _) => true,
            (_, Some(part)) if listing => {
                if !out.contains(&part) {
                    out.push(part);
                }
                true
            }
            ("and", _) => listing,
            _ => false,
        };
    }
    out
}

/// The chain from numbers to verdict.
fn chain(flow: &mut Flow, record: &LotRecord) {
    if record.explanation.is_empty() {
        return;
    }
    flow.subheading("How the verdict follows", 60.0);
    let mut table = Table::new(vec![
        Column::new("About", Align::Left, Span::Share(0.75)),
        Column::new("Rule", Align::Left, Span::Share(1.6)),
        Column::new("Numbers", Align::Left, Span::Share(1.6)),
        Column::new("Result", Align::Left, Span::Share(0.95)),
        Column::new("Source", Align::Left, Span::Share(1.1)),
    ]);
    table.size = 8.6;
    for step in &record.explanation {
        table.row(vec![
            Cell::text(step.about.clone()).bold(),
            Cell::text(step.rule.clone()),
            Cell::text(step.numbers.clone()),
            Cell::text(step.result.clone()),
            Cell::text(step.source.clone()).ink(QUIET),
        ]);
    }
    table.set(flow);
}

/// What is wrong with each part that is not conforming.
fn not_conforming(flow: &mut Flow, record: &LotRecord) {
    let parts: Vec<&PartRecord> = record
        .parts
        .iter()
        .filter(|p| p.verdict != PartVerdict::Conforming)
        .collect();
    if parts.is_empty() {
        return;
    }
    flow.subheading("Parts that are not conforming", 50.0);
    let mut table = Table::new(vec![
        Column::new("Part", Align::Left, Span::Natural),
        Column::new("Verdict", Align::Left, Span::Natural),
        Column::new("Class", Align::Left, Span::Natural),
        Column::new("Found", Align::Left, Span::Share(1.0)),
    ]);
    for part in parts.iter().take(LISTED) {
        table.row(vec![
            Cell::text(part.part.clone()).link(part_anchor(&part.part)),
            Cell::text(part_word(part.verdict))
                .mark(part_mark(part.verdict))
                .ink(part_ink(part.verdict)),
            Cell::text(part.class.clone().unwrap_or_else(|| ABSENT.to_owned())),
            Cell::text(findings(record, part)),
        ]);
    }
    table.set(flow);
    let more = parts.len().saturating_sub(LISTED);
    if more > 0 {
        flow.y += 3.0;
        flow.small(&format!(
            "{more} more parts are not conforming; the parts table has them all."
        ));
    }
}

/// The readings outside their limits, and the faults.
pub(in crate::certificate) fn findings(record: &LotRecord, part: &PartRecord) -> String {
    let mut out = readings_outside(record, part);
    out.extend(part.faults.iter().map(|f| f.text.clone()));
    if out.is_empty() {
        return ABSENT.to_owned();
    }
    out.join("; ")
}

/// The readings that are not conforming, each with value, limits and verdict.
fn readings_outside(record: &LotRecord, part: &PartRecord) -> Vec<String> {
    record
        .limits
        .characteristics
        .iter()
        .filter_map(|bound| {
            let reading = part.readings.get(&bound.key)?;
            let nothing = part.verdict == PartVerdict::Unmeasured
                && reading.value.is_none()
                && reading.warnings.is_empty();
            if reading.verdict == PartVerdict::Conforming || nothing {
                return None;
            }
            let scale = crate::certificate::figures::Scale::of_bound(bound, reading);
            let value = match (reading.value, reading.above, reading.below) {
                (Some(v), _, _) => {
                    format!(
                        "{} {}",
                        scale.reading(v, reading.standard_uncertainty),
                        scale.unit
                    )
                }
                (None, Some(above), _) => format!("above {} {}", scale.exact(above), scale.unit),
                (None, None, Some(below)) => format!("below {} {}", scale.exact(below), scale.unit),
                (None, None, None) => "no value".to_owned(),
            };
            let limits = match (reading.lower, reading.upper) {
                (Some(l), Some(u)) => format!(
                    "limits {} to {} {}",
                    scale.exact(l),
                    scale.exact(u),
                    scale.unit
                ),
                (Some(l), None) => format!("lower limit {} {}", scale.exact(l), scale.unit),
                (None, Some(u)) => format!("upper limit {} {}", scale.exact(u), scale.unit),
                (None, None) => "no limit".to_owned(),
            };
            let why = reading
                .warnings
                .iter()
                .map(|w| format!(", {}", w.text))
                .collect::<String>();
            Some(format!(
                "{} {value}, {limits}, {}{why}",
                bound.name,
                part_word(reading.verdict)
            ))
        })
        .collect()
}

/// Limit file, decision rule and acceptance in words.
pub(in crate::certificate) fn limits_in_force(record: &LotRecord) -> String {
    let limits = &record.limits;
    format!(
        "Limit file {} revision {}; decision rule {}, coverage factor {}; acceptance {}.",
        limits.part,
        limits.revision,
        limits.decision_rule.replace('_', " "),
        crate::certificate::figures::plain(limits.coverage_factor),
        limits.acceptance
    )
}

fn conditions(flow: &mut Flow, record: &LotRecord) {
    flow.subheading("Limits and conditions in force", 60.0);
    flow.paragraph(&limits_in_force(record));
    bounds(flow, record);
    let limits = &record.limits;
    if limits.conditions.is_empty() {
        return;
    }
    flow.gap(8.0);
    let mut table = Table::new(vec![
        Column::new("Condition", Align::Left, Span::Natural),
        Column::new("Demanded", Align::Left, Span::Share(1.0)),
        Column::new("Found", Align::Left, Span::Share(1.0)),
        Column::new("Met", Align::Left, Span::Natural),
    ]);
    for c in &limits.conditions {
        let met = if c.met {
            Cell::text("yes")
        } else {
            Cell::text("no").bold().ink(NONCONFORMING)
        };
        table.row(vec![
            Cell::text(c.name.clone()),
            Cell::text(c.demanded.clone()),
            Cell::text(c.found.clone()),
            met,
        ]);
    }
    table.set(flow);
}

/// The limits with their classes.
fn bounds(flow: &mut Flow, record: &LotRecord) {
    let mut table = Table::new(vec![
        Column::new("Characteristic", Align::Left, Span::Share(1.0)),
        Column::new("Key in the record", Align::Left, Span::Natural),
        Column::new("Class", Align::Left, Span::Natural),
        Column::new("Unit", Align::Left, Span::Natural),
        Column::new("Lower", Align::Decimal, Span::Natural),
        Column::new("Nominal", Align::Decimal, Span::Natural),
        Column::new("Upper", Align::Decimal, Span::Natural),
    ]);
    for c in characteristics(record) {
        let exact =
            |v: Option<f64>| Cell::text(v.map_or_else(|| ABSENT.to_owned(), |v| c.scale.exact(v)));
        table.row(vec![
            Cell::text(c.bound.name.clone()),
            Cell::text(c.bound.key.clone()),
            Cell::text(c.bound.class.clone()),
            Cell::text(c.scale.unit.clone()),
            exact(c.bound.lower),
            exact(c.bound.nominal),
            exact(c.bound.upper),
        ]);
    }
    table.set(flow);
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn parts_are_found_where_a_sentence_names_them_and_nowhere_else() {
        let names: BTreeSet<&str> = ["017", "3", "031"].into();
        assert_eq!(
            named_parts("Parts 017, 031 and 3 lie outside.", &names),
            ["017", "031", "3"]
        );
        assert_eq!(
            named_parts("3 nonconforming parts, 1 allowed: part 017 (ESR)", &names),
            ["017"]
        );
        assert!(named_parts("at most 3 of 31", &names).is_empty());
    }
}
