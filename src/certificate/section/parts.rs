//! The parts table: every part, every try, every reading with its uncertainty.

use super::{Characteristic, part_anchor, part_ink, part_mark, part_word};
use crate::certificate::figures::{ABSENT, significant};
use crate::certificate::flow::Flow;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use crate::record::{AttemptRecord, LotRecord, PartRecord, PartVerdict, ReadingRecord};

/// Most characteristics side by side; more go into further tables, of about as many each.
const SIDE_BY_SIDE: usize = 6;
const SIZE: f64 = 8.4;

pub(in crate::certificate) fn parts(
    flow: &mut Flow,
    record: &LotRecord,
    characteristics: &[Characteristic],
) {
    flow.heading("Parts", 120.0);
    flow.small(
        "Value ± standard uncertainty, rounded to two digits of it; limits are judged on unrounded values. A part's \
         readings are those of the try that counts; earlier tries stand above it. Drive: voltage across the part, V rms, \
         where the sweep carries it.",
    );
    let count = characteristics.len().div_ceil(SIDE_BY_SIDE);
    let each = characteristics.len().div_ceil(count.max(1)).max(1);
    for (index, group) in characteristics.chunks(each).enumerate() {
        if count > 1 {
            let first = index * each + 1;
            let (last, all) = (first + group.len() - 1, characteristics.len());
            let title = if first == last {
                format!("Characteristic {first} of {all}")
            } else {
                format!("Characteristics {first} to {last} of {all}")
            };
            flow.subheading(&title, 60.0);
        }
        table(record, group).set(flow);
    }
}

/// Columns that a record has only where they say something.
#[derive(Clone, Copy)]
struct Shown {
    /// Some part was measured more than once.
    tries: bool,
    /// Some sweep carries the voltage across its part.
    drive: bool,
}

fn table<'a>(record: &'a LotRecord, group: &'a [Characteristic]) -> Table<'a> {
    let mut columns = vec![Column::new("Part", Align::Left, Span::Natural)];
    let tries = record.parts.iter().any(|p| p.attempts.len() > 1);
    if tries {
        columns.push(Column::new("Try", Align::Right, Span::Natural));
    }
    columns.push(Column::new("Verdict", Align::Left, Span::Natural));
    let drive = record.parts.iter().any(|p| p.drive.is_some());
    let shown = Shown { tries, drive };
    if drive {
        columns.push(Column::new("Drive", Align::Decimal, Span::Natural).unit("V"));
    }
    columns.extend(
        group
            .iter()
            .map(|c| Column::new(&c.name(), Align::Decimal, Span::Natural).unit(&c.scale.unit)),
    );
    let mut table = Table::new(columns);
    table.size = SIZE;
    table.rule_every = 5;
    for part in &record.parts {
        let counts = counting(part);
        if part.attempts.is_empty() {
            table.row_at(part_anchor(&part.part), row(part, None, true, shown, group));
        }
        for (index, attempt) in part.attempts.iter().enumerate() {
            let cells = row(part, Some(attempt), Some(index) == counts, shown, group);
            if index == 0 {
                table.row_at(part_anchor(&part.part), cells);
            } else {
                table.row(cells);
            }
        }
    }
    table
}

/// Index of the try that the readings are of.
fn counting(part: &PartRecord) -> Option<usize> {
    part.attempts
        .iter()
        .position(|a| a.counts)
        .or_else(|| part.attempts.len().checked_sub(1))
}

fn row<'a>(
    part: &PartRecord,
    attempt: Option<&AttemptRecord>,
    counts: bool,
    shown: Shown,
    group: &[Characteristic],
) -> Vec<Cell<'a>> {
    let verdict = attempt
        .filter(|_| !counts)
        .map_or(part.verdict, |a| a.verdict);
    let mut word = Cell::text(part_word(verdict))
        .mark(part_mark(verdict))
        .ink(part_ink(verdict));
    if verdict == PartVerdict::Nonconforming {
        word = word.bold();
    }
    let mut cells = vec![Cell::text(part.part.clone())];
    if shown.tries {
        let number = attempt.map_or_else(|| ABSENT.to_owned(), |a| a.attempt.to_string());
        cells.push(Cell::text(number));
    }
    cells.push(word);
    if shown.drive {
        let level = part.drive.filter(|_| counts);
        cells.push(Cell::text(
            level.map_or_else(String::new, |v| significant(v, 3)),
        ));
    }
    for c in group {
        let reading = part.readings.get(&c.bound.key).filter(|_| counts);
        cells.push(reading.map_or_else(Cell::default, |r| cell(r, c)));
    }
    cells
}

/// A reading; one that is not conforming stands out by weight and mark.
fn cell<'a>(reading: &ReadingRecord, c: &Characteristic) -> Cell<'a> {
    let text = match (reading.value, reading.above, reading.below) {
        (Some(v), _, _) => c.scale.reading(v, reading.standard_uncertainty),
        (None, Some(above), _) => format!("> {}", c.scale.exact(above)),
        (None, None, Some(below)) => format!("< {}", c.scale.exact(below)),
        (None, None, None) => ABSENT.to_owned(),
    };
    let cell = Cell::text(text);
    match reading.verdict {
        PartVerdict::Nonconforming | PartVerdict::Undecided => cell
            .bold()
            .mark(part_mark(reading.verdict))
            .spoken(part_word(reading.verdict))
            .ink(part_ink(reading.verdict)),
        _ => cell,
    }
}
