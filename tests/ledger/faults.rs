//! An error at each step of an act: afterwards the ledger opens, verifies, and holds all of the
//! entry or nothing of it; doing the same again works.

use crate::support::*;
use reelgate::ledger::{Decision, Ledger, LedgerError, Recorded};
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::Ordering;

const EIO: i32 = 5;
const EACCES: i32 = 13;
const ENOSPC: i32 = 28;

const FAULTS: [Fault; 6] = [
    Fault::Once(EIO),
    Fault::Once(ENOSPC),
    Fault::Once(EACCES),
    Fault::Forever(EIO),
    Fault::Forever(ENOSPC),
    Fault::Short,
];

type Act = fn(&mut Ledger) -> Result<Recorded, LedgerError>;

fn judge_one(ledger: &mut Ledger) -> Result<Recorded, LedgerError> {
    judge(ledger, "26K-0900", "hold", "", 40)
}

fn dispose_one(ledger: &mut Ledger) -> Result<Recorded, LedgerError> {
    ledger.dispose(
        "26K-0003-0123456789ab",
        Decision::Concession,
        "as agreed",
        &made(41),
    )
}

fn approve_one(ledger: &mut Ledger) -> Result<Recorded, LedgerError> {
    approve(ledger, b"part: RG-0475-X7R\nrevision: 4\n", 42)
}

fn issue_one(ledger: &mut Ledger) -> Result<Recorded, LedgerError> {
    ledger.issued("26K-0003-0123456789ab", b"%PDF", &made(43))
}

/// One act with a fault at step `at`; whether the fault was reached.
fn attempt(records: &Path, act: Act, before: u64, at: u64, fault: Fault) -> bool {
    let place = format!("step {at}, {fault:?}");
    let disk = Failing::new(at, fault);
    let outcome =
        Ledger::open_on(records, signer(), time(0), disk.clone()).and_then(|mut l| act(&mut l));
    let struck = disk.struck.load(Ordering::SeqCst);
    assert!(struck || outcome.is_ok(), "{place}: {outcome:?}");

    let size = match Ledger::open(records) {
        Ok(ledger) => ledger.size().expect("a size"),
        // The very first act may fail before there is a ledger.
        Err(LedgerError::Missing { .. }) => 0,
        Err(error) => panic!("{place}: {error}"),
    };
    assert!(
        size == before || size == before + 1,
        "{place}: {size} entries, {before} before"
    );
    match &outcome {
        Ok(found) => assert_eq!((size, found.entry.index), (before + 1, before), "{place}"),
        Err(error) => {
            let text = error.to_string();
            assert!(
                !text.is_empty() && !text.contains("Error {"),
                "{place}: {text}"
            );
        }
    }
    if size > 0 {
        let report = report(records, &[]);
        assert!(report.proven(), "{place}: {report:?}");
    }
    let again = act(&mut open(records)).unwrap_or_else(|e| panic!("{place}: again: {e}"));
    assert_eq!(again.entry.index, before, "{place}");
    assert_eq!(again.new, size == before, "{place}");
    let report = report(records, &[anchor("again", &again.checkpoint)]);
    assert!(
        report.proven() && report.size == before + 1,
        "{place}: {report:?}"
    );
    struck
}

/// Every fault at step 1, 2, 3 … until the act is through before the fault; how many there were.
fn every_step(prepare: fn(&Path), act: Act, before: u64) -> u64 {
    let prepared = scratch();
    let from = prepared.path().join("records");
    prepare(&from);
    let mut cases = 0;
    for fault in FAULTS {
        for at in 1.. {
            let folder = scratch();
            let records = folder.path().join("records");
            if from.is_dir() {
                copy(&from, &records);
            }
            if !attempt(&records, act, before, at, fault) {
                break;
            }
            cases += 1;
        }
    }
    cases
}

fn nothing(_: &Path) {}

fn a_site(records: &Path) {
    site(records);
}

#[test]
fn the_first_act_of_a_site() {
    let cases = every_step(nothing, judge_one, 0);
    assert!(cases >= 6 * 20, "{cases} faults");
}

#[test]
fn a_lot_judged() {
    let cases = every_step(a_site, judge_one, 8);
    assert!(cases >= 6 * 12, "{cases} faults");
}

#[test]
fn a_disposition() {
    let cases = every_step(a_site, dispose_one, 8);
    assert!(cases >= 6 * 4, "{cases} faults");
}

#[test]
fn an_approval() {
    let cases = every_step(a_site, approve_one, 8);
    assert!(cases >= 6 * 8, "{cases} faults");
}

#[test]
fn a_certificate() {
    let cases = every_step(a_site, issue_one, 8);
    assert!(cases >= 6 * 4, "{cases} faults");
}

/// The harness can fail: a fault that is swallowed would let an act end as if nothing had been.
#[test]
fn the_faulty_disk_is_faulty() {
    let folder = scratch();
    let disk = Failing::new(1, Fault::Once(EIO));
    let opened = Ledger::open_on(
        &folder.path().join("records"),
        signer(),
        time(0),
        disk.clone(),
    );
    assert!(matches!(opened, Err(LedgerError::Io { .. })));
    assert!(disk.struck.load(Ordering::SeqCst));
    let archive =
        reelgate::ledger::Archive::new(folder.path(), Arc::new(reelgate::ledger::disk::System));
    assert!(archive.is_empty().expect("a listing"));
}

/// No room: the database may not grow beyond what it is.
#[cfg(target_os = "linux")]
#[test]
fn a_folder_that_cannot_be_written() {
    use std::os::unix::fs::PermissionsExt;
    let folder = scratch();
    let records = folder.path().join("records");
    std::fs::create_dir(&records).expect("a folder");
    std::fs::set_permissions(&records, std::fs::Permissions::from_mode(0o555)).expect("read-only");
    let probe = std::fs::write(records.join("probe"), b"");
    let opened = Ledger::open_for_writing(&records, signer(), time(0));
    // The superuser writes everywhere.
    assert_eq!(opened.is_ok(), probe.is_ok(), "{:?}", opened.err());
    std::fs::set_permissions(&records, std::fs::Permissions::from_mode(0o755)).expect("writable");
}
