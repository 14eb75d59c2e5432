//! The acts: what is appended to the ledger, and what is refused.

use super::*;
use crate::record::LotVerdict;
use crate::statistics::sampling::Severity;
use store::Decided;

impl Ledger {
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
        let holds = |_: &dyn Reader| Ok(true);
        self.judged_while(record, record_json, inputs, objects, made, &holds)
    }

    /// The same for a record that says something about other entries: `holds` looks, when no other
    /// process can append any more, whether that is still so.
    ///
    /// # Errors
    /// [`LedgerError::Overtaken`] where it is not, besides those of [`Ledger::judged`].
    pub fn judged_while(
        &mut self,
        record: &LotRecord,
        record_json: &[u8],
        inputs: &str,
        objects: &[Object],
        made: &Made,
        holds: &dyn Fn(&dyn Reader) -> Result<bool, LedgerError>,
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
            if !holds(reader)? {
                return Err(LedgerError::Overtaken);
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

    /// Records the severity of inspection that a person sets. `class` is `None` for every class.
    /// `allowed` looks, when no other process can append any more, whether it can be set as things are.
    ///
    /// # Errors
    /// Besides those of the store and of `allowed`: no reason, nobody named.
    pub fn set_severity(
        &mut self,
        act: &SetSeverity,
        made: &Made,
        allowed: &dyn Fn(&dyn Reader) -> Result<(), LedgerError>,
    ) -> Result<Recorded, LedgerError> {
        need(made.by.unwrap_or(""), "a severity that is set says by whom")?;
        need(act.reason, "a severity that is set says why")?;
        let new = Act::Severity {
            part: act.part.to_owned(),
            supplier: act.supplier.map(str::to_owned),
            class: act.class.map(str::to_owned),
            severity: act.severity,
            reason: act.reason.to_owned(),
        };
        self.append(&[], made, &|reader| {
            let query = Query::PartSupplier {
                part: act.part,
                supplier: act.supplier,
            };
            let last = reader.find(query)?.last().copied();
            let chosen = repeat_or_new(reader, last.as_slice(), &new, made.by)?;
            if matches!(chosen, Chosen::Act(_)) {
                allowed(reader)?;
            }
            Ok(chosen)
        })
    }

    /// Records an approval of a limit, station or site file, or that one is taken back: `note` is the
    /// signed statement, `verifier` the key that the site trusts, `with` the files that belong to the
    /// file.
    ///
    /// # Errors
    /// A note that does not verify, or that is not about these bytes under this name for this ledger;
    /// [`LedgerError::Overtaken`] where another statement about the file was entered meanwhile.
    pub fn approve(
        &mut self,
        file: &Object,
        with: &[Object],
        note: &str,
        verifier: &Verifier,
        made: &Made,
    ) -> Result<Recorded, LedgerError> {
        let statement = approval::Statement::open(note, verifier)
            .map_err(|e| LedgerError::Refused(format!("{}: not approved: {e}", file.name)))?;
        let belonging: Vec<(String, String)> = with
            .iter()
            .map(|o| (sha256_hex(o.bytes), o.name.to_owned()))
            .collect();
        if !statement.approves(self.verifier.name(), file.name, file.bytes)
            || statement.kind.role() != file.role
            || statement.with != belonging
        {
            return Err(LedgerError::Refused(format!(
                "{}: the approval is of another file, of other bytes, or for another ledger",
                file.name
            )));
        }
        let (name, entries) = (file.name.to_owned(), statement.entries);
        let act = match statement.withdraws {
            false => Act::Approval {
                file: name.clone(),
                revision: statement.revision,
                sha256: statement.sha256,
                statement: note.to_owned(),
            },
            true => Act::Withdrawal {
                file: name.clone(),
                sha256: statement.sha256,
                reason: statement.meaning,
                statement: note.to_owned(),
            },
        };
        let objects: Vec<Object> = std::iter::once(*file).chain(with.iter().copied()).collect();
        self.append(&objects, made, &|reader| {
            let mut earlier = reader.find(Query::Kind("approval"))?;
            earlier.extend(reader.find(Query::Kind("withdrawal"))?);
            let chosen = repeat_or_new(reader, &earlier, &act, made.by)?;
            if matches!(chosen, Chosen::Act(_)) {
                if entries > reader.size()? {
                    return Err(LedgerError::Refused(format!(
                        "{name}: the approval was signed for a longer ledger"
                    )));
                }
                earlier.retain(|index| *index >= entries);
                for index in earlier {
                    if statement_of(reader, index)?.is_some_and(|file| file == name) {
                        return Err(LedgerError::Overtaken);
                    }
                }
            }
            Ok(chosen)
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

/// A severity to be set.
#[derive(Debug, Clone, Copy)]
#[allow(missing_docs)]
pub struct SetSeverity<'a> {
    pub part: &'a str,
    pub supplier: Option<&'a str>,
    pub class: Option<&'a str>,
    pub severity: Severity,
    pub reason: &'a str,
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

/// The file that an entry makes a statement about.
fn statement_of(reader: &dyn Reader, index: u64) -> Result<Option<String>, LedgerError> {
    let Some(row) = reader.row(index)? else {
        return Ok(None);
    };
    Ok(match Entry::read(index, &row.body)?.act {
        Act::Approval { file, .. } | Act::Withdrawal { file, .. } => Some(file),
        _ => None,
    })
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
