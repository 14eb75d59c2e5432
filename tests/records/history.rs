//! What the lots before say about the next one of the same part from the same supplier.

use crate::site::{Site, run};
use serde_json::Value;
use std::fs;

/// Sample lot 26K-0466, which is rejected, as another lot: the sweeps differ in a preamble line.
fn rejected_lot(site: &Site, number: &str) {
    let from = "sample-lots/26K-0466";
    let folder = site.file(&format!("lots/{number}"));
    fs::create_dir_all(folder.join("sweeps")).expect("a folder");
    let text = fs::read_to_string(format!("{from}/lot.yaml")).expect("a lot file");
    fs::write(folder.join("lot.yaml"), text.replace("26K-0466", number)).expect("a lot file");
    for entry in fs::read_dir(format!("{from}/sweeps")).expect("sweeps") {
        let path = entry.expect("an entry").path();
        let mut bytes = format!("Reel;{number}\r\n").into_bytes();
        bytes.extend(fs::read(&path).expect("a sweep"));
        let to = folder
            .join("sweeps")
            .join(path.file_name().expect("a name"));
        fs::write(to, bytes).expect("a sweep");
    }
}

fn judged(site: &Site, number: &str) -> Value {
    let (status, out, err) = run(
        site,
        &["judge", "--format", "json", &format!("lots/{number}")],
    );
    assert_eq!(status, Some(1), "{err}");
    serde_json::from_str(&out).expect("a record")
}

/// ISO 2859-1:1999, 9.3.1: two of five or fewer lots not accepted on original inspection bring
/// tightened inspection. Judging a lot again does not count it again.
#[test]
fn two_rejected_lots_bring_tightened_inspection() {
    let site = Site::new();
    let severities: Vec<String> = ["26K-9001", "26K-9001", "26K-9002", "26K-9003"]
        .iter()
        .map(|number| {
            rejected_lot(&site, number);
            let record = judged(&site, number);
            record["sampling"]["classes"]["A"]["severity"]
                .as_str()
                .expect("a severity")
                .to_owned()
        })
        .collect();
    assert_eq!(severities, ["normal", "normal", "normal", "tightened"]);
    site.ok(&["records", "verify"]);
}

/// A person sets the severity; the lots after it are judged by it, say so, and are made again the same.
#[test]
fn a_severity_set_by_a_person_is_in_force_and_in_the_record() {
    let site = Site::new();
    rejected_lot(&site, "26K-9001");
    let before = judged(&site, "26K-9001");
    let part = before["lot"]["part"].as_str().expect("a part");
    assert_eq!(
        before["sampling"]["switching"]["classes"]["A"]["set"],
        Value::Null
    );
    let supplier = before["lot"]["supplier"]
        .as_str()
        .expect("a supplier")
        .to_owned();
    let reason = "two field returns \u{1b}]0;x\u{7} <script>";
    let set = [
        "records",
        "severity",
        part,
        "--supplier",
        &supplier,
        "--set",
        "tightened",
        "--reason",
        reason,
        "--by",
        "QE-02",
    ];
    let said = site.ok(&set);
    assert!(
        said.contains("tightened inspection: set to tightened by QE-02"),
        "{said}"
    );
    assert!(
        !said.contains('\u{1b}') && !said.contains('\u{7}'),
        "{said}"
    );
    let entry = site.json(&set);
    assert_eq!(entry["act"]["kind"], "severity");
    assert_eq!(entry["act"]["reason"], reason, "as it was written");
    assert_eq!(
        site.json(&["records", "list", "--severities"])
            .as_array()
            .map(Vec::len),
        Some(1)
    );

    let plan = site.json(&["plan", part, "--lot-size", "3000", "--supplier", &supplier]);
    assert_eq!(plan["severity"], "tightened");
    let other = site.json(&["plan", part, "--lot-size", "3000", "--supplier", "SUP-999"]);
    assert_eq!(other["severity"], "normal", "another supplier's lots");

    rejected_lot(&site, "26K-9002");
    let record = judged(&site, "26K-9002");
    let state = &record["sampling"]["switching"]["classes"]["A"];
    assert_eq!(
        plan["switching"], record["sampling"]["switching"],
        "plan and judge agree"
    );
    assert_eq!(state["severity"], "tightened");
    assert_eq!(record["sampling"]["classes"]["A"]["severity"], "tightened");
    assert_eq!(state["set"]["entry"], entry["index"]);
    assert_eq!(state["set"]["by"], "QE-02");
    assert_eq!(state["set"]["reason"], reason);
    assert_eq!(state["lots"], 0, "what went before does not count any more");
    let steps = record["explanation"].as_array().expect("a chain");
    assert!(
        steps
            .iter()
            .any(|s| s["result"] == "normal → tightened" && s["source"] == "ISO 2859-1:1999, 9.1"),
        "{steps:?}"
    );

    let name = record["record"].as_str().expect("a name");
    let shown = site.ok(&["records", "show", name]);
    assert!(
        shown.contains(&format!("by QE-02: severity of inspection of {part}")),
        "{shown}"
    );
    assert!(!shown.contains('\u{1b}'));
    let listed = site.ok(&["records", "list"]);
    assert!(
        listed.contains("Severity of inspection set by a person") && !listed.contains('\u{1b}')
    );
    site.ok(&["records", "verify"]);
}

/// ISO 2859-1:1999, 9.4: five lots not accepted on tightened inspection discontinue acceptance; it is
/// resumed as tightened inspection, when the supplier has acted.
#[test]
fn a_discontinued_supplier_is_resumed_by_a_person_as_tightened() {
    let site = Site::new();
    let numbers: Vec<String> = (1..=8).map(|n| format!("26K-90{n:02}")).collect();
    let mut last = Value::Null;
    for number in &numbers {
        rejected_lot(&site, number);
        last = judged(&site, number);
    }
    let state = &last["sampling"]["switching"]["classes"]["A"];
    assert_eq!(state["discontinued"], true);
    let lots = &state["changes"][1]["lots"];
    assert_eq!(
        lots,
        &serde_json::json!(numbers[2..7]),
        "the five that were not accepted"
    );
    assert!(
        last["reasons"]
            .as_array()
            .expect("reasons")
            .iter()
            .any(|r| r["code"] == "inspection_discontinued")
    );

    let supplier = last["lot"]["supplier"]
        .as_str()
        .expect("a supplier")
        .to_owned();
    let part = last["lot"]["part"].as_str().expect("a part").to_owned();
    let set = |severity: &str| {
        [
            "records",
            "severity",
            &part,
            "--supplier",
            &supplier,
            "--set",
            severity,
            "--reason",
            "corrective action 8812 audited",
            "--by",
            "QE-02",
        ]
        .map(str::to_owned)
    };
    let refused = set("normal");
    let said = site.fails(&refused.each_ref().map(String::as_str));
    assert!(said.contains("9.4") && said.contains("tightened"), "{said}");
    site.ok(&set("tightened").each_ref().map(String::as_str));
    rejected_lot(&site, "26K-9009");
    let next = judged(&site, "26K-9009");
    let state = &next["sampling"]["switching"]["classes"]["A"];
    assert_eq!(
        (&state["severity"], &state["discontinued"]),
        (&Value::from("tightened"), &Value::from(false))
    );
    assert!(state["why"].as_str().expect("why").contains("9.4"));
    site.ok(&["records", "verify"]);
}

#[test]
fn a_severity_that_cannot_be_is_refused() {
    let site = Site::new();
    let with = |part: &str, more: &[&str]| {
        let args = [
            &["records", "severity", part, "--supplier", "SUP-041"],
            more,
        ]
        .concat();
        site.fails(&args)
    };
    let by = ["--reason", "r", "--by", "QE-02"];
    let set = |severity: &'static str| [&["--set", severity], by.as_slice()].concat();
    assert!(with("RG-0475-X7R", &set("reduced")).contains("does not allow reduced"));
    assert!(with("RG-0475-X7R", &set("severe")).contains("normal, tightened, reduced"));
    assert!(with("RG-9999", &set("normal")).contains("RG-9999.yaml"));
    let class = [set("normal").as_slice(), &["--class", "Z"]].concat();
    assert!(with("RG-0475-X7R", &class).contains("no class `Z`"));
    let blank = ["--set", "normal", "--reason", " ", "--by", "QE-02"];
    assert!(with("RG-0475-X7R", &blank).contains("says why"));
}
