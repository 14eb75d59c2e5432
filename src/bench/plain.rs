//! The run line by line: for screen readers, slow lines and tests. No cursor, no colour, nothing drawn.

use super::desk::{Desk, Told};
use super::run::Run;
use super::scene::{Ending, PlanText, reading_rows};
use super::words;
use super::{Message, Tone};
use crate::diagnostic::printable;
use std::fmt::Write;

/// A message; its tone is a word.
pub fn message(message: &Message) -> String {
    let head = match message.tone {
        Tone::Plain | Tone::Quiet | Tone::Good => "",
        Tone::Warn => "Note: ",
        Tone::Bad => "STOP: ",
    };
    let text = message.text.strip_prefix("STOP. ").unwrap_or(&message.text);
    let lines: Vec<String> = text.lines().map(printable).collect();
    format!("{head}{}\n", lines.join("\n"))
}

/// The plan.
pub fn plan(plan: &PlanText) -> String {
    let mut out = format!("Plan of {}\n", printable(&plan.title));
    for (name, text) in &plan.rows {
        let _ = writeln!(out, "  {name}: {}", printable(text));
    }
    for caution in &plan.cautions {
        let _ = writeln!(out, "  {}: {}", words::CAUTION, printable(caution));
    }
    for foreseen in &plan.foreseen {
        let _ = writeln!(out, "  {}: {}", words::FORESEEN, printable(foreseen));
    }
    out
}

/// The verdict on a part with its readings.
pub fn told(told: &Told, run: &Run, desk: &Desk) -> String {
    let verdict = told.verdict();
    let again = match told.attempt {
        1 => String::new(),
        n => format!(", try {n}"),
    };
    let mut out = format!(
        "Part {}{again}: {} {}\n",
        told.part,
        words::verdict(verdict),
        words::mark(verdict)
    );
    for fault in &told.judged.faults {
        let _ = writeln!(out, "  {}", printable(&fault.text));
    }
    for [mark, name, value, limits] in reading_rows(&desk.limits, told) {
        let _ = writeln!(out, "  {mark} {name}: {value} ({limits})");
    }
    let may_follow = run.standing(&told.part).may_follow;
    let after = words::after(verdict, &told.part, may_follow);
    if !after.is_empty() {
        let _ = writeln!(out, "  {after}");
    }
    let left = run.parts.saturating_sub(run.done());
    let _ = writeln!(out, "  {}", words::standing(&run.chances(), left));
    out
}

/// The verdict on the lot.
pub fn ending(ending: &Ending) -> String {
    let record = &ending.record;
    let mut out = format!(
        "Lot {}: {} {}\n  {}\n",
        printable(&record.lot.lot),
        words::lot_verdict(record.verdict),
        words::lot_mark(record.verdict),
        words::reel(record.verdict)
    );
    for reason in &record.reasons {
        let _ = writeln!(out, "  {}: {}", reason.code, printable(&reason.text));
    }
    let _ = writeln!(out, "  {}", words::record(&printable(&ending.certificate)));
    let _ = writeln!(
        out,
        "  {}",
        words::label_written(&printable(&ending.tag_path))
    );
    for line in ending.tag.lines() {
        let _ = writeln!(out, "  | {line}");
    }
    let _ = writeln!(out, "  {}", words::NOT_SAFETY);
    out
}
