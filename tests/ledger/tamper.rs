//! Whatever is changed is found, and named.

use crate::support::*;
use reelgate::ledger::{Anchor, Claim, Ledger, LedgerError, Report, Row, sha256_hex, verify};
use rusqlite::{Connection, params};
use std::path::{Path, PathBuf};

struct Site {
    _folder: tempfile::TempDir,
    records: PathBuf,
    checkpoints: Vec<String>,
}

fn prepared() -> Site {
    let folder = scratch();
    let records = folder.path().join("records");
    let checkpoints = site(&records);
    Site {
        _folder: folder,
        records,
        checkpoints,
    }
}

fn database(records: &Path) -> PathBuf {
    records.join(reelgate::ledger::FILE)
}

/// Somebody with another tool: takes the triggers off, does it, and puts the triggers back.
fn tamper(records: &Path, work: impl FnOnce(&Connection)) {
    let connection = Connection::open(database(records)).expect("a database");
    connection
        .pragma_update(None, "foreign_keys", "OFF")
        .expect("set");
    let triggers: Vec<(String, String)> = connection
        .prepare("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'")
        .expect("a statement")
        .query_map([], |row| Ok((row.get(0)?, row.get(1)?)))
        .expect("rows")
        .collect::<Result<_, _>>()
        .expect("triggers");
    for (name, _) in &triggers {
        connection
            .execute(&format!("DROP TRIGGER {name}"), [])
            .expect("dropped");
    }
    work(&connection);
    for (_, sql) in &triggers {
        connection.execute(sql, []).expect("put back");
    }
}

fn execute(records: &Path, sql: &str) {
    tamper(records, |connection| {
        connection.execute(sql, []).expect("changed");
    });
}

/// The findings that name an entry, as code and entry.
fn named(report: &Report) -> Vec<(&'static str, Option<u64>)> {
    report.findings.iter().map(|f| (f.code, f.since)).collect()
}

#[test]
fn nothing_changed_is_no_alarm() {
    let site = prepared();
    tamper(&site.records, |_| {});
    Connection::open(database(&site.records))
        .expect("a database")
        .execute("VACUUM", [])
        .expect("vacuumed");
    let anchors: Vec<Anchor> = site.checkpoints.iter().map(|c| anchor("kept", c)).collect();
    let report = report(&site.records, &anchors);
    assert!(report.proven(), "{report:?}");
    assert_eq!(report.anchors, 8);
    assert!(report.reach().contains("8 of 8"));
}

#[test]
fn without_an_anchor_the_report_says_what_it_cannot_exclude() {
    let site = prepared();
    let report = report(&site.records, &[]);
    assert!(report.proven());
    assert!(
        report.reach().contains("cannot be excluded"),
        "{}",
        report.reach()
    );
}

/// One character of each column of each row, at places spread over it.
#[test]
fn a_changed_row_is_found_and_named() {
    let site = prepared();
    for index in 0..8_u64 {
        for column in ["body", "peaks", "checkpoint"] {
            for share in [0.0, 0.11, 0.35, 0.5, 0.77, 0.98, 1.0] {
                let folder = scratch();
                let records = folder.path().join("records");
                copy(&site.records, &records);
                let mut valid = true;
                tamper(&records, |connection| {
                    let sql =
                        format!("SELECT CAST({column} AS BLOB) FROM entry WHERE position = ?1");
                    let mut value: Vec<u8> = connection
                        .query_row(&sql, [index as i64], |r| r.get(0))
                        .expect("a value");
                    let place = ((value.len() - 1) as f64 * share) as usize;
                    value[place] ^= 1;
                    let kind = if column == "peaks" { "BLOB" } else { "TEXT" };
                    let sql = format!(
                        "UPDATE entry SET {column} = CAST(?1 AS {kind}) WHERE position = ?2"
                    );
                    // A body that is no JSON is refused by the table itself.
                    valid = connection
                        .execute(&sql, params![value, index as i64])
                        .is_ok();
                });
                if !valid {
                    continue;
                }
                let report = report(&records, &[]);
                let found = named(&report);
                let place = format!("{column} of {index} at {share}: {report:?}");
                assert!(!found.is_empty(), "{place}");
                assert!(
                    found.iter().all(|(_, since)| *since == Some(index)),
                    "{place}"
                );
            }
        }
    }
}

#[test]
fn a_row_removed_from_the_middle_is_found() {
    for index in 0..7_u64 {
        let site = prepared();
        execute(
            &site.records,
            &format!("DELETE FROM object WHERE position = {index}"),
        );
        execute(
            &site.records,
            &format!("DELETE FROM entry WHERE position = {index}"),
        );
        let report = report(&site.records, &[]);
        assert!(
            named(&report).contains(&("entry_missing", Some(index))),
            "{report:?}"
        );
        let alarms = named(&report)
            .into_iter()
            .filter(|(code, _)| *code == "entry_changed");
        assert_eq!(alarms.count(), 0, "{report:?}");
    }
}

#[test]
fn rows_removed_and_closed_up_are_found() {
    let site = prepared();
    tamper(&site.records, |connection| {
        for sql in [
            "DELETE FROM object WHERE position = 3",
            "DELETE FROM entry WHERE position = 3",
            "UPDATE entry SET position = position - 1 WHERE position > 3",
            "UPDATE object SET position = position - 1 WHERE position > 3",
        ] {
            connection.execute(sql, []).expect("changed");
        }
    });
    let report = report(&site.records, &[]);
    assert_eq!(report.findings[0].since, Some(3), "{report:?}");
}

#[test]
fn rows_exchanged_are_found() {
    let site = prepared();
    tamper(&site.records, |connection| {
        for sql in [
            "UPDATE entry SET position = 100 WHERE position = 1",
            "UPDATE entry SET position = 1 WHERE position = 2",
            "UPDATE entry SET position = 2 WHERE position = 100",
        ] {
            connection.execute(sql, []).expect("changed");
        }
    });
    assert_eq!(report(&site.records, &[]).findings[0].since, Some(1));
}

#[test]
fn a_row_added_by_hand_is_found() {
    let site = prepared();
    execute(
        &site.records,
        "INSERT INTO entry (position, body, peaks, checkpoint) \
         SELECT 8, replace(body, '\"index\":3', '\"index\":8'), peaks, checkpoint FROM entry WHERE position = 3",
    );
    let report = report(&site.records, &[]);
    assert!(
        named(&report).iter().all(|(_, since)| *since == Some(8)) && !report.proven(),
        "{report:?}"
    );
}

/// Every number of rows removed from the end: invisible without an anchor, found with one.
#[test]
fn rows_removed_from_the_end_are_found_by_an_anchor() {
    for kept in 1..8_u64 {
        let site = prepared();
        execute(
            &site.records,
            &format!("DELETE FROM object WHERE position >= {kept}"),
        );
        execute(
            &site.records,
            &format!("DELETE FROM entry WHERE position >= {kept}"),
        );
        let without = report(&site.records, &[]);
        assert!(
            without.proven() && without.reach().contains("cannot be excluded"),
            "{without:?}"
        );
        for seen in kept + 1..=8 {
            let note = &site.checkpoints[seen as usize - 1];
            let with = report(&site.records, &[anchor("certificate", note)]);
            assert_eq!(named(&with), [("ledger_truncated", Some(kept))]);
            let ledger = Ledger::open(&site.records).expect("a ledger");
            assert!(matches!(
                ledger.continues(note),
                Err(LedgerError::Damaged { .. })
            ));
        }
        let ledger = Ledger::open(&site.records).expect("a ledger");
        assert!(
            ledger
                .continues(&site.checkpoints[kept as usize - 1])
                .is_ok()
        );
    }
}

#[test]
fn an_older_copy_put_back_is_found_by_a_newer_certificate() {
    let site = prepared();
    let older = site.records.with_file_name("older");
    copy(&site.records, &older);
    let newer = judge(&mut open(&site.records), "26K-0005", "accept", "", 9).expect("an entry");
    std::fs::copy(database(&older), database(&site.records)).expect("put back");
    let report = report(&site.records, &[anchor("certificate", &newer.checkpoint)]);
    assert_eq!(named(&report), [("ledger_truncated", Some(8))]);
    assert!(
        report
            .remarks
            .iter()
            .any(|r| r.contains("no entry names it")),
        "{report:?}"
    );
}

/// Somebody with the ledger's key writes another history: whole in itself, but not what was seen.
#[test]
fn a_history_rewritten_with_the_key_is_found_by_an_anchor() {
    let site = prepared();
    let folder = scratch();
    let records = folder.path().join("records");
    let mut ledger = open(&records);
    judge(&mut ledger, "26K-0001", "accept", "", 1).expect("an entry");
    judge(&mut ledger, "26K-0002", "accept", "", 2).expect("an entry");
    for k in 3..12 {
        judge(&mut ledger, &format!("26K-{k:04}"), "hold", "", k).expect("an entry");
    }
    drop(ledger);
    assert!(report(&records, &[]).proven());
    for (k, note) in site.checkpoints.iter().enumerate() {
        let found = named(&report(&records, &[anchor("certificate", note)]));
        if k == 0 {
            assert_eq!(found, [], "the first entry is the same in both");
        } else {
            assert_eq!(found[0].0, "history_rewritten");
        }
    }
}

#[test]
fn an_anchor_of_another_ledger_is_named() {
    let site = prepared();
    let other = reelgate::ledger::Signer::new("other.example/ledger", &[7; 32]).expect("a signer");
    let head = reelgate::ledger::Checkpoint {
        origin: "other.example/ledger".to_owned(),
        size: 1,
        root: [0; 32],
    };
    let notes = [
        head.sign(&other).expect("a note"),
        head.sign(&signer()).expect("a note"),
        site.checkpoints[0].replace('\u{2014}', "-"),
        String::new(),
    ];
    for note in &notes {
        let report = report(&site.records, &[anchor("certificate", note)]);
        assert_eq!(named(&report), [("anchor_invalid", None)], "{note}");
        assert_eq!(report.anchors, 0);
    }
}

#[test]
fn a_certificate_must_be_of_its_entry() {
    let site = prepared();
    let json = serde_json::to_vec(&record("26K-0002", "reject")).expect("JSON");
    let (sha256, record) = (sha256_hex(&json), "26K-0002-0123456789ab");
    let good = Claim {
        index: 1,
        record,
        sha256: &sha256,
    };
    let other = sha256_hex(b"other");
    let check = |claim| {
        let anchor = Anchor {
            name: "x.pdf",
            checkpoint: &site.checkpoints[1],
            claim: Some(claim),
        };
        codes(&report(&site.records, &[anchor]))
    };
    assert_eq!(check(good), [""; 0]);
    for bad in [
        Claim { index: 0, ..good },
        Claim { index: 2, ..good },
        Claim {
            index: u64::MAX,
            ..good
        },
        Claim {
            record: "26K-0001-0123456789ab",
            ..good
        },
        Claim {
            sha256: &other,
            ..good
        },
    ] {
        assert_eq!(check(bad), ["certificate_differs"], "{bad:?}");
    }
}

/// Each object of the archive: a byte changed, the file emptied, removed, exchanged for another.
#[test]
fn a_changed_object_is_found_with_the_entry_since_which() {
    let site = prepared();
    let ledger = Ledger::open(&site.records).expect("a ledger");
    let mut first = std::collections::BTreeMap::new();
    for entry in ledger.entries().expect("entries") {
        for object in &entry.objects {
            first.entry(object.sha256.clone()).or_insert(entry.index);
        }
    }
    assert!(first.len() >= 13, "{} objects", first.len());
    let names: Vec<String> = first.keys().cloned().collect();
    for (k, (name, index)) in first.iter().enumerate() {
        let path = ledger.archive().path(name);
        let good = std::fs::read(&path).expect("bytes");
        let other =
            std::fs::read(ledger.archive().path(&names[(k + 1) % names.len()])).expect("bytes");
        let expect = |code: &str| {
            let report = report(&site.records, &[]);
            assert_eq!(named(&report).len(), 1, "{report:?}");
            assert_eq!(
                (report.findings[0].code, report.findings[0].since),
                (code, Some(*index))
            );
            assert!(report.findings[0].place.contains(name.as_str()));
        };
        for place in [0, 9, 12, 20, good.len() / 2, good.len() - 1] {
            let mut bad = good.clone();
            bad[place] ^= 0x10;
            std::fs::write(&path, &bad).expect("written");
            expect("object_damaged");
        }
        for bad in [&b""[..], &other, &[0x1f, 0x8b]] {
            std::fs::write(&path, bad).expect("written");
            expect("object_damaged");
        }
        std::fs::remove_file(&path).expect("removed");
        expect("object_missing");
        std::fs::write(&path, &good).expect("written");
    }
    assert!(report(&site.records, &[]).proven());
}

#[test]
fn the_table_of_objects_is_compared_with_the_entries() {
    for sql in [
        "DELETE FROM object WHERE position = 2 AND ordinal = 1",
        "UPDATE object SET name = 'sweeps/002.csv' WHERE position = 2 AND ordinal = 3",
        "UPDATE object SET bytes = bytes + 1 WHERE position = 2 AND ordinal = 0",
        "INSERT INTO object SELECT 2, 9, role, name, sha256, bytes FROM object WHERE position = 1 AND ordinal = 3",
    ] {
        let site = prepared();
        execute(&site.records, sql);
        assert_eq!(
            named(&report(&site.records, &[])),
            [("objects_differ", Some(2))],
            "{sql}"
        );
    }
}

#[test]
fn a_changed_schema_is_found() {
    for sql in [
        "DROP TRIGGER entry_no_delete",
        "DROP INDEX entry_lot",
        "CREATE VIEW lots AS SELECT 1",
        "CREATE TRIGGER t AFTER INSERT ON entry BEGIN SELECT 1; END",
        "CREATE TABLE extra (x)",
        "ALTER TABLE entry ADD COLUMN y TEXT",
    ] {
        let site = prepared();
        let connection = Connection::open(database(&site.records)).expect("a database");
        connection.execute(sql, []).expect("changed");
        drop(connection);
        let found = codes(&report(&site.records, &[]));
        assert!(
            !found.is_empty() && found.iter().all(|code| *code == "database_damaged"),
            "{sql}: {found:?}"
        );
    }
}

#[test]
fn the_public_key_exchanged_is_found() {
    let site = prepared();
    tamper(&site.records, |connection| {
        let other = engineer().verifier().public();
        connection
            .execute("UPDATE identity SET public_key = ?1", [other])
            .expect("changed");
    });
    let report = report(
        &site.records,
        &[anchor("certificate", &site.checkpoints[0])],
    );
    let found = codes(&report);
    assert_eq!(
        found
            .iter()
            .filter(|code| **code == "checkpoint_damaged")
            .count(),
        8,
        "{report:?}"
    );
    assert!(found.contains(&"anchor_invalid"));
}

/// Everything that a reader sees of a ledger.
fn content(records: &Path) -> Result<Vec<Row>, LedgerError> {
    let ledger = Ledger::open(records)?;
    let mut rows = Vec::new();
    ledger.store().each(0, &mut |row| {
        rows.push(row?);
        Ok(())
    })?;
    Ok(rows)
}

/// Bits of the database file at places spread over all of it: where a reader sees something else
/// than before, verification must say so.
#[test]
fn a_bit_changed_in_the_file_is_found_or_changes_nothing() {
    let site = prepared();
    let path = database(&site.records);
    let good = std::fs::read(&path).expect("bytes");
    let before = content(&site.records).expect("rows");
    let (mut changed, mut seen) = (0, 0);
    let count = 1500_usize;
    for k in 0..count {
        let place = k * good.len() / count + k % 7;
        let mut bad = good.clone();
        let Some(byte) = bad.get_mut(place) else {
            continue;
        };
        *byte ^= 1 << (k % 8);
        std::fs::write(&path, &bad).expect("written");
        let differs = content(&site.records).ok().as_ref() != Some(&before);
        let found = Ledger::open(&site.records).and_then(|ledger| verify(&ledger, &[]));
        let alarm = found.as_ref().map_or(true, |report| !report.proven());
        changed += usize::from(differs);
        seen += usize::from(alarm);
        assert!(
            alarm || !differs,
            "byte {place}, bit {}: changed unseen",
            k % 8
        );
    }
    assert!(
        changed > count / 10 && seen >= changed,
        "{changed} changed, {seen} seen"
    );
}
