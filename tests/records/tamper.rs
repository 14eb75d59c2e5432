//! What is changed behind the program's back is found and named.

use crate::site::{Site, copy, run};
use reelgate::ledger::{Ledger, Made, Object, ObjectRef, Query, Signer, inputs_digest};
use reelgate::record::{self, LotRecord, LotVerdict};
use rusqlite::Connection;
use std::fs;
use std::path::{Path, PathBuf};

/// Asserts that among the findings is one of the code whose place or words hold a text.
fn found(wrong: &[(String, String)], code: &str, words: &str) {
    let hit = wrong
        .iter()
        .any(|(c, text)| c == code && text.contains(words));
    assert!(hit, "no {code} with {words:?} in {wrong:#?}");
}

/// Changes one byte in the middle of a file.
fn flip(path: &Path) {
    let mut bytes = fs::read(path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    let middle = bytes.len() / 2;
    bytes[middle] ^= 1;
    fs::write(path, bytes).expect("a change");
}

/// Where an object of the only judged entry lies.
fn object(site: &Site, role: &str) -> PathBuf {
    let ledger = Ledger::open(&site.file("records")).expect("a ledger");
    let entry = ledger
        .find(Query::Kind("judged"))
        .expect("entries")
        .remove(0);
    let digest = entry
        .objects_of(role)
        .next()
        .expect("an object")
        .sha256
        .clone();
    ledger.archive().path(&digest)
}

#[test]
fn a_changed_object_of_each_role_is_found_and_named() {
    let site = Site::new();
    site.judge("26K-0001");
    for (role, name) in [
        ("record", "26K-0001-"),
        ("lot", "lot.yaml"),
        ("label", "label"),
        ("limits", "limits/parts/RG-0475-X7R.yaml"),
        ("station", "limits/stations/"),
        ("sweep", "sweeps/001.csv"),
    ] {
        let path = object(&site, role);
        let before = fs::read(&path).expect("an object");
        flip(&path);
        let wrong = site.wrong(&[]);
        found(&wrong, "object_damaged", &format!("{role} {name}"));
        fs::remove_file(&path).expect("gone");
        found(
            &site.wrong(&[]),
            "object_missing",
            &format!("{role} {name}"),
        );
        fs::write(&path, before).expect("put back");
    }
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
}

#[test]
fn changed_files_beside_the_ledger_are_found() {
    let site = Site::new();
    let record = site.judge("26K-0001");
    let (pdf, json) = (
        site.certificate(&record, "pdf"),
        site.certificate(&record, "json"),
    );
    let bytes = fs::read(&pdf).expect("a PDF");
    flip(&pdf);
    let wrong = site.wrong(&[]);
    assert!(
        wrong
            .iter()
            .any(|(code, text)| code.starts_with("certificate_un") && text.contains(".pdf")),
        "{wrong:?}"
    );
    // Another document than the ledger's is not replaced unseen.
    let (status, _, err) = run(&site, &["judge", "lots/26K-0001"]);
    assert_eq!(status, Some(2));
    assert!(err.contains("was changed after it was issued"), "{err}");
    // Bytes after the end are a change too.
    fs::write(&pdf, [&bytes[..], b"\n"].concat()).expect("a change");
    found(
        &site.wrong(&[]),
        "certificate_unknown",
        "changed after it was issued",
    );
    let elsewhere = site.file("mailed.pdf");
    fs::rename(&pdf, &elsewhere).expect("moved");
    let path = elsewhere.to_str().expect("a path");
    found(&site.wrong(&[path]), "certificate_unknown", "mailed.pdf");
    fs::write(&elsewhere, b"no PDF").expect("a change");
    found(&site.wrong(&[path]), "certificate_unreadable", "mailed.pdf");
    fs::write(&pdf, bytes).expect("put back");

    let text = fs::read_to_string(&json).expect("a record");
    fs::write(&json, text.replace("\"hold\"", "\"accept\"")).expect("a change");
    found(&site.wrong(&[]), "record_changed", ".json");
    fs::write(&json, text).expect("put back");
    fs::copy(&json, json.with_file_name("26K-0002-0123456789ab.json")).expect("a forgery");
    found(&site.wrong(&[]), "record_unknown", "26K-0002-0123456789ab");
}

/// Changes the database as its owner can: triggers off, then a statement.
fn alter(site: &Site, statement: &str) {
    let database = Connection::open(site.file("records/ledger.sqlite")).expect("a database");
    let triggers: Vec<(String, String)> = database
        .prepare("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'")
        .and_then(|mut query| {
            query
                .query_map([], |row| Ok((row.get(0)?, row.get(1)?)))?
                .collect()
        })
        .expect("triggers");
    for (name, _) in &triggers {
        database
            .execute(&format!("DROP TRIGGER {name}"), [])
            .expect("dropped");
    }
    assert!(database.execute(statement, []).expect("a change") > 0);
    for (_, sql) in &triggers {
        database.execute(sql, []).expect("put back");
    }
}

#[test]
fn a_changed_row_is_found() {
    let site = Site::new();
    site.judge("26K-0001");
    alter(
        &site,
        "UPDATE entry SET body = replace(body, '\"hold\"', '\"accept\"') WHERE position = 0",
    );
    let wrong = site.wrong(&[]);
    found(&wrong, "entry_changed", "entry 0");
    found(&wrong, "entry_contradicts_record", "verdict");
}

#[test]
fn an_older_copy_of_the_database_is_found_by_a_newer_certificate() {
    let site = Site::new();
    site.judge("26K-0001");
    let ledger = site.file("records/ledger.sqlite");
    let old = fs::read(&ledger).expect("a database");
    site.copy_sweep("26K-0001", "004");
    let second = site.judge("26K-0001");
    let pdf = site.certificate(&second, "pdf");
    fs::write(&ledger, old).expect("an older copy");
    let wrong = site.wrong(&[]);
    found(&wrong, "ledger_truncated", "old copy");
    found(&wrong, "certificate_unknown", ".pdf");
    found(&wrong, "record_unknown", ".json");
    // With everything of the second record gone, only the document that left the site tells.
    let mailed = site.file("mailed.pdf");
    fs::rename(&pdf, &mailed).expect("moved");
    fs::remove_file(site.certificate(&second, "json")).expect("gone");
    let reach = site.json(&["records", "verify"])["reach"].clone();
    assert!(
        reach
            .as_str()
            .expect("words")
            .contains("cannot be excluded")
    );
    found(
        &site.wrong(&[mailed.to_str().expect("a path")]),
        "ledger_truncated",
        "mailed.pdf",
    );
}

/// Somebody with the ledger's key makes a whole new ledger with another record of the same files.
fn forge(site: &Site, change: impl Fn(&mut LotRecord)) {
    let records = site.file("records");
    let key = fs::read_to_string(records.join("ledger.key")).expect("a key");
    let ledger = Ledger::open(&records).expect("a ledger");
    let entry = ledger.entry(0).expect("an entry").entry;
    let bytes = ledger.object(&entry, "record").expect("bytes");
    let mut forged = record::from_bytes(&bytes).expect("a record");
    change(&mut forged);
    let json = record::to_bytes(&forged).expect("JSON");
    let get = |o: &ObjectRef| ledger.archive().get(&o.sha256).expect("bytes");
    let files: Vec<(&ObjectRef, Vec<u8>)> =
        entry.objects[1..].iter().map(|o| (o, get(o))).collect();
    let objects: Vec<Object> = files
        .iter()
        .map(|(o, bytes)| Object {
            role: &o.role,
            name: &o.name,
            bytes,
        })
        .collect();
    fs::remove_dir_all(&records).expect("gone");
    let time = chrono::DateTime::parse_from_rfc3339(&entry.time).expect("a time");
    let signer = Signer::read(&key).expect("a key");
    let mut ledger = Ledger::open_for_writing(&records, signer, time).expect("a ledger");
    let made = Made {
        by: Some("OP-17"),
        time,
        program: "reelgate 0.0.1",
    };
    ledger
        .judged(&forged, &json, &inputs_digest(&objects), &objects, &made)
        .expect("forged");
    fs::write(records.join("ledger.key"), key).expect("a key");
}

#[test]
fn a_record_that_its_files_do_not_give_is_found() {
    let site = Site::new();
    let record = site.judge("26K-0001");
    copy(&site.file("records"), &site.file("kept"));
    forge(&site, |record| record.verdict = LotVerdict::Accept);
    let wrong = site.wrong(&[]);
    found(&wrong, "record_not_reproduced", "verdict");
    // The document that left the site knows another history.
    let pdf = site.certificate(&record, "pdf");
    let kept = site
        .file("kept/certificates")
        .join(pdf.file_name().expect("a name"));
    found(
        &site.wrong(&[kept.to_str().expect("a path")]),
        "history_rewritten",
        "kept",
    );
}

#[test]
fn a_record_of_an_earlier_version_is_proven_where_it_comes_out_the_same() {
    let site = Site::new();
    let first = site.judge("26K-0001");
    let earlier = |record: &mut LotRecord| {
        record.program.version = "0.0.1".to_owned();
        record.record = "26K-0001-0123456789ab".to_owned();
    };
    forge(&site, earlier);
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
    // The same files answer with that record, though its name holds another version.
    let again = site.judge("26K-0001");
    assert_eq!(again["record"], "26K-0001-0123456789ab");
    assert_ne!(again["record"], first["record"]);
    assert!(site.certificate(&again, "pdf").exists());
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
    forge(&site, |record| record.verdict = LotVerdict::Accept);
    found(&site.wrong(&[]), "record_of_other_version", "0.0.1");
}
