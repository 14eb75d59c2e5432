//! The records: an append-only ledger with a Merkle tree over its entries, and the raw archive of
//! the bytes that each record rests on.
//!
//! One act is one entry, in one transaction. Objects go into the archive first; then the entry
//! that names them is appended, signed as the new head of the tree, and read back. A run that ends
//! in between leaves at most objects that no entry names. Doing the same act again answers with
//! the entry that is there.
//!
//! Clock, identity and keys are arguments. [`Store`] is what a server database would implement.

mod acts;
pub mod approval;
mod archive;
pub mod bag;
mod checkpoint;
mod digest;
pub mod disk;
mod entry;
mod error;
mod key;
pub mod merkle;
mod proof;
mod schema;
mod sqlite;
mod store;
pub mod trust;
mod verify;
pub mod witness;

pub use crate::keys::{NoteError, Signer, Verifier};
pub use acts::SetSeverity;
pub use archive::{Archive, Listing, MAX_OBJECT};
pub use checkpoint::Checkpoint;
pub use digest::{Hash, hex, sha256, sha256_hex};
pub use entry::{Act, Decision, ENTRY_SCHEMA, Entry, ObjectRef};
pub use error::LedgerError;
pub use key::{KEY_FILE, ledger_key};
pub use proof::Proof;
pub use sqlite::FILE;
pub use store::{Decided, Identity, Query, Reader, Row, Store};
pub use verify::{Anchor, Claim, Finding, Report, verify};

use crate::diagnostic::Note;
use crate::record::LotRecord;
use chrono::{DateTime, FixedOffset};
use disk::{Disk, System};
use merkle::Frontier;
use sqlite::{Access, SqliteStore};
use std::path::Path;
use std::sync::Arc;

/// The records of a site.
pub struct Ledger {
    store: Box<dyn Store>,
    archive: Archive,
    signer: Option<Signer>,
    verifier: Verifier,
}

/// By whom, when and with what an entry is made.
#[derive(Debug, Clone, Copy)]
#[allow(missing_docs)]
pub struct Made<'a> {
    /// The code that the site uses for the person.
    pub by: Option<&'a str>,
    pub time: DateTime<FixedOffset>,
    /// Name and version.
    pub program: &'a str,
}

/// Bytes that an entry rests on.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Object<'a> {
    /// See [`ObjectRef::role`].
    pub role: &'a str,
    pub name: &'a str,
    pub bytes: &'a [u8],
}

/// An entry that is in the ledger.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Recorded {
    /// The entry.
    pub entry: Entry,
    /// Signed checkpoint of the ledger that ends with it.
    pub checkpoint: String,
    /// Inclusion proof of the entry in the tree of that checkpoint.
    pub proof: Vec<Hash>,
    /// Whether it was made now; an entry made before answers an act that is repeated.
    pub new: bool,
}

impl Recorded {
    /// Index, inclusion proof and checkpoint in one text, for a certificate to carry.
    pub fn proof_text(&self) -> String {
        let proof = Proof {
            index: self.entry.index,
            hashes: self.proof.clone(),
            checkpoint: self.checkpoint.clone(),
        };
        proof.text()
    }
}

/// Digest of what a verdict rests on: role, name and digest of every object, in any order.
pub fn inputs_digest(objects: &[Object]) -> String {
    let mut lines: Vec<String> = objects
        .iter()
        .map(|o| serde_json::json!([o.role, o.name, sha256_hex(o.bytes)]).to_string())
        .collect();
    lines.sort_unstable();
    sha256_hex(lines.join("\n").as_bytes())
}

impl Ledger {
    /// Opens the records of a site for reading; nothing is written.
    ///
    /// # Errors
    /// No ledger there, not a ledger, or one of a later version.
    pub fn open(records: &Path) -> Result<Self, LedgerError> {
        Self::with(records, &Access::Read, None, Arc::new(System))
    }

    /// Opens the records for appending with the ledger's key, whose name is the ledger's origin.
    /// Where there are no records yet, they are made; `created` is their date.
    ///
    /// # Errors
    /// Besides those of [`Ledger::open`]: a key that is not the ledger's, a file system that keeps
    /// no locks, an archive whose ledger is gone.
    pub fn open_for_writing(
        records: &Path,
        signer: Signer,
        created: DateTime<FixedOffset>,
    ) -> Result<Self, LedgerError> {
        Self::open_on(records, signer, created, Arc::new(System))
    }

    /// The same on a file system of the caller's.
    #[allow(missing_docs)]
    pub fn open_on(
        records: &Path,
        signer: Signer,
        created: DateTime<FixedOffset>,
        disk: Arc<dyn Disk>,
    ) -> Result<Self, LedgerError> {
        let identity = Identity {
            origin: signer.verifier().name().to_owned(),
            public_key: signer.verifier().public(),
            created: created.to_rfc3339(),
        };
        make_records(records, disk.as_ref())?;
        refuse_lost_ledger(records, &disk)?;
        let ledger = Self::with(records, &Access::Write(&identity), Some(signer), disk)?;
        let found = ledger.store.identity();
        if (&found.origin, found.public_key) != (&identity.origin, identity.public_key) {
            return Err(LedgerError::Key(format!(
                "{}: the ledger {:?} was made with another key than the one given: give its key",
                records.display(),
                found.origin
            )));
        }
        Ok(ledger)
    }

    fn with(
        records: &Path,
        access: &Access,
        signer: Option<Signer>,
        disk: Arc<dyn Disk>,
    ) -> Result<Self, LedgerError> {
        let store = SqliteStore::open(records, access, disk.clone())?;
        let identity = store.identity();
        let verifier = Verifier::new(&identity.origin, &identity.public_key)
            .map_err(|e| LedgerError::damaged("the ledger's identity", e.to_string()))?;
        Ok(Ledger {
            store: Box::new(store),
            archive: Archive::new(records, disk),
            signer,
            verifier,
        })
    }

    /// The key that the ledger's checkpoints are checked with.
    pub fn verifier(&self) -> &Verifier {
        &self.verifier
    }

    /// The store beneath.
    pub fn store(&self) -> &dyn Store {
        self.store.as_ref()
    }

    /// The raw archive.
    pub fn archive(&self) -> &Archive {
        &self.archive
    }

    /// Number of entries.
    #[allow(missing_docs)]
    pub fn size(&self) -> Result<u64, LedgerError> {
        self.store.size()
    }

    /// One entry with its checkpoint and proof.
    ///
    /// # Errors
    /// No such entry, or one that is damaged.
    pub fn entry(&self, index: u64) -> Result<Recorded, LedgerError> {
        match self.store.row(index)? {
            Some(row) => recorded(self.store.as_ref(), &row, false),
            None => Err(LedgerError::Refused(format!("there is no entry {index}"))),
        }
    }

    /// The entries that a query finds, in entry order.
    #[allow(missing_docs)]
    pub fn find(&self, query: Query) -> Result<Vec<Entry>, LedgerError> {
        let indices = self.store.find(query)?;
        indices
            .into_iter()
            .map(|index| self.entry(index).map(|found| found.entry))
            .collect()
    }

    /// Every entry, in order.
    #[allow(missing_docs)]
    pub fn entries(&self) -> Result<Vec<Entry>, LedgerError> {
        let mut out = Vec::new();
        self.store.each(0, &mut |row| {
            let row = row?;
            out.push(Entry::read(row.index, &row.body)?);
            Ok(())
        })?;
        Ok(out)
    }

    /// The newest checkpoint; `None` for a ledger without entries.
    #[allow(missing_docs)]
    pub fn head(&self) -> Result<Option<String>, LedgerError> {
        match self.store.size()?.checked_sub(1) {
            Some(last) => Ok(self.store.row(last)?.map(|row| row.checkpoint)),
            None => Ok(None),
        }
    }

    /// The bytes of the first object of a role in an entry, hashed anew.
    ///
    /// # Errors
    /// No such object, or one that is missing or damaged in the archive.
    pub fn object(&self, entry: &Entry, role: &str) -> Result<Vec<u8>, LedgerError> {
        match entry.objects_of(role).next() {
            Some(object) => self.archive.get(&object.sha256),
            None => Err(LedgerError::Refused(format!(
                "entry {} has no {role}",
                entry.index
            ))),
        }
    }

    /// Inclusion proof of an entry in the tree of the first `size` entries.
    #[allow(missing_docs)]
    pub fn inclusion_proof(&self, index: u64, size: u64) -> Result<Vec<Hash>, LedgerError> {
        let leaves = self.leaves(size)?;
        let index = usize::try_from(index).unwrap_or(usize::MAX);
        merkle::inclusion_proof(&leaves, index).ok_or_else(|| no_tree(size))
    }

    /// Consistency proof from the tree of the first `old` entries to that of the first `size`.
    #[allow(missing_docs)]
    pub fn consistency_proof(&self, old: u64, size: u64) -> Result<Vec<Hash>, LedgerError> {
        let leaves = self.leaves(size)?;
        let old = usize::try_from(old).unwrap_or(usize::MAX);
        merkle::consistency_proof(&leaves, old).ok_or_else(|| no_tree(size))
    }

    fn leaves(&self, size: u64) -> Result<Vec<Hash>, LedgerError> {
        let mut leaves = Vec::new();
        self.store.each(0, &mut |row| {
            let row = row?;
            if row.index < size {
                leaves.push(merkle::leaf_hash(row.body.as_bytes()));
            }
            Ok(())
        })?;
        if leaves.len() as u64 == size {
            Ok(leaves)
        } else {
            Err(no_tree(size))
        }
    }

    /// Whether the ledger still begins with what a checkpoint saw; a ledger that does not (an old
    /// copy put back) must not be appended to.
    ///
    /// # Errors
    /// What differs.
    pub fn continues(&self, checkpoint: &str) -> Result<(), LedgerError> {
        let seen = Checkpoint::open(checkpoint, &self.verifier)
            .map_err(|e| LedgerError::Key(format!("the checkpoint is not of this ledger: {e}")))?;
        let size = self.store.size()?;
        if seen.size > size {
            return Err(LedgerError::damaged(
                "the ledger",
                format!(
                    "{} entries had existed, {size} are there: an old copy was put back, or \
                     entries were removed",
                    seen.size
                ),
            ));
        }
        if merkle::root(&self.leaves(seen.size)?) != seen.root {
            let why = format!(
                "its first {} entries are not those that had existed",
                seen.size
            );
            return Err(LedgerError::damaged("the ledger", why));
        }
        Ok(())
    }
}

/// The peaks that a row left.
fn frontier(row: Option<&Row>) -> Result<Frontier, LedgerError> {
    let Some(row) = row else {
        return Ok(Frontier::default());
    };
    Frontier::new(row.index + 1, &row.peaks).ok_or_else(|| {
        LedgerError::damaged(
            format!("entry {}", row.index),
            "the head of the tree that it left is not one of its size",
        )
    })
}

fn recorded(reader: &dyn Reader, row: &Row, new: bool) -> Result<Recorded, LedgerError> {
    let before = match row.index.checked_sub(1) {
        Some(before) => reader.row(before)?,
        None => None,
    };
    let proof = frontier(before.as_ref())?.push(merkle::leaf_hash(row.body.as_bytes()));
    Ok(Recorded {
        entry: Entry::read(row.index, &row.body)?,
        checkpoint: row.checkpoint.clone(),
        proof,
        new,
    })
}

fn no_tree(size: u64) -> LedgerError {
    LedgerError::Refused(format!("the ledger has no tree of {size} entries"))
}

fn make_records(records: &Path, disk: &dyn Disk) -> Result<(), LedgerError> {
    if records.is_dir() {
        return Ok(());
    }
    disk.create_folder(records)
        .map_err(|e| LedgerError::io("making the records folder", records, e))?;
    match records.parent().filter(|p| !p.as_os_str().is_empty()) {
        Some(parent) => disk
            .sync_folder(parent)
            .map_err(|e| LedgerError::io("syncing the folder", parent, e)),
        None => Ok(()),
    }
}

/// An archive with objects had a ledger: a new one must not take its place unseen. The archive is
/// looked at first, since another process may be making both at this moment.
fn refuse_lost_ledger(records: &Path, disk: &Arc<dyn Disk>) -> Result<(), LedgerError> {
    if Archive::new(records, disk.clone()).is_empty()? {
        return Ok(());
    }
    let path = records.join(FILE);
    let length = std::fs::metadata(&path).map_or(0, |m| m.len());
    if length > 0 {
        return Ok(());
    }
    Err(LedgerError::Missing {
        path,
        why: "the archive beside it holds objects, so there was one: put its backup back, or move \
              the records folder away to begin anew"
            .to_owned(),
    })
}
