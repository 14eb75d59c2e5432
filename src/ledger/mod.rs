//! The records: an append-only ledger with a Merkle tree over its entries, and the raw archive of
//! the bytes that each record rests on.
//!
//! One act is one entry, in one transaction. Objects go into the archive first; then the entry
//! that names them is appended, signed as the new head of the tree, and read back. A run that ends
//! in between leaves at most objects that no entry names. Doing the same act again answers with
//! the entry that is there.
//!
//! Clock, identity and keys are arguments. [`Store`] is what a server database would implement.

pub mod approval;
mod archive;
mod checkpoint;
mod digest;
pub mod disk;
mod entry;
mod error;
pub mod merkle;
mod note;
mod schema;
mod sqlite;
mod store;
mod verify;
pub mod witness;

pub use archive::{Archive, Listing, MAX_OBJECT};
pub use checkpoint::Checkpoint;
pub use digest::{Hash, hex, sha256, sha256_hex};
pub use entry::{Act, Decision, ENTRY_SCHEMA, Entry, ObjectRef};
pub use error::LedgerError;
pub use note::{NoteError, Signer, Verifier};
pub use sqlite::FILE;
pub use store::{Decided, Identity, Query, Reader, Row, Store};
pub use verify::{Anchor, Claim, Finding, Report, verify};

use crate::diagnostic::Note;
use crate::record::{LotRecord, LotVerdict};
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

    /// Records a judged lot: `objects` are the bytes it was made from, `record_json` its record as
    /// written. The same inputs answer with the entry that exists; other inputs for the same lot,
    /// part and supplier make an entry that names the earlier one.
    ///
    /// # Errors
    /// Nothing is recorded, except where the error says that it is not known.
    pub fn judged(
        &mut self,
        record: &LotRecord,
        record_json: &[u8],
        inputs: &str,
        objects: &[Object],
        made: &Made,
    ) -> Result<Recorded, LedgerError> {
        if let Some(&index) = self.store.find(Query::Inputs(inputs))?.first() {
            return self.entry(index);
        }
        let name = format!("{}.json", record.record);
        let of_record = Object {
            role: "record",
            name: &name,
            bytes: record_json,
        };
        let all: Vec<Object> = std::iter::once(of_record)
            .chain(objects.iter().copied())
            .collect();
        let act = |earlier| Act::Judged {
            record: record.record.clone(),
            inputs: inputs.to_owned(),
            lot: record.lot.lot.clone(),
            part: record.lot.part.clone(),
            supplier: record.lot.supplier.clone(),
            verdict: verdict(record.verdict).to_owned(),
            earlier,
        };
        self.append(&all, made, &|reader| {
            if let Some(&index) = reader.find(Query::Inputs(inputs))?.first() {
                return Ok(Chosen::Before(index));
            }
            let earlier = earlier_of(reader, record)?;
            Ok(Chosen::Act(act(earlier)))
        })
    }

    /// Records what a person decided on a held or rejected lot.
    ///
    /// # Errors
    /// Besides those of the store: an unknown record, an accepted lot, no reason, nobody named.
    pub fn dispose(
        &mut self,
        record: &str,
        decision: Decision,
        reason: &str,
        made: &Made,
    ) -> Result<Recorded, LedgerError> {
        need(made.by.unwrap_or(""), "a disposition says who decided")?;
        need(reason, "a disposition says why")?;
        let act = Act::Disposition {
            record: record.to_owned(),
            decision,
            reason: reason.to_owned(),
        };
        self.append(&[], made, &|reader| {
            if judged_verdict(reader, record)? == "accept" {
                return Err(LedgerError::Refused(format!(
                    "record {record} accepts its lot: there is nothing to dispose of"
                )));
            }
            let last = reader.find(Query::Record(record))?.last().copied();
            repeat_or_new(reader, last.as_slice(), &act, made.by)
        })
    }

    /// Records an approval of a limit or station file: `note` is the signed statement, `verifier`
    /// the key that the site trusts, `role` is `limits` or `station`.
    ///
    /// # Errors
    /// A note that does not verify, or that is not about these bytes under this name for this ledger.
    pub fn approve(
        &mut self,
        file: &Object,
        note: &str,
        verifier: &Verifier,
        made: &Made,
    ) -> Result<Recorded, LedgerError> {
        let statement = approval::Statement::open(note, verifier)
            .map_err(|e| LedgerError::Refused(format!("{}: not approved: {e}", file.name)))?;
        if !statement.approves(self.verifier.name(), file.name, file.bytes) {
            return Err(LedgerError::Refused(format!(
                "{}: the approval is of another file, of other bytes, or for another ledger",
                file.name
            )));
        }
        let act = Act::Approval {
            file: file.name.to_owned(),
            revision: statement.revision,
            sha256: statement.sha256,
            statement: note.to_owned(),
        };
        self.append(&[*file], made, &|reader| {
            let approvals = reader.find(Query::Kind("approval"))?;
            repeat_or_new(reader, &approvals, &act, made.by)
        })
    }

    /// Records the certificate that was made of a record.
    ///
    /// # Errors
    /// An unknown record, or those of the store.
    pub fn issued(
        &mut self,
        record: &str,
        certificate: &[u8],
        made: &Made,
    ) -> Result<Recorded, LedgerError> {
        let act = Act::Issue {
            record: record.to_owned(),
            certificate: sha256_hex(certificate),
        };
        self.append(&[], made, &|reader| {
            judged_verdict(reader, record)?;
            repeat_or_new(reader, &reader.find(Query::Record(record))?, &act, made.by)
        })
    }

    /// Records that a certificate was made again; each time is an entry.
    ///
    /// # Errors
    /// An unknown record, no reason, or those of the store.
    pub fn reissued(
        &mut self,
        record: &str,
        certificate: &[u8],
        reason: &str,
        made: &Made,
    ) -> Result<Recorded, LedgerError> {
        need(reason, "a re-issue says why")?;
        let act = Act::Reissue {
            record: record.to_owned(),
            certificate: sha256_hex(certificate),
            reason: reason.to_owned(),
        };
        self.append(&[], made, &|reader| {
            judged_verdict(reader, record)?;
            Ok(Chosen::Act(act.clone()))
        })
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

    fn append(
        &mut self,
        objects: &[Object],
        made: &Made,
        choose: &dyn Fn(&dyn Reader) -> Result<Chosen, LedgerError>,
    ) -> Result<Recorded, LedgerError> {
        let Some(signer) = self.signer.clone() else {
            return Err(LedgerError::Refused(
                "the ledger was opened for reading".to_owned(),
            ));
        };
        let bytes: Vec<&[u8]> = objects.iter().map(|object| object.bytes).collect();
        let names = self.archive.put_all(&bytes)?;
        let objects: Vec<ObjectRef> = objects
            .iter()
            .zip(names)
            .map(|(object, sha256)| ObjectRef {
                role: object.role.to_owned(),
                name: object.name.to_owned(),
                sha256,
                bytes: object.bytes.len() as u64,
            })
            .collect();
        let mut new = false;
        let row = self.store.append(&mut |reader| match choose(reader)? {
            Chosen::Before(index) => Ok(Decided::Before(index)),
            Chosen::Act(act) => {
                new = true;
                next_row(reader, act, &objects, made, &signer).map(Decided::New)
            }
        })?;
        recorded(self.store.as_ref(), &row, new)
    }
}

/// What an act comes to before it has a place.
enum Chosen {
    Before(u64),
    Act(Act),
}

/// The row that makes the act the newest entry.
fn next_row(
    reader: &dyn Reader,
    act: Act,
    objects: &[ObjectRef],
    made: &Made,
    signer: &Signer,
) -> Result<Row, LedgerError> {
    let index = reader.size()?;
    let last = match index.checked_sub(1) {
        Some(last) => reader.row(last)?,
        None => None,
    };
    let mut frontier = frontier(last.as_ref())?;
    let entry = Entry {
        schema: ENTRY_SCHEMA,
        ledger: signer.verifier().name().to_owned(),
        index,
        time: made.time.to_rfc3339(),
        by: made.by.map(str::to_owned),
        program: made.program.to_owned(),
        act,
        objects: objects.to_vec(),
        notes: clock_notes(last.as_ref(), made.time)?,
    };
    let body = entry.bytes()?;
    frontier.push(merkle::leaf_hash(body.as_bytes()));
    let head = Checkpoint {
        origin: entry.ledger,
        size: frontier.size(),
        root: frontier.root(),
    };
    let checkpoint = head
        .sign(signer)
        .map_err(|e| LedgerError::Refused(e.to_string()))?;
    Ok(Row {
        index,
        body,
        peaks: frontier.bytes(),
        checkpoint,
        objects: objects.to_vec(),
    })
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

/// The order of entries is their index; a clock that was set back is only noted.
fn clock_notes(last: Option<&Row>, now: DateTime<FixedOffset>) -> Result<Vec<Note>, LedgerError> {
    let Some(last) = last else {
        return Ok(Vec::new());
    };
    let before = Entry::read(last.index, &last.body)?;
    let then = DateTime::parse_from_rfc3339(&before.time)
        .map_err(|e| LedgerError::damaged(format!("entry {}", last.index), e.to_string()))?;
    if now >= then {
        return Ok(Vec::new());
    }
    let seconds = (then - now).num_seconds();
    Ok(vec![Note::new(
        "clock_went_back",
        format!(
            "the clock stood {seconds} s behind the entry before, of {}: check the clock",
            before.time
        ),
    )])
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

/// The entry among the candidates that says the same, by the same person; else a new one.
fn repeat_or_new(
    reader: &dyn Reader,
    candidates: &[u64],
    act: &Act,
    by: Option<&str>,
) -> Result<Chosen, LedgerError> {
    for &index in candidates {
        if let Some(row) = reader.row(index)? {
            let entry = Entry::read(index, &row.body)?;
            if entry.act == *act && entry.by.as_deref() == by {
                return Ok(Chosen::Before(index));
            }
        }
    }
    Ok(Chosen::Act(act.clone()))
}

/// The newest entry that judged the same lot of the same part from the same supplier.
fn earlier_of(reader: &dyn Reader, record: &LotRecord) -> Result<Option<u64>, LedgerError> {
    let mut earlier = None;
    for index in reader.find(Query::Lot(&record.lot.lot))? {
        let Some(row) = reader.row(index)? else {
            continue;
        };
        let act = Entry::read(index, &row.body)?.act;
        if let Act::Judged { part, supplier, .. } = act
            && part == record.lot.part
            && supplier == record.lot.supplier
        {
            earlier = Some(index);
        }
    }
    Ok(earlier)
}

/// The verdict of a record that was judged.
fn judged_verdict(reader: &dyn Reader, record: &str) -> Result<String, LedgerError> {
    for index in reader.find(Query::Record(record))? {
        if let Some(row) = reader.row(index)?
            && let Act::Judged { verdict, .. } = Entry::read(index, &row.body)?.act
        {
            return Ok(verdict);
        }
    }
    Err(LedgerError::Refused(format!(
        "the ledger has no record {record:?}"
    )))
}

fn verdict(verdict: LotVerdict) -> &'static str {
    match verdict {
        LotVerdict::Accept => "accept",
        LotVerdict::Reject => "reject",
        LotVerdict::Hold => "hold",
    }
}

fn need(text: &str, why: &str) -> Result<(), LedgerError> {
    if text.trim().is_empty() {
        return Err(LedgerError::Refused(why.to_owned()));
    }
    Ok(())
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
