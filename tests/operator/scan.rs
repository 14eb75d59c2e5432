//! The scan: what is missing is asked for, what contradicts is said at once.

use super::site::{Bench, LABEL, Site, WHO, go_to_first_part};

#[test]
fn single_codes_one_by_one() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    bench.see("Scan the label");
    bench.line("PRG-9475-X7R");
    bench.see("Lot number?");
    bench.line("1T26K-9001");
    bench.see("How many parts");
    bench.line("four hundred");
    bench.see("quantity is not clear");
    bench.line("Q400");
    bench.see("Date code?");
    bench.line("2699");
    bench.see("no date code");
    bench.line("");
    bench.see("Supplier?");
    bench.line("");
    bench.see("Order number?");
    bench.line("PO-9");
    bench.see("Plan of lot 26K-9001, 400 parts");
    bench.line("");
    bench.see("Temperature");
    bench.line("15");
    bench.see("outside");
    bench.line("22.8");
    bench.see("Part 001 of 5");
    bench.kill();
    let journal = site.text("lots/26K-9001/run.jsonl");
    assert!(
        journal.contains(r#""scans":["PRG-9475-X7R","1T26K-9001","Q400"]"#),
        "as typed: {journal}"
    );
}

#[test]
fn a_label_that_contradicts_the_order() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &[&WHO[..], &["--lot", "26K-9002"]].concat());
    bench.see("Scan the label");
    bench.line(LABEL);
    bench.see("STOP: Wrong reel? lot is 1T 26K-9001, expected 26K-9002");
    bench.see("Nothing of it was kept");
    bench.line(&LABEL.replace("26K-9001", "26K-9002"));
    bench.see("Plan of lot 26K-9002");
    assert_eq!(bench.close().code(), Some(0));
}

#[test]
fn an_unknown_part_and_a_date_code_to_come() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    bench.see("Scan the label");
    bench.line(&LABEL.replace("RG-9475-X7R", "RG-9457-X7R"));
    bench.see("no limit file for part RG-9457-X7R (nearest: RG-9475-X7R)");
    bench.see("Scan the label");
    bench.line(&LABEL.replace("10D2638", "10D2650"));
    bench.see("2650 lies in the future");
    bench.see("Scan the label");
    // 2024-W38 is more than 52 weeks before 2026-10-05.
    bench.line(&LABEL.replace("10D2638", "10D2438"));
    bench.see("weeks old; the limit file allows 52");
    bench.line("");
    bench.see("Scan the label");
    bench.line("[)>06PRG");
    bench.see("The scan cannot be used");
    bench.kill();
    assert!(
        !super::site::exists(&site.file("lots")),
        "nothing was begun"
    );
}

#[test]
fn a_lot_that_was_judged_already() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    bench.see("Part 001 of 5");
    site.save_scaled("001", "a", 2.0);
    bench.see("NONCONFORMING");
    bench.line("end");
    bench.line("end");
    bench.see("REJECT");
    bench.line(LABEL);
    bench.see("was judged already: reject on 2026-10-05");
    bench.line("yes");
    bench.see("Plan of lot 26K-9001");
    bench.line("");
    bench.see("Temperature");
    assert_eq!(bench.close().code(), Some(5));
    assert_eq!(site.list("lots"), ["26K-9001", "26K-9001~2"]);
}

#[test]
fn another_label_while_measuring_is_noticed() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    go_to_first_part(&mut bench);
    bench.see("Part 001 of 5");
    bench.line(LABEL);
    bench.see("Yes, this is lot 26K-9001");
    bench.line(&LABEL.replace("26K-9001", "26K-9002"));
    bench.see("label of lot 26K-9002");
    bench.kill();
}

#[test]
fn control_text_of_a_label_cannot_act() {
    let site = Site::new();
    let mut bench = Bench::start(&site, &WHO);
    bench.see("Scan the label");
    bench.line("\u{1b}[2J\u{1b}]0;title\u{7}PRG");
    bench.line("[)>\u{1e}06\u{1d}PRG\u{202e}X\u{1d}Q1\u{1d}1T../../x\u{1e}\u{4}");
    bench.line("P../../etc/passwd");
    bench.see("no limit file");
    bench.line("=../x");
    bench.see("Part number?");
    bench.line("=../x");
    bench.see("no limit file");
    let all = bench.all();
    assert!(
        !all.contains('\u{1b}') && !all.contains('\u{202e}'),
        "{all:?}"
    );
    bench.kill();
}

/// Said with the plan, before anything is measured; the key is an invented person's.
#[test]
fn files_that_nobody_approved_are_said_with_the_plan() {
    let site = Site::new();
    let rules = "site: Invented\napproval: required\ntrusted_keys:\n  - {name: QE-02, role: quality_engineer, \
                 key: QE-02+19a5d1ec+AQwII+gvx2XSr48e0uoSHIPKnnpTc7/z5a8WlcJbrGB6}\n";
    std::fs::write(site.file("limits/site.yaml"), rules).expect("a site file");
    let mut bench = Bench::start(&site, &WHO);
    bench.line(LABEL);
    bench.see("would be held: limits/site.yaml demands approvals");
    bench.see("would be held: limits/parts/RG-9475-X7R.yaml was never approved");
    bench.see("would be held: limits/stations/BENCH-9.yaml was never approved");
    bench.kill();
}
