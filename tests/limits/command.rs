//! `limits check`, `limits show`, `limits schema`.

use super::{FAULTY, LIMITS, LOT, SITE, STATION};
use serde_json::Value;
use std::ffi::OsString;
use std::fs;
use std::path::Path;
use unicode_width::UnicodeWidthStr;

struct Ran {
    status: u8,
    out: String,
    err: String,
}

fn run(site: &Path, words: &[&str]) -> Ran {
    let (mut out, mut err) = (Vec::new(), Vec::new());
    let start = [
        "reelgate".into(),
        "--site".into(),
        site.as_os_str().to_owned(),
    ];
    let args = start.into_iter().chain(words.iter().map(OsString::from));
    let status = reelgate::commands::run(args, &mut out, &mut err);
    let text = |bytes: Vec<u8>| {
        let text = String::from_utf8(bytes).expect("UTF-8");
        anstream::adapter::strip_str(&text).to_string()
    };
    Ran {
        status,
        out: text(out),
        err: text(err),
    }
}

/// A site with a limit file, a station file with its standards, and a lot.
fn site() -> tempfile::TempDir {
    let site = tempfile::tempdir().expect("a folder");
    let put = |path: &str, text: &str| {
        let path = site.path().join(path);
        fs::create_dir_all(path.parent().expect("a parent")).expect("a folder");
        fs::write(path, text).expect("a file");
    };
    put("limits/parts/RG-0475-X7R.yaml", LIMITS);
    put("limits/stations/BENCH-2.yaml", STATION);
    for standard in ["open", "short", "load"] {
        put(
            &format!("limits/stations/compensation/{standard}.csv"),
            "f,z\n",
        );
    }
    put("lots/26K-0457/lot.yaml", LOT);
    site
}

#[test]
fn check_finds_all_files_of_a_site() {
    let site = site();
    let ran = run(site.path(), &["limits", "check"]);
    assert_eq!((ran.status, ran.err.as_str()), (0, ""), "{}", ran.out);
    let words = ran.out.replace('\n', " ");
    assert!(words.contains("limits of RG-0475-X7R, revision 3, 6 bounds"));
    assert!(words.contains("station BENCH-2"));
    assert!(ran.out.ends_with("2 files valid, 0 invalid\n"));
    let lots = site.path().join("lots");
    let ran = run(
        site.path(),
        &["limits", "check", lots.to_str().expect("UTF-8")],
    );
    assert_eq!(ran.status, 0);
    assert!(
        ran.out
            .replace('\n', " ")
            .contains("lot 26K-0457 of RG-0475-X7R")
    );
}

#[test]
fn check_reads_the_site_file_too() {
    let site = site();
    let path = site.path().join("limits/site.yaml");
    fs::write(&path, SITE).expect("a file");
    let ran = run(site.path(), &["limits", "check"]);
    assert_eq!(ran.status, 0, "{}", ran.err);
    let words = ran.out.replace('\n', " ");
    let said = "site Goods-in, hall 2, approval required, 2 trusted keys";
    assert!(words.contains(said), "{words}");
    fs::write(&path, SITE.replace("approval:", "aproval:")).expect("a file");
    let ran = run(site.path(), &["limits", "check"]);
    assert_eq!(ran.status, 2);
    assert!(ran.err.contains("site.yaml:2:1"), "{}", ran.err);
    assert!(ran.err.contains("did you mean `approval`?"), "{}", ran.err);
}

#[test]
fn check_lists_every_fault_of_every_file() {
    let site = site();
    let path = |name: &str| site.path().join("limits/parts").join(name);
    fs::write(path("a.yaml"), FAULTY).expect("a file");
    fs::write(path("b.yml"), LIMITS).expect("a file");
    fs::remove_file(site.path().join("limits/stations/compensation/open.csv")).expect("gone");
    let ran = run(site.path(), &["limits", "check"]);
    assert_eq!(ran.status, 2);
    for words in [
        "did you mean `tolerance`?",
        "does not end in `.yaml`",
        "compensation/open.csv",
    ] {
        assert!(ran.err.contains(words), "{words}: {}", ran.err);
    }
    assert!(
        ran.out.ends_with("1 file valid, 3 invalid\n"),
        "{}",
        ran.out
    );
    assert!(ran.out.lines().all(|line| line.width() <= 80));

    let ran = run(site.path(), &["--format", "json", "limits", "check"]);
    assert_eq!((ran.status, ran.err.as_str()), (2, ""));
    let json: Value = serde_json::from_str(&ran.out).expect("JSON and nothing else");
    assert_eq!(json["valid"], false);
    let files = json["files"].as_array().expect("files");
    assert_eq!(files.len(), 4);
    let faulty = files
        .iter()
        .find(|f| f["path"].as_str().is_some_and(|p| p.ends_with("a.yaml")));
    let fault = &faulty.expect("the file")["faults"][0];
    assert_eq!(
        (fault["line"].as_u64(), fault["column"].as_u64()),
        (Some(1), Some(7))
    );
}

#[test]
fn check_says_when_there_is_nothing() {
    let empty = tempfile::tempdir().expect("a folder");
    let ran = run(empty.path(), &["limits", "check"]);
    assert_eq!(ran.status, 2);
    assert!(ran.err.contains("cannot be read"));
    fs::create_dir(empty.path().join("limits")).expect("a folder");
    let ran = run(empty.path(), &["limits", "check"]);
    assert_eq!(ran.status, 2);
    assert!(ran.err.contains("a folder without `.yaml` files"));
}

#[test]
fn a_file_of_no_kind_is_not_passed_over() {
    let folder = tempfile::tempdir().expect("a folder");
    fs::write(folder.path().join("x.yaml"), "color: red\n").expect("a file");
    let ran = run(
        folder.path(),
        &["limits", "check", folder.path().to_str().expect("UTF-8")],
    );
    assert_eq!(ran.status, 2);
    assert!(
        ran.err.contains("keys of neither a limit file"),
        "{}",
        ran.err
    );
}

#[test]
fn show_gives_the_absolute_windows() {
    let site = site();
    let ran = run(site.path(), &["limits", "show", "RG-0475-X7R"]);
    assert_eq!((ran.status, ran.err.as_str()), (0, ""));
    assert!(
        ran.out.lines().all(|line| line.width() <= 80),
        "{}",
        ran.out
    );
    insta::assert_snapshot!(ran.out);

    let ran = run(
        site.path(),
        &["--format", "json", "limits", "show", "RG-0475-X7R"],
    );
    let json: Value = serde_json::from_str(&ran.out).expect("JSON");
    assert_eq!(json["bounds"][0]["key"], "capacitance@1kHz");
    assert!(
        json["bounds"][0]["lower"]
            .as_f64()
            .is_some_and(|v| (v - 4.23e-6).abs() < 1e-17)
    );
    assert_eq!(json["acceptance"]["attributes"]["aql"]["A"], 0.65);
}

#[test]
fn show_says_what_is_wrong() {
    let site = site();
    let ran = run(site.path(), &["limits", "show", "RG-9999"]);
    assert_eq!((ran.status, ran.out.as_str()), (2, ""));
    assert!(ran.err.contains("RG-9999"));
    let ran = run(
        site.path(),
        &["--format", "json", "limits", "show", "RG-9999"],
    );
    let json: Value = serde_json::from_str(&ran.out).expect("JSON");
    assert_eq!(
        (ran.status, json["faults"][0]["code"].as_str()),
        (2, Some("unreadable"))
    );
}

#[test]
fn schemas_are_printed() {
    for (kind, title) in [
        ("limits", "Limit file"),
        ("station", "Station file"),
        ("lot", "Lot file"),
        ("site", "Site file"),
    ] {
        let ran = run(Path::new("."), &["limits", "schema", kind]);
        let json: Value = serde_json::from_str(&ran.out).expect("JSON");
        assert_eq!((ran.status, json["title"].as_str()), (0, Some(title)));
    }
}
