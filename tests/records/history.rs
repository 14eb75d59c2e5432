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
