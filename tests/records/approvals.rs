//! Approvals: keys, who is trusted, lots held without them, and every way round them refused.

use crate::site::{Site, run};
use reelgate::keys::{Signer, Verifier, decrypt};
use reelgate::ledger::approval::{Approved, Statement};
use reelgate::ledger::{Act, Ledger, Made, Object, Query, sha256_hex};
use serde_json::Value;
use std::fs;
use std::process::Command;

const LIMITS: &str = "limits/parts/RG-0475-X7R.yaml";
const STATION: &str = "limits/stations/BENCH-1.yaml";
const SITE: &str = "limits/site.yaml";
const PASSPHRASE: &str = "seven reels of capacitors";

/// Makes a key; the line for the site file.
fn key(site: &Site, name: &str, role: &str) -> String {
    fs::write(site.file("passphrase"), format!("{PASSPHRASE}\n")).expect("a file");
    let out = format!("{name}.pem");
    let made = site.ok(&[
        "limits",
        "key",
        "--name",
        name,
        "--role",
        role,
        "--out",
        &out,
        "--passphrase-file",
        "passphrase",
    ]);
    let line = made.lines().last().expect("a line").to_owned();
    assert!(
        line.starts_with(&format!("  - {{name: {name}, role: {role}, key: {name}+")),
        "{made}"
    );
    line
}

fn demand(site: &Site, lines: &[&str]) {
    let text = format!(
        "site: Hall 2\napproval: required\ntrusted_keys:\n{}\n",
        lines.join("\n")
    );
    fs::write(site.file(SITE), text).expect("a site file");
}

fn approve<'a>(file: &'a str, key: &'a str) -> Vec<&'a str> {
    vec![
        "limits",
        "approve",
        file,
        "--key",
        key,
        "--meaning",
        "checked against the drawing",
        "--passphrase-file",
        "passphrase",
    ]
}

/// A site that demands approvals, with the key QE-02, and all files approved by it.
fn approved() -> Site {
    let site = Site::new();
    let line = key(&site, "QE-02", "quality_engineer");
    demand(&site, &[&line]);
    for file in [SITE, LIMITS, STATION] {
        site.ok(&approve(file, "QE-02.pem"));
    }
    site
}

/// Codes that speak of approvals, and all their words.
fn missing(record: &Value) -> (Vec<String>, String) {
    let reasons = record["reasons"].as_array().expect("reasons").iter();
    let text = |value: &Value| value.as_str().expect("text").to_owned();
    let of = reasons.filter(|r| text(&r["code"]).ends_with("_not_approved"));
    let (codes, words): (Vec<String>, Vec<String>) =
        of.map(|r| (text(&r["code"]), text(&r["text"]))).unzip();
    (codes, words.join("\n"))
}

fn change(site: &Site, file: &str, from: &str, to: &str) {
    let text = fs::read_to_string(site.file(file)).expect("a file");
    assert!(text.contains(from), "{from} in {text}");
    fs::write(site.file(file), text.replace(from, to)).expect("a file");
}

fn holds(site: &Site, codes: &[&str], words: &str) {
    let record = site.judge("26K-0001");
    assert_eq!(record["verdict"], "hold");
    let (found, text) = missing(&record);
    assert_eq!(found, codes, "{text}");
    assert!(text.contains(words), "{words:?} in {text}");
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
}

fn signer(site: &Site, name: &str) -> Signer {
    let pem = fs::read_to_string(site.file(&format!("{name}.pem"))).expect("a key");
    Signer::new(name, &decrypt(&pem, PASSPHRASE).expect("the passphrase")).expect("a name")
}

#[test]
fn a_key_is_encrypted_private_and_readable_by_openssl() {
    let site = Site::new();
    let line = key(&site, "QE-02", "quality_engineer");
    let text = line
        .split("key: ")
        .nth(1)
        .and_then(|t| t.strip_suffix('}'))
        .expect("a key");
    let public = Verifier::read(text).expect("a key");
    assert_eq!(public, signer(&site, "QE-02").verifier());
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        let mode = fs::metadata(site.file("QE-02.pem"))
            .expect("a file")
            .permissions()
            .mode();
        assert_eq!(mode & 0o777, 0o600);
    }
    let pem = fs::read_to_string(site.file("QE-02.pem")).expect("a key");
    assert!(pem.contains("BEGIN ENCRYPTED PRIVATE KEY"), "{pem}");
    // OpenSSL has the same public key from it (RFC 8410 section 4: the last 32 bytes).
    let openssl = |pass: &str| {
        Command::new("openssl")
            .args([
                "pkey",
                "-in",
                "QE-02.pem",
                "-passin",
                pass,
                "-pubout",
                "-outform",
                "DER",
            ])
            .current_dir(site.file(""))
            .output()
            .expect("openssl runs")
    };
    let out = openssl(&format!("pass:{PASSPHRASE}"));
    assert!(
        out.status.success(),
        "{}",
        String::from_utf8_lossy(&out.stderr)
    );
    assert_eq!(out.stdout[out.stdout.len() - 32..], public.public());
    assert!(!openssl("pass:seven reels of resistors").status.success());
    // And a key that OpenSSL made is read.
    let made = Command::new("openssl")
        .args([
            "genpkey",
            "-algorithm",
            "ed25519",
            "-aes256",
            "-pass",
            &format!("pass:{PASSPHRASE}"),
        ])
        .output()
        .expect("openssl runs");
    let pem = String::from_utf8(made.stdout).expect("PEM");
    assert!(decrypt(&pem, PASSPHRASE).is_ok());
    assert!(decrypt(&pem, "another passphrase").is_err());
}

#[test]
fn a_key_is_never_overwritten_and_needs_a_passphrase() {
    let site = Site::new();
    key(&site, "QE-02", "quality_engineer");
    let before = fs::read(site.file("QE-02.pem")).expect("a key");
    let make = |name: &str, out: &str, file: &str| {
        site.fails(&[
            "limits",
            "key",
            "--name",
            name,
            "--out",
            out,
            "--passphrase-file",
            file,
        ])
    };
    assert!(make("QE-02", "QE-02.pem", "passphrase").contains("is there already"));
    assert_eq!(fs::read(site.file("QE-02.pem")).expect("a key"), before);
    fs::write(site.file("short"), "1234567\n").expect("a file");
    assert!(make("QE-03", "QE-03.pem", "short").contains("shorter than 8"));
    fs::write(site.file("empty"), "\n").expect("a file");
    assert!(make("QE-03", "QE-03.pem", "empty").contains("holds no passphrase"));
    assert!(make("QE 03", "QE-03.pem", "passphrase").contains("cannot name a key"));
    assert!(make("QЕ-03", "QE-03.pem", "passphrase").contains("cannot name a key"));
    assert!(!site.file("QE-03.pem").exists());
    // Without a terminal and without a file there is nothing to ask.
    let mut asked = Command::new("setsid");
    asked.args([
        "--wait",
        env!("CARGO_BIN_EXE_reelgate"),
        "limits",
        "key",
        "--name",
        "QE-03",
        "--out",
        "QE-03.pem",
    ]);
    let out = asked.current_dir(site.file("")).output().expect("it runs");
    assert_eq!(out.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&out.stderr).contains("give --passphrase-file"));
}

#[test]
fn a_lot_is_held_until_site_limit_and_station_file_are_approved() {
    let site = Site::new();
    let line = key(&site, "QE-02", "quality_engineer");
    demand(&site, &[&line]);
    let all = [
        "site_not_approved",
        "limits_not_approved",
        "station_not_approved",
    ];
    holds(&site, &all, "was never approved");
    let first = site.ok(&approve(SITE, "QE-02.pem"));
    assert!(first.contains("approved by QE-02"), "{first}");
    holds(&site, &all[1..], "reelgate limits approve");
    site.ok(&approve(LIMITS, "QE-02.pem"));
    holds(&site, &all[2..], STATION);
    site.ok(&approve(STATION, "QE-02.pem"));

    let record = site.judge("26K-0001");
    assert_eq!(missing(&record).0, Vec::<String>::new());
    let approvals = record["approvals"].as_array().expect("approvals");
    let files: Vec<&str> = approvals
        .iter()
        .filter_map(|a| a["file"].as_str())
        .collect();
    assert_eq!(files, [SITE, LIMITS, STATION]);
    assert!(
        approvals
            .iter()
            .all(|a| a["by"] == "QE-02" && a["meaning"] == "checked against the drawing")
    );
    // The same again is the same record; an approval repeated is no new entry.
    assert_eq!(site.judge("26K-0001"), record);
    assert!(
        site.ok(&approve(LIMITS, "QE-02.pem"))
            .contains("(as before)")
    );
    assert_eq!(site.judge("26K-0001"), record);
    assert_eq!(site.json(&["records", "verify"])["proven"], true);

    // Seen by the operator, the quality engineer and the auditor.
    let (_, out, _) = run(&site, &["judge", "--explain", "lots/26K-0001"]);
    assert!(
        out.contains("approvals") && out.contains("QE-02 (quality"),
        "{out}"
    );
    let check = site.ok(&["limits", "check", LIMITS]);
    assert!(check.contains("approved by QE-02 in entry"), "{check}");
    let name = record["record"].as_str().expect("a name");
    let shown = site.ok(&["records", "show", name]);
    assert!(
        shown.contains("Approved: revision 3, by QE-02 (quality engineer), entry"),
        "{shown}"
    );
    let pdf = site.certificate(&record, "pdf");
    let out = Command::new("pdftotext")
        .arg("-layout")
        .arg(pdf)
        .arg("-")
        .output()
        .expect("pdftotext");
    let text = String::from_utf8_lossy(&out.stdout).into_owned();
    assert!(
        text.matches("checked against the drawing").count() >= 4,
        "{text}"
    );
}

#[test]
fn a_rejection_does_not_rest_on_limits_that_nobody_approved() {
    let site = Site::new();
    fs::create_dir_all(site.file("lots")).expect("a folder");
    crate::site::copy(
        std::path::Path::new("sample-lots/26K-0458"),
        &site.file("lots/26K-0458"),
    );
    let (status, _, _) = run(&site, &["judge", "lots/26K-0458"]);
    assert_eq!(status, Some(1));
    let line = key(&site, "QE-02", "quality_engineer");
    demand(&site, &[&line]);
    let (status, out, _) = run(&site, &["judge", "--format", "json", "lots/26K-0458"]);
    assert_eq!(status, Some(3));
    let record: Value = serde_json::from_str(&out).expect("JSON");
    let codes: Vec<&str> = record["reasons"]
        .as_array()
        .expect("reasons")
        .iter()
        .filter_map(|r| r["code"].as_str())
        .collect();
    assert_eq!(codes[0], "site_not_approved");
    assert!(codes.contains(&"nonconforming_over_ac"), "{codes:?}");
}

#[test]
fn a_limit_cannot_be_loosened_unseen() {
    let site = approved();
    holds(&site, &[], "");
    let approved_text = fs::read_to_string(site.file(LIMITS)).expect("a file");
    change(&site, LIMITS, "revision: 3", "revision: 4");
    holds(
        &site,
        &["limits_not_approved"],
        "another form is in force (revision 3, approved by QE-02 in entry",
    );
    let check = site.ok(&["limits", "check", LIMITS]);
    assert!(check.contains("‖ is not approved in this form"), "{check}");
    site.ok(&approve(LIMITS, "QE-02.pem"));
    holds(&site, &[], "");
    // The older revision, though it was approved once.
    fs::write(site.file(LIMITS), approved_text).expect("a file");
    holds(
        &site,
        &["limits_not_approved"],
        "is an older form (revision 3, approved by QE-02",
    );
    // A file with a fault cannot be approved, nor one that lots are not judged by.
    change(&site, LIMITS, "revision: 3", "revison: 3");
    let err = site.fails(&approve(LIMITS, "QE-02.pem"));
    assert!(
        err.contains("cannot be approved") && err.contains("did you mean `revision`?"),
        "{err}"
    );
    fs::copy(
        site.file("limits/parts/RG-0102-C0G.yaml"),
        site.file("RG-0102-C0G.yaml"),
    )
    .expect("a copy");
    let err = site.fails(&approve("RG-0102-C0G.yaml", "QE-02.pem"));
    assert!(
        err.contains("is not the file that lots are judged by"),
        "{err}"
    );
    let err = site.fails(&approve("lots/26K-0001/lot.yaml", "QE-02.pem"));
    assert!(err.contains("is a lot file"), "{err}");
}

#[test]
fn the_site_file_cannot_be_loosened_unseen() {
    let site = approved();
    let text = fs::read_to_string(site.file(SITE)).expect("a file");
    let put = |text: &str| fs::write(site.file(SITE), text).expect("a file");
    // The demand dropped.
    put(&text.replace("approval: required", "approval: optional"));
    holds(
        &site,
        &["site_not_approved"],
        "is not the one that QE-02 approved in entry 0",
    );
    // A key added, with which the operator then approves loosened limits.
    let own = key(&site, "OP-17", "quality_engineer");
    put(&format!("{text}{own}\n"));
    change(&site, LIMITS, "revision: 3", "revision: 4");
    for file in [SITE, LIMITS] {
        let err = site.fails(&approve(file, "OP-17.pem"));
        assert!(err.contains("is not a key that the site trusts"), "{err}");
    }
    holds(
        &site,
        &["site_not_approved", "limits_not_approved"],
        "put that one back",
    );
    // The trusted key replaced by one under the same name.
    fs::rename(site.file("QE-02.pem"), site.file("true.pem")).expect("moved");
    let false_line = key(&site, "QE-02", "quality_engineer");
    demand(&site, &[&false_line]);
    assert!(
        site.fails(&approve(SITE, "QE-02.pem"))
            .contains("is not a key that the site trusts")
    );
    holds(
        &site,
        &["site_not_approved", "limits_not_approved"],
        "put that one back",
    );
    // The file gone.
    fs::remove_file(site.file(SITE)).expect("gone");
    holds(
        &site,
        &["site_not_approved", "limits_not_approved"],
        "is gone: put it back",
    );
    // Whose key is trusted can do all of it.
    put(&format!("{text}{own}\n"));
    site.ok(&approve(SITE, "true.pem"));
    site.ok(&approve(LIMITS, "OP-17.pem"));
    holds(&site, &[], "");
}

#[test]
fn keys_approve_what_their_role_allows_while_they_are_trusted() {
    let site = Site::new();
    let engineer = key(&site, "QE-02", "quality_engineer");
    let metrologist = key(&site, "CAL-1", "metrologist");
    demand(&site, &[&engineer, &metrologist]);
    site.ok(&approve(SITE, "QE-02.pem"));
    site.ok(&approve(STATION, "CAL-1.pem"));
    let err = site.fails(&approve(LIMITS, "CAL-1.pem"));
    assert!(err.contains("approved by a quality engineer"), "{err}");
    site.ok(&approve(LIMITS, "QE-02.pem"));
    holds(&site, &[], "");
    // Revoked at the entry after its approval: that one goes on counting, later ones do not.
    let revoked = metrologist.replace("}", ", revoked_at_entry: 2}");
    demand(&site, &[&engineer, &revoked]);
    site.ok(&approve(SITE, "QE-02.pem"));
    holds(&site, &[], "");
    change(
        &site,
        STATION,
        "instrument:",
        "# looked at again\ninstrument:",
    );
    let err = site.fails(&approve(STATION, "CAL-1.pem"));
    assert!(err.contains("does not count at entry"), "{err}");
    // Revoked from before it on: it does not count any more.
    change(&site, STATION, "# looked at again\n", "");
    let revoked = metrologist.replace("}", ", revoked_at_entry: 1}");
    demand(&site, &[&engineer, &revoked]);
    site.ok(&approve(SITE, "QE-02.pem"));
    holds(
        &site,
        &["station_not_approved"],
        "is signed by CAL-1, whose key was revoked at entry 1",
    );
    // Another passphrase, no key, a key without a passphrase.
    fs::write(site.file("passphrase"), "another one of them\n").expect("a file");
    assert!(
        site.fails(&approve(STATION, "QE-02.pem"))
            .contains("passphrase is not that of the key")
    );
    assert!(
        site.fails(&approve(STATION, SITE))
            .contains("not an encrypted private key")
    );
    assert!(
        site.fails(&approve(STATION, "none.pem"))
            .contains("cannot be read")
    );
}

#[test]
fn an_approval_is_withdrawn_by_an_entry() {
    let site = approved();
    let before = site.judge("26K-0001");
    let withdraw = [
        "limits",
        "withdraw",
        LIMITS,
        "--key",
        "QE-02.pem",
        "--reason",
        "the drawing has changed",
        "--passphrase-file",
        "passphrase",
    ];
    let said = site.ok(&withdraw);
    assert!(said.contains("approval withdrawn by QE-02"), "{said}");
    holds(
        &site,
        &["limits_not_approved"],
        "QE-02 withdrew the approval",
    );
    assert!(
        site.fails(&withdraw)
            .contains("there is nothing to withdraw")
    );
    assert_eq!(site.judge("26K-0001")["supersedes"], before["record"]);
    site.ok(&approve(LIMITS, "QE-02.pem"));
    holds(&site, &[], "");
}

/// Whoever owns the machine can append what the ledger's key signs; it is found, and counts for nothing.
fn append(site: &Site, note: &str, by: &Signer, file: &str) {
    let records = site.file("records");
    let key = Signer::read(&fs::read_to_string(records.join("ledger.key")).expect("a key"))
        .expect("a key");
    let time = chrono::DateTime::parse_from_rfc3339("2026-11-02T08:00:00+01:00").expect("a time");
    let mut ledger = Ledger::open_for_writing(&records, key, time).expect("a ledger");
    let bytes = fs::read(site.file(file)).expect("a file");
    let file = Object {
        role: "limits",
        name: file,
        bytes: &bytes,
    };
    let made = Made {
        by: Some("QE-02"),
        time,
        program: "reelgate 0.0.1",
    };
    ledger
        .approve(&file, &[], note, &by.verifier(), &made)
        .expect("appended");
}

fn statement(site: &Site, file: &str) -> Statement {
    let ledger = Ledger::open(&site.file("records")).expect("a ledger");
    Statement {
        withdraws: false,
        ledger: ledger.verifier().name().to_owned(),
        entries: ledger.size().expect("a size"),
        kind: Approved::Limits,
        file: file.to_owned(),
        revision: Some("4".to_owned()),
        sha256: sha256_hex(&fs::read(site.file(file)).expect("a file")),
        with: Vec::new(),
        meaning: "checked against the drawing".to_owned(),
    }
}

fn notes(site: &Site) -> Vec<String> {
    let ledger = Ledger::open(&site.file("records")).expect("a ledger");
    let entries = ledger.find(Query::Kind("approval")).expect("entries");
    let note = |act: Act| match act {
        Act::Approval { statement, .. } => statement,
        _ => panic!("an approval"),
    };
    entries.into_iter().map(|entry| note(entry.act)).collect()
}

#[test]
fn forged_approvals_count_for_nothing_and_are_found() {
    let site = approved();
    change(&site, LIMITS, "revision: 3", "revision: 4");
    let true_notes = notes(&site);
    // By a key of one's own under the engineer's name.
    let own = Signer::new("QE-02", &[7; 32]).expect("a key");
    append(
        &site,
        &statement(&site, LIMITS).sign(&own).expect("a note"),
        &own,
        LIMITS,
    );
    let record = site.judge("26K-0001");
    let (codes, words) = missing(&record);
    assert_eq!(codes, ["limits_not_approved"]);
    assert!(
        words.contains("is not signed by a key that the site trusts"),
        "{words}"
    );
    let wrong = site.wrong(&[]);
    assert!(
        wrong
            .iter()
            .any(|(code, text)| code == "approval_invalid" && text.contains("entry 3")),
        "{wrong:?}"
    );
    assert_eq!(wrong.len(), 1, "{wrong:?}");

    // The library refuses what is not signed so: other bytes, another file, another ledger, another kind.
    let engineer = signer(&site, "QE-02");
    let good = statement(&site, LIMITS);
    let records = site.file("records");
    let key = Signer::read(&fs::read_to_string(records.join("ledger.key")).expect("a key"))
        .expect("a key");
    let time = chrono::DateTime::parse_from_rfc3339("2026-11-02T08:00:00+01:00").expect("a time");
    let mut ledger = Ledger::open_for_writing(&records, key, time).expect("a ledger");
    let size = ledger.size().expect("a size");
    let bytes = fs::read(site.file(LIMITS)).expect("a file");
    let file = Object {
        role: "limits",
        name: LIMITS,
        bytes: &bytes,
    };
    let made = Made {
        by: Some("QE-02"),
        time,
        program: "reelgate 0.0.1",
    };
    let other = |change: &dyn Fn(&mut Statement)| {
        let mut statement = good.clone();
        change(&mut statement);
        statement.sign(&engineer).unwrap_or_default()
    };
    let signed = other(&|_| ());
    let forged = [
        other(&|s| s.file = "limits/parts/RG-0102-C0G.yaml".to_owned()),
        other(&|s| s.ledger = "ledger-0123456789abcdef".to_owned()),
        other(&|s| s.sha256 = sha256_hex(b"other")),
        other(&|s| s.kind = Approved::Station),
        other(&|s| s.entries = size + 10),
        other(&|s| s.entries = 0),
        other(&|s| s.with = vec![(sha256_hex(b"x"), "x".to_owned())]),
        other(&|s| s.meaning = String::new()),
        other(&|s| s.meaning = "x\nfile: y".to_owned()),
        signed.replace("revision: 4", "revision: 5"),
        signed.replace("meaning: checked", "meaning: chеcked"),
        signed.split("\n\n").next().unwrap_or_default().to_owned(),
        signed.replace("\u{2014} QE-02 ", "\u{2014} QЕ-02 "),
        signed.replace("\u{2014} QE-02 ", "\u{2014}  "),
        String::new(),
    ]
    .into_iter()
    .chain(true_notes);
    for note in forged {
        let outcome = ledger.approve(&file, &[], &note, &engineer.verifier(), &made);
        assert!(outcome.is_err(), "{note}");
    }
    assert_eq!(ledger.size().expect("a size"), size);
}

#[test]
fn a_copy_of_an_earlier_approval_does_not_bring_it_back() {
    let site = approved();
    let old = fs::read_to_string(site.file(LIMITS)).expect("a file");
    let note = notes(&site)[1].clone();
    change(&site, LIMITS, "revision: 3", "revision: 4");
    site.ok(&approve(LIMITS, "QE-02.pem"));
    fs::write(site.file(LIMITS), old).expect("a file");
    // The program answers with the entry that is there; an entry by other means names another person.
    let records = site.file("records");
    let key = Signer::read(&fs::read_to_string(records.join("ledger.key")).expect("a key"))
        .expect("a key");
    let time = chrono::DateTime::parse_from_rfc3339("2026-11-02T08:00:00+01:00").expect("a time");
    let mut ledger = Ledger::open_for_writing(&records, key, time).expect("a ledger");
    let bytes = fs::read(site.file(LIMITS)).expect("a file");
    let file = Object {
        role: "limits",
        name: LIMITS,
        bytes: &bytes,
    };
    let made = Made {
        by: Some("OP-17"),
        time,
        program: "reelgate 0.0.1",
    };
    let trusted = signer(&site, "QE-02").verifier();
    assert!(ledger.approve(&file, &[], &note, &trusted, &made).is_err());
    drop(ledger);
    holds(&site, &["limits_not_approved"], "is an older form");
}

#[test]
fn sweeps_of_the_standards_are_part_of_a_station_file() {
    let site = Site::new();
    let line = key(&site, "QE-02", "quality_engineer");
    demand(&site, &[&line]);
    site.ok(&approve(SITE, "QE-02.pem"));
    site.ok(&approve("limits/stations/BENCH-2.yaml", "QE-02.pem"));
    let check = site.ok(&["limits", "check", "limits/stations/BENCH-2.yaml"]);
    assert!(check.contains("✔ is approved by QE-02"), "{check}");
    let sweep = site.file("limits/stations/compensation/bench-2-short.csv");
    let mut text = fs::read_to_string(&sweep).expect("a sweep");
    text.push('\n');
    fs::write(&sweep, text).expect("a sweep");
    let check = site.ok(&["limits", "check", "limits/stations/BENCH-2.yaml"]);
    assert!(check.contains("‖ is not approved in this form"), "{check}");
}

#[test]
fn an_exported_record_carries_its_approvals() {
    let site = approved();
    let record = site.judge("26K-0001");
    let name = record["record"].as_str().expect("a name");
    site.ok(&["records", "export", name, "package"]);
    let python = std::env::var("REELGATE_PYTHON").unwrap_or_else(|_| "python3".to_owned());
    let tool = fs::canonicalize("tests/tools/verify_record.py").expect("the verifier");
    let verify = || {
        let out = Command::new(&python)
            .arg(&tool)
            .arg(site.file("package"))
            .output()
            .expect("python");
        (
            out.status.code(),
            String::from_utf8_lossy(&out.stdout).into_owned()
                + &String::from_utf8_lossy(&out.stderr),
        )
    };
    assert_eq!(verify().0, Some(0), "{}", verify().1);
    let entries = fs::read_dir(site.file("package/data/approvals"))
        .expect("approvals")
        .count();
    assert_eq!(entries, 6);
    // Another key in the list, with the manifests made anew: no site file lists it.
    let keys = site.file("package/data/approval-keys.txt");
    let text = fs::read_to_string(&keys).expect("keys");
    let own = Signer::new("OP-17", &[7; 32])
        .expect("a key")
        .verifier()
        .text();
    fs::write(&keys, format!("{text}{own}\n")).expect("keys");
    remake_manifests(&site);
    let (status, said) = verify();
    assert_eq!(status, Some(1));
    assert!(said.contains("no site file lists"), "{said}");
    // No key at all.
    fs::write(&keys, "").expect("keys");
    remake_manifests(&site);
    assert!(verify().1.contains("not signed by a key"), "{}", verify().1);
}

fn remake_manifests(site: &Site) {
    for name in ["manifest-sha256.txt", "tagmanifest-sha256.txt"] {
        let path = site.file(&format!("package/{name}"));
        let text = fs::read_to_string(&path).expect("a manifest");
        let lines = text.lines().map(|line| {
            let file = &line[66..];
            let bytes = fs::read(site.file(&format!("package/{file}"))).expect("a file");
            format!("{}  {file}\n", sha256_hex(&bytes))
        });
        fs::write(&path, lines.collect::<String>()).expect("a manifest");
    }
}
