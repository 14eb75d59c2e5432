//! The small label that goes on the reel: plain text, for any printer.

use super::words;
use crate::record::LotRecord;
use std::fmt::Write;

/// Columns of the label.
pub const WIDTH: usize = 40;

/// The label of a judged lot, at most [`WIDTH`] columns; each line ends with a newline.
pub fn tag(record: &LotRecord) -> String {
    let lot = &record.lot;
    let s = &record.sampling;
    let mut out = String::new();
    let mut line = |text: String| {
        let mut safe = crate::diagnostic::printable(&text);
        if safe.chars().count() > WIDTH {
            safe = safe.chars().take(WIDTH - 1).collect();
            safe.push('…');
        }
        let _ = writeln!(out, "{}", safe.trim_end());
    };
    let verdict = words::lot_verdict(record.verdict);
    line(format!("{} {verdict}", words::lot_mark(record.verdict)));
    line(format!("LOT  {}", lot.lot));
    line(format!("PART {} rev {}", lot.part, record.limits.revision));
    let code = lot
        .date_code
        .as_ref()
        .map_or(String::new(), |c| format!("  D/C {c}"));
    line(format!("QTY  {}{code}", lot.quantity));
    if let Some(supplier) = &lot.supplier {
        line(format!("FROM {supplier}"));
    }
    line(format!(
        "n {}  nonconforming {}  undecided {}",
        s.presented, s.nonconforming, s.undecided
    ));
    let by = lot
        .operator
        .as_ref()
        .map_or(String::new(), |o| format!("  {o}"));
    let day = record
        .issued
        .get(..16)
        .unwrap_or(&record.issued)
        .replace('T', " ");
    line(format!("{day}{by}"));
    line(record.record.clone());
    out
}
