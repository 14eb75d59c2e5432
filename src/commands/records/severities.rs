//! The severities of inspection that persons set, as `records list` shows them.

use super::list::cell;
use crate::commands::Format;
use crate::commands::text::wrapped;
use crate::ledger::{Act, Entry};
use crate::statistics::sampling::Severity;
use serde::Serialize;

/// One decision.
#[derive(Debug, Serialize)]
pub struct Line {
    entry: u64,
    time: String,
    part: String,
    supplier: Option<String>,
    class: Option<String>,
    severity: Severity,
    by: Option<String>,
    reason: String,
}

/// Those of the part, supplier and time that are wanted.
pub fn lines(entries: &[Entry], wanted: impl Fn(&str, Option<&str>, &str) -> bool) -> Vec<Line> {
    entries
        .iter()
        .filter_map(|entry| match &entry.act {
            Act::Severity {
                part,
                supplier,
                class,
                severity,
                reason,
            } if wanted(part, supplier.as_deref(), &entry.time) => Some(Line {
                entry: entry.index,
                time: entry.time.clone(),
                part: part.clone(),
                supplier: supplier.clone(),
                class: class.clone(),
                severity: *severity,
                by: entry.by.clone(),
                reason: reason.clone(),
            }),
            _ => None,
        })
        .collect()
}

/// For people.
pub fn text(lines: &[Line]) -> String {
    let mut out = String::from("\nSeverity of inspection set by a person\n");
    for line in lines {
        let day: String = line.time.chars().take(16).collect();
        let words = format!(
            "{}  entry {}: {} from {}, {}: {} by {}: {}",
            day.replace('T', " "),
            line.entry,
            line.part,
            line.supplier.as_deref().unwrap_or("no stated supplier"),
            line.class
                .as_ref()
                .map_or("every class".to_owned(), |class| format!("class {class}")),
            line.severity,
            line.by.as_deref().unwrap_or("–"),
            line.reason
        );
        out.push_str(&wrapped(&words, "", "  "));
    }
    out
}

/// Alone, in the format asked for.
pub fn bytes(lines: &[Line], as_csv: bool, format: Format) -> Result<Vec<u8>, String> {
    if as_csv {
        return csv(lines).map_err(|e| e.to_string());
    }
    match format {
        Format::Json => {
            let mut bytes = serde_json::to_vec_pretty(lines).map_err(|e| e.to_string())?;
            bytes.push(b'\n');
            Ok(bytes)
        }
        Format::Text => Ok(text(lines).trim_start().as_bytes().to_vec()),
    }
}

fn csv(lines: &[Line]) -> Result<Vec<u8>, csv::Error> {
    let mut writer = csv::WriterBuilder::new()
        .terminator(csv::Terminator::CRLF)
        .from_writer(Vec::new());
    writer.write_record([
        "entry", "time", "part", "supplier", "class", "severity", "by", "reason",
    ])?;
    for line in lines {
        writer.write_record([
            line.entry.to_string(),
            cell(&line.time),
            cell(&line.part),
            cell(line.supplier.as_deref().unwrap_or("")),
            cell(line.class.as_deref().unwrap_or("")),
            line.severity.to_string(),
            cell(line.by.as_deref().unwrap_or("")),
            cell(&line.reason),
        ])?;
    }
    writer
        .into_inner()
        .map_err(|e| csv::Error::from(e.into_error()))
}
