//! Entries: what happened, to which record, by whom, on which bytes.
//!
//! An entry is kept as one line of JSON in a fixed order of keys; those exact bytes are the leaf of
//! the Merkle tree. Nothing in an entry is ever changed: a correction is a new entry that names the
//! old one.

use super::error::LedgerError;
use crate::diagnostic::Note;
use crate::statistics::sampling::Severity;
use serde::{Deserialize, Serialize};

/// The version of the shape of an entry.
pub const ENTRY_SCHEMA: u32 = 1;

/// One entry of the ledger.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
#[allow(missing_docs)]
pub struct Entry {
    /// [`ENTRY_SCHEMA`].
    pub schema: u32,
    /// Which ledger; the origin of its checkpoints.
    pub ledger: String,
    /// Place in the ledger, from 0 without a gap.
    pub index: u64,
    /// When, by the clock of the machine, RFC 3339 with offset. Order is by `index`, not by this.
    pub time: String,
    /// Who, by the code that the site uses for a person.
    pub by: Option<String>,
    /// Name and version of the program that made the entry.
    pub program: String,
    pub act: Act,
    /// The bytes that it rests on, in the raw archive.
    pub objects: Vec<ObjectRef>,
    /// Anomalies on making the entry: `clock_went_back`.
    pub notes: Vec<Note>,
}

/// What was done.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(tag = "kind", rename_all = "lowercase", deny_unknown_fields)]
#[allow(missing_docs)]
pub enum Act {
    /// A lot was judged. The object with role `record` is its JSON record.
    Judged {
        record: String,
        /// Digest of everything that the verdict rests on; at most one entry for each.
        inputs: String,
        lot: String,
        part: String,
        supplier: Option<String>,
        verdict: String,
        /// Index of the entry that judged the same lot before, with other inputs.
        earlier: Option<u64>,
    },
    /// A person decided on a held or rejected lot.
    Disposition {
        record: String,
        decision: Decision,
        reason: String,
    },
    /// A person set the severity of inspection of a part from a supplier (`None`: lots that name
    /// none), for one class or for all (ISO 2859-1:1999, 9.1 and 9.4).
    Severity {
        part: String,
        supplier: Option<String>,
        class: Option<String>,
        severity: Severity,
        reason: String,
    },
    /// A limit, station or site file was approved. The object with role `limits`, `station` or
    /// `site` is the file, those with role `compensation` belong to it; `statement` is the signed
    /// note (see [`super::approval`]).
    Approval {
        file: String,
        revision: Option<String>,
        sha256: String,
        statement: String,
    },
    /// The approval of a file was taken back; `statement` is the signed note.
    Withdrawal {
        file: String,
        sha256: String,
        reason: String,
        statement: String,
    },
    /// A certificate was made of a record: what it is known by.
    Issue { record: String, certificate: String },
    /// The certificate was made again.
    Reissue {
        record: String,
        certificate: String,
        reason: String,
    },
}

/// What becomes of a lot that was not accepted.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Decision {
    /// Used as it is, by concession (ISO 9001:2015 clause 8.7).
    Concession,
    /// Sent back to the supplier.
    Return,
    /// Inspected part by part.
    Sort,
    /// Destroyed or made unusable.
    Scrap,
    /// To be measured again, as a new lot record.
    Retest,
}

/// An object of the raw archive, and what it is to the entry.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ObjectRef {
    /// `approval`, `withdrawal` (the signed notes), `record`, `site`, `lot`, `label`, `limits`, `station`, `compensation`, `sweep`, `certificate`.
    pub role: String,
    /// The name it had, relative to the lot folder or the site.
    pub name: String,
    /// Lower-case hexadecimal: its name in the archive.
    pub sha256: String,
    /// Its size uncompressed.
    pub bytes: u64,
}

impl Act {
    /// `judged`, `disposition`, `severity`, `approval`, `withdrawal`, `issue`, `reissue`.
    pub fn kind(&self) -> &'static str {
        match self {
            Act::Judged { .. } => "judged",
            Act::Disposition { .. } => "disposition",
            Act::Severity { .. } => "severity",
            Act::Approval { .. } => "approval",
            Act::Withdrawal { .. } => "withdrawal",
            Act::Issue { .. } => "issue",
            Act::Reissue { .. } => "reissue",
        }
    }

    /// The record that it is about.
    pub fn record(&self) -> Option<&str> {
        match self {
            Act::Judged { record, .. }
            | Act::Disposition { record, .. }
            | Act::Issue { record, .. }
            | Act::Reissue { record, .. } => Some(record),
            Act::Severity { .. } | Act::Approval { .. } | Act::Withdrawal { .. } => None,
        }
    }
}

impl Entry {
    /// The bytes that the ledger keeps and the Merkle tree covers.
    pub fn bytes(&self) -> Result<String, LedgerError> {
        serde_json::to_string(self)
            .map_err(|e| LedgerError::Refused(format!("the entry cannot be written: {e}")))
    }

    /// Reads an entry, which must be in the very form that [`Entry::bytes`] makes.
    pub fn read(index: u64, bytes: &str) -> Result<Self, LedgerError> {
        let what = || format!("entry {index}");
        let entry: Entry = serde_json::from_str(bytes)
            .map_err(|e| LedgerError::damaged(what(), format!("not an entry ({e})")))?;
        if entry.schema != ENTRY_SCHEMA {
            let why = format!(
                "its shape is of version {}, not {ENTRY_SCHEMA}",
                entry.schema
            );
            return Err(LedgerError::damaged(what(), why));
        }
        if entry.index != index {
            let why = format!("it says of itself that it is entry {}", entry.index);
            return Err(LedgerError::damaged(what(), why));
        }
        if entry.bytes()? != bytes {
            return Err(LedgerError::damaged(
                what(),
                "not in the form in which entries are made",
            ));
        }
        Ok(entry)
    }

    /// The objects of one role.
    pub fn objects_of<'a>(&'a self, role: &'a str) -> impl Iterator<Item = &'a ObjectRef> {
        self.objects
            .iter()
            .filter(move |object| object.role == role)
    }
}
