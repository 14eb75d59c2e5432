//! Every sample lot through the whole of the program, against the outcome that it was made for.
//!
//! `expected.json` of a lot says what must come out, `truth.json` what each part truly is: exact
//! values of the models behind the sweeps (see `sample-lots/README.md`). Two lots hold sweeps that
//! no code of this project computed: a circuit simulator's and a network library's.

use reelgate::ledger::Signer;
use serde_json::Value;
use std::collections::BTreeSet;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

fn lots() -> Vec<PathBuf> {
    let mut all: Vec<PathBuf> = fs::read_dir("sample-lots")
        .expect("sample-lots")
        .map(|entry| entry.expect("an entry").path())
        .filter(|path| path.join("lot.yaml").exists())
        .collect();
    all.sort();
    all
}

fn json(path: &Path) -> Value {
    let bytes = fs::read(path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    serde_json::from_slice(&bytes).unwrap_or_else(|e| panic!("{}: {e}", path.display()))
}

/// A site in a folder of its own that shares the limit files, so that records go there.
fn site() -> tempfile::TempDir {
    let site = tempfile::tempdir().expect("a folder");
    copy(Path::new("limits"), &site.path().join("limits"));
    let key = Signer::new("test/ledger", &[7; 32]).expect("a key");
    fs::write(site.path().join(KEY), key.secret_text()).expect("a key");
    site
}

/// The key of every site's ledger: certificates carry what it signs, and must come out the same.
const KEY: &str = "test-ledger.key";

fn copy(from: &Path, to: &Path) {
    fs::create_dir_all(to).expect("a folder");
    for entry in fs::read_dir(from).expect("limits") {
        let path = entry.expect("an entry").path();
        let target = to.join(path.file_name().expect("a name"));
        if path.is_dir() {
            copy(&path, &target);
        } else {
            fs::copy(&path, &target).expect("a copy");
        }
    }
}

/// Judges a lot; the exit status and the record on standard output.
fn judge(site: &Path, lot: &Path) -> (i32, Value) {
    let output = Command::new(env!("CARGO_BIN_EXE_reelgate"))
        .args([
            "judge",
            "--format",
            "json",
            "--now",
            "2026-11-02T08:00:00+01:00",
            "--ledger-key",
        ])
        .arg(site.join(KEY))
        .arg("--site")
        .arg(site)
        .arg(lot)
        .output()
        .expect("reelgate runs");
    let record = serde_json::from_slice(&output.stdout).unwrap_or_else(|e| {
        panic!(
            "{}: {e}\n{}",
            lot.display(),
            String::from_utf8_lossy(&output.stderr)
        )
    });
    (output.status.code().expect("an exit status"), record)
}

fn codes(notes: &Value) -> BTreeSet<String> {
    notes
        .as_array()
        .expect("a list")
        .iter()
        .map(|n| n["code"].as_str().expect("a code").to_owned())
        .collect()
}

fn names(list: &Value) -> BTreeSet<String> {
    list.as_array()
        .into_iter()
        .flatten()
        .map(|n| n.as_str().expect("a name").to_owned())
        .collect()
}

/// Parts with a verdict, each with the keys of the readings that have it.
fn parts_with(record: &Value, verdict: &str) -> Vec<(String, BTreeSet<String>)> {
    let parts = record["parts"].as_array().expect("parts");
    parts
        .iter()
        .filter(|p| p["verdict"] == verdict)
        .map(|p| {
            let readings = p["readings"].as_object().expect("readings");
            let keys = readings
                .iter()
                .filter(|(_, r)| r["verdict"] == verdict)
                .map(|(key, _)| key.clone());
            (
                p["part"].as_str().expect("a name").to_owned(),
                keys.collect(),
            )
        })
        .collect()
}

#[test]
fn every_lot_comes_out_as_it_was_made_to() {
    let site = site();
    let mut verdicts = BTreeSet::new();
    let mut wrong = Vec::new();
    for lot in lots() {
        let expected = json(&lot.join("expected.json"));
        let (status, record) = judge(site.path(), &lot);
        let verdict = record["verdict"].as_str().expect("a verdict").to_owned();
        let mut check = |what: &str, found: String, wanted: String| {
            if found != wanted {
                wrong.push(format!(
                    "{}: {what}: found {found}, expected {wanted}",
                    lot.display()
                ));
            }
        };
        check(
            "verdict",
            verdict.clone(),
            expected["verdict"].as_str().expect("a verdict").to_owned(),
        );
        let by_verdict = match verdict.as_str() {
            "accept" => 0,
            "reject" => 1,
            _ => 3,
        };
        check("exit status", status.to_string(), by_verdict.to_string());
        let (reasons, must) = (codes(&record["reasons"]), names(&expected["reasons"]));
        check(
            "reasons missing",
            format!("{:?}", must.difference(&reasons).collect::<Vec<_>>()),
            "[]".to_owned(),
        );
        let may: BTreeSet<String> = must
            .union(&names(&expected["also_possible"]))
            .cloned()
            .collect();
        check(
            "reasons too many",
            format!("{:?}", reasons.difference(&may).collect::<Vec<_>>()),
            "[]".to_owned(),
        );
        for key in ["required", "presented"] {
            check(
                key,
                record["sampling"][key].to_string(),
                expected["sampling"][key].to_string(),
            );
        }
        for (class, wanted) in expected["sampling"]["classes"]
            .as_object()
            .expect("classes")
        {
            let found = &record["sampling"]["classes"][class];
            for key in ["n", "ac", "re", "nonconforming", "undecided"] {
                check(
                    &format!("class {class} {key}"),
                    found[key].to_string(),
                    wanted[key].to_string(),
                );
            }
        }
        for verdict in ["nonconforming", "undecided"] {
            let found: Vec<_> = parts_with(&record, verdict);
            let wanted: Vec<_> = expected[verdict]
                .as_object()
                .expect("parts")
                .iter()
                .map(|(part, keys)| (part.clone(), names(keys)))
                .collect();
            check(verdict, format!("{found:?}"), format!("{wanted:?}"));
        }
        let unmeasured: Vec<String> = parts_with(&record, "unmeasured")
            .into_iter()
            .map(|(part, _)| part)
            .collect();
        let wanted: Vec<String> = expected["unmeasured"]
            .as_object()
            .expect("parts")
            .keys()
            .cloned()
            .collect();
        check(
            "unmeasured",
            format!("{unmeasured:?}"),
            format!("{wanted:?}"),
        );
        for (key, outliers) in expected["outliers"].as_object().expect("outliers") {
            check(
                key,
                format!("{:?}", names(&record["statistics"][key]["outliers"])),
                format!("{:?}", names(outliers)),
            );
        }
        verdicts.insert(verdict);
    }
    assert!(wrong.is_empty(), "\n{}", wrong.join("\n"));
    assert_eq!(verdicts.len(), 3, "the sample lots show every verdict");
}

#[test]
fn readings_agree_with_the_exact_values() {
    let site = site();
    let mut compared = 0;
    let mut wrong = Vec::new();
    for lot in lots() {
        let (expected, truth) = (
            json(&lot.join("expected.json")),
            json(&lot.join("truth.json")),
        );
        let (_, record) = judge(site.path(), &lot);
        for part in record["parts"].as_array().expect("parts") {
            let name = part["part"].as_str().expect("a name");
            if part["verdict"] == "unmeasured" {
                continue;
            }
            for (key, reading) in part["readings"].as_object().expect("readings") {
                let Some(exact) = truth["parts"][name][key].as_f64() else {
                    continue;
                };
                let characteristic = key.split('@').next().expect("a name");
                let Some(tolerance) = expected["tolerance"][characteristic].as_f64() else {
                    continue;
                };
                let Some(value) = reading["value"].as_f64() else {
                    continue;
                };
                compared += 1;
                if (value / exact - 1.0).abs() > tolerance {
                    wrong.push(format!(
                        "{} part {name} {key}: {value:e}, exactly {exact:e}",
                        lot.display()
                    ));
                }
            }
        }
    }
    assert!(
        compared > 1000,
        "only {compared} readings have an exact value"
    );
    assert!(
        wrong.is_empty(),
        "{} of {compared}:\n{}",
        wrong.len(),
        wrong[..wrong.len().min(30)].join("\n")
    );
}

#[test]
fn the_same_inputs_give_the_same_bytes() {
    for lot in lots().into_iter().take(3) {
        let files: Vec<Vec<Vec<u8>>> = (0..2)
            .map(|_| {
                let site = site();
                let (_, record) = judge(site.path(), &lot);
                let name = record["record"].as_str().expect("a name");
                let folder = site.path().join("records").join("certificates");
                ["pdf", "json"]
                    .map(|kind| {
                        fs::read(folder.join(format!("{name}.{kind}")))
                            .expect("a file of the record")
                    })
                    .to_vec()
            })
            .collect();
        assert!(
            files[0] == files[1],
            "{}: two sites, two different records",
            lot.display()
        );
        assert!(files[0][0].starts_with(b"%PDF-"));
    }
}

#[test]
fn judging_again_answers_with_the_record_that_exists() {
    let site = site();
    let lot = &lots()[0];
    let (_, first) = judge(site.path(), lot);
    let again = Command::new(env!("CARGO_BIN_EXE_reelgate"))
        .args([
            "judge",
            "--format",
            "json",
            "--now",
            "2027-01-01T00:00:00Z",
            "--site",
        ])
        .arg(site.path())
        .arg(lot)
        .output()
        .expect("reelgate runs");
    let second: Value = serde_json::from_slice(&again.stdout).expect("a record");
    assert_eq!(first, second);

    let name = first["record"].as_str().expect("a name");
    let path = site
        .path()
        .join("records")
        .join("certificates")
        .join(format!("{name}.json"));
    let changed = fs::read_to_string(&path).expect("the record").replacen(
        "\"verdict\": \"",
        "\"verdict\":  \"",
        1,
    );
    fs::write(&path, changed).expect("a change");
    let tampered = Command::new(env!("CARGO_BIN_EXE_reelgate"))
        .args(["judge", "--site"])
        .arg(site.path())
        .arg(lot)
        .output()
        .expect("reelgate runs");
    assert_eq!(tampered.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&tampered.stderr).contains("was changed after it was issued"));
}
