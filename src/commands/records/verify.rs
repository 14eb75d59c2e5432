//! `records verify`: whether the records are what was recorded.

mod again;
mod approvals;
mod files;
mod report;

use super::{Done, document};
use crate::certificate::{self, as_issued};
use crate::commands::site::Site;
use crate::commands::{Format, exit};
use crate::ledger::{
    Anchor, Claim, Entry, Finding, Ledger, LedgerError, Proof, sha256_hex, verify, witness,
};
use crate::record;
use report::Outcome;
use std::io::Read;
use std::path::{Path, PathBuf};

#[derive(Debug, clap::Args)]
pub struct Args {
    /// PDF lot records that were kept elsewhere
    #[arg(value_name = "PDF")]
    documents: Vec<PathBuf>,
    /// File of checkpoints that was kept elsewhere
    #[arg(long, env = "REELGATE_WITNESS", value_name = "FILE")]
    witness: Vec<PathBuf>,
}

/// Looks at everything and says what is wrong.
pub fn run(args: &Args, site: &Site, format: Format) -> Done {
    let documents: Vec<Document> = args
        .documents
        .iter()
        .map(|path| Document::read(path))
        .collect::<Result<_, _>>()?;
    let (witness, remark) = named_witness(args, site);
    let mut outcome = match Ledger::open(&site.records()) {
        Ok(ledger) => examine(&ledger, site, &documents, &witness)?,
        Err(error) => unopened(error, site)?,
    };
    outcome.remarks.extend(remark);
    let status = if outcome.findings.is_empty() {
        exit::OK
    } else {
        exit::REJECT
    };
    Ok((status, report::bytes(&outcome, format)))
}

/// The witness files that were asked for, else the one that the site file names; and what is to be
/// said where that one cannot be looked at.
fn named_witness(args: &Args, site: &Site) -> (Vec<PathBuf>, Option<String>) {
    if !args.witness.is_empty() {
        return (args.witness.clone(), None);
    }
    let rules = match site.rules() {
        Ok(rules) => rules,
        Err(stop) => {
            return (
                Vec::new(),
                Some(format!("the site file was not read: {stop}")),
            );
        }
    };
    match site.witness(None, rules.as_ref()) {
        Some(path) if path.exists() => (vec![path], None),
        Some(path) => {
            let text =
                "the witness file that the site file names is not there, or not to be reached";
            (Vec::new(), Some(format!("{}: {text}", path.display())))
        }
        None => (Vec::new(), None),
    }
}

/// A ledger that cannot be opened: damaged, or not to be looked at.
fn unopened(error: LedgerError, site: &Site) -> Result<Outcome, String> {
    let code = match &error {
        LedgerError::Missing { .. } if files::are_there(site) => "ledger_missing",
        LedgerError::Foreign { .. } | LedgerError::Damaged { .. } => "database_damaged",
        LedgerError::Database { .. } => "database_unreadable",
        _ => return Err(error.to_string()),
    };
    Ok(Outcome::unopened(Finding {
        code,
        place: "the database".to_owned(),
        since: Some(0),
        text: error.to_string(),
    }))
}

fn examine(
    ledger: &Ledger,
    site: &Site,
    documents: &[Document],
    witnesses: &[PathBuf],
) -> Result<Outcome, String> {
    let notes = witnessed(witnesses)?;
    let mut anchors: Vec<Anchor> = documents.iter().filter_map(Document::anchor).collect();
    anchors.extend(notes.iter().map(|(name, checkpoint)| Anchor {
        name,
        checkpoint,
        claim: None,
    }));
    let report = verify(ledger, &anchors).map_err(|e| e.to_string())?;
    let entries = readable(ledger);
    let certificates = files::Certificates::of(&entries);
    let mut outcome = Outcome::of(ledger, report, &entries);
    for document in documents {
        outcome.findings.extend(certificates.check(document, None));
    }
    files::beside(ledger, site, &certificates, &entries, &mut outcome);
    approvals::check(ledger, &entries, site, &mut outcome);
    again::judge_all(ledger, &entries, &mut outcome);
    Ok(outcome)
}

/// The checkpoints of witness files with names for messages.
fn witnessed(paths: &[PathBuf]) -> Result<Vec<(String, String)>, String> {
    let mut out = Vec::new();
    for path in paths {
        if !path.exists() {
            return Err(format!("{}: there is no such file", path.display()));
        }
        let notes = witness::read(path).map_err(|e| e.to_string())?;
        let name = |n: usize| format!("{}, checkpoint {}", path.display(), n + 1);
        out.extend(
            notes
                .into_iter()
                .enumerate()
                .map(|(n, note)| (name(n), note)),
        );
    }
    Ok(out)
}

/// The entries that can be read; the others are findings already.
fn readable(ledger: &Ledger) -> Vec<Entry> {
    let mut entries = Vec::new();
    let walked = ledger.store().each(0, &mut |row| {
        if let Ok(entry) = row.and_then(|row| Entry::read(row.index, &row.body)) {
            entries.push(entry);
        }
        Ok(())
    });
    // A walk that ends early is a finding of the ledger's own verification.
    let _ = walked;
    entries
}

/// A PDF lot record as a file.
struct Document {
    name: String,
    /// Of the bytes that were issued: without a signature that holds.
    digest: String,
    /// Why the signature does not hold.
    signature: Option<String>,
    /// Carried record and proof, with the entry's index and the record's name.
    carried: Result<Carried, String>,
}

struct Carried {
    index: u64,
    record: String,
    record_digest: String,
    checkpoint: String,
}

impl Document {
    /// # Errors
    /// A file that cannot be read at all.
    fn read(path: &Path) -> Result<Document, String> {
        let name = path.display().to_string();
        let mut bytes = Vec::new();
        if std::fs::metadata(path).is_ok_and(|kind| !kind.is_file()) {
            return Err(format!("{name}: is not a plain file"));
        }
        std::fs::File::open(path)
            .and_then(|file| file.take(document::MOST_BYTES + 1).read_to_end(&mut bytes))
            .map_err(|e| format!("{name}: cannot be read: {e}"))?;
        Ok(Document {
            name,
            digest: sha256_hex(as_issued(&bytes)),
            signature: certificate::examine(&bytes).and_then(Result::err),
            carried: if bytes.len() as u64 > document::MOST_BYTES {
                Err("is larger than any PDF lot record".to_owned())
            } else {
                carried(&bytes)
            },
        })
    }

    fn anchor(&self) -> Option<Anchor<'_>> {
        let carried = self.carried.as_ref().ok()?;
        Some(Anchor {
            name: &self.name,
            checkpoint: &carried.checkpoint,
            claim: Some(Claim {
                index: carried.index,
                record: &carried.record,
                sha256: &carried.record_digest,
            }),
        })
    }
}

fn carried(pdf: &[u8]) -> Result<Carried, String> {
    let found = document::carried(pdf)?;
    let proof = Proof::read(&found.proof).map_err(|e| format!("carries a proof that is {e}"))?;
    let record = record::from_bytes(&found.record)
        .map_err(|e| format!("carries a record.json that is no lot record ({e})"))?;
    Ok(Carried {
        index: proof.index,
        record: record.record,
        record_digest: sha256_hex(&found.record),
        checkpoint: proof.checkpoint,
    })
}
