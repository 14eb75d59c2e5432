//! Every record judged again from the archived bytes, and compared byte for byte.

use super::Outcome;
use crate::commands::evidence::remake_digested;
use crate::diagnostic::excerpt;
use crate::ledger::{Act, Entry, Ledger};
use crate::record::{LotRecord, from_bytes, to_bytes};

pub fn judge_all(ledger: &Ledger, entries: &[Entry], outcome: &mut Outcome) {
    for entry in entries {
        if !matches!(entry.act, Act::Judged { .. }) {
            continue;
        }
        outcome.records += 1;
        let place = format!("record {}", entry.act.record().unwrap_or("?"));
        match judge(ledger, entry) {
            Ok(()) => outcome.judged_again += 1,
            Err((code, text)) => outcome.wrong(code, &place, Some(entry.index), text),
        }
    }
}

fn judge(ledger: &Ledger, entry: &Entry) -> Result<(), (&'static str, String)> {
    let impossible = |text: String| ("record_not_judged_again", text);
    let archived = ledger
        .object(entry, "record")
        .map_err(|e| impossible(e.to_string()))?;
    let record = from_bytes(&archived)
        .map_err(|e| impossible(format!("the archived record is no lot record ({e})")))?;
    let (_, made, digest) =
        remake_digested(ledger, entry).map_err(|e| impossible(e.to_string()))?;
    if let Some(what) = contradiction(entry, &record, &digest) {
        return Err((
            "entry_contradicts_record",
            format!("the entry says another {what}"),
        ));
    }
    let mut again = made.record;
    let other = again.program != record.program;
    if other {
        // The name of a record holds the version of the program that made it.
        again.program = record.program.clone();
        again.record = record.record.clone();
    }
    let bytes = to_bytes(&again).map_err(|e| impossible(e.to_string()))?;
    if bytes == archived {
        return Ok(());
    }
    let difference = difference(&archived, &bytes);
    if other {
        let version = &record.program.version;
        let text = format!(
            "made by version {version}, and comes out otherwise here: verify it with that version; {difference}"
        );
        return Err(("record_of_other_version", text));
    }
    let text = format!("the archived files do not give the archived record; {difference}");
    Err(("record_not_reproduced", text))
}

/// What the entry says otherwise than the record that it names.
fn contradiction(entry: &Entry, made: &LotRecord, digest: &str) -> Option<&'static str> {
    let Act::Judged {
        record,
        inputs,
        lot,
        part,
        supplier,
        verdict,
        ..
    } = &entry.act
    else {
        return Some("act");
    };
    let pairs = [
        ("record", *record == made.record),
        ("lot", *lot == made.lot.lot),
        ("part", *part == made.lot.part),
        ("supplier", *supplier == made.lot.supplier),
        ("verdict", verdict == made.verdict.name()),
        ("time", entry.time == made.issued),
        ("digest of its files", inputs == digest),
    ];
    pairs
        .into_iter()
        .find(|(_, same)| !same)
        .map(|(what, _)| what)
}

/// The first line that differs.
fn difference(archived: &[u8], again: &[u8]) -> String {
    let (archived, again) = (
        String::from_utf8_lossy(archived),
        String::from_utf8_lossy(again),
    );
    let mut pairs = archived.lines().zip(again.lines()).enumerate();
    match pairs.find(|(_, (a, b))| a != b) {
        Some((n, (a, b))) => format!(
            "line {} of the record is `{}`, judged again `{}`",
            n + 1,
            excerpt(a.trim()),
            excerpt(b.trim())
        ),
        None => "one of them goes on longer".to_owned(),
    }
}
