//! Further tries: the limit file says which replace the one before, and all of them stay in sight.

use crate::site::{Site, run};
use serde_json::Value;
use std::fs;
use std::process::Command;

/// Another sweep of the sample lot as a further try at a part.
fn try_again(site: &Site, part: &str, attempt: u32, sweep: &str) {
    let to = site.file(&format!("lots/26K-0001/sweeps/{part}~{attempt}.csv"));
    fs::copy(format!("sample-lots/26K-0457/sweeps/{sweep}.csv"), to).expect("a sweep");
}

fn part<'r>(record: &'r Value, name: &str) -> &'r Value {
    let mut parts = record["parts"].as_array().expect("parts").iter();
    parts.find(|part| part["part"] == name).expect("the part")
}

/// File, verdict and whether it counts, of each try.
fn tries(part: &Value) -> Vec<(String, String, bool)> {
    let text = |value: &Value| value.as_str().expect("text").to_owned();
    let all = part["attempts"].as_array().expect("tries").iter();
    all.map(|a| (text(&a["file"]), text(&a["verdict"]), a["counts"] == true))
        .collect()
}

fn has(record: &Value, code: &str) -> bool {
    let reasons = record["reasons"].as_array().expect("reasons");
    reasons.iter().any(|reason| reason["code"] == code)
}

/// Text of the PDF lot record.
fn document(site: &Site, record: &Value) -> String {
    let pdf = site.certificate(record, "pdf");
    let out = Command::new("pdftotext")
        .arg("-layout")
        .arg(pdf)
        .arg("-")
        .output();
    String::from_utf8_lossy(&out.expect("pdftotext runs").stdout).into_owned()
}

/// The record of the lot, which is rejected.
fn rejected(site: &Site) -> Value {
    let (status, out, err) = run(site, &["judge", "--format", "json", "lots/26K-0001"]);
    assert_eq!(status, Some(1), "{err}");
    serde_json::from_str(&out).expect("a record")
}

/// A limit that no part meets.
fn no_part_conforms(site: &Site, retest: &str) {
    let path = site.file("limits/parts/RG-0475-X7R.yaml");
    let text = fs::read_to_string(&path).expect("a limit file");
    let lines: Vec<String> = text
        .lines()
        .map(|line| match line.trim_start() {
            l if l.starts_with("esr_minimum:") => {
                "  esr_minimum: {max: 0.01 mΩ, class: A}".to_owned()
            }
            l if l.starts_with("retest:") => format!("retest: {retest}"),
            _ => line.to_owned(),
        })
        .collect();
    assert!(
        lines.iter().any(|line| line.starts_with("retest:")),
        "{text}"
    );
    fs::write(&path, lines.join("\n") + "\n").expect("a limit file");
}

#[test]
fn a_try_replaces_an_unmeasured_one_where_the_limit_file_allows_it() {
    let site = Site::new();
    fs::write(site.file("lots/26K-0001/sweeps/002.csv"), "no sweep\n").expect("a file");
    assert_eq!(
        part(&site.judge("26K-0001"), "002")["verdict"],
        "unmeasured"
    );
    try_again(&site, "002", 2, "002");
    let record = site.judge("26K-0001");
    assert!(!has(&record, "retest_not_allowed"));
    let found = tries(part(&record, "002"));
    assert_eq!(found.len(), 2, "{found:?}");
    assert_eq!((found[0].1.as_str(), found[0].2), ("unmeasured", false));
    assert_eq!((found[1].1.as_str(), found[1].2), ("conforming", true));
    // One is allowed, and no second one.
    fs::write(
        site.file("lots/26K-0001/sweeps/002~2.csv"),
        "no sweep either\n",
    )
    .expect("a file");
    try_again(&site, "002", 3, "002");
    let record = site.judge("26K-0001");
    assert!(has(&record, "retest_not_allowed"));
    let found = tries(part(&record, "002"));
    assert_eq!(
        found.iter().map(|t| t.2).collect::<Vec<_>>(),
        [false, true, false]
    );
    assert_eq!(part(&record, "002")["verdict"], "unmeasured");
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
}

#[test]
fn measuring_until_it_passes_is_refused_and_visible() {
    let site = Site::new();
    no_part_conforms(&site, "{unmeasured: 1, nonconforming: 0}");
    try_again(&site, "001", 2, "004");
    try_again(&site, "001", 3, "005");
    let record = rejected(&site);
    assert!(has(&record, "retest_not_allowed"));
    let first = part(&record, "001");
    assert_eq!(first["verdict"], "nonconforming");
    let found = tries(first);
    assert_eq!(
        found.iter().map(|t| t.2).collect::<Vec<_>>(),
        [true, false, false]
    );
    let text = document(&site, &record);
    for (file, verdict, _) in &found {
        let listed = |line: &str| line.contains(file.as_str()) && line.contains(verdict.as_str());
        assert!(text.lines().any(listed), "{file} in {text}");
    }
    assert!(
        text.contains("retest_not_allowed") || text.contains("Retest not allowed"),
        "{text}"
    );
}

#[test]
fn a_try_that_is_allowed_after_a_nonconforming_one_stays_beside_it() {
    let site = Site::new();
    no_part_conforms(&site, "{unmeasured: 1, nonconforming: 1}");
    try_again(&site, "001", 2, "004");
    let record = rejected(&site);
    assert!(!has(&record, "retest_not_allowed"));
    let found = tries(part(&record, "001"));
    assert_eq!(found.iter().map(|t| t.2).collect::<Vec<_>>(), [false, true]);
    let text = document(&site, &record);
    assert!(
        found.iter().all(|(file, ..)| text.contains(file.as_str())),
        "{text}"
    );
}

#[test]
fn one_sweep_for_two_parts_is_found_by_its_bytes() {
    let site = Site::new();
    let sweeps = site.file("lots/26K-0001/sweeps");
    fs::copy(sweeps.join("001.csv"), sweeps.join("004.csv")).expect("a copy");
    let record = site.judge("26K-0001");
    assert!(has(&record, "duplicate_sweep"), "{}", record["reasons"]);
    // As a further try at another part too.
    fs::remove_file(sweeps.join("004.csv")).expect("gone");
    fs::write(sweeps.join("002.csv"), "no sweep\n").expect("a file");
    fs::copy(sweeps.join("001.csv"), sweeps.join("002~2.csv")).expect("a copy");
    assert!(has(&site.judge("26K-0001"), "duplicate_sweep"));
}
