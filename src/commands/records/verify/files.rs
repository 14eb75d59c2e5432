//! The files beside the ledger: each must be what an entry says.

use super::{Document, Outcome};
use crate::commands::site::Site;
use crate::ledger::{Act, Archive, Entry, Finding, Ledger, disk::System, sha256_hex};
use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// Certificates that the ledger knows: digest to record.
pub struct Certificates<'a>(BTreeMap<&'a str, &'a str>);

impl<'a> Certificates<'a> {
    pub fn of(entries: &'a [Entry]) -> Self {
        let of_act = |entry: &'a Entry| match &entry.act {
            Act::Issue {
                record,
                certificate,
            }
            | Act::Reissue {
                record,
                certificate,
                ..
            } => Some((certificate.as_str(), record.as_str())),
            _ => None,
        };
        Certificates(entries.iter().filter_map(of_act).collect())
    }

    /// Whether a PDF is one of them, and of the record that its name says.
    pub fn check(&self, document: &Document, stem: Option<&str>) -> Option<Finding> {
        let since = document.carried.as_ref().ok().map(|c| c.index);
        let finding = |code, text: String| {
            Some(Finding {
                code,
                place: document.name.clone(),
                since,
                text,
            })
        };
        match (self.0.get(document.digest.as_str()), stem) {
            (Some(record), Some(stem)) if !belongs(stem, record) => finding(
                "certificate_misplaced",
                format!("it is the certificate of record {record}"),
            ),
            (Some(_), _) => None,
            (None, _) => match &document.carried {
                Err(why) => finding("certificate_unreadable", why.clone()),
                Ok(_) if document.signature.is_some() => finding(
                    "signature_invalid",
                    format!(
                        "it carries a signature that does not hold: {}",
                        document.signature.as_deref().unwrap_or_default()
                    ),
                ),
                Ok(carried) => finding(
                    "certificate_unknown",
                    format!(
                        "its bytes are not those of a certificate of record {} that the ledger issued: it was \
                         changed after it was issued, or the ledger lacks entries",
                        carried.record
                    ),
                ),
            },
        }
    }
}

/// `<record>.pdf`, `<record>.copy-<n>.pdf`
fn belongs(stem: &str, record: &str) -> bool {
    match stem.strip_prefix(record) {
        Some("") => true,
        Some(rest) => rest
            .strip_prefix(".copy-")
            .is_some_and(|n| n.bytes().all(|b| b.is_ascii_digit())),
        None => false,
    }
}

/// Whether there are records though there is no ledger.
pub fn are_there(site: &Site) -> bool {
    let archive = Archive::new(&site.records(), Arc::new(System));
    let has_objects = archive.is_empty().is_ok_and(|empty| !empty);
    has_objects || fs::read_dir(site.certificates()).is_ok_and(|mut folder| folder.next().is_some())
}

/// Checks every file of the certificates folder, and looks for those that should be there.
pub fn beside(
    ledger: &Ledger,
    site: &Site,
    certificates: &Certificates,
    entries: &[Entry],
    outcome: &mut Outcome,
) {
    let folder = site.certificates();
    let mut seen = BTreeSet::new();
    let mut newest: Option<(String, String)> = None;
    for path in listed(&folder, outcome) {
        let name = path
            .file_name()
            .unwrap_or_default()
            .to_string_lossy()
            .into_owned();
        let stem = path
            .file_stem()
            .unwrap_or_default()
            .to_string_lossy()
            .into_owned();
        match path.extension().and_then(|e| e.to_str()) {
            Some("pdf") => match Document::read(&path) {
                Err(text) => outcome.wrong("certificate_unreadable", &name, None, text),
                Ok(document) => {
                    outcome
                        .findings
                        .extend(certificates.check(&document, Some(&stem)));
                    outcome.documents += 1;
                    if let Ok(carried) = document.carried
                        && newest
                            .as_ref()
                            .is_none_or(|(_, note)| size(note) < size(&carried.checkpoint))
                    {
                        newest = Some((document.name, carried.checkpoint));
                    }
                }
            },
            Some("json") => json(&path, &stem, entries, outcome),
            _ => outcome
                .remarks
                .push(format!("{}: no file of the program", path.display())),
        }
        seen.insert(name);
    }
    if let Some((name, checkpoint)) = newest
        && let Err(error) = ledger.continues(&checkpoint)
    {
        let since = ledger.size().ok();
        outcome.wrong("ledger_truncated", &name, since, error.to_string());
    }
    for record in entries.iter().filter_map(judged) {
        for kind in ["pdf", "json"] {
            let name = format!("{record}.{kind}");
            if !seen.contains(&name) {
                outcome.remarks.push(format!(
                    "{}: not there; judging the lot again makes it as it was",
                    folder.join(name).display()
                ));
            }
        }
    }
}

/// The entries that a checkpoint speaks of, by its second line.
fn size(checkpoint: &str) -> u64 {
    checkpoint
        .lines()
        .nth(1)
        .and_then(|line| line.parse().ok())
        .unwrap_or(0)
}

fn judged(entry: &Entry) -> Option<&str> {
    match &entry.act {
        Act::Judged { record, .. } => Some(record),
        _ => None,
    }
}

fn listed(folder: &Path, outcome: &mut Outcome) -> Vec<PathBuf> {
    let entries = match fs::read_dir(folder) {
        Ok(entries) => entries,
        Err(e) if e.kind() == std::io::ErrorKind::NotFound => return Vec::new(),
        Err(e) => {
            let text = format!("cannot be listed: {e}");
            outcome.wrong(
                "certificate_unreadable",
                &folder.display().to_string(),
                None,
                text,
            );
            return Vec::new();
        }
    };
    let mut paths: Vec<PathBuf> = entries.filter_map(|e| Some(e.ok()?.path())).collect();
    paths.sort();
    paths
}

/// The JSON record beside the PDF against the one in the archive.
fn json(path: &Path, stem: &str, entries: &[Entry], outcome: &mut Outcome) {
    let place = path.display().to_string();
    let Some(entry) = entries.iter().find(|entry| judged(entry) == Some(stem)) else {
        let text = format!(
            "the ledger has no record {stem:?}: it lacks entries, or the file was put there"
        );
        return outcome.wrong("record_unknown", &place, None, text);
    };
    let recorded = entry.objects_of("record").next().map(|o| o.sha256.as_str());
    let kind = fs::symlink_metadata(path);
    if kind.is_ok_and(|kind| !kind.is_file()) {
        let text = "is not a plain file".to_owned();
        return outcome.wrong("record_unreadable", &place, Some(entry.index), text);
    }
    match fs::read(path) {
        Err(e) => outcome.wrong(
            "record_unreadable",
            &place,
            Some(entry.index),
            format!("cannot be read: {e}"),
        ),
        Ok(bytes) if Some(sha256_hex(&bytes).as_str()) != recorded => {
            let text = "was changed after it was issued: it is not the record that the ledger has";
            outcome.wrong("record_changed", &place, Some(entry.index), text.to_owned());
        }
        Ok(_) => {}
    }
}
