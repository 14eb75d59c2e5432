//! Keeping a record: its entry in the ledger first, then its files beside it.

use super::evidence::{self, Evidence};
use super::store::{Paths, remove_leftovers, write_whole};
use crate::certificate::{self, Curve, InLedger, Paper, Signer};
use crate::ledger::disk::System;
use crate::ledger::{
    Act, Archive, Entry, Ledger, LedgerError, Made as By, Proof, Query, Reader, Recorded,
    Signer as Sealer, hex, ledger_key, sha256, sha256_hex, witness,
};
use crate::record::{self, LotRecord, Made, Occasion, Refusal, Sources};
use chrono::{DateTime, FixedOffset, Local, Timelike};
use std::collections::BTreeSet;
use std::fs;
use std::io::ErrorKind;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::SystemTime;

/// Name and version, as entries have it.
pub const PROGRAM: &str = concat!("reelgate ", env!("CARGO_PKG_VERSION"));

/// How often a lot is judged anew because other lots that bear on it were recorded meanwhile. Of eight
/// processes on one part and supplier each comes first in an eighth of the rounds: with 20 tries 2 of
/// 1,000 lots gave up, with 200 one of 10^11 would.
const TRIES: usize = 200;

/// Where and when records are kept.
#[derive(Debug)]
#[allow(missing_docs)]
pub struct Place {
    /// `records/`
    pub records: PathBuf,
    /// `records/certificates/`
    pub certificates: PathBuf,
    /// Key that a new ledger begins with; without one the key is made.
    pub key: Option<PathBuf>,
    /// File on another machine or share that gets every new checkpoint.
    pub witness: Option<PathBuf>,
    /// The time, to the second.
    pub now: DateTime<FixedOffset>,
    /// Who signs the documents.
    pub signer: Option<Signer>,
}

/// The time that was given, else the clock's; to the second.
pub fn now(given: Option<DateTime<FixedOffset>>) -> DateTime<FixedOffset> {
    // `Local::now` does not survive a clock that stands before 1970.
    let clock = || DateTime::<Local>::from(SystemTime::now()).fixed_offset();
    let now = given.unwrap_or_else(clock);
    now.with_nanosecond(0).unwrap_or(now)
}

/// A record that is in the ledger.
#[derive(Debug)]
#[allow(missing_docs)]
pub struct Kept {
    pub record: LotRecord,
    pub paths: Paths,
    /// Present where the lot was judged now.
    pub made: Option<Made>,
    /// Why its files are not on the disk, though it is in the ledger.
    pub unwritten: Option<String>,
    /// What the operator should know though the record is kept.
    pub warnings: Vec<String>,
}

/// Why a lot has no record.
#[derive(Debug)]
#[allow(missing_docs)]
pub enum NotKept {
    Refused(Refusal),
    Ledger(LedgerError),
    /// A file beside the ledger is not what was issued.
    Changed(PathBuf),
    Other(String),
}

impl From<LedgerError> for NotKept {
    fn from(error: LedgerError) -> Self {
        NotKept::Ledger(error)
    }
}

impl Place {
    /// The ledger for reading; `None` where there is none yet, or another process is making it.
    /// One that is gone is found out on opening it for appending.
    pub fn look(&self) -> Result<Option<Ledger>, LedgerError> {
        match Ledger::open(&self.records) {
            Ok(ledger) => Ok(Some(ledger)),
            Err(LedgerError::Missing { .. }) => Ok(None),
            Err(error) => Err(error),
        }
    }

    /// The ledger for appending, made where there is none.
    pub fn open(&self) -> Result<Ledger, LedgerError> {
        let given = self.key.as_deref().map(read_key).transpose()?;
        let signer = ledger_key(
            &self.records,
            &|| given.clone().map_or_else(random_key, Ok),
            &System,
        )?;
        if given.is_some_and(|given| given.verifier() != signer.verifier()) {
            return Err(LedgerError::Key(
                "the key that was given is not the one of this ledger: leave --ledger-key out"
                    .to_owned(),
            ));
        }
        let ledger = Ledger::open_for_writing(&self.records, signer, self.now)?;
        // A witness that cannot be reached keeps nobody from working; one that contradicts does.
        let seen = self.witness.as_deref().map(witness::read);
        if let Some(Ok(seen)) = seen
            && let Some(last) = seen.last()
        {
            ledger.continues(last)?;
        }
        Ok(ledger)
    }

    /// Gives the newest checkpoint to the witness.
    ///
    /// # Errors
    /// In words; the entry stands all the same.
    pub fn tell_witness(&self, ledger: &Ledger) -> Result<(), String> {
        let Some(path) = &self.witness else {
            return Ok(());
        };
        let without = |e: LedgerError| format!("the witness file was not written: {e}");
        match ledger.head().map_err(without)? {
            Some(head) => witness::append(path, &head).map_err(without),
            None => Ok(()),
        }
    }

    /// Who makes an entry here and now.
    pub fn by<'a>(&self, operator: Option<&'a str>) -> By<'a> {
        By {
            by: operator,
            time: self.now,
            program: PROGRAM,
        }
    }
}

fn read_key(path: &Path) -> Result<Sealer, LedgerError> {
    let text = fs::read_to_string(path).map_err(|source| LedgerError::Io {
        doing: "reading the key",
        path: path.to_owned(),
        source,
    })?;
    Sealer::read(&text).map_err(|e| LedgerError::Key(format!("{}: {e}", path.display())))
}

/// A key from the randomness of the system, named after itself.
fn random_key() -> Result<Sealer, LedgerError> {
    let wrong = |e: String| LedgerError::Key(format!("no key for the ledger could be made: {e}"));
    let mut secret = [0; 32];
    getrandom::fill(&mut secret).map_err(|e| wrong(e.to_string()))?;
    let named = |name: &str| Sealer::new(name, &secret).map_err(|e| wrong(e.to_string()));
    let public = named("ledger")?.verifier().public();
    let id = hex(&sha256(&public));
    named(&format!("ledger-{}", id.get(..16).unwrap_or(&id)))
}

/// Judges a lot, unless the ledger has it already, and keeps its record.
pub fn judge(
    place: &Place,
    sources: &Sources,
    evidence: &Evidence,
    paper: Paper,
    read: &(dyn Fn() + Sync),
) -> Result<Kept, NotKept> {
    for _ in 0..TRIES {
        let issued = place.now.to_rfc3339();
        let occasion = match place.look()? {
            None => evidence.first_occasion(&issued),
            Some(ledger) => {
                let (store, archive, size) = (ledger.store(), ledger.archive(), ledger.size()?);
                let inputs = evidence.digest(&evidence.approvals(store, archive, size)?);
                match ledger.find(Query::Inputs(&inputs))?.first() {
                    Some(entry) => return answer(place, &ledger, entry, paper),
                    None => evidence.occasion(store, archive, size, &issued)?,
                }
            }
        };
        let inputs = evidence.digest(&occasion.approvals);
        let made = record::make(sources, &occasion, read).map_err(NotKept::Refused)?;
        let json = record::to_bytes(&made.record).map_err(|e| NotKept::Other(e.to_string()))?;
        match append(place, evidence, &inputs, &occasion, (&made, &json)) {
            Err(NotKept::Ledger(LedgerError::Overtaken)) => {}
            Err(error) => return Err(error),
            Ok((mut ledger, recorded)) if recorded.new => {
                return Ok(finish(
                    place,
                    &mut ledger,
                    &recorded,
                    (sources, made, &json),
                    paper,
                ));
            }
            Ok((ledger, recorded)) => return answer(place, &ledger, &recorded.entry, paper),
        }
    }
    Err(LedgerError::Overtaken.into())
}

fn append(
    place: &Place,
    evidence: &Evidence,
    inputs: &str,
    occasion: &Occasion,
    (made, json): (&Made, &[u8]),
) -> Result<(Ledger, Recorded), NotKept> {
    let mut ledger = place.open()?;
    let archive = Archive::new(&place.records, Arc::new(System));
    let recorded = ledger.judged_while(
        &made.record,
        json,
        inputs,
        &evidence.objects(&occasion.approvals),
        &place.by(evidence.lot.operator.as_deref()),
        &|reader: &dyn Reader| {
            let now = evidence.occasion(reader, &archive, reader.size()?, &occasion.issued)?;
            Ok(now == *occasion)
        },
    )?;
    Ok((ledger, recorded))
}

/// The files of a record that was made now. From here on it is in the ledger, whatever happens.
fn finish(
    place: &Place,
    ledger: &mut Ledger,
    recorded: &Recorded,
    (sources, made, json): (&Sources, Made, &[u8]),
    paper: Paper,
) -> Kept {
    let paths = Paths::of(&place.certificates, &made.record.record);
    let notes = recorded.entry.notes.iter();
    let mut warnings: Vec<String> = notes.map(|note| note.text.clone()).collect();
    let written = issue(place, ledger, recorded, sources, &made, &[paper]).and_then(|document| {
        warnings.extend(document.warnings);
        write(&paths, Some(&document.pdf), json)
    });
    warnings.extend(recorded.entry.notes.iter().map(|note| note.text.clone()));
    warnings.extend(place.tell_witness(ledger).err());
    Kept {
        record: made.record.clone(),
        paths,
        made: Some(made),
        unwritten: written.err(),
        warnings,
    }
}

/// The record that is there, with what is missing of its files made again.
fn answer(place: &Place, ledger: &Ledger, entry: &Entry, paper: Paper) -> Result<Kept, NotKept> {
    let json = ledger.object(entry, "record")?;
    let record = record::from_bytes(&json)
        .map_err(|e| NotKept::Other(format!("the archived record is no record: {e}")))?;
    let paths = Paths::of(&place.certificates, &record.record);
    let known = certificates_of(ledger, &record.record)?;
    let has_json = on_disk(&paths.json, |bytes| bytes == json)?;
    let has_pdf = on_disk(&paths.pdf, |bytes| {
        known.contains(&sha256_hex(certificate::as_issued(bytes)))
    })?;
    let mut warnings = Vec::new();
    let written = if has_json && has_pdf {
        Ok(())
    } else {
        remove_leftovers(&paths.pdf);
        remove_leftovers(&paths.json);
        restore(place, entry.index, has_pdf, paper).and_then(|document| {
            let document = document.map(|d| {
                warnings = d.warnings;
                d.pdf
            });
            write(&paths, document.as_deref(), &json)
        })
    };
    Ok(Kept {
        record,
        paths,
        made: None,
        unwritten: written.err(),
        warnings,
    })
}

/// Whether the file is there; one that is not what it should be is not touched.
fn on_disk(path: &Path, right: impl Fn(&[u8]) -> bool) -> Result<bool, NotKept> {
    // A pipe in the place of a file would be waited for.
    if fs::symlink_metadata(path).is_ok_and(|kind| !kind.is_file()) {
        return Err(NotKept::Changed(path.to_owned()));
    }
    match fs::read(path) {
        Ok(bytes) if right(&bytes) => Ok(true),
        Ok(_) => Err(NotKept::Changed(path.to_owned())),
        Err(e) if e.kind() == ErrorKind::NotFound => Ok(false),
        Err(e) => Err(NotKept::Other(format!(
            "{}: cannot be read: {e}",
            path.display()
        ))),
    }
}

/// The PDF of a record that is in the ledger, where it is needed: as it was issued, if it was.
fn restore(
    place: &Place,
    index: u64,
    has_pdf: bool,
    paper: Paper,
) -> Result<Option<Document>, String> {
    if has_pdf {
        return Ok(None);
    }
    let mut ledger = place.open().map_err(unissued)?;
    let recorded = ledger.entry(index).map_err(unissued)?;
    let (sources, made) = drawn_again(&ledger, &recorded.entry)?;
    let papers = [paper, Paper::A4, Paper::Letter];
    issue(place, &mut ledger, &recorded, &sources, &made, &papers).map(Some)
}

/// The archived record, which another version of the program may have made, with curves from its
/// archived files.
fn drawn_again(ledger: &Ledger, entry: &Entry) -> Result<(Sources, Made), String> {
    let (sources, mut made) = evidence::remake(ledger, entry).map_err(|e| e.to_string())?;
    let json = ledger.object(entry, "record").map_err(|e| e.to_string())?;
    made.record =
        record::from_bytes(&json).map_err(|e| format!("the archived record is no record: {e}"))?;
    Ok((sources, made))
}

/// The certificate on the paper on which it was issued already, else on the first; it is known to
/// the ledger before it is anywhere else.
fn issue(
    place: &Place,
    ledger: &mut Ledger,
    recorded: &Recorded,
    sources: &Sources,
    made: &Made,
    papers: &[Paper],
) -> Result<Document, String> {
    let proof = recorded.proof_text();
    let in_ledger = InLedger {
        index: recorded.entry.index,
        proof: &proof,
        copy: None,
    };
    let known = certificates_of(ledger, &made.record.record).map_err(unissued)?;
    let signer = place.signer.as_ref();
    let forms: Vec<(Paper, Option<&Signer>)> = match (papers.first(), known.is_empty()) {
        (Some(paper), true) => vec![(*paper, signer)],
        // It was issued before: on which paper, and with a signature or without, is found out.
        _ => papers
            .iter()
            .flat_map(|paper| [(*paper, signer), (*paper, None)])
            .collect(),
    };
    let mut first = None;
    for (paper, signer) in forms {
        let drawn = draw(sources, made, in_ledger, paper, signer)?;
        if known.contains(&sha256_hex(&drawn.pdf)) {
            return drawn.signed(signer, time_of(&made.record, place));
        }
        first.get_or_insert((drawn, signer));
    }
    let (drawn, signer) = first.ok_or("no paper to draw on")?;
    let unsigned = drawn.pdf.clone();
    // Signed first: what cannot be signed is not issued.
    let document = drawn.signed(signer, time_of(&made.record, place))?;
    let by = place.by(made.record.lot.operator.as_deref());
    ledger
        .issued(&made.record.record, &unsigned, &by)
        .map_err(unissued)?;
    Ok(document)
}

/// When a record was issued.
fn time_of(record: &LotRecord, place: &Place) -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339(&record.issued).unwrap_or(place.now)
}

/// A PDF lot record with what it could not show as it is.
pub struct Document {
    #[allow(missing_docs)]
    pub pdf: Vec<u8>,
    #[allow(missing_docs)]
    pub warnings: Vec<String>,
}

impl Document {
    /// With a signature behind it, where someone signs.
    fn signed(self, signer: Option<&Signer>, time: DateTime<FixedOffset>) -> Result<Self, String> {
        let Some(signer) = signer else {
            return Ok(self);
        };
        signer.valid_at(time).map_err(|e| e.to_string())?;
        let pdf = certificate::sign(self.pdf, signer, time).map_err(|e| e.to_string())?;
        Ok(Document { pdf, ..self })
    }
}

/// The record stands; what is missing is the entry of its certificate.
fn unissued(error: LedgerError) -> String {
    format!("its PDF was not entered in the ledger: {error}")
}

/// Makes the certificate of a record again, marked as a copy and with the ledger's newest
/// checkpoint; its path.
///
/// # Errors
/// In words. Nothing is written that the ledger does not know.
pub fn reissue(
    place: &Place,
    record: &str,
    by: Option<&str>,
    reason: &str,
) -> Result<(PathBuf, Option<String>), String> {
    let text = |e: LedgerError| e.to_string();
    let mut ledger = place.open().map_err(text)?;
    let entry = judged(&ledger, record).map_err(text)?;
    let copies = ledger
        .find(Query::Record(record))
        .map_err(text)?
        .iter()
        .filter(|entry| matches!(entry.act, Act::Reissue { .. }))
        .count();
    let number = copies + 1;
    let (sources, made) = drawn_again(&ledger, &entry)?;
    let paper = issued_paper(place, &ledger, &entry, &sources, &made)?;
    let size = ledger.size().map_err(text)?;
    let proof = Proof {
        index: entry.index,
        hashes: ledger.inclusion_proof(entry.index, size).map_err(text)?,
        checkpoint: ledger.head().map_err(text)?.unwrap_or_default(),
    };
    let copy = format!("{number}, made on {}", place.now.to_rfc3339());
    let in_ledger = InLedger {
        index: entry.index,
        proof: &proof.text(),
        copy: Some(&copy),
    };
    let signer = place.signer.as_ref();
    let drawn = draw(&sources, &made, in_ledger, paper, signer)?;
    let unsigned = drawn.pdf.clone();
    let pdf = drawn.signed(signer, place.now)?.pdf;
    ledger
        .reissued(record, &unsigned, reason, &place.by(by))
        .map_err(text)?;
    let told = place.tell_witness(&ledger);
    let path = place
        .certificates
        .join(format!("{record}.copy-{number}.pdf"));
    write_whole(&path, &pdf).map_err(|e| {
        format!(
            "recorded, but {}: could not be written: {e}",
            path.display()
        )
    })?;
    Ok((path, told.err()))
}

/// The paper on which the original was issued.
fn issued_paper(
    place: &Place,
    ledger: &Ledger,
    entry: &Entry,
    sources: &Sources,
    made: &Made,
) -> Result<Paper, String> {
    let recorded = ledger.entry(entry.index).map_err(|e| e.to_string())?;
    let proof = recorded.proof_text();
    let in_ledger = InLedger {
        index: entry.index,
        proof: &proof,
        copy: None,
    };
    let known = certificates_of(ledger, &made.record.record).map_err(|e| e.to_string())?;
    for signer in [place.signer.as_ref(), None] {
        let letter = draw(sources, made, in_ledger, Paper::Letter, signer)?;
        if known.contains(&sha256_hex(&letter.pdf)) {
            return Ok(Paper::Letter);
        }
    }
    Ok(Paper::A4)
}

/// The entry by which a record was made.
///
/// # Errors
/// A ledger without such a record.
pub fn judged(ledger: &Ledger, record: &str) -> Result<Entry, LedgerError> {
    ledger
        .find(Query::Record(record))?
        .into_iter()
        .find(|entry| matches!(entry.act, Act::Judged { .. }))
        .ok_or_else(|| LedgerError::Refused(format!("the ledger has no record {record:?}")))
}

/// Digests of the certificates of a record that the ledger knows.
pub fn certificates_of(ledger: &Ledger, record: &str) -> Result<BTreeSet<String>, LedgerError> {
    let entries = ledger.find(Query::Record(record))?;
    Ok(entries
        .into_iter()
        .filter_map(|entry| match entry.act {
            Act::Issue { certificate, .. } | Act::Reissue { certificate, .. } => Some(certificate),
            _ => None,
        })
        .collect())
}

/// The PDF lot record, not signed yet, but naming who signs it.
pub fn draw(
    sources: &Sources,
    made: &Made,
    ledger: InLedger,
    paper: Paper,
    signer: Option<&Signer>,
) -> Result<Document, String> {
    let curves: Vec<Curve> = made
        .curves
        .iter()
        .map(|c| Curve {
            part: c.part.clone(),
            verdict: c.verdict,
            frequency: c.sweep.frequency.clone(),
            impedance: c.sweep.impedance.clone(),
        })
        .collect();
    let texts = certificate::Sources {
        limit_file: std::str::from_utf8(&sources.limits.bytes).ok(),
        station_file: std::str::from_utf8(&sources.station.bytes).ok(),
        ledger: Some(ledger),
        signature: signer.map(Signer::signatory),
    };
    certificate::render(&made.record, &curves, &texts, paper)
        .map(|made| Document {
            pdf: made.pdf,
            warnings: made.warnings.into_iter().map(|note| note.text).collect(),
        })
        .map_err(|e| format!("the PDF lot record could not be made: {e}"))
}

fn write(paths: &Paths, pdf: Option<&[u8]>, json: &[u8]) -> Result<(), String> {
    for (path, bytes) in [(&paths.pdf, pdf), (&paths.json, Some(json))] {
        if let Some(bytes) = bytes {
            write_whole(path, bytes)
                .map_err(|e| format!("{}: could not be written: {e}", path.display()))?;
        }
    }
    Ok(())
}
