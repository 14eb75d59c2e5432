//! What a record rests on, as objects of the ledger, and the way back from them.

use super::approvals::{self, SITE_FILE};
use crate::diagnostic::{Faults, Note};
use crate::ledger::{
    Act, Archive, Entry, Ledger, LedgerError, Object, Query, Reader, inputs_digest, trust::Trust,
};
use crate::limits::Limits;
use crate::lot::{self, History, Lot, PastLot, SeveritySet, Switching};
use crate::record::{self, Approvals, Made, Occasion, Refusal, Sources, sha256};
use crate::statistics::sampling::Severity;
use crate::sweep::RawFile;
use std::collections::{BTreeMap, BTreeSet};

/// Sweep files named in one reason; the record has all.
const NAMED: usize = 4;
/// Records before this one that are looked at. The oldest brings the state of the switching rules with it.
const LOTS_BEFORE: usize = 40;

/// The files of a lot with what the ledger calls them.
pub struct Evidence<'a> {
    #[allow(missing_docs)]
    pub lot: Lot,
    sources: &'a Sources,
    limits: String,
    station: String,
}

impl<'a> Evidence<'a> {
    /// # Errors
    /// Faults of the lot file.
    pub fn of(sources: &'a Sources) -> Result<Evidence<'a>, Faults> {
        let lot = lot::read(&sources.lot.name, &sources.lot.bytes)?;
        Ok(Evidence {
            limits: format!("limits/parts/{}.yaml", lot.part),
            station: format!("limits/stations/{}.yaml", lot.station),
            lot,
            sources,
        })
    }

    /// What the entries before one say of the approval of these files.
    ///
    /// # Errors
    /// Those of the ledger.
    pub fn approvals(
        &self,
        reader: &dyn Reader,
        archive: &Archive,
        before: u64,
    ) -> Result<Approvals, LedgerError> {
        let trust = Trust::read(reader, archive, before)?;
        Ok(self.approvals_by(&trust))
    }

    fn approvals_by(&self, trust: &Trust) -> Approvals {
        approvals::look(trust, self.sources, &self.limits, &self.station)
    }

    /// Every file, the label as it was scanned, and the statements about the files.
    pub fn objects<'b>(&'b self, approvals: &'b Approvals) -> Vec<Object<'b>> {
        fn file<'f>(role: &'f str, name: &'f str, file: &'f RawFile) -> Object<'f> {
            Object {
                role,
                name,
                bytes: &file.bytes,
            }
        }
        let mut all = vec![
            file("lot", "lot.yaml", &self.sources.lot),
            file("limits", &self.limits, &self.sources.limits),
            file("station", &self.station, &self.sources.station),
        ];
        let site = self.sources.site.as_ref();
        all.extend(site.map(|site| file("site", SITE_FILE, site)));
        all.extend(self.lot.label.as_ref().map(|label| Object {
            role: "label",
            name: "label",
            bytes: label.as_bytes(),
        }));
        for (role, files) in [
            ("compensation", &self.sources.compensation),
            ("sweep", &self.sources.sweeps),
        ] {
            all.extend(files.iter().map(|f| file(role, f.name.as_str(), f)));
        }
        all.extend(approvals.notes.iter().map(|note| Object {
            role: note.role,
            name: &note.file,
            bytes: note.text.as_bytes(),
        }));
        all
    }

    /// What the ledger finds the record by.
    pub fn digest(&self, approvals: &Approvals) -> String {
        inputs_digest(&self.objects(approvals))
    }

    /// The occasion where there are no other records.
    pub fn first_occasion(&self, issued: &str) -> Occasion {
        Occasion {
            approvals: self.approvals_by(&Trust::default()),
            ..first_occasion(issued)
        }
    }

    /// What the entries before one say about this lot.
    ///
    /// # Errors
    /// Those of the ledger.
    pub fn occasion(
        &self,
        reader: &dyn Reader,
        archive: &Archive,
        before: u64,
        issued: &str,
    ) -> Result<Occasion, LedgerError> {
        let mut entries = Entries::new(reader);
        Ok(Occasion {
            supersedes: supersedes(&self.lot, &mut entries, before)?,
            further: used_before(&self.lot, &self.sources.sweeps, &mut entries, before)?,
            history: history(&of(&self.lot), &mut entries, archive, before)?,
            approvals: self.approvals(reader, archive, before)?,
            ..first_occasion(issued)
        })
    }
}

/// What the entries before one say about the severity of inspection of the next lot of a part from
/// a supplier (`None`: lots that name none); `None` where the scheme has no severities.
///
/// The plan in force is then [`lot::plan_in_state`].
///
/// # Errors
/// Those of the ledger.
pub fn severity_in_force(
    reader: &dyn Reader,
    archive: &Archive,
    limits: &Limits,
    supplier: Option<&str>,
    before: u64,
) -> Result<Option<Switching>, LedgerError> {
    let of = Of {
        part: &limits.part,
        supplier,
        lot: None,
    };
    let history = history(&of, &mut Entries::new(reader), archive, before)?;
    let begins = first_occasion("").severity;
    Ok(lot::severity_state(
        &history,
        &limits.acceptance,
        begins,
        limits.reduced_inspection,
    ))
}

/// The same where there may be no ledger yet.
///
/// # Errors
/// Those of the ledger.
pub fn severity_at(
    ledger: Option<&Ledger>,
    limits: &Limits,
    supplier: Option<&str>,
) -> Result<Option<Switching>, LedgerError> {
    match ledger {
        Some(ledger) => severity_in_force(
            ledger.store(),
            ledger.archive(),
            limits,
            supplier,
            ledger.size()?,
        ),
        None => Ok(lot::severity_state(
            &History::default(),
            &limits.acceptance,
            first_occasion("").severity,
            limits.reduced_inspection,
        )),
    }
}

/// The occasion where there is nothing but the lot.
pub fn first_occasion(issued: &str) -> Occasion {
    Occasion {
        issued: issued.to_owned(),
        severity: Severity::Normal,
        history: History::default(),
        supersedes: None,
        further: Vec::new(),
        approvals: Approvals::default(),
    }
}

/// Entries of the ledger, each read once.
struct Entries<'a> {
    reader: &'a dyn Reader,
    read: BTreeMap<u64, Option<Entry>>,
}

impl<'a> Entries<'a> {
    fn new(reader: &'a dyn Reader) -> Self {
        Entries {
            reader,
            read: BTreeMap::new(),
        }
    }

    fn get(&mut self, index: u64) -> Result<Option<&Entry>, LedgerError> {
        if !self.read.contains_key(&index) {
            let row = self.reader.row(index)?;
            let entry = row.map(|row| Entry::read(index, &row.body)).transpose()?;
            self.read.insert(index, entry);
        }
        Ok(self.read.get(&index).and_then(Option::as_ref))
    }

    fn find(&self, query: Query, before: u64) -> Result<Vec<u64>, LedgerError> {
        let mut found = self.reader.find(query)?;
        found.retain(|index| *index < before);
        Ok(found)
    }
}

/// The record of an entry that judged a lot, and whether it is this one.
fn judged<'e>(entry: &'e Entry, of: &Lot) -> Option<(&'e str, &'e str, bool)> {
    match &entry.act {
        Act::Judged {
            record,
            lot,
            part,
            supplier,
            ..
        } => {
            let same = (lot, part, supplier) == (&of.lot, &of.part, &of.supplier);
            Some((record, lot, same))
        }
        _ => None,
    }
}

/// The newest record of the same lot of the same part from the same supplier.
fn supersedes(
    lot: &Lot,
    entries: &mut Entries,
    before: u64,
) -> Result<Option<String>, LedgerError> {
    for index in entries
        .find(Query::Lot(&lot.lot), before)?
        .into_iter()
        .rev()
    {
        let found = entries.get(index)?.and_then(|entry| judged(entry, lot));
        if let Some((record, _, true)) = found {
            return Ok(Some(record.to_owned()));
        }
    }
    Ok(None)
}

/// Whose history is asked for.
struct Of<'a> {
    part: &'a str,
    supplier: Option<&'a str>,
    /// A lot that is no history of itself.
    lot: Option<&'a str>,
}

fn of(lot: &Lot) -> Of<'_> {
    Of {
        part: &lot.part,
        supplier: lot.supplier.as_deref(),
        lot: Some(&lot.lot),
    }
}

/// The records of the part from the supplier that were made before, oldest first, and the severities
/// that were set in between. Of a lot that was first judged before the oldest record in view, no later
/// record is in it, since it is not known whether it counted then.
fn history(
    of: &Of,
    entries: &mut Entries,
    archive: &Archive,
    before: u64,
) -> Result<History, LedgerError> {
    let query = Query::PartSupplier {
        part: of.part,
        supplier: of.supplier,
    };
    let found = entries.find(query, before)?;
    let from = in_view(&found, entries)?;
    let mut history = History::default();
    let mut kept = BTreeSet::new();
    for index in found.into_iter().skip(from) {
        let Some(entry) = entries.get(index)? else {
            continue;
        };
        match &entry.act {
            Act::Severity {
                class,
                severity,
                reason,
                ..
            } => history.set.push(SeveritySet {
                after: history.lots.len(),
                class: class.clone(),
                severity: *severity,
                reason: reason.clone(),
                by: entry.by.clone(),
                time: entry.time.clone(),
                entry: index,
            }),
            Act::Judged {
                record,
                lot,
                earlier,
                ..
            } if of.lot != Some(lot) && earlier.is_none_or(|earlier| kept.contains(&earlier)) => {
                kept.insert(index);
                history.lots.extend(past(entry, record, archive)?);
            }
            _ => {}
        }
    }
    Ok(history)
}

/// Where in the entries found the newest [`LOTS_BEFORE`] judgements begin.
fn in_view(found: &[u64], entries: &mut Entries) -> Result<usize, LedgerError> {
    let mut left = LOTS_BEFORE;
    for (place, index) in found.iter().enumerate().rev() {
        let judged = entries
            .get(*index)?
            .is_some_and(|entry| matches!(entry.act, Act::Judged { .. }));
        if judged {
            left -= 1;
        }
        if left == 0 {
            return Ok(place);
        }
    }
    Ok(0)
}

/// `None` where the lot was judged by files that nobody had approved: it says nothing of the supplier.
fn past(entry: &Entry, record: &str, archive: &Archive) -> Result<Option<PastLot>, LedgerError> {
    let kept = entry
        .objects_of("record")
        .next()
        .map(|o| archive.get(&o.sha256));
    let bytes = kept.transpose()?.unwrap_or_default();
    let past = record::from_bytes(&bytes).map_err(|e| {
        LedgerError::Refused(format!(
            "the record {record} of an earlier lot cannot be read ({e})"
        ))
    })?;
    let unapproved = |reason: &Note| lot::NOT_APPROVED.contains(&reason.code.as_str());
    Ok((!past.reasons.iter().any(unapproved)).then(|| PastLot::of(&past)))
}

/// A reason for each record of another lot that rests on a sweep of this one. A file without a
/// byte is no sweep.
fn used_before(
    lot: &Lot,
    sweeps: &[RawFile],
    entries: &mut Entries,
    before: u64,
) -> Result<Vec<Note>, LedgerError> {
    let mut uses: BTreeMap<u64, (String, Vec<&str>)> = BTreeMap::new();
    for file in sweeps.iter().filter(|file| !file.bytes.is_empty()) {
        let digest = sha256(&file.bytes);
        for index in entries.find(Query::Object(&digest), before)? {
            let Some(entry) = entries.get(index)? else {
                continue;
            };
            let as_sweep = entry.objects_of("sweep").any(|o| o.sha256 == digest);
            if let (Some((record, other, false)), true) = (judged(entry, lot), as_sweep) {
                let words = format!("lot {other} (record {record})");
                let files = &mut uses.entry(index).or_insert((words, Vec::new())).1;
                files.push(&file.name);
            }
        }
    }
    Ok(uses
        .into_values()
        .map(|(words, files)| note(&words, &files))
        .collect())
}

fn note(other: &str, files: &[&str]) -> Note {
    let named: Vec<&str> = files.iter().take(NAMED).copied().collect();
    let more = match files.len().saturating_sub(NAMED) {
        0 => String::new(),
        n => format!(" and {n} more"),
    };
    Note::new(
        "duplicate_sweep",
        format!(
            "{}{more} already used for {other}: find out which lot was measured, measure the other again",
            named.join(", ")
        ),
    )
}

/// The files that an entry's record was made from, out of the archive.
///
/// # Errors
/// Objects that are missing or damaged.
pub fn sources(ledger: &Ledger, entry: &Entry) -> Result<Sources, LedgerError> {
    let files = |role: &str| -> Result<Vec<RawFile>, LedgerError> {
        entry
            .objects_of(role)
            .map(|object| {
                Ok(RawFile {
                    name: object.name.clone(),
                    bytes: ledger.archive().get(&object.sha256)?,
                })
            })
            .collect()
    };
    let one = |role: &str| -> Result<RawFile, LedgerError> {
        let mut found = files(role)?;
        match (found.pop(), found.is_empty()) {
            (Some(file), true) => Ok(file),
            _ => Err(LedgerError::Refused(format!(
                "entry {} has not one {role}",
                entry.index
            ))),
        }
    };
    let site = match entry.objects_of("site").next() {
        Some(_) => Some(one("site")?),
        None => None,
    };
    Ok(Sources {
        site,
        lot: one("lot")?,
        limits: one("limits")?,
        station: one("station")?,
        compensation: files("compensation")?,
        sweeps: files("sweep")?,
    })
}

/// Why a record cannot be made again.
pub enum NotRemade {
    #[allow(missing_docs)]
    Ledger(LedgerError),
    #[allow(missing_docs)]
    Refused(String),
}

impl From<LedgerError> for NotRemade {
    fn from(error: LedgerError) -> Self {
        NotRemade::Ledger(error)
    }
}

impl std::fmt::Display for NotRemade {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            NotRemade::Ledger(error) => error.fmt(f),
            NotRemade::Refused(text) => f.write_str(text),
        }
    }
}

/// A record made again from the archived bytes, as it was when its entry was made, with those bytes.
///
/// # Errors
/// An archive that does not hold them any more; files that this program cannot judge.
pub fn remake(ledger: &Ledger, entry: &Entry) -> Result<(Sources, Made), NotRemade> {
    remake_digested(ledger, entry).map(|(sources, made, _)| (sources, made))
}

/// The same, with the digest by which the ledger finds it.
#[allow(missing_docs)]
pub fn remake_digested(
    ledger: &Ledger,
    entry: &Entry,
) -> Result<(Sources, Made, String), NotRemade> {
    let sources = sources(ledger, entry)?;
    let refused = |faults: &Faults| crate::diagnostic::render(faults, false);
    let evidence = Evidence::of(&sources).map_err(|faults| NotRemade::Refused(refused(&faults)))?;
    let occasion = evidence.occasion(ledger.store(), ledger.archive(), entry.index, &entry.time)?;
    let digest = evidence.digest(&occasion.approvals);
    let made = record::make(&sources, &occasion, &|| ()).map_err(|refusal| match refusal {
        Refusal::Faults(all) => NotRemade::Refused(all.iter().map(refused).collect()),
        Refusal::Impossible(note) => NotRemade::Refused(note.text),
    })?;
    Ok((sources, made, digest))
}
