//! Sweep files with their digests, and what was found on parts and files.

use super::{part_anchor, part_word};
use crate::certificate::flow::Flow;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use crate::diagnostic::Note;
use crate::record::LotRecord;
use indexmap::IndexMap;

pub(in crate::certificate) fn files(flow: &mut Flow, record: &LotRecord) {
    findings(flow, record);
    if record.parts.iter().all(|p| p.attempts.is_empty()) {
        return;
    }
    flow.heading("Sweep files", 80.0);
    let mut table = Table::new(vec![
        Column::new("Part", Align::Left, Span::Natural),
        Column::new("Try", Align::Right, Span::Natural),
        Column::new("Verdict", Align::Left, Span::Natural),
        Column::new("File", Align::Left, Span::Share(1.0)),
        Column::new("SHA-256 of its bytes", Align::Left, Span::Natural),
    ]);
    table.size = 7.4;
    table.rule_every = 5;
    for part in &record.parts {
        for attempt in &part.attempts {
            table.row(vec![
                Cell::text(part.part.clone()),
                Cell::text(attempt.attempt.to_string()),
                Cell::text(part_word(attempt.verdict)),
                Cell::text(attempt.file.clone()),
                Cell::text(attempt.sha256.clone()),
            ]);
        }
    }
    table.set(flow);
}

/// Faults, warnings and notes: each sentence once, with the parts and tries that it is about.
fn findings(flow: &mut Flow, record: &LotRecord) {
    let mut found: IndexMap<(&'static str, &str, &str), Vec<String>> = IndexMap::new();
    for part in &record.parts {
        let name = part.part.as_str();
        collect(&mut found, "fault", &part.faults, name);
        collect(&mut found, "warning", &part.warnings, name);
        for reading in part.readings.values() {
            collect(&mut found, "warning", &reading.warnings, name);
        }
        for attempt in &part.attempts {
            let of = if part.attempts.len() > 1 {
                format!("{name} try {}", attempt.attempt)
            } else {
                name.to_owned()
            };
            collect(&mut found, "fault", &attempt.faults, &of);
            collect(&mut found, "note", &attempt.notes, &of);
        }
    }
    if found.is_empty() {
        return;
    }
    flow.heading("Findings on parts and files", 80.0);
    let mut table = Table::new(vec![
        Column::new("Kind", Align::Left, Span::Natural),
        Column::new("Code", Align::Left, Span::Natural),
        Column::new("Finding", Align::Left, Span::Share(2.0)),
        Column::new("Parts", Align::Left, Span::Share(1.2)),
    ]);
    table.size = 8.6;
    for ((kind, code, text), mut of) in found {
        of.dedup();
        let cell = match of.as_slice() {
            [one] if !one.contains(" try ") => Cell::text(one.clone()).link(part_anchor(one)),
            many => Cell::text(listed(many, record.parts.len())),
        };
        table.row(vec![
            Cell::text(kind),
            Cell::text(code.to_owned()),
            Cell::text(text.to_owned()),
            cell,
        ]);
    }
    table.set(flow);
}

fn collect<'r>(
    found: &mut IndexMap<(&'static str, &'r str, &'r str), Vec<String>>,
    kind: &'static str,
    notes: &'r [Note],
    of: &str,
) {
    for note in notes {
        let parts = found
            .entry((kind, note.code.as_str(), note.text.as_str()))
            .or_default();
        if parts.last().is_none_or(|last| last != of) {
            parts.push(of.to_owned());
        }
    }
}

/// The parts by name, or how many where all are meant.
fn listed(parts: &[String], of: usize) -> String {
    if of > 3 && parts.len() == of {
        return format!("all {of} parts");
    }
    parts.join(", ")
}
