//! The same content as plain text: for screen readers, terminals and quick looking.
//!
//! One statement a line, every number with its unit, no drawing; a character that would act on a
//! terminal or turn the reading direction stands as its code point.

use super::Sources;
use super::figures::{ABSENT, index, plain, significant};
use super::section::{
    Characteristic, answer, characteristics, integrity, lot_word, part_word, plan, reasons, station,
};
use crate::diagnostic::Note;
use crate::record::{self, LotRecord, PartRecord, ReadingRecord};
use std::fmt::Write;

/// The lot record as plain text, lines of any length, a final newline.
pub fn plain_text(record: &LotRecord, sources: &Sources) -> String {
    let all = characteristics(record);
    let mut out = Text::default();
    out.line(&format!("Lot record {}", record.record));
    out.line(&format!(
        "Verdict: {}",
        lot_word(record.verdict).to_uppercase()
    ));
    for note in &record.reasons {
        out.note("Because", note);
    }
    if !record.explanation.is_empty() {
        out.heading("How the verdict follows");
    }
    for step in &record.explanation {
        out.line(&format!(
            "{}: {}. {}. Result: {}. Source: {}",
            step.about, step.rule, step.numbers, step.result, step.source
        ));
    }
    out.heading("Lot");
    out.facts(answer::identity(record));
    out.heading("Sampling");
    sampling(&mut out, record);
    out.heading("Characteristics");
    for c in &all {
        characteristic(&mut out, c);
    }
    conditions(&mut out, record);
    if !record.warnings.is_empty() {
        out.heading("Warnings that decided nothing");
        for note in &record.warnings {
            out.note("Warning", note);
        }
    }
    out.heading("Parts");
    for part in &record.parts {
        self::part(&mut out, part, &all);
    }
    for (title, folder, text) in [
        ("Limit file", "limits/parts/", sources.limit_file),
        ("Station file", "limits/stations/", sources.station_file),
    ] {
        if let Some(text) = text {
            out.heading(title);
            if let Some(words) = record.approval_words(folder) {
                out.line(&words);
            }
            for (index, line) in text.lines().enumerate() {
                out.line(&format!("{:>4}  {line}", index + 1));
            }
        }
    }
    out.heading("Station and calibration");
    out.facts(station::facts(record));
    out.heading("Integrity");
    let digest =
        record::to_bytes(record).map_or_else(|_| ABSENT.to_owned(), |bytes| record::sha256(&bytes));
    out.facts(integrity::facts(record, &digest));
    if let Some(ledger) = &sources.ledger {
        out.facts(integrity::ledger_facts(ledger));
    }
    out.0
}

#[derive(Default)]
struct Text(String);

impl Text {
    fn line(&mut self, text: &str) {
        for c in text.chars() {
            if acts(c) {
                // Writing to a string cannot fail.
                let _ = write!(self.0, "<U+{:04X}>", u32::from(c));
            } else {
                self.0.push(c);
            }
        }
        self.0.push('\n');
    }

    fn heading(&mut self, title: &str) {
        self.0.push('\n');
        self.line(title);
        self.line(&"-".repeat(title.chars().count()));
    }

    fn facts(&mut self, facts: Vec<(&'static str, String)>) {
        for (label, value) in facts {
            self.line(&format!("{label}: {value}"));
        }
    }

    fn note(&mut self, kind: &str, note: &Note) {
        self.line(&format!("{kind}: {} ({})", note.text, note.code));
    }
}

/// Controls, and what turns or hides text (Unicode general category Cf, the common ones).
fn acts(c: char) -> bool {
    c.is_control()
        || matches!(u32::from(c), 0xAD | 0x61C | 0x180E | 0x200B..=0x200F | 0x2028..=0x202E
            | 0x2060..=0x206F | 0xFEFF | 0xFFF9..=0xFFFB | 0xE0000..=0xE007F)
}

fn sampling(out: &mut Text, record: &LotRecord) {
    for (name, class) in &record.sampling.classes {
        let mut words = vec![format!("Class {name}: {}", lot_word(class.verdict))];
        words.extend(class.aql.map(|aql| format!("AQL {} %", plain(aql))));
        words.extend(
            class
                .code_letter
                .as_ref()
                .map(|l| format!("code letter {l}")),
        );
        words.push(format!(
            "n {}, Ac {}, Re {}, nonconforming {}, undecided {}",
            class.n, class.ac, class.re, class.nonconforming, class.undecided
        ));
        out.line(&words.join(", "));
        if let Some(oc) = &class.operating_characteristic {
            out.line(&format!("  Operating characteristic: {}", plan::words(oc)));
        }
        for v in &class.variables {
            out.line(&format!(
                "  By variables, {}: {}; {}",
                v.key,
                lot_word(v.verdict),
                v.why
            ));
        }
    }
    out.line(&answer::plan(record));
}

fn characteristic(out: &mut Text, c: &Characteristic) {
    let unit = &c.scale.unit;
    let mut words = Vec::new();
    for (word, value) in [
        ("lower limit", c.bound.lower),
        ("nominal", c.bound.nominal),
        ("upper limit", c.bound.upper),
    ] {
        words.extend(value.map(|v| format!("{word} {} {unit}", c.scale.exact(v))));
    }
    out.line(&format!(
        "{} ({}), class {}: {}",
        c.bound.name,
        c.bound.key,
        c.bound.class,
        words.join(", ")
    ));
    let Some(s) = c.statistics else { return };
    let fine = |v: Option<f64>| {
        v.map_or_else(
            || ABSENT.to_owned(),
            |v| format!("{} {unit}", c.scale.finer(v)),
        )
    };
    let wide = |v: Option<f64>| {
        v.map_or_else(
            || ABSENT.to_owned(),
            |v| format!("{} {unit}", c.scale.spread(v)),
        )
    };
    out.line(&format!(
        "  n {}, mean {}, s {}, s within {}, minimum {}, median {}, maximum {}",
        s.n,
        fine(s.mean),
        wide(s.standard_deviation),
        wide(s.sigma_within),
        fine(s.minimum),
        fine(s.median),
        fine(s.maximum)
    ));
    out.line(&format!(
        "  Cp {}, Cpk {} (lower 95 % {}), Pp {}, Ppk {} (lower 95 % {}), nonconforming {}, undecided {}",
        index(s.cp),
        index(s.cpk),
        index(s.cpk_lower_95),
        index(s.pp),
        index(s.ppk),
        index(s.ppk_lower_95),
        s.nonconforming,
        s.undecided
    ));
    if !s.outliers.is_empty() {
        out.line(&format!("  outliers: {}", s.outliers.join(", ")));
    }
    for note in &s.warnings {
        out.note("  Note", note);
    }
}

fn conditions(out: &mut Text, record: &LotRecord) {
    out.heading("Limits and conditions in force");
    out.line(&reasons::limits_in_force(record));
    for c in &record.limits.conditions {
        let met = if c.met { "met" } else { "NOT MET" };
        out.line(&format!(
            "{}: {met}; demanded {}; found {}",
            c.name, c.demanded, c.found
        ));
    }
}

fn part(out: &mut Text, part: &PartRecord, all: &[Characteristic]) {
    let class = part
        .class
        .as_ref()
        .map_or_else(String::new, |c| format!(", class {c}"));
    out.line(&format!(
        "Part {}: {}{class}",
        part.part,
        part_word(part.verdict)
    ));
    if let Some(drive) = part.drive {
        out.line(&format!(
            "  drive across the part {} V rms",
            significant(drive, 3)
        ));
    }
    for attempt in &part.attempts {
        let counts = if attempt.counts { ", counts" } else { "" };
        out.line(&format!(
            "  try {}: {}{counts}, {}, SHA-256 {}",
            attempt.attempt,
            part_word(attempt.verdict),
            attempt.file,
            attempt.sha256
        ));
        for note in &attempt.faults {
            out.note("    Fault", note);
        }
        for note in &attempt.notes {
            out.note("    Note", note);
        }
    }
    for c in all {
        if let Some(reading) = part.readings.get(&c.bound.key) {
            out.line(&format!("  {} {}", c.bound.name, reading_words(reading, c)));
            for note in &reading.warnings {
                out.note("    Warning", note);
            }
        }
    }
    for note in &part.faults {
        out.note("  Fault", note);
    }
    for note in &part.warnings {
        out.note("  Warning", note);
    }
}

fn reading_words(reading: &ReadingRecord, c: &Characteristic) -> String {
    let unit = &c.scale.unit;
    let value = match (reading.value, reading.above, reading.below) {
        (Some(v), _, _) => format!(
            "{} {unit}",
            c.scale.reading(v, reading.standard_uncertainty)
        ),
        (None, Some(above), _) => format!("above {} {unit}", c.scale.exact(above)),
        (None, None, Some(below)) => format!("below {} {unit}", c.scale.exact(below)),
        (None, None, None) => "no value".to_owned(),
    };
    format!("{value}: {}", part_word(reading.verdict))
}
