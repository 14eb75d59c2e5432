//! A lot record on the terminal: the verdict first and large, then why, then the numbers.
//!
//! Fits 80 columns. The verdict is a word and a mark; colour only repeats it.

use super::switching;
use super::text::{WIDTH, clipped, wrapped};
use crate::diagnostic::printable;
use crate::quantity::{NO_VALUE, engineering, scale, scaled_unit, shortest, with_uncertainty};
use crate::record::{
    BoundSection, LotRecord, LotVerdict, PartRecord, PartVerdict, ReadingRecord, Statistics,
};
use anstyle::{AnsiColor, Style};
use comfy_table::{CellAlignment, ColumnConstraint, ContentArrangement, Table, Width, presets};
use std::fmt::Write;

/// Parts that are not conforming are listed up to this many; the record has all.
const PARTS_SHOWN: usize = 20;

/// The screen of a judged lot; styled with ANSI sequences, which the stream strips where there is
/// no terminal.
pub fn screen(record: &LotRecord) -> String {
    let mut out = String::new();
    banner(&mut out, record);
    reasons(&mut out, record);
    sample(&mut out, record);
    characteristics(&mut out, record);
    parts(&mut out, record);
    warnings(&mut out, record);
    out
}

fn colour(verdict: LotVerdict) -> AnsiColor {
    match verdict {
        LotVerdict::Accept => AnsiColor::Green,
        LotVerdict::Reject => AnsiColor::Red,
        LotVerdict::Hold => AnsiColor::Yellow,
    }
}

/// Mark and word: `✔ ACCEPT`, `✘ REJECT`, `‖ HOLD`.
fn mark(verdict: LotVerdict) -> (&'static str, &'static str) {
    match verdict {
        LotVerdict::Accept => ("✔", "A C C E P T"),
        LotVerdict::Reject => ("✘", "R E J E C T"),
        LotVerdict::Hold => ("‖", "H O L D"),
    }
}

fn banner(out: &mut String, record: &LotRecord) {
    let (mark, word) = mark(record.verdict);
    let style = Style::new()
        .bold()
        .fg_color(Some(colour(record.verdict).into()));
    let rule = "━".repeat(WIDTH);
    let lot = &record.lot;
    let who = lot
        .supplier
        .as_ref()
        .map_or(String::new(), |s| format!(" from {s}"));
    let what = format!("lot {}   {} × {}{who}", lot.lot, lot.quantity, lot.part);
    let _ = writeln!(out, "{style}{rule}{style:#}");
    let _ = writeln!(
        out,
        "{style}  {mark}  {word:<16}{style:#}{}",
        clipped(&what, WIDTH - 21)
    );
    let _ = writeln!(out, "{style}{rule}{style:#}");
}

fn heading(out: &mut String, text: &str) {
    let style = Style::new().bold();
    let _ = writeln!(out, "\n{style}{text}{style:#}");
}

fn reasons(out: &mut String, record: &LotRecord) {
    heading(out, "Why");
    for reason in &record.reasons {
        let _ = writeln!(out, "  {}", printable(&reason.code));
        out.push_str(&wrapped(&reason.text, "    ", "    "));
    }
}

fn sample(out: &mut String, record: &LotRecord) {
    heading(out, "Sample");
    let s = &record.sampling;
    let severity = s
        .severity
        .as_ref()
        .map_or(String::new(), |v| format!(", {v} inspection"));
    let letter = s
        .code_letter
        .as_ref()
        .map_or(String::new(), |v| format!(", code letter {v}"));
    out.push_str(&wrapped(
        &format!("{}{letter}{severity}", record.limits.acceptance),
        "  ",
        "  ",
    ));
    let counted = [
        (s.nonconforming, "nonconforming"),
        (s.undecided, "undecided"),
        (s.unmeasured, "unmeasured"),
    ];
    let others: String = counted
        .iter()
        .filter(|(n, _)| *n > 0)
        .map(|(n, word)| format!(", {n} {word}"))
        .collect();
    let conforming = s.measured - (s.nonconforming + s.undecided).min(s.measured);
    out.push_str(&wrapped(
        &format!(
            "{} parts of {} demanded: {conforming} conforming{others}",
            s.presented, s.required
        ),
        "  ",
        "  ",
    ));
    if let Some(state) = &s.switching {
        out.push_str(&switching::states(state));
    }
    for (name, class) in &s.classes {
        let undecided = if class.undecided > 0 {
            format!(", {} undecided", class.undecided)
        } else {
            String::new()
        };
        let plan = if class.by_variables {
            format!("n {} by variables", class.n)
        } else {
            format!("n {}, Ac {}, Re {}", class.n, class.ac, class.re)
        };
        let most = class
            .share_nonconforming_upper_95
            .map_or(String::new(), |share| {
                format!("; at most {:.2} % of the lot (95 %)", 100.0 * share)
            });
        let line = format!(
            "class {name}: {plan}: {} nonconforming{undecided}{most}",
            class.nonconforming
        );
        out.push_str(&wrapped(&line, "  ", "    "));
    }
}

/// A table without boxes that keeps to the width; text columns left, the others right.
fn table(header: &[&str], left: usize) -> Table {
    let mut table = Table::new();
    table
        .load_style(presets::NOTHING)
        .set_width(WIDTH as u16)
        .set_content_arrangement(ContentArrangement::Dynamic);
    table.set_header(header.iter().copied());
    for (i, column) in table.column_iter_mut().enumerate() {
        column.set_padding((if i == 0 { 2 } else { 1 }, 0));
        if i >= left {
            column.set_cell_alignment(CellAlignment::Right);
        }
    }
    table
}

fn push(out: &mut String, table: &Table) {
    for line in table.lines() {
        out.push_str(line.trim_end());
        out.push('\n');
    }
}

fn characteristics(out: &mut String, record: &LotRecord) {
    heading(out, "Characteristics");
    let mut table = table(&["", "limits", "mean ± s", "range", "Cpk", "n.c."], 1);
    for bound in &record.limits.characteristics {
        let Some(s) = record.statistics.get(&bound.key) else {
            continue;
        };
        let column = Scaled::of(bound, s);
        table.add_row([
            printable(&bound.name),
            column.limits(bound),
            column.spread(s),
            column.range(s),
            cpk(s),
            s.nonconforming.to_string(),
        ]);
    }
    if let Some(name) = table.column_mut(0) {
        name.set_constraint(ColumnConstraint::UpperBoundary(Width::Fixed(24)));
    }
    push(out, &table);
    no_cpk(out, record);
    intervals(out, record);
    for bound in &record.limits.characteristics {
        let Some(s) = record.statistics.get(&bound.key) else {
            continue;
        };
        if !s.outliers.is_empty() {
            let all = s.outliers.join(", ");
            out.push_str(&wrapped(
                &format!("unlike the rest in {}: {all}", bound.name),
                "  ",
                "    ",
            ));
        }
    }
    joint(out, record);
    before(out, record);
}

/// Why there is no Cpk, once for the characteristics of which the same is true.
fn no_cpk(out: &mut String, record: &LotRecord) {
    let mut said: Vec<(&str, Vec<&str>)> = Vec::new();
    for bound in &record.limits.characteristics {
        let of = record.statistics.get(&bound.key);
        let notes = of.iter().flat_map(|s| &s.warnings);
        for note in notes.filter(|note| note.code == "cpk_undefined") {
            let why = note.text.strip_prefix("no cpk: ").unwrap_or(&note.text);
            match said.iter_mut().find(|(other, _)| *other == why) {
                Some((_, names)) => names.push(&bound.name),
                None => said.push((why, vec![&bound.name])),
            }
        }
    }
    for (why, names) in said {
        let line = format!("no Cpk of {}: {why}", names.join(", "));
        out.push_str(&wrapped(&line, "  ", "    "));
    }
}

/// Where 95 % of the parts of the lot lie, and the index of values that are not normal.
fn intervals(out: &mut String, record: &LotRecord) {
    let mut first = true;
    for bound in &record.limits.characteristics {
        let Some(s) = record.statistics.get(&bound.key) else {
            continue;
        };
        let mut words = Vec::new();
        if let Some([low, high]) = s.tolerance_95_95 {
            let column = Scaled::of(bound, s);
            let unit = &column.unit;
            words.push(format!(
                "{} to {} {unit}",
                column.number(low),
                column.number(high)
            ));
        }
        if let (Some(ppk), Some(p)) = (s.ppk_percentile, s.normality_p_value) {
            words.push(format!(
                "Ppk by percentiles {ppk:.2} (not normal, p {p:.3})"
            ));
        }
        if words.is_empty() {
            continue;
        }
        if first {
            out.push_str("  95 % of the parts, with 95 % confidence:\n");
            first = false;
        }
        let line = format!("{}: {}", bound.name, words.join("; "));
        out.push_str(&wrapped(&line, "    ", "      "));
    }
}

/// What a rule found in comparing with the lots before.
fn before(out: &mut String, record: &LotRecord) {
    for of in &record.findings.trend {
        let p = |p: Option<f64>| p.map_or(NO_VALUE.to_owned(), |p| format!("{p:.3}"));
        let line = if of.previous_mean.is_none() {
            format!("{}: too few accepted lots before to compare with", of.of)
        } else {
            format!(
                "{} against {} accepted lots before: shift p {}, spread p {}{}",
                of.of,
                of.history.len(),
                p(of.shift_p_value),
                p(of.spread_p_value),
                if of.signals.is_empty() {
                    ", like them".to_owned()
                } else {
                    format!("; {}", of.signals.join("; "))
                }
            )
        };
        out.push_str(&wrapped(&line, "  ", "    "));
    }
}

/// Where noise dominates the spread, what it is at least.
fn cpk(s: &Statistics) -> String {
    let at_least = || s.at_least.and_then(|indices| indices.cpk);
    match (s.cpk, at_least()) {
        (Some(v), _) => format!("{v:.2}"),
        (None, Some(v)) => format!("≥ {v:.2}"),
        (None, None) => NO_VALUE.to_owned(),
    }
}

/// Parts found by several characteristics together. Groups of a mixed lot stand in the reasons.
fn joint(out: &mut String, record: &LotRecord) {
    for section in record
        .findings
        .joint
        .iter()
        .filter(|s| !s.outliers.is_empty())
    {
        let parts: Vec<&str> = section.outliers.iter().map(|o| o.part.as_str()).collect();
        let of = section.of.join(", ");
        let line = format!("unlike the rest in {of} together: {}", parts.join(", "));
        out.push_str(&wrapped(&line, "  ", "    "));
    }
}

/// One prefix and one number of decimals for all the values of a row.
struct Scaled {
    factor: f64,
    unit: String,
    decimals: usize,
}

impl Scaled {
    fn of(bound: &BoundSection, s: &Statistics) -> Scaled {
        let typical = bound
            .nominal
            .or(bound.upper)
            .or(bound.lower)
            .or(s.mean)
            .unwrap_or(1.0);
        let (factor, prefix) = scale(typical, &bound.unit);
        let whole = (typical / factor).abs().log10().floor();
        let decimals = if whole.is_finite() {
            (3.0 - whole).clamp(0.0, 6.0) as usize
        } else {
            3
        };
        Scaled {
            factor,
            unit: scaled_unit(prefix, &bound.unit),
            decimals,
        }
    }

    fn number(&self, value: f64) -> String {
        format!("{:.*}", self.decimals, value / self.factor)
    }

    /// Limits keep the digits that they were written with.
    fn limit(&self, value: f64) -> String {
        let digits = self.number(value);
        if digits.contains('.') {
            digits
                .trim_end_matches('0')
                .trim_end_matches('.')
                .to_owned()
        } else {
            digits
        }
    }

    fn limits(&self, bound: &BoundSection) -> String {
        let words = match (bound.lower, bound.upper) {
            (Some(l), Some(u)) => format!("{} to {}", self.limit(l), self.limit(u)),
            (Some(l), None) => format!("≥ {}", self.limit(l)),
            (None, Some(u)) => format!("≤ {}", self.limit(u)),
            (None, None) => NO_VALUE.to_owned(),
        };
        format!("{words} {}", self.unit)
    }

    fn spread(&self, s: &Statistics) -> String {
        match (s.mean, s.standard_deviation) {
            (Some(mean), Some(sd)) => format!("{} ± {}", self.number(mean), self.number(sd)),
            (Some(mean), None) => self.number(mean),
            _ => NO_VALUE.to_owned(),
        }
    }

    fn range(&self, s: &Statistics) -> String {
        match (s.minimum, s.maximum) {
            (Some(low), Some(high)) => format!("{} to {}", self.number(low), self.number(high)),
            _ => NO_VALUE.to_owned(),
        }
    }
}

fn parts(out: &mut String, record: &LotRecord) {
    let shown: Vec<&PartRecord> = record
        .parts
        .iter()
        .filter(|p| p.verdict != PartVerdict::Conforming)
        .collect();
    if shown.is_empty() {
        return;
    }
    heading(out, "Parts that are not conforming");
    let bounds = &record.limits.characteristics;
    let alike: Vec<(String, Vec<&str>)> = shown.iter().fold(Vec::new(), |mut all, part| {
        let class = part
            .class
            .as_ref()
            .map_or(String::new(), |c| format!(" (class {c})"));
        let text = format!(
            "{}{class}: {}",
            part.verdict.name(),
            what_is_wrong(part, bounds)
        );
        match all.last_mut() {
            Some((last, names)) if *last == text => names.push(&part.part),
            _ => all.push((text, vec![&part.part])),
        }
        all
    });
    for (text, names) in alike.iter().take(PARTS_SHOWN) {
        let name = match names.as_slice() {
            [one] => clipped(one, 12),
            [first, .., last] => format!("{} to {}", clipped(first, 12), clipped(last, 12)),
            [] => continue,
        };
        out.push_str(&wrapped(text, &format!("  {name:<6} "), "         "));
    }
    let left: usize = alike
        .iter()
        .skip(PARTS_SHOWN)
        .map(|(_, names)| names.len())
        .sum();
    if left > 0 {
        let _ = writeln!(out, "  and {left} more, all in the record");
    }
}

fn what_is_wrong(part: &PartRecord, bounds: &[BoundSection]) -> String {
    if !part.faults.is_empty() {
        return part
            .faults
            .iter()
            .map(|f| f.text.as_str())
            .collect::<Vec<_>>()
            .join("; ");
    }
    let each: Vec<String> = bounds
        .iter()
        .filter_map(|b| Some((b, part.readings.get(&b.key)?)))
        .filter(|(_, r)| r.verdict != PartVerdict::Conforming)
        .map(|(b, r)| format!("{} {}", b.name, against(r)))
        .collect();
    each.join("; ")
}

/// `4.113 µF ± 0.012 µF, at least 4.23 µF`, or why there is no value.
fn against(reading: &ReadingRecord) -> String {
    let unit = &reading.unit;
    let limit = match (reading.value, reading.lower, reading.upper) {
        (Some(v), Some(l), Some(u)) => {
            if v - l < u - v {
                format!("at least {}", shortest(l, unit))
            } else {
                format!("at most {}", shortest(u, unit))
            }
        }
        (_, Some(l), None) => format!("at least {}", shortest(l, unit)),
        (_, None, Some(u)) => format!("at most {}", shortest(u, unit)),
        (None, Some(l), Some(u)) => format!("{} to {}", shortest(l, unit), shortest(u, unit)),
        (_, None, None) => NO_VALUE.to_owned(),
    };
    let value = match (
        reading.value,
        reading.standard_uncertainty,
        reading.above,
        reading.below,
    ) {
        (Some(v), Some(u), ..) => with_uncertainty(v, u, unit),
        (Some(v), None, ..) => engineering(v, unit, 4),
        (None, _, Some(least), _) => format!("above {}", engineering(least, unit, 4)),
        (None, _, None, Some(most)) => format!("below {}", engineering(most, unit, 4)),
        (None, ..) => {
            return reading
                .warnings
                .first()
                .map_or("no value".to_owned(), |w| format!("no value: {}", w.text));
        }
    };
    format!("{value}, {limit}")
}

fn warnings(out: &mut String, record: &LotRecord) {
    if record.warnings.is_empty() {
        return;
    }
    heading(out, "To know");
    for warning in &record.warnings {
        out.push_str(&wrapped(&warning.text, "  ", "    "));
    }
}
