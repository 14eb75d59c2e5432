//! A lot line by line: from the scan to the record, with faults, undo, pause and death in between.

use super::site::{Bench, LABEL, Site, WHO, go_to_first_part};

#[test]
fn a_lot_from_scan_to_label() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    for (i, part) in ["001", "002", "003", "004", "005"].iter().enumerate() {
        bench.see(&format!("Part {part} of 5"));
        site.save(part);
        bench.see(&format!("Part {part}: CONFORMING ✔"));
        bench.see("capacitance at 1 kHz");
        let left = [
            "4 parts left",
            "3 parts left",
            "2 parts left",
            "1 part left",
            "none left",
        ];
        bench.see(&format!("{}; the lot can still be accepted", left[i]));
    }
    bench.see("All parts are measured");
    bench.line("");
    bench.see("Lot 26K-9001: ACCEPT ✔");
    bench.see("may go to the line");
    bench.see("Record: records/certificates/26K-9001-");
    assert_eq!(bench.close().code(), Some(0));

    let label = site.text("lots/26K-9001/label.txt");
    assert!(
        label.contains("ACCEPT") && label.contains("LOT  26K-9001"),
        "{label}"
    );
    let lot = site.text("lots/26K-9001/lot.yaml");
    assert!(
        lot.contains("label: \"[)>\\u001E06\\u001DPRG-9475-X7R"),
        "{lot}"
    );
    assert_eq!(
        site.list("lots/26K-9001/sweeps"),
        ["001.csv", "002.csv", "003.csv", "004.csv", "005.csv"]
    );
    for part in ["001", "005"] {
        let kept = site.text(&format!("lots/26K-9001/sweeps/{part}.csv"));
        let saved = std::fs::read_to_string(format!("sample-lots/26K-0457/sweeps/{part}.csv"));
        assert_eq!(kept, saved.expect("a sweep"));
    }

    // Judging the folder again answers with the same record, and the ledger proves it.
    let (status, record) = site.judge("26K-9001");
    assert_eq!(status, Some(0));
    assert!(label.contains(record["record"].as_str().expect("a name")));
    assert_eq!(record["lot"]["run"]["seed"], 7);
    let (status, said) = site.run(&["records", "verify"]);
    assert_eq!(status, Some(0), "{said}");
}

#[test]
fn a_contact_fault_is_measured_again_and_a_nonconforming_part_is_not() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    bench.see("Part 001 of 5");
    site.save_open("a");
    bench.see("Part 001: UNMEASURED");
    bench.see("Reseat part 001");
    bench.see("Part 001, try 2");
    site.save("001");
    bench.see("Part 001, try 2: CONFORMING");
    bench.see("Part 002 of 5");
    // Twice |Z|: half the capacitance.
    site.save_scaled("002", "b", 2.0);
    bench.see("Part 002: NONCONFORMING ✘");
    bench.see("✘ capacitance");
    bench.see("Keep part 002 apart");
    bench.see("the lot CANNOT be accepted any more");
    bench.line("again");
    bench.see("allows no further try");
    bench.line("end");
    bench.see("Type end once more");
    bench.line("end");
    bench.see("Lot 26K-9001: REJECT ✘");
    bench.see("Block the reel");
    assert_eq!(bench.close().code(), Some(1));
    assert_eq!(
        site.list("lots/26K-9001/sweeps"),
        ["001.csv", "001~2.csv", "002.csv"]
    );
    let (status, record) = site.judge("26K-9001");
    assert_eq!(status, Some(1));
    assert_eq!(record["parts"][0]["verdict"], "conforming");
    assert_eq!(record["parts"][0]["attempts"][1]["counts"], true);
}

#[test]
fn an_undone_placement_keeps_both_sweeps() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    bench.line("undo");
    bench.see("Nothing is measured yet");
    site.save_scaled("001", "wrong", 2.0);
    bench.see("Part 001: NONCONFORMING");
    bench.line("u");
    bench.see("Part 001, try 1 is marked misplaced");
    bench.see("a quality engineer will be asked");
    for part in ["001", "002", "003", "004", "005"] {
        bench.see(&format!("Part {part} of 5"));
        site.save(part);
        bench.see("CONFORMING ✔");
    }
    bench.see("All parts are measured");
    bench.line("");
    bench.see("Lot 26K-9001: HOLD");
    bench.see("misplaced_not_conforming");
    assert_eq!(bench.close().code(), Some(3));
    let (_, record) = site.judge("26K-9001");
    let tries = &record["parts"][0]["attempts"];
    assert_eq!(tries[0]["set_aside"], "misplaced");
    assert_eq!(tries[0]["verdict"], "nonconforming");
    assert_eq!(
        (&tries[0]["counts"], &tries[1]["counts"]),
        (&false.into(), &true.into())
    );
    assert_eq!(record["reasons"].as_array().map(Vec::len), Some(1));
}

#[test]
fn a_run_goes_on_after_it_was_killed() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    for part in ["001", "002"] {
        bench.see(&format!("Part {part} of 5"));
        site.save(part);
        bench.see(&format!("Part {part}: CONFORMING"));
    }
    bench.kill();
    // Saved while nobody looked; and a line that was being written.
    site.save("003");
    let journal = site.file("lots/26K-9001/run.jsonl");
    let mut torn = std::fs::read(&journal).expect("a journal");
    torn.extend_from_slice(b"{\"at\":\"2026-");
    std::fs::write(&journal, torn).expect("a journal");

    let mut bench = Bench::start(&site, &["--operator", "OP-08", "--station", "BENCH-9"]);
    bench.see("Not finished: lot 26K-9001 (2 of 5 parts)");
    bench.line("1T26K-9001");
    bench.see("Lot 26K-9001 goes on where it stopped: 2 of 5 parts are measured");
    bench.see("OP-08 goes on from here");
    bench.see("Part 003: CONFORMING");
    bench.see("Part 004 of 5");
    site.save("004");
    bench.see("Part 004: CONFORMING");
    bench.line("pause");
    bench.see("Paused. 4 of 5 parts");
    assert_eq!(bench.close().code(), Some(5));

    let mut bench = Bench::start(&site, &WHO);
    bench.line(LABEL);
    bench.see("4 of 5 parts are measured");
    bench.see("Part 005 of 5");
    site.save("005");
    bench.see("All parts are measured");
    bench.line("");
    bench.see("ACCEPT");
    assert_eq!(bench.close().code(), Some(0));
    let (_, record) = site.judge("26K-9001");
    assert_eq!(
        record["lot"]["run"]["operators"],
        serde_json::json!(["OP-17", "OP-08"])
    );
    let swept = site
        .events("26K-9001")
        .iter()
        .filter(|e| *e == "swept")
        .count();
    assert_eq!(swept, 5, "each sweep once");
}

#[test]
fn a_sweep_kept_but_not_yet_in_the_journal_is_taken_in() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    bench.see("Part 001 of 5");
    site.save("001");
    bench.see("Part 001: CONFORMING");
    bench.kill();
    // The machine stopped between keeping the sweep and the line about it.
    let journal = site.file("lots/26K-9001/run.jsonl");
    let text = std::fs::read_to_string(&journal).expect("a journal");
    let without: String = text
        .lines()
        .filter(|l| !l.contains("\"swept\""))
        .map(|l| format!("{l}\n"))
        .collect();
    std::fs::write(&journal, without).expect("a journal");
    let mut bench = Bench::start(&site, &WHO);
    bench.line(LABEL);
    bench.see("1 sweep was already on the disk");
    bench.see("Part 002 of 5");
    site.save("002");
    bench.see("Part 002: CONFORMING");
    bench.kill();
    assert_eq!(site.list("lots/26K-9001/sweeps"), ["001.csv", "002.csv"]);
}

#[test]
fn the_end_of_the_input_pauses() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    bench.see("Part 001 of 5");
    assert_eq!(bench.close().code(), Some(5));
    let bench = Bench::start(&site, &WHO);
    assert_eq!(bench.close().code(), Some(0), "nothing was begun");
}

#[test]
fn the_same_sweep_is_never_two_parts() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    bench.see("Part 001 of 5");
    site.save_as("001", "first");
    bench.see("Part 001: CONFORMING");
    bench.see("Part 002 of 5");
    site.save_as("001", "second");
    site.save("002");
    bench.see("Part 002: CONFORMING");
    bench.kill();
    assert_eq!(site.list("lots/26K-9001/sweeps"), ["001.csv", "002.csv"]);
}

#[test]
fn two_benches_cannot_hold_one_lot() {
    let site = Site::new();
    let mut first = Bench::start(&site, &WHO);
    go_to_first_part(&mut first);
    first.see("Part 001 of 5");
    let mut second = Bench::start(&site, &WHO);
    second.line(LABEL);
    second.see("is being measured at another place");
    second.kill();
    first.kill();
}
