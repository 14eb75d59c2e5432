//! The same content as plain text: for screen readers, terminals and quick looking.
//!
//! One statement a line, every number with its unit, no drawing; a character that would act on a
//! terminal or turn the reading direction stands as its code point.

use super::Sources;
use super::figures::{ABSENT, chance, index, plain, significant};
use super::section::{
    Characteristic, answer, characteristics, curves, integrity, lot_word, lots, part_word, plan,
    populations, reasons, scatter, signatures, station,
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
    evidence(&mut out, record, &all);
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
    if let Some(signatory) = sources.signature {
        out.heading("Electronic signature");
        out.facts(signatures::facts(signatory));
    }
    out.0
}

/// What the pages between the characteristics and the parts have in drawings and tables.
fn evidence(out: &mut Text, record: &LotRecord, all: &[Characteristic]) {
    if let Some(circuit) = curves::circuit_words(record) {
        out.heading("Equivalent circuit");
        out.line(&circuit);
    }
    if all.iter().any(|c| c.mixed.is_some()) {
        out.heading("Two populations");
    }
    for (c, mixed) in all.iter().filter_map(|c| Some((c, c.mixed?))) {
        out.line(&populations::evidence(c, mixed));
        let unit = &c.scale.unit;
        for (name, group) in ["light", "dark"].iter().zip(&mixed.groups) {
            out.line(&format!(
                "  Group {name}: {} parts, mean {} {unit}, s {} {unit}: {}",
                group.parts.len(),
                c.scale.finer(group.mean),
                c.scale.spread(group.standard_deviation),
                group.parts.join(", ")
            ));
        }
    }
    if let Some(words) = scatter::caption(record, all) {
        out.heading("Capacitance against self-resonance");
        out.line(&words);
    }
    let charts = lots::charts(record, all);
    if !charts.is_empty() {
        out.heading("Lot to lot");
    }
    for (c, chart) in charts {
        out.line(&format!(
            "{}: {}",
            c.bound.name,
            lots::caption(record, c, chart)
        ));
        for lot in &chart.lots {
            let s = lot.standard_deviation;
            out.line(&format!(
                "  Lot {}: n {}, mean {}, s {}",
                lot.lot,
                lot.n,
                c.scale.finer(lot.mean),
                s.map_or_else(|| ABSENT.to_owned(), |s| c.scale.spread(s))
            ));
        }
    }
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
        if class.share_nonconforming_upper_95.is_some() {
            out.line(&format!(
                "  Share nonconforming in the sample {} %, in the lot at least {} %, at most {} % (confidence 95 % each)",
                plan::share(class.share_nonconforming),
                plan::share(class.share_nonconforming_lower_95),
                plan::share(class.share_nonconforming_upper_95)
            ));
        }
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
    if let Some(switching) = &record.sampling.switching {
        for (name, state) in &switching.classes {
            let more = if state.discontinued {
                ", discontinued"
            } else {
                ""
            };
            out.line(&format!(
                "Severity of inspection, class {name}: {}{more}; score {}, lots that count {}; {}",
                state.severity, state.score, state.lots, state.why
            ));
        }
        for words in plan::decisions(switching) {
            out.line(&words);
        }
        out.line(&plan::before(switching));
    }
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
    let chances = [
        ("normality p", s.normality_p_value.map(chance)),
        ("Pp by percentiles", s.pp_percentile.map(|v| index(Some(v)))),
        (
            "Ppk by percentiles",
            s.ppk_percentile.map(|v| index(Some(v))),
        ),
        (
            "tolerance interval 95 % / 95 %",
            s.tolerance_95_95.map(|[low, high]| {
                format!("{} to {} {unit}", c.scale.finer(low), c.scale.finer(high))
            }),
        ),
        (
            "consumer's risk",
            s.consumers_risk.map(|v| format!("{} %", chance(v * 100.0))),
        ),
        (
            "producer's risk",
            s.producers_risk.map(|v| format!("{} %", chance(v * 100.0))),
        ),
    ];
    let words: Vec<String> = chances
        .into_iter()
        .filter_map(|(word, value)| Some(format!("{word} {}", value?)))
        .collect();
    if !words.is_empty() {
        out.line(&format!("  {}", words.join(", ")));
    }
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
