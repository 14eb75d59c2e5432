//! Whether the records are what was recorded: database, log, archive, and anchors kept elsewhere.
//!
//! Without an anchor (a certificate handed out, a witness file) nothing can tell a ledger whose
//! last entries were removed from one that never had them; the report says so.

use super::Ledger;
use super::checkpoint::Checkpoint;
use super::digest::Hash;
use super::entry::{Act, Entry};
use super::error::LedgerError;
use super::merkle::{Frontier, leaf_hash};
use super::store::Row;
use std::collections::{BTreeMap, BTreeSet};

/// Something that is wrong.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Finding {
    /// Stable, lower case with underscores.
    pub code: &'static str,
    /// What it is about: `entry 12`, `archive object 3f…`, the name of an anchor.
    pub place: String,
    /// The first entry that cannot be relied on for it.
    pub since: Option<u64>,
    /// One sentence for people.
    pub text: String,
}

/// A checkpoint that was kept outside the records.
#[derive(Debug, Clone, Copy)]
pub struct Anchor<'a> {
    /// Where it comes from: a file name.
    pub name: &'a str,
    /// The signed checkpoint.
    pub checkpoint: &'a str,
    /// What a certificate says besides.
    pub claim: Option<Claim<'a>>,
}

/// What a certificate says of its record.
#[derive(Debug, Clone, Copy)]
#[allow(missing_docs)]
pub struct Claim<'a> {
    pub index: u64,
    pub record: &'a str,
    /// Of the JSON record.
    pub sha256: &'a str,
}

/// What verification came to.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Report {
    /// Entries in the ledger.
    pub size: u64,
    /// What is wrong; empty where everything is proven that can be.
    pub findings: Vec<Finding>,
    /// What is worth knowing and wrong with nothing: objects that no entry names.
    pub remarks: Vec<String>,
    /// Anchors that hold.
    pub anchors: usize,
    /// How many entries the newest anchor that holds covers.
    pub covered: u64,
}

impl Report {
    /// Whether nothing is wrong.
    pub fn proven(&self) -> bool {
        self.findings.is_empty()
    }

    /// How far the proof reaches, in one sentence.
    pub fn reach(&self) -> String {
        let size = self.size;
        if self.anchors == 0 {
            return format!(
                "no checkpoint from outside was given: that entries after the {size} there were \
                 removed, or that all of it was replaced by an older copy, cannot be excluded"
            );
        }
        let rest = size.saturating_sub(self.covered);
        format!(
            "checked against {} checkpoint(s) from outside; the newest covers {} of {size} \
             entries, and {rest} rest on this machine alone",
            self.anchors, self.covered
        )
    }
}

/// Verifies everything that can be verified without judging again.
///
/// # Errors
/// Only where the records cannot be looked at; what is wrong with them is in the report.
pub fn verify(ledger: &Ledger, anchors: &[Anchor]) -> Result<Report, LedgerError> {
    let mut walk = Walk::new(ledger, anchors);
    match ledger.store().check() {
        Ok(wrong) => {
            for text in wrong {
                walk.find("database_damaged", "the database", None, text);
            }
        }
        Err(error) => walk.find("database_damaged", "the database", None, error.to_string()),
    }
    let seen = ledger.store().each(0, &mut |row| {
        walk.row(row);
        Ok(())
    });
    if let Err(error) = seen {
        let since = walk.next;
        walk.find(
            "database_damaged",
            "the database",
            Some(since),
            error.to_string(),
        );
    }
    walk.archive()?;
    walk.anchors(anchors);
    Ok(walk.report)
}

/// A walk over the rows in order.
struct Walk<'a> {
    ledger: &'a Ledger,
    report: Report,
    /// The index that the next row must have.
    next: u64,
    /// Peaks as computed from the entries so far.
    frontier: Frontier,
    /// Digest to the first entry that rests on it.
    objects: BTreeMap<String, u64>,
    /// Records judged so far.
    records: BTreeSet<String>,
    /// Whether an entry so far is missing or cannot be read, so that `records` may lack some.
    incomplete: bool,
    /// Roots at the sizes that anchors speak of.
    roots: BTreeMap<u64, Option<Hash>>,
}

impl<'a> Walk<'a> {
    fn new(ledger: &'a Ledger, anchors: &[Anchor]) -> Self {
        let sizes = anchors
            .iter()
            .filter_map(|anchor| Checkpoint::open(anchor.checkpoint, ledger.verifier()).ok());
        Walk {
            ledger,
            report: Report::default(),
            next: 0,
            frontier: Frontier::default(),
            objects: BTreeMap::new(),
            records: BTreeSet::new(),
            incomplete: false,
            roots: sizes.map(|head| (head.size, None)).collect(),
        }
    }

    fn find(
        &mut self,
        code: &'static str,
        place: impl Into<String>,
        since: Option<u64>,
        text: impl Into<String>,
    ) {
        self.report.findings.push(Finding {
            code,
            place: place.into(),
            since,
            text: text.into(),
        });
    }

    fn of_entry(&mut self, code: &'static str, index: u64, text: impl Into<String>) {
        self.find(code, format!("entry {index}"), Some(index), text);
    }

    fn row(&mut self, row: Result<Row, LedgerError>) {
        let row = match row {
            Ok(row) => row,
            Err(error) => {
                let index = self.next;
                self.incomplete = true;
                self.of_entry("entry_damaged", index, error.to_string());
                return;
            }
        };
        for index in self.next..row.index {
            self.of_entry(
                "entry_missing",
                index,
                "not in the ledger, though later ones are",
            );
            if index > self.next + 1000 {
                break;
            }
        }
        self.incomplete |= row.index > self.next;
        self.next = row.index + 1;
        self.report.size = self.next;
        self.head(&row);
        self.entry(&row);
        if let Some(root) = self.roots.get_mut(&self.next) {
            *root = Some(self.frontier.root());
        }
    }

    /// Body, peaks and signed checkpoint of a row against each other and against the rows before.
    fn head(&mut self, row: &Row) {
        let index = row.index;
        let mut computed = self.frontier.clone();
        computed.push(leaf_hash(row.body.as_bytes()));
        let stored = Frontier::new(index + 1, &row.peaks);
        let signed = match Checkpoint::open(&row.checkpoint, self.ledger.verifier()) {
            Ok(head) => Some(head),
            Err(error) => {
                self.of_entry("checkpoint_damaged", index, error.to_string());
                None
            }
        };
        let origin = self.ledger.verifier().name();
        if signed
            .as_ref()
            .is_some_and(|head| head.size != index + 1 || head.origin != origin)
        {
            self.of_entry(
                "checkpoint_damaged",
                index,
                "its checkpoint is of another entry",
            );
        }
        let fits = |frontier: &Frontier| {
            frontier.size() == index + 1
                && signed
                    .as_ref()
                    .is_none_or(|head| head.root == frontier.root())
        };
        let computed_fits = fits(&computed);
        match stored.filter(&fits) {
            // After a gap nothing can be computed; the gap itself is reported.
            Some(stored) if self.frontier.size() != index => self.frontier = stored,
            Some(stored) if stored != computed => {
                self.of_entry(
                    "entry_changed",
                    index,
                    "it, or one before it, is not what was recorded",
                );
                // What is after it is judged by the head that was signed with it.
                self.frontier = stored;
            }
            Some(_) => self.frontier = computed,
            None if computed_fits => {
                let text = "the peaks kept with it are not those of the tree";
                self.of_entry("head_damaged", index, text);
                self.frontier = computed;
            }
            None => {
                let text = "neither it nor the head kept with it is what was recorded";
                self.of_entry("entry_changed", index, text);
                self.frontier = computed;
            }
        }
    }

    fn entry(&mut self, row: &Row) {
        let entry = match Entry::read(row.index, &row.body) {
            Ok(entry) => entry,
            Err(error) => {
                self.incomplete = true;
                return self.of_entry("entry_damaged", row.index, error.to_string());
            }
        };
        if entry.ledger != self.ledger.verifier().name() {
            self.of_entry(
                "entry_damaged",
                row.index,
                "it is an entry of another ledger",
            );
        }
        if entry.objects != row.objects {
            let text = "the table of objects says something else than the entry";
            self.of_entry("objects_differ", row.index, text);
        }
        for object in &entry.objects {
            self.objects
                .entry(object.sha256.clone())
                .or_insert(row.index);
        }
        match (&entry.act, entry.act.record()) {
            (Act::Judged { record, .. }, _) => {
                self.records.insert(record.clone());
            }
            (_, Some(record)) if !self.incomplete && !self.records.contains(record) => {
                let text = format!("it is about record {record:?}, which no entry before it made");
                self.of_entry("record_unknown", row.index, text);
            }
            _ => {}
        }
    }

    fn archive(&mut self) -> Result<(), LedgerError> {
        let listing = self.ledger.archive().list()?;
        let referenced = std::mem::take(&mut self.objects);
        for name in listing
            .objects
            .iter()
            .filter(|name| !referenced.contains_key(*name))
        {
            let text = format!(
                "{}: no entry names it (a run ended before its entry)",
                object(name)
            );
            self.report.remarks.push(text);
        }
        for (name, since) in referenced {
            if !listing.objects.contains(&name) {
                let text = "an entry rests on it, and it is not in the archive";
                self.find("object_missing", object(&name), Some(since), text);
            } else if let Err(error) = self.ledger.archive().get(&name) {
                self.find(
                    "object_damaged",
                    object(&name),
                    Some(since),
                    error.to_string(),
                );
            }
        }
        self.remark(&listing);
        Ok(())
    }

    fn remark(&mut self, listing: &super::Listing) {
        for path in listing.temporary.iter().chain(&listing.foreign) {
            self.report
                .remarks
                .push(format!("{}: not an object of the archive", path.display()));
        }
    }

    fn anchors(&mut self, anchors: &[Anchor]) {
        for anchor in anchors {
            match Checkpoint::open(anchor.checkpoint, self.ledger.verifier()) {
                Ok(head) => self.anchor(anchor, &head),
                Err(error) => {
                    let text = format!("its checkpoint is not one of this ledger: {error}");
                    self.find("anchor_invalid", anchor.name, None, text);
                }
            }
        }
    }

    fn anchor(&mut self, anchor: &Anchor, head: &Checkpoint) {
        let size = self.report.size;
        if head.origin != self.ledger.verifier().name() {
            return self.find(
                "anchor_invalid",
                anchor.name,
                None,
                "it is of another ledger",
            );
        }
        if head.size > size {
            let text = format!(
                "it saw {} entries and {size} are there: entries were removed, or an older copy \
                 was put back",
                head.size
            );
            return self.find("ledger_truncated", anchor.name, Some(size), text);
        }
        let root = self.roots.get(&head.size).copied().flatten();
        if root != Some(head.root) {
            let text = format!("the first {} entries are not those that it saw", head.size);
            let since = self.report.findings.iter().filter_map(|f| f.since).min();
            return self.find("history_rewritten", anchor.name, since.or(Some(0)), text);
        }
        if let Some(claim) = &anchor.claim
            && let Err(text) = self.claim(claim, head.size)
        {
            return self.find("certificate_differs", anchor.name, Some(claim.index), text);
        }
        self.report.anchors += 1;
        self.report.covered = self.report.covered.max(head.size);
    }

    fn claim(&self, claim: &Claim, size: u64) -> Result<(), String> {
        if claim.index >= size {
            return Err("its entry is not covered by its checkpoint".to_owned());
        }
        let found = self.ledger.entry(claim.index).map_err(|e| e.to_string())?;
        if found.entry.act.kind() != "judged" || found.entry.act.record() != Some(claim.record) {
            return Err(format!("entry {} is of another record", claim.index));
        }
        let record = found.entry.objects_of("record").next();
        if record.is_none_or(|object| object.sha256 != claim.sha256) {
            return Err("its record is not the one that was recorded".to_owned());
        }
        Ok(())
    }
}

fn object(name: &str) -> String {
    format!("archive object {name}")
}
