//! What is opened, and what is refused.

use crate::support::*;
use reelgate::ledger::disk::System;
use reelgate::ledger::{KEY_FILE, Ledger, LedgerError, Signer, ledger_key, verify};
use rusqlite::Connection;
use std::path::{Path, PathBuf};

fn prepared() -> (tempfile::TempDir, PathBuf) {
    let folder = scratch();
    let records = folder.path().join("records");
    site(&records);
    (folder, records)
}

fn database(records: &Path) -> PathBuf {
    records.join(reelgate::ledger::FILE)
}

fn refusal<T>(outcome: Result<T, LedgerError>) -> LedgerError {
    match outcome {
        Ok(_) => panic!("opened"),
        Err(error) => error,
    }
}

#[test]
fn the_sqlite_inside_is_recent() {
    assert!(
        rusqlite::version_number() >= 3_051_003,
        "{}",
        rusqlite::version()
    );
}

#[test]
fn the_file_says_what_it_is() {
    let (_folder, records) = prepared();
    let connection = Connection::open(database(&records)).expect("a database");
    let get = |name| {
        connection
            .pragma_query_value(None, name, |r| r.get::<_, i64>(0))
            .expect("a value")
    };
    assert_eq!(
        (get("application_id"), get("user_version")),
        (0x524C_4754, 1)
    );
    let mode: String = connection
        .pragma_query_value(None, "journal_mode", |r| r.get(0))
        .expect("a mode");
    assert_eq!(mode, "delete");
    let strict: i64 = connection
        .query_row(
            "SELECT count(*) FROM pragma_table_list WHERE schema = 'main' AND strict = 1",
            [],
            |r| r.get(0),
        )
        .expect("a count");
    assert_eq!(strict, 3);
}

#[test]
fn update_delete_and_replace_are_refused() {
    let (_folder, records) = prepared();
    let connection = Connection::open(database(&records)).expect("a database");
    for statement in [
        "UPDATE entry SET checkpoint = '' WHERE position = 1",
        "DELETE FROM entry WHERE position = 7",
        "INSERT OR REPLACE INTO entry (position, body, peaks, checkpoint) VALUES (3, '{}', x'', '')",
        "INSERT INTO entry (position, body, peaks, checkpoint) VALUES (9, '{}', x'', '')",
        "UPDATE object SET name = ''",
        "DELETE FROM object",
        "INSERT INTO object VALUES (1, 9, '', '', substr(hex(zeroblob(32)), 1, 64), 0)",
        "UPDATE identity SET origin = ''",
        "DELETE FROM identity",
        "INSERT OR REPLACE INTO identity VALUES (1, '', zeroblob(32), '')",
    ] {
        assert!(connection.execute(statement, []).is_err(), "{statement}");
    }
    drop(connection);
    assert!(report(&records, &[]).proven());
}

#[test]
fn what_is_no_ledger_is_refused() {
    let folder = scratch();
    assert!(matches!(
        refusal(Ledger::open(folder.path())),
        LedgerError::Missing { .. }
    ));
    std::fs::write(
        database(folder.path()),
        b"no database, but a text that is long enough",
    )
    .expect("written");
    assert!(matches!(
        refusal(Ledger::open(folder.path())),
        LedgerError::Database { .. }
    ));
    std::fs::remove_file(database(folder.path())).expect("removed");
    let other = Connection::open(database(folder.path())).expect("a database");
    other.execute("CREATE TABLE t (x)", []).expect("a table");
    drop(other);
    let error = refusal(Ledger::open_for_writing(folder.path(), signer(), time(0)));
    assert!(matches!(error, LedgerError::Foreign { .. }), "{error}");
}

#[test]
fn another_application_and_a_later_version_are_refused() {
    for (pragma, value) in [("application_id", 1), ("user_version", 2)] {
        let (_folder, records) = prepared();
        let connection = Connection::open(database(&records)).expect("a database");
        connection.pragma_update(None, pragma, value).expect("set");
        drop(connection);
        let error = refusal(Ledger::open(&records));
        assert!(matches!(error, LedgerError::Foreign { .. }), "{error}");
        let error = refusal(Ledger::open_for_writing(&records, signer(), time(0)));
        assert!(matches!(error, LedgerError::Foreign { .. }), "{error}");
    }
}

#[test]
fn another_key_is_refused() {
    let (_folder, records) = prepared();
    for other in [
        Signer::new(ORIGIN, &[8; 32]),
        Signer::new("other.example/ledger", &[7; 32]),
    ] {
        let other = other.expect("a signer");
        let error = refusal(Ledger::open_for_writing(&records, other, time(0)));
        assert!(matches!(error, LedgerError::Key(_)), "{error}");
    }
}

#[test]
fn a_lost_ledger_is_not_begun_anew() {
    let (_folder, records) = prepared();
    for remove in [false, true] {
        if remove {
            std::fs::remove_file(database(&records)).expect("removed");
        } else {
            std::fs::write(database(&records), b"").expect("emptied");
        }
        let error = refusal(Ledger::open_for_writing(&records, signer(), time(0)));
        assert!(matches!(error, LedgerError::Missing { .. }), "{error}");
        assert!(matches!(
            refusal(Ledger::open(&records)),
            LedgerError::Missing { .. }
        ));
    }
}

#[test]
fn a_file_cut_short_is_noticed() {
    let (_folder, records) = prepared();
    let good = std::fs::read(database(&records)).expect("bytes");
    for length in [
        1,
        99,
        100,
        512,
        4096,
        5000,
        good.len() / 2,
        good.len() - 4096,
        good.len() - 1,
    ] {
        std::fs::write(database(&records), &good[..length]).expect("written");
        let found = Ledger::open(&records).and_then(|ledger| verify(&ledger, &[]));
        assert!(
            found.as_ref().is_ok_and(|r| !r.proven()) || found.is_err(),
            "{length}: {found:?}"
        );
    }
}

#[cfg(unix)]
#[test]
fn a_ledger_behind_a_link_is_refused_and_a_folder_behind_one_is_not() {
    let (folder, records) = prepared();
    let linked = folder.path().join("linked");
    std::os::unix::fs::symlink(&records, &linked).expect("a link");
    assert!(Ledger::open(&linked).is_ok());
    let moved = folder.path().join("moved.sqlite");
    std::fs::rename(database(&records), &moved).expect("moved");
    std::os::unix::fs::symlink(&moved, database(&records)).expect("a link");
    assert!(matches!(
        refusal(Ledger::open(&records)),
        LedgerError::Database { .. }
    ));
}

#[test]
fn locks_that_do_not_lock_are_noticed() {
    let (_folder, records) = prepared();
    let mut ledger = open(&records);
    // Somebody holds the second lock although the database is free: what a file system looks like
    // that gives one of two locks to everybody.
    let held = std::fs::File::options()
        .write(true)
        .open(records.join("ledger.lock"))
        .expect("the lock file");
    held.lock().expect("the lock");
    let error = refusal(judge(&mut ledger, "26K-0900", "hold", "", 40));
    assert!(matches!(error, LedgerError::Locks { .. }), "{error}");
    drop(held);
    assert_eq!(
        judge(&mut ledger, "26K-0900", "hold", "", 40)
            .expect("an entry")
            .entry
            .index,
        8
    );
}

#[test]
fn reading_needs_no_write_and_leaves_no_trace() {
    let (_folder, records) = prepared();
    let before: Vec<_> = files(&records)
        .iter()
        .map(|f| (f.clone(), std::fs::read(f).expect("bytes")))
        .collect();
    assert!(report(&records, &[]).proven());
    let after: Vec<_> = files(&records)
        .iter()
        .map(|f| (f.clone(), std::fs::read(f).expect("bytes")))
        .collect();
    assert!(before == after);
}

/// What a process leaves that is killed in the middle of a transaction: a journal, and a database
/// half written.
#[test]
fn an_interrupted_transaction_is_rolled_back_by_whoever_looks_next() {
    let (folder, records) = prepared();
    let left = folder.path().join("left");
    let connection = Connection::open(database(&records)).expect("a database");
    connection
        .pragma_update(None, "cache_size", 1)
        .expect("set");
    connection.execute("BEGIN IMMEDIATE", []).expect("begun");
    connection
        .execute("CREATE TABLE filler (x BLOB)", [])
        .expect("a table");
    for _ in 0..200 {
        connection
            .execute("INSERT INTO filler VALUES (randomblob(3000))", [])
            .expect("a row");
    }
    copy(&records, &left);
    connection.execute("ROLLBACK", []).expect("rolled back");
    assert!(left.join("ledger.sqlite-journal").is_file());
    let report = report(&left, &[]);
    assert!(report.proven() && report.size == 8, "{report:?}");
    assert!(!left.join("ledger.sqlite-journal").exists());
}

#[test]
fn the_key_is_made_once_and_kept_to_the_user() {
    let folder = scratch();
    let records = folder.path().join("records");
    let first = || Ok(signer());
    let second = || -> Result<Signer, LedgerError> { panic!("a second key") };
    let key = |new: &dyn Fn() -> Result<Signer, LedgerError>| ledger_key(&records, new, &System);
    assert_eq!(key(&first).expect("a key").verifier(), signer().verifier());
    assert_eq!(key(&second).expect("a key").verifier(), signer().verifier());
    let path = records.join(KEY_FILE);
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        let mode = path.metadata().expect("a file").permissions().mode();
        assert_eq!(mode & 0o777, 0o600);
    }
    site(&records);
    let text = std::fs::read_to_string(&path).expect("a text");
    std::fs::write(&path, text.replace("ledger", "ladder")).expect("written");
    assert!(matches!(refusal(key(&second)), LedgerError::Key(_)));
    std::fs::remove_file(&path).expect("removed");
    assert!(matches!(refusal(key(&second)), LedgerError::Key(_)));
}

#[test]
fn a_key_is_whole_or_not_there() {
    for fault in [Fault::Once(28), Fault::Forever(5), Fault::Short] {
        for at in 1.. {
            let folder = scratch();
            let records = folder.path().join("records");
            let disk = Failing::new(at, fault);
            let outcome = ledger_key(&records, &|| Ok(signer()), disk.as_ref());
            let again = ledger_key(&records, &|| Ok(signer()), &System).expect("a key");
            assert_eq!(again.verifier(), signer().verifier());
            if outcome.is_ok() {
                assert!(at > 5, "{at} steps");
                break;
            }
        }
    }
}
