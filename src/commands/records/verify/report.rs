//! What verification came to, for people and for programs.

use crate::commands::Format;
use crate::commands::text::wrapped;
use crate::ledger::{Entry, Finding, Ledger, Report};
use serde_json::json;
use std::collections::BTreeMap;

/// What was looked at and what is wrong.
#[derive(Debug, Default)]
pub struct Outcome {
    /// The ledger's name in its checkpoints.
    origin: String,
    entries: u64,
    pub records: usize,
    pub judged_again: usize,
    /// PDFs in the certificates folder.
    pub documents: usize,
    pub findings: Vec<Finding>,
    pub remarks: Vec<String>,
    reach: String,
    /// Time of each entry.
    times: BTreeMap<u64, String>,
}

impl Outcome {
    pub fn unopened(finding: Finding) -> Outcome {
        Outcome {
            findings: vec![finding],
            reach: "the ledger could not be opened: nothing is proven".to_owned(),
            ..Outcome::default()
        }
    }

    /// What the ledger's own verification came to, with words for its objects.
    pub fn of(ledger: &Ledger, report: Report, entries: &[Entry]) -> Outcome {
        let reach = report.reach();
        let mut findings = report.findings;
        for finding in &mut findings {
            if let Some(words) = object_words(&finding.place, entries) {
                finding.text = format!("{words}: {}", finding.text);
            }
        }
        Outcome {
            origin: ledger.verifier().name().to_owned(),
            entries: report.size,
            findings,
            remarks: report.remarks,
            reach,
            times: entries.iter().map(|e| (e.index, e.time.clone())).collect(),
            ..Outcome::default()
        }
    }

    pub fn wrong(&mut self, code: &'static str, place: &str, since: Option<u64>, text: String) {
        self.findings.push(Finding {
            code,
            place: place.to_owned(),
            since,
            text,
        });
    }

    /// `entry 12 of 2026-10-05T09:14:03+02:00`
    fn since(&self, finding: &Finding) -> Option<String> {
        let index = finding.since?;
        Some(match self.times.get(&index) {
            Some(time) => format!("entry {index} of {time}"),
            None => format!("entry {index}"),
        })
    }
}

/// What an object of the archive is: its role and its name.
fn object_words(place: &str, entries: &[Entry]) -> Option<String> {
    let digest = place.strip_prefix("archive object ")?;
    let mut objects = entries.iter().flat_map(|entry| &entry.objects);
    let object = objects.find(|object| object.sha256 == digest)?;
    Some(format!("{} {}", object.role, object.name))
}

pub fn bytes(outcome: &Outcome, format: Format) -> Vec<u8> {
    match format {
        Format::Text => text(outcome).into_bytes(),
        Format::Json => format!("{:#}\n", value(outcome)).into_bytes(),
    }
}

fn value(outcome: &Outcome) -> serde_json::Value {
    let findings: Vec<_> = outcome
        .findings
        .iter()
        .map(|f| {
            json!({
                "code": f.code,
                "where": f.place,
                "since_entry": f.since,
                "since_time": f.since.and_then(|index| outcome.times.get(&index)),
                "text": f.text,
            })
        })
        .collect();
    json!({
        "proven": outcome.findings.is_empty(),
        "ledger": outcome.origin,
        "entries": outcome.entries,
        "records": outcome.records,
        "judged_again": outcome.judged_again,
        "certificates": outcome.documents,
        "findings": findings,
        "remarks": outcome.remarks,
        "reach": outcome.reach,
    })
}

fn text(outcome: &Outcome) -> String {
    let mut out = String::new();
    for finding in &outcome.findings {
        out.push_str(&wrapped(
            &format!("✘ {}: {}", finding.code, finding.place),
            "",
            "  ",
        ));
        out.push_str(&wrapped(&finding.text, "    ", "    "));
        if let Some(since) = outcome.since(finding) {
            out.push_str(&wrapped(&format!("since {since}"), "    ", "    "));
        }
    }
    for remark in &outcome.remarks {
        out.push_str(&wrapped(&format!("· {remark}"), "", "  "));
    }
    let counts = format!(
        "{} entries; {} of {} records judged again with the same result; {} certificates",
        outcome.entries, outcome.judged_again, outcome.records, outcome.documents
    );
    out.push_str(&wrapped(&counts, "", "  "));
    out.push_str(&wrapped(
        &format!("How far this reaches: {}", outcome.reach),
        "",
        "  ",
    ));
    out.push_str(&match outcome.findings.len() {
        0 => "✔ Proven: everything is as it was recorded\n".to_owned(),
        1 => "✘ WRONG: 1 finding\n".to_owned(),
        n => format!("✘ WRONG: {n} findings\n"),
    });
    out
}
