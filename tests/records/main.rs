//! Records from end to end, through the program: judged, listed, shown, exported, disposed of,
//! verified, and tampered with in every place.

mod approvals;
mod clock;
mod documents;
mod history;
mod retest;
mod site;
mod tamper;

use serde_json::Value;
use site::{Site, run};
use std::fs;
use std::process::Command;

#[test]
fn a_judged_lot_is_listed_shown_and_proven() {
    let site = Site::new();
    let record = site.judge("26K-0001");
    let list = site.json(&["records", "list"]);
    assert_eq!(list.as_array().map(Vec::len), Some(1));
    assert_eq!(list[0]["record"], record["record"]);
    assert_eq!(list[0]["verdict"], "hold");
    assert_eq!(list[0]["disposition"], Value::Null);

    let name = record["record"].as_str().expect("a name");
    assert_eq!(site.json(&["records", "show", name]), record);
    let text = site.ok(&["records", "show", "26K-0001"]);
    assert!(text.contains(&format!("Lot record {name}")), "{text}");
    assert!(text.contains("Entry 0: 2026-11-02T08:00:00+01:00 by OP-17: judged: hold"));
    for part in record["parts"].as_array().expect("parts") {
        let part = part["part"].as_str().expect("a name");
        assert!(
            text.contains(&format!("Part {part}")),
            "no part {part} in\n{text}"
        );
    }

    let verified = site.json(&["records", "verify"]);
    assert_eq!(verified["proven"], true);
    assert_eq!(verified["judged_again"], 1);
    assert!(
        verified["reach"]
            .as_str()
            .expect("words")
            .contains("cannot be excluded")
    );
    let pdf = site.file(&format!("records/certificates/{name}.pdf"));
    let verified = site.json(&["records", "verify", pdf.to_str().expect("a path")]);
    assert!(
        verified["reach"]
            .as_str()
            .expect("words")
            .contains("1 checkpoint(s) from outside")
    );
}

#[test]
fn the_same_inputs_are_one_record_and_other_inputs_name_it() {
    let site = Site::new();
    let first = site.judge("26K-0001");
    assert_eq!(site.judge("26K-0001"), first);
    // The PDF is lost; judging again makes it as it was.
    let pdf = site.certificate(&first, "pdf");
    let bytes = fs::read(&pdf).expect("a PDF");
    fs::remove_file(&pdf).expect("gone");
    assert_eq!(site.judge("26K-0001"), first);
    assert!(fs::read(&pdf).expect("a PDF") == bytes);
    assert_eq!(
        site.json(&["records", "list"]).as_array().map(Vec::len),
        Some(1)
    );
    assert_eq!(site.json(&["records", "verify"])["entries"], 2);

    site.copy_sweep("26K-0001", "004");
    let second = site.judge("26K-0001");
    assert_eq!(second["supersedes"], first["record"]);
    assert_ne!(second["record"], first["record"]);
    let list = site.json(&["records", "list", "--lot", "26K-0001"]);
    assert_eq!(list[0]["superseded_by"], second["record"]);
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
    let ambiguous = site.fails(&["records", "show", "26K-0001"]);
    assert!(ambiguous.contains("2 records"), "{ambiguous}");
}

#[test]
fn a_site_file_is_archived_with_each_record() {
    let site = Site::new();
    let without = site.judge("26K-0001");
    assert!(without.get("site").is_none());
    let text = "site: Hall 2\nwitness: witness.txt\n";
    fs::write(site.file("limits/site.yaml"), text).expect("a file");
    let with = site.judge("26K-0001");
    assert_ne!(with["record"], without["record"]);
    assert_eq!(with["supersedes"], without["record"]);
    assert_eq!(with["site"]["site"], "Hall 2");
    let digest = reelgate::ledger::sha256_hex(text.as_bytes());
    assert_eq!(with["site"]["sha256"], digest.as_str());
    let shown = site.ok(&["records", "show", with["record"].as_str().expect("a name")]);
    assert!(
        shown.contains("Hall 2") && shown.contains(&digest),
        "{shown}"
    );
    // The witness that the site file names has the checkpoint; another that is asked for goes before.
    let witness = fs::read_to_string(site.file("witness.txt")).expect("a witness file");
    run(&site, &["judge", "--witness", "other.txt", "lots/26K-0001"]);
    site.copy_sweep("26K-0001", "004");
    let (status, _, err) = run(&site, &["judge", "--witness", "other.txt", "lots/26K-0001"]);
    assert_eq!((status, err.as_str()), (Some(3), ""));
    assert_eq!(
        fs::read_to_string(site.file("witness.txt")).expect("a file"),
        witness
    );
    assert!(site.file("other.txt").exists());
    let verified = site.json(&["records", "verify"]);
    assert_eq!(verified["proven"], true);
    assert!(
        verified["reach"]
            .as_str()
            .expect("words")
            .contains("1 checkpoint(s) from outside")
    );
    // A fault in it keeps lots from being judged, with its place.
    fs::write(site.file("limits/site.yaml"), "site: Hall 2\nwitnes: x\n").expect("a file");
    let err = site.fails(&["judge", "lots/26K-0001"]);
    assert!(
        err.contains("site.yaml:2:1") && err.contains("did you mean `witness`?"),
        "{err}"
    );
}

#[test]
fn a_sweep_that_another_lot_rests_on_holds_the_lot() {
    let site = Site::new();
    site.judge("26K-0001");
    site.lot("26K-0002");
    let record = site.judge("26K-0002");
    let reasons = record["reasons"].as_array().expect("reasons");
    let reason = reasons
        .iter()
        .find(|reason| reason["code"] == "duplicate_sweep")
        .expect("the reason");
    let text = reason["text"].as_str().expect("words");
    assert!(text.contains("26K-0001"), "{text}");
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
}

#[test]
fn what_becomes_of_a_lot_is_an_entry() {
    let site = Site::new();
    let record = site.judge("26K-0001");
    let name = record["record"].as_str().expect("a name");
    let decide = [
        "records",
        "dispose",
        name,
        "--decision",
        "return",
        "--by",
        "QE-03",
    ];
    let said = site.ok(&[&decide[..], &["--reason", "sample too small"]].concat());
    assert!(
        said.contains("disposition: return, because: sample too small"),
        "{said}"
    );
    assert!(
        site.fails(&[&decide[..], &["--reason", " "]].concat())
            .contains("says why")
    );
    assert!(
        site.fails(&[
            "records",
            "dispose",
            "26K-9999",
            "--decision",
            "sort",
            "--reason",
            "x",
            "--by",
            "y"
        ])
        .contains("no record and no lot")
    );
    let list = site.json(&[
        "records",
        "list",
        "--verdict",
        "hold",
        "--from",
        "2026-11-02",
        "--to",
        "2026-11-02",
    ]);
    assert_eq!(list[0]["disposition"], "return");
    assert_eq!(
        site.json(&["records", "list", "--to", "2026-11-01"]),
        serde_json::json!([])
    );
    let csv = site.ok(&["records", "list", "--csv"]);
    assert!(csv.contains(",hold,return,"), "{csv}");

    let copy = [
        "records",
        "reissue",
        name,
        "--reason",
        "the first one got wet",
    ];
    site.ok(&copy);
    site.ok(&copy);
    let copies: Vec<_> = (1..=2)
        .map(|n| fs::read(site.certificate(&record, &format!("copy-{n}.pdf"))).expect("a copy"))
        .collect();
    assert!(copies[0].starts_with(b"%PDF-") && copies[0] != copies[1]);
    let verified = site.json(&["records", "verify"]);
    assert_eq!(verified["proven"], true, "{verified:#}");
    assert_eq!(verified["certificates"], 3);
}

#[test]
fn an_exported_record_is_proven_without_the_program() {
    let site = Site::new();
    let record = site.judge("26K-0001");
    let name = record["record"].as_str().expect("a name");
    site.ok(&["records", "reissue", name, "--reason", "for the customer"]);
    let folder = site.file("package");
    site.ok(&["records", "export", name, folder.to_str().expect("a path")]);
    let python = std::env::var("REELGATE_PYTHON").unwrap_or_else(|_| "python3".to_owned());
    let checked = || {
        let mut command = Command::new(&python);
        let command = command.arg("tests/tools/verify_record.py").arg(&folder);
        let output = command.output().expect("python");
        (
            output.status.code(),
            String::from_utf8_lossy(&output.stdout).into_owned(),
        )
    };
    let (status, said) = checked();
    assert_eq!(status, Some(0), "{said}");
    assert!(said.contains(name) && said.contains("hold"), "{said}");
    assert!(folder.join("data/certificate.pdf").exists());
    fs::write(folder.join("data/certificate.pdf"), b"%PDF-1.7 another").expect("a change");
    assert_eq!(checked().0, Some(1));
    assert!(
        site.fails(&["records", "export", name, folder.to_str().expect("a path")])
            .contains("is there already")
    );
}

#[test]
fn nothing_to_look_at_is_not_proven() {
    let site = Site::new();
    assert!(site.fails(&["records", "verify"]).contains("no ledger"));
    assert!(!site.file("records").exists());
    site.judge("26K-0001");
    let missing = site.fails(&["records", "verify", "no-such.pdf"]);
    assert!(missing.contains("no-such.pdf: cannot be read"), "{missing}");
    // A run that could not judge leaves no ledger.
    let other = Site::new();
    fs::write(other.file("lots/26K-0001/lot.yaml"), "lot: [").expect("a change");
    let (status, ..) = run(&other, &["judge", "lots/26K-0001"]);
    assert_eq!(status, Some(2));
    assert!(!other.file("records").exists());
}

#[test]
fn recorded_but_not_written_is_said_and_mended_by_judging_again() {
    let site = Site::new();
    fs::create_dir(site.file("records")).expect("a folder");
    let folder = site.file("records/certificates");
    fs::write(&folder, "in the way").expect("a file");
    let (status, _, err) = run(&site, &["judge", "lots/26K-0001"]);
    assert_eq!(status, Some(4));
    assert!(
        err.contains("recorded, but") && err.contains("could not be written"),
        "{err}"
    );
    fs::remove_file(&folder).expect("gone");
    let found = site.json(&["records", "verify"]);
    assert_eq!(
        (&found["proven"], &found["entries"]),
        (&true.into(), &2.into())
    );
    assert!(
        found["remarks"][0]
            .as_str()
            .expect("words")
            .contains("not there")
    );
    let record = site.judge("26K-0001");
    assert!(
        site.certificate(&record, "pdf").exists() && site.certificate(&record, "json").exists()
    );
    let found = site.json(&["records", "verify"]);
    assert_eq!(found["remarks"], serde_json::json!([]));
    assert_eq!(found["entries"], 2);
}

#[test]
fn benches_that_judge_at_once_lose_nothing_and_see_each_other() {
    let site = Site::new();
    let lots: Vec<String> = (1..=8).map(|n| format!("26K-000{n}")).collect();
    lots.iter().skip(1).for_each(|lot| site.lot(lot));
    std::thread::scope(|scope| {
        for lot in &lots {
            // Each lot twice at the same time.
            scope.spawn(|| site.judge(lot));
            scope.spawn(|| site.judge(lot));
        }
    });
    let found = site.json(&["records", "verify"]);
    assert_eq!(found["proven"], true, "{found:#}");
    assert_eq!(
        (&found["records"], &found["entries"]),
        (&8.into(), &16.into())
    );
    // All lots have the same sweeps: all but the one that came first say so.
    let list = site.json(&["records", "list"]);
    let duplicates = list.as_array().expect("a list").iter().filter(|line| {
        let record = site.json(&["records", "show", line["record"].as_str().expect("a name")]);
        record["reasons"].to_string().contains("duplicate_sweep")
    });
    assert_eq!(duplicates.count(), 7);
}

#[test]
fn a_witness_elsewhere_gets_each_checkpoint_and_keeps_an_old_copy_from_growing() {
    let site = Site::new();
    let witness = site.file("share.txt");
    let path = witness.to_str().expect("a path");
    let judge = ["judge", "lots/26K-0001", "--witness", path];
    assert_eq!(run(&site, &judge).0, Some(3));
    let ledger = site.file("records/ledger.sqlite");
    let old = fs::read(&ledger).expect("a database");
    site.ok(&[
        "records",
        "dispose",
        "26K-0001",
        "--decision",
        "sort",
        "--reason",
        "x",
        "--by",
        "QE-03",
        "--witness",
        path,
    ]);
    let found = site.json(&["records", "verify", "--witness", path]);
    assert!(
        found["reach"]
            .as_str()
            .expect("words")
            .contains("covers 3 of 3"),
        "{found:#}"
    );

    fs::write(&ledger, old).expect("an older copy");
    let wrong = site.wrong(&["--witness", path]);
    assert!(
        wrong.iter().any(|(code, _)| code == "ledger_truncated"),
        "{wrong:?}"
    );
    site.copy_sweep("26K-0001", "004");
    let (status, _, err) = run(&site, &judge);
    assert_eq!(status, Some(2));
    assert!(err.contains("an old copy was put back"), "{err}");
    // A witness that cannot be reached keeps nobody from working.
    let (status, _, err) = run(
        &site,
        &["judge", "lots/26K-0001", "--witness", "no/such/share.txt"],
    );
    assert_eq!(status, Some(3));
    assert!(
        err.contains("warning: the witness file was not written"),
        "{err}"
    );
}

#[test]
fn the_document_says_where_it_is_recorded_and_a_copy_says_so_on_every_page() {
    use reelgate::certificate::{InLedger, Paper, Sources, placed_text};
    let site = Site::new();
    let first = site.judge("26K-0001");
    site.copy_sweep("26K-0001", "004");
    let second = site.judge("26K-0001");
    let json = fs::read(site.certificate(&second, "json")).expect("a record");
    let record = reelgate::record::from_bytes(&json).expect("a record");
    let ledger = reelgate::ledger::Ledger::open(&site.file("records")).expect("a ledger");
    let recorded = ledger.entry(2).expect("an entry");
    let proof = recorded.proof_text();
    let texts = |copy| {
        let ledger = Some(InLedger {
            index: 2,
            proof: &proof,
            copy,
        });
        let sources = Sources {
            ledger,
            ..Sources::default()
        };
        placed_text(&record, &[], &sources, Paper::A4).0
    };
    let original = texts(None);
    let says = |text: &str| original.iter().any(|placed| placed.text.contains(text));
    for line in recorded.checkpoint.lines().take(3) {
        assert!(says(line), "{line}");
    }
    let on_first_page = original.iter().filter(|placed| placed.page == 1);
    let first = first["record"].as_str().expect("a name");
    assert!(
        on_first_page
            .clone()
            .any(|placed| placed.text.contains(first))
    );
    assert!(!says("Copy"));
    let copy = texts(Some("1, made on 2026-11-02T08:00:00+01:00"));
    let pages = copy.iter().map(|placed| placed.page).max().expect("pages");
    for page in 1..=pages {
        let marked = |placed: &&reelgate::certificate::PlacedText| {
            placed.page == page && placed.text.starts_with("Copy of lot record")
        };
        assert_eq!(copy.iter().filter(marked).count(), 1, "page {page}");
    }
}
