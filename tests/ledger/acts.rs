//! Acts and what they answer.

use crate::support::*;
use reelgate::ledger::{Act, Decision, Ledger, LedgerError, Made, Query, merkle};

#[test]
fn every_kind_of_entry_is_kept_and_proven() {
    let folder = scratch();
    let records = folder.path().join("records");
    let checkpoints = site(&records);
    let ledger = Ledger::open(&records).expect("a ledger");
    let kinds: Vec<&str> = ledger
        .entries()
        .expect("entries")
        .iter()
        .map(|e| e.act.kind())
        .collect();
    assert_eq!(
        kinds,
        [
            "judged",
            "judged",
            "judged",
            "disposition",
            "approval",
            "issue",
            "reissue",
            "judged"
        ]
    );
    let last = checkpoints.last().expect("a checkpoint");
    assert_eq!(ledger.head().expect("a head").as_ref(), Some(last));
    let anchors = [
        anchor("certificate", last),
        anchor("older", &checkpoints[3]),
    ];
    let report = report(&records, &anchors);
    assert!(report.proven(), "{report:?}");
    assert_eq!((report.size, report.anchors, report.covered), (8, 2, 8));
    assert_eq!(report.remarks, Vec::<String>::new());
}

#[test]
fn the_same_inputs_answer_with_the_entry_that_is_there() {
    let folder = scratch();
    let mut ledger = open(folder.path());
    let first = judge(&mut ledger, "26K-0001", "accept", "", 1).expect("an entry");
    let again = judge(&mut ledger, "26K-0001", "accept", "", 9).expect("an entry");
    assert!(first.new && !again.new);
    assert_eq!(
        (first.entry, first.checkpoint, first.proof),
        (again.entry, again.checkpoint, again.proof)
    );
    assert_eq!(ledger.size().expect("a size"), 1);
}

#[test]
fn other_inputs_for_the_same_lot_name_the_earlier_entry() {
    let folder = scratch();
    let mut ledger = open(folder.path());
    for variant in ["", "b", "c"] {
        judge(&mut ledger, "26K-0001", "hold", variant, 1).expect("an entry");
    }
    judge(&mut ledger, "26K-0002", "hold", "", 1).expect("an entry");
    let earlier: Vec<Option<u64>> = ledger
        .entries()
        .expect("entries")
        .into_iter()
        .map(|entry| match entry.act {
            Act::Judged { earlier, .. } => earlier,
            other => panic!("{other:?}"),
        })
        .collect();
    assert_eq!(earlier, [None, Some(0), Some(1), None]);
}

#[test]
fn look_ups_answer_in_entry_order() {
    let folder = scratch();
    let records = folder.path().join("records");
    site(&records);
    let ledger = Ledger::open(&records).expect("a ledger");
    let found = |query| -> Vec<u64> {
        ledger
            .find(query)
            .expect("entries")
            .iter()
            .map(|e| e.index)
            .collect()
    };
    assert_eq!(found(Query::Lot("26K-0003")), [2]);
    assert_eq!(found(Query::Record("26K-0003-0123456789ab")), [2, 3]);
    assert_eq!(found(Query::Record("26K-0001-0123456789ab")), [0, 5, 6]);
    let part = "RG-0475-X7R";
    assert_eq!(
        found(Query::PartSupplier {
            part,
            supplier: Some("SUP-041")
        }),
        [0, 1, 2, 7]
    );
    assert_eq!(
        found(Query::PartSupplier {
            part,
            supplier: None
        }),
        [0_u64; 0]
    );
    assert_eq!(found(Query::Kind("approval")), [4]);
    assert_eq!(found(Query::Inputs("nothing")), [0_u64; 0]);
    // The limit file is an object of every lot and of its approval; a sweep is of one lot.
    let limits = reelgate::ledger::sha256_hex(b"part: RG-0475-X7R\n");
    assert_eq!(found(Query::Object(&limits)), [0, 1, 2, 4, 7]);
    let entry = ledger.entry(1).expect("an entry").entry;
    let sweep = entry
        .objects_of("sweep")
        .next()
        .expect("a sweep")
        .sha256
        .clone();
    assert_eq!(found(Query::Object(&sweep)), [1]);
    let hostile = "x' OR '1'='1";
    assert_eq!(found(Query::Lot(hostile)), [0_u64; 0]);
}

#[test]
fn the_record_is_in_the_archive_byte_for_byte() {
    let folder = scratch();
    let mut ledger = open(folder.path());
    let made = judge(&mut ledger, "26K-0001", "accept", "", 1).expect("an entry");
    let json = serde_json::to_vec(&record("26K-0001", "accept")).expect("JSON");
    assert_eq!(ledger.object(&made.entry, "record").expect("bytes"), json);
    assert!(ledger.object(&made.entry, "certificate").is_err());
}

#[test]
fn what_cannot_be_recorded_is_refused() {
    let folder = scratch();
    let mut ledger = open(folder.path());
    judge(&mut ledger, "26K-0001", "accept", "", 1).expect("an entry");
    judge(&mut ledger, "26K-0002", "hold", "", 1).expect("an entry");
    let accepted = "26K-0001-0123456789ab";
    let held = "26K-0002-0123456789ab";
    let nobody = Made {
        by: None,
        ..made(2)
    };
    let refused = |outcome: Result<_, LedgerError>| {
        assert!(
            matches!(outcome, Err(LedgerError::Refused(_))),
            "{outcome:?}"
        );
    };
    refused(ledger.dispose(accepted, Decision::Sort, "why", &made(2)));
    refused(ledger.dispose("unknown", Decision::Sort, "why", &made(2)));
    refused(ledger.dispose(held, Decision::Sort, "  ", &made(2)));
    refused(ledger.dispose(held, Decision::Sort, "why", &nobody));
    refused(ledger.reissued(held, b"%PDF", "", &made(2)));
    refused(ledger.issued("unknown", b"%PDF", &made(2)));
    refused(ledger.entry(2));
    let mut reading = Ledger::open(folder.path()).expect("a ledger");
    refused(reading.dispose(held, Decision::Sort, "why", &made(2)));
    assert_eq!(ledger.size().expect("a size"), 2);
}

#[test]
fn a_decision_repeated_is_one_entry_and_a_changed_one_is_two() {
    let folder = scratch();
    let mut ledger = open(folder.path());
    judge(&mut ledger, "26K-0002", "hold", "", 1).expect("an entry");
    let held = "26K-0002-0123456789ab";
    let mut decide = |decision, reason| {
        let found = ledger
            .dispose(held, decision, reason, &made(2))
            .expect("an entry");
        (found.entry.index, found.new)
    };
    assert_eq!(decide(Decision::Sort, "one outlier"), (1, true));
    assert_eq!(decide(Decision::Sort, "one outlier"), (1, false));
    assert_eq!(decide(Decision::Return, "three outliers"), (2, true));
    assert_eq!(decide(Decision::Sort, "one outlier"), (3, true));
}

#[test]
fn approvals_are_of_these_bytes_for_this_ledger() {
    let folder = scratch();
    let mut ledger = open(folder.path());
    let bytes = b"part: RG-0475-X7R\n";
    let first = approve(&mut ledger, bytes, 1).expect("an entry");
    assert!(!approve(&mut ledger, bytes, 2).expect("an entry").new);
    let Act::Approval { statement, .. } = &first.entry.act else {
        panic!("{:?}", first.entry)
    };
    let file = reelgate::ledger::Object {
        role: "limits",
        name: LIMITS,
        bytes: b"part: other\n",
    };
    let trusted = engineer().verifier();
    assert!(
        ledger
            .approve(&file, &[], statement, &trusted, &made(3))
            .is_err()
    );
    let file = reelgate::ledger::Object {
        role: "limits",
        name: "limits/parts/other.yaml",
        bytes,
    };
    assert!(
        ledger
            .approve(&file, &[], statement, &trusted, &made(3))
            .is_err()
    );
    let file = reelgate::ledger::Object {
        role: "limits",
        name: LIMITS,
        bytes,
    };
    assert!(
        ledger
            .approve(&file, &[], statement, &signer().verifier(), &made(3))
            .is_err()
    );
    let forged = statement.replace("revision: 3", "revision: 4");
    assert!(
        ledger
            .approve(&file, &[], &forged, &trusted, &made(3))
            .is_err()
    );
    assert_eq!(ledger.size().expect("a size"), 1);
}

#[test]
fn a_clock_set_back_is_noted_and_blocks_nothing() {
    let folder = scratch();
    let mut ledger = open(folder.path());
    judge(&mut ledger, "26K-0001", "accept", "", 30).expect("an entry");
    let back = judge(&mut ledger, "26K-0002", "accept", "", 10).expect("an entry");
    let on = judge(&mut ledger, "26K-0003", "accept", "", 11).expect("an entry");
    let codes = |found: &reelgate::ledger::Recorded| -> Vec<String> {
        found
            .entry
            .notes
            .iter()
            .map(|note| note.code.clone())
            .collect()
    };
    assert_eq!(codes(&back), ["clock_went_back"]);
    assert_eq!(codes(&on), [""; 0]);
    assert!(back.entry.notes[0].text.contains("1200 s"));
    // The hour that daylight saving repeats is no anomaly: times carry their offset.
    let summer = chrono::DateTime::parse_from_rfc3339("2026-10-25T02:30:00+02:00").expect("a time");
    let winter = chrono::DateTime::parse_from_rfc3339("2026-10-25T02:10:00+01:00").expect("a time");
    for (lot, time) in [("26K-0004", summer), ("26K-0005", winter)] {
        let json = b"{}";
        let made = Made { time, ..made(0) };
        let entry = ledger
            .judged(&record(lot, "accept"), json, lot, &[], &made)
            .expect("an entry");
        assert_eq!(codes(&entry), [""; 0]);
    }
}

#[test]
fn proofs_of_entries_hold_against_checkpoints() {
    let folder = scratch();
    let records = folder.path().join("records");
    let notes = site(&records);
    let ledger = Ledger::open(&records).expect("a ledger");
    let heads: Vec<reelgate::ledger::Checkpoint> = notes
        .iter()
        .map(|note| {
            reelgate::ledger::Checkpoint::open(note, ledger.verifier()).expect("a checkpoint")
        })
        .collect();
    for (k, head) in heads.iter().enumerate() {
        let index = k as u64;
        let found = ledger.entry(index).expect("an entry");
        let leaf = merkle::leaf_hash(found.entry.bytes().expect("bytes").as_bytes());
        assert_eq!(head.size, index + 1);
        assert!(merkle::verify_inclusion(
            &leaf,
            index,
            head.size,
            &found.proof,
            &head.root
        ));
        assert_eq!(
            ledger.inclusion_proof(index, head.size).expect("a proof"),
            found.proof
        );
        for later in &heads[k..] {
            let proof = ledger.inclusion_proof(index, later.size).expect("a proof");
            assert!(merkle::verify_inclusion(
                &leaf,
                index,
                later.size,
                &proof,
                &later.root
            ));
            let proof = ledger
                .consistency_proof(head.size, later.size)
                .expect("a proof");
            let (old, new) = ((head.size, &head.root), (later.size, &later.root));
            assert!(merkle::verify_consistency(old, new, &proof));
        }
    }
    assert!(ledger.inclusion_proof(8, 8).is_err());
    assert!(ledger.consistency_proof(1, 9).is_err());
}

#[test]
fn hostile_text_is_kept_as_it_is_and_leads_nowhere() {
    let folder = scratch();
    let records = folder.path().join("records");
    let mut ledger = open(&records);
    let long = "x".repeat(5000);
    let names = [
        "../../etc/x",
        "/etc/x",
        "a\u{0}b",
        "\u{1b}[31m",
        "\u{202e}abc",
        "=cmd()",
        "'; DROP TABLE entry; --",
        "line\nbreak",
        "",
        &long,
    ];
    for (k, name) in names.iter().enumerate() {
        let mut record = record("x", "hold");
        record.lot.lot = (*name).to_owned();
        record.record = format!("r{k}");
        let object = reelgate::ledger::Object {
            role: "sweep",
            name,
            bytes: name.as_bytes(),
        };
        ledger
            .judged(&record, b"{}", &format!("inputs {k}"), &[object], &made(1))
            .expect("an entry");
    }
    for name in names {
        assert_eq!(
            ledger.find(Query::Lot(name)).expect("entries").len(),
            1,
            "{name:?}"
        );
    }
    assert!(report(&records, &[]).proven());
    let outside = files(folder.path())
        .into_iter()
        .filter(|path| !path.starts_with(&records));
    assert_eq!(outside.count(), 0);
}
