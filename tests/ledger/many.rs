//! Several processes on one ledger, and processes that are killed.
//!
//! The processes are this test program again, told by the environment to be a writer.

use crate::support::*;
use reelgate::ledger::{Ledger, Query};
use std::io::{BufRead, BufReader, Write};
use std::path::Path;
use std::process::{Child, Command, Stdio};
use std::time::Duration;

/// `folder|name|count`
const WRITER: &str = "REELGATE_TEST_WRITER";

/// Not a test of its own: appends and says so, line by line, where the environment asks for it.
/// What is refused is said too, and ends it.
#[test]
fn writer() {
    let Ok(order) = std::env::var(WRITER) else {
        return;
    };
    let mut parts = order.split('|');
    let folder = parts.next().expect("a folder").to_owned();
    let name = parts.next().expect("a name").to_owned();
    let count: u32 = parts.next().and_then(|n| n.parse().ok()).expect("a count");
    let say = |line: String| {
        let mut out = std::io::stdout().lock();
        writeln!(out, "{line}").and_then(|()| out.flush())
    };
    let opened = Ledger::open_for_writing(Path::new(&folder), signer(), time(0));
    let done = opened.and_then(|mut ledger| {
        for k in 0..count {
            let lot = format!("26K-{name}-{k:04}");
            let found = judge(&mut ledger, &lot, "accept", "", 1)?;
            if say(format!("recorded {lot} {}", found.entry.index)).is_err() {
                std::process::exit(4);
            }
        }
        Ok(())
    });
    if let Err(error) = done {
        let _ = say(format!("refused {error}"));
        std::process::exit(3);
    }
}

/// `folder`
const CHECKER: &str = "REELGATE_TEST_CHECKER";

/// Not a test of its own: verifies and says what there is, where the environment asks for it.
#[test]
fn checker() {
    let Ok(folder) = std::env::var(CHECKER) else {
        return;
    };
    let folder = Path::new(&folder);
    let report = match Ledger::open(folder) {
        Ok(ledger) => reelgate::ledger::verify(&ledger, &[]).expect("a report"),
        // A journal that a killed process left is rolled back by whoever writes next.
        Err(_) => {
            let ledger = Ledger::open_for_writing(folder, signer(), time(0)).expect("a ledger");
            reelgate::ledger::verify(&ledger, &[]).expect("a report")
        }
    };
    let said = format!("checked {} {}\n", report.size, report.proven());
    std::io::stdout().write_all(said.as_bytes()).expect("said");
}

fn spawn(records: &Path, name: &str, count: u32) -> Child {
    Command::new(std::env::current_exe().expect("this program"))
        .args(["--exact", "many::writer", "--nocapture", "--test-threads=1"])
        .env(WRITER, format!("{}|{name}|{count}", records.display()))
        .stdout(Stdio::piped())
        .stderr(Stdio::null())
        .spawn()
        .expect("a process")
}

/// Lot and index of what the process said that it had recorded.
fn recorded(line: &str) -> Option<(String, u64)> {
    let (lot, index) = line.split_once("recorded ")?.1.split_once(' ')?;
    Some((lot.to_owned(), index.parse().ok()?))
}

fn all_said(child: &mut Child) -> Vec<(String, u64)> {
    let out = BufReader::new(child.stdout.take().expect("a pipe"));
    out.lines()
        .map_while(Result::ok)
        .filter_map(|line| recorded(&line))
        .collect()
}

#[test]
fn eight_processes_lose_nothing_and_have_one_order() {
    let folder = tempfile::tempdir().expect("a folder");
    let records = folder.path().join("records");
    let mut children: Vec<Child> = (0..8)
        .map(|k| spawn(&records, &format!("P{k}"), 10))
        .collect();
    let mut said = Vec::new();
    for child in &mut children {
        let lines = all_said(child);
        assert!(child.wait().expect("an end").success());
        assert_eq!(lines.len(), 10);
        assert!(lines.is_sorted_by_key(|(_, index)| *index));
        said.extend(lines);
    }
    let ledger = Ledger::open(&records).expect("a ledger");
    for (lot, index) in &said {
        assert_eq!(
            ledger.find(Query::Lot(lot)).expect("entries")[0].index,
            *index
        );
    }
    let mut indices: Vec<u64> = said.into_iter().map(|(_, index)| index).collect();
    indices.sort_unstable();
    assert_eq!(indices, (0..80).collect::<Vec<u64>>());
    assert!(report(&records, &[]).proven());
}

#[test]
fn the_same_lot_at_several_benches_is_one_entry() {
    let folder = tempfile::tempdir().expect("a folder");
    let records = folder.path().join("records");
    let mut children: Vec<Child> = (0..4).map(|_| spawn(&records, "same", 12)).collect();
    let said: Vec<Vec<(String, u64)>> = children.iter_mut().map(all_said).collect();
    for child in &mut children {
        assert!(child.wait().expect("an end").success());
    }
    assert!(
        said.iter()
            .all(|lines| lines.len() == 12 && *lines == said[0])
    );
    let report = report(&records, &[]);
    assert!(report.proven() && report.size == 12, "{report:?}");
}

/// How many kills: more by the environment for the long run.
fn kills() -> u64 {
    std::env::var("REELGATE_TEST_KILLS")
        .ok()
        .and_then(|n| n.parse().ok())
        .unwrap_or(20)
}

#[test]
fn a_killed_process_leaves_all_of_an_entry_or_nothing() {
    let mut folder = tempfile::tempdir().expect("a folder");
    let (mut acknowledged, mut interrupted) = (0, 0);
    for round in 0..kills() {
        if round % 20 == 0 {
            folder = tempfile::tempdir().expect("a folder");
        }
        let records = folder.path().join("records");
        let mut child = spawn(&records, &format!("K{round}"), 400);
        // Times spread evenly over the life of the process, from before its first entry on.
        std::thread::sleep(Duration::from_micros(
            5_000 + round.wrapping_mul(7919) % 120_000,
        ));
        child.kill().expect("killed");
        let said = all_said(&mut child);
        child.wait().expect("an end");
        interrupted += u64::from(said.len() < 400);
        acknowledged += said.len();
        let ledger = match Ledger::open_for_writing(&records, signer(), time(0)) {
            Ok(ledger) => ledger,
            Err(error) => panic!("round {round}: {error}"),
        };
        for (lot, index) in said {
            let found = ledger.find(Query::Lot(&lot)).expect("entries");
            assert_eq!(found.len(), 1, "round {round}: {lot}");
            assert_eq!(found[0].index, index);
        }
        drop(ledger);
        let report = report(&records, &[]);
        assert!(report.proven(), "round {round}: {report:?}");
    }
    assert_eq!(interrupted, kills());
    assert!(
        acknowledged > 0,
        "no process lived long enough to record anything"
    );
}
