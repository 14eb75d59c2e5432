//! `records show`: a whole record as plain text, for screen readers and quick looking.

use super::{Done, list, open, resolve};
use crate::certificate::{self, InLedger, Signatory, Sources, plain_text};
use crate::commands::site::Site;
use crate::commands::store::Paths;
use crate::commands::{Format, exit, keep};
use crate::diagnostic::printable;
use crate::ledger::{Act, Entry, Ledger, LedgerError, Query};
use crate::record::{self, LotRecord};
use std::collections::BTreeSet;

/// As text with what happened since, or the JSON record as it was archived.
pub fn run(name: &str, site: &Site, format: Format) -> Done {
    let ledger = open(site)?;
    let name = resolve(&ledger, name)?;
    let text = |e: crate::ledger::LedgerError| e.to_string();
    let entry = keep::judged(&ledger, &name).map_err(text)?;
    let json = ledger.object(&entry, "record").map_err(text)?;
    if format == Format::Json {
        return Ok((exit::OK, json));
    }
    let record = record::from_bytes(&json)
        .map_err(|e| format!("record {name}: the archived bytes are no record: {e}"))?;
    let file = |role| ledger.object(&entry, role).map_err(text);
    let (limits, station) = (file("limits")?, file("station")?);
    let proof = ledger.entry(entry.index).map_err(text)?.proof_text();
    let signed = signatory(site, &name);
    let sources = Sources {
        limit_file: std::str::from_utf8(&limits).ok(),
        station_file: std::str::from_utf8(&station).ok(),
        ledger: Some(InLedger {
            index: entry.index,
            proof: &proof,
            copy: None,
        }),
        signature: signed.as_ref(),
    };
    let mut out = plain_text(&record, &sources);
    out.push_str("\nIn the ledger\n");
    let of_record = ledger.find(Query::Record(&name)).map_err(text)?;
    let mut entries = decisions(&ledger, &record).map_err(text)?;
    entries.extend(of_record);
    for entry in entries {
        out.push_str(&format!("Entry {}: {}\n", entry.index, words(&entry)));
    }
    Ok((exit::OK, out.into_bytes()))
}

/// Whose signature the PDF beside the ledger carries, if it holds.
fn signatory(site: &Site, record: &str) -> Option<Signatory> {
    let pdf = std::fs::read(Paths::of(&site.certificates(), record).pdf).ok()?;
    Some(certificate::examine(&pdf)?.ok()?.by)
}

/// The decisions of persons on the severity of inspection that the record rests on.
fn decisions(ledger: &Ledger, record: &LotRecord) -> Result<Vec<Entry>, LedgerError> {
    let classes = record
        .sampling
        .switching
        .iter()
        .flat_map(|s| s.classes.values());
    let indices: BTreeSet<u64> = classes
        .filter_map(|state| Some(state.set.as_ref()?.entry))
        .collect();
    indices
        .into_iter()
        .map(|index| Ok(ledger.entry(index)?.entry))
        .collect()
}

/// An entry in one line.
pub fn words(entry: &Entry) -> String {
    let what = match &entry.act {
        Act::Judged {
            verdict, earlier, ..
        } => {
            let before = earlier.map_or(String::new(), |e| {
                format!(", after entry {e} on the same lot")
            });
            format!("judged: {verdict}{before}")
        }
        Act::Disposition {
            decision, reason, ..
        } => format!(
            "disposition: {}, because: {reason}",
            list::decision(*decision)
        ),
        Act::Severity {
            part,
            supplier,
            class,
            severity,
            reason,
        } => {
            let supplier = supplier
                .as_ref()
                .map_or("no stated supplier".to_owned(), |s| s.clone());
            let class = class
                .as_ref()
                .map_or("every class".to_owned(), |c| format!("class {c}"));
            format!(
                "severity of inspection of {part} from {supplier}, {class}, set to {severity}, because: {reason}"
            )
        }
        Act::Approval { file, .. } => format!("approval of {file}"),
        Act::Withdrawal { file, reason, .. } => {
            format!("approval of {file} withdrawn, because: {reason}")
        }
        Act::Issue { certificate, .. } => format!("certificate issued, SHA-256 {certificate}"),
        Act::Reissue {
            certificate,
            reason,
            ..
        } => format!("copy issued, SHA-256 {certificate}, because: {reason}"),
    };
    let by = entry
        .by
        .as_ref()
        .map_or(String::new(), |by| format!(" by {by}"));
    let notes: String = entry
        .notes
        .iter()
        .map(|note| format!("; {}", note.text))
        .collect();
    printable(&format!("{}{by}: {what}{notes}", entry.time))
}
