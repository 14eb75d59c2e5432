//! Proofs and packages that can be checked elsewhere.

use crate::support::*;
use reelgate::ledger::bag::{Export, export};
use reelgate::ledger::disk::System;
use reelgate::ledger::{Ledger, LedgerError, Proof};
use std::path::Path;
use std::process::Command;

const RECORD: &str = "26K-0001-0123456789ab";

fn order(record: &str) -> Export<'_> {
    Export {
        record,
        certificate: Some(b"%PDF first"),
        time: time(50),
        program: "reelgate 0.1.0",
    }
}

#[test]
fn a_proof_in_text_form_proves_its_entry() {
    let folder = scratch();
    let records = folder.path().join("records");
    site(&records);
    let ledger = Ledger::open(&records).expect("a ledger");
    for index in 0..8 {
        let found = ledger.entry(index).expect("an entry");
        let bytes = found.entry.bytes().expect("bytes");
        let text = found.proof_text();
        let proof = Proof::read(&text).expect("a proof");
        assert_eq!(proof.text(), text);
        let head = proof
            .check(bytes.as_bytes(), ledger.verifier())
            .expect("proven");
        assert_eq!(head.size, index + 1);
        assert!(proof.check(b"another entry", ledger.verifier()).is_err());
        assert!(
            proof
                .check(bytes.as_bytes(), &engineer().verifier())
                .is_err()
        );
        let other = Proof {
            index: index ^ 1,
            ..proof.clone()
        };
        assert!(other.check(bytes.as_bytes(), ledger.verifier()).is_err());
        let extra = text.replacen('\n', "\nextra AAAA\n", 1);
        assert_eq!(Proof::read(&extra), Ok(proof));
    }
}

#[test]
fn texts_that_are_no_proof() {
    let good = format!(
        "c2sp.org/tlog-proof@v1\nindex 0\n{}\n\n",
        "A".repeat(43) + "="
    );
    assert!(Proof::read(&good).is_ok());
    for bad in [
        String::new(),
        "\n\n".to_owned(),
        good.replace("v1", "v2"),
        good.replace("index 0", "index 00"),
        good.replace("index 0", "index -1"),
        good.replace("index 0", "index 99999999999999999999"),
        good.replace("index 0\n", ""),
        good.replace("AAA=", "AAA"),
        good.replace("A=\n", "A=\nAAAA\n"),
        good.replace(
            "index 0\n",
            &format!("index 0\n{}", format!("{}=\n", "A".repeat(43)).repeat(64)),
        ),
    ] {
        assert!(Proof::read(&bad).is_err(), "{bad:?}");
    }
}

fn python() -> String {
    std::env::var("REELGATE_PYTHON").unwrap_or_else(|_| "python3".to_owned())
}

/// What the verifier that is not ours in code says: everything holds, or why not.
fn apart(package: &Path, key: Option<&str>) -> Result<String, String> {
    let mut command = Command::new(python());
    command.arg("tests/tools/verify_record.py").arg(package);
    if let Some(key) = key {
        command.args(["--key", key]);
    }
    let out = command.output().expect("python");
    let said = String::from_utf8(out.stdout).expect("text");
    assert!(
        out.stderr.is_empty(),
        "{}",
        String::from_utf8_lossy(&out.stderr)
    );
    match out.status.code() {
        Some(0) => Ok(said),
        Some(1) => Err(said),
        other => panic!("{other:?}: {said}"),
    }
}

struct Package {
    _folder: tempfile::TempDir,
    path: std::path::PathBuf,
    key: String,
}

fn package() -> Package {
    let folder = scratch();
    let records = folder.path().join("records");
    site(&records);
    let ledger = Ledger::open(&records).expect("a ledger");
    let path = folder.path().join("package");
    export(&ledger, &order(RECORD), &path, &System).expect("a package");
    let key = ledger.verifier().text();
    Package {
        _folder: folder,
        path,
        key,
    }
}

#[test]
fn a_package_is_verified_apart() {
    let package = package();
    let said = apart(&package.path, Some(&package.key)).expect("proven");
    assert!(
        said.starts_with("ok: 26K-0001-0123456789ab, accept: entry 0 of 8"),
        "{said}"
    );
    let said = apart(&package.path, None).expect("whole");
    assert!(said.contains("proves nothing of who made it"));
    let other = engineer().verifier().text();
    apart(&package.path, Some(&other)).expect_err("another key");
    // Two later entries are in it: issue and re-issue.
    let history = files(&package.path.join("data/history"));
    assert_eq!(history.len(), 4);
}

/// The manifests made to fit again, as somebody would who changes a package with care.
fn seal(package: &Path) {
    let digest = |path: &Path| reelgate::ledger::sha256_hex(&std::fs::read(path).expect("bytes"));
    let list = |names: Vec<std::path::PathBuf>| -> String {
        let line = |path: &std::path::PathBuf| {
            let name = path
                .strip_prefix(package)
                .expect("inside")
                .display()
                .to_string();
            format!("{}  {name}\n", digest(path))
        };
        names.iter().map(line).collect()
    };
    let manifest = list(files(&package.join("data")));
    std::fs::write(package.join("manifest-sha256.txt"), manifest).expect("written");
    let tags = ["bag-info.txt", "bagit.txt", "manifest-sha256.txt"].map(|name| package.join(name));
    std::fs::write(package.join("tagmanifest-sha256.txt"), list(tags.to_vec())).expect("written");
}

/// Every file of a package with a byte changed, at its beginning, middle or end, with the manifests
/// left and with the manifests made to fit; and every file removed.
#[test]
fn a_changed_package_is_found_apart() {
    let package = package();
    seal(&package.path);
    apart(&package.path, Some(&package.key)).expect("sealing alone changes nothing");
    for (k, file) in files(&package.path).into_iter().enumerate() {
        let name = file.strip_prefix(&package.path).expect("inside").to_owned();
        let good = std::fs::read(&file).expect("bytes");
        // Instructions for people and the package's own description prove nothing.
        let unproven = name.ends_with("README.txt") || name.ends_with("bag-info.txt");
        let place = [0, good.len() / 2, good.len() - 1][k % 3];
        let what = format!("{} at {place}", name.display());
        let copied = scratch();
        let path = copied.path().join("package");
        copy(&package.path, &path);
        let mut bad = good;
        bad[place] ^= 1;
        std::fs::write(path.join(&name), bad).expect("written");
        apart(&path, Some(&package.key)).expect_err(&what);
        if name.starts_with("data") && !unproven {
            seal(&path);
            apart(&path, Some(&package.key)).expect_err(&format!("{what}, sealed"));
        }
        let copied = scratch();
        let path = copied.path().join("package");
        copy(&package.path, &path);
        std::fs::remove_file(path.join(&name)).expect("removed");
        apart(&path, Some(&package.key)).expect_err(&format!("without {}", name.display()));
    }
    std::fs::write(package.path.join("data/extra.txt"), b"x").expect("written");
    apart(&package.path, Some(&package.key)).expect_err("a file too many");
}

#[test]
fn a_package_is_whole_or_not_there() {
    let folder = scratch();
    let records = folder.path().join("records");
    site(&records);
    let ledger = Ledger::open(&records).expect("a ledger");
    for at in 1.. {
        for fault in [Fault::Once(28), Fault::Once(5)] {
            let target = folder.path().join("package");
            let disk = Failing::new(at, fault);
            let outcome = export(&ledger, &order(RECORD), &target, disk.as_ref());
            let struck = disk.struck.load(std::sync::atomic::Ordering::SeqCst);
            assert_eq!(outcome.is_err(), struck);
            assert!(
                !folder.path().join("package.unfinished").exists(),
                "step {at}"
            );
            if target.exists() {
                apart(&target, None).expect("whole");
                std::fs::remove_dir_all(&target).expect("removed");
                if !struck {
                    assert!(at > 40, "{at} steps");
                    return;
                }
            }
        }
    }
}

#[test]
fn what_cannot_be_packed_is_refused() {
    let folder = scratch();
    let records = folder.path().join("records");
    site(&records);
    let ledger = Ledger::open(&records).expect("a ledger");
    let refused = export(
        &ledger,
        &order("unknown"),
        &folder.path().join("p"),
        &System,
    );
    assert!(matches!(refused, Err(LedgerError::Refused(_))));
    let refused = export(&ledger, &order(RECORD), &records, &System);
    assert!(matches!(refused, Err(LedgerError::Refused(_))));
    let entry = ledger.entry(0).expect("an entry").entry;
    let sweep = entry.objects_of("sweep").next().expect("a sweep");
    std::fs::write(ledger.archive().path(&sweep.sha256), b"").expect("emptied");
    let refused = export(&ledger, &order(RECORD), &folder.path().join("p"), &System);
    assert!(matches!(refused, Err(LedgerError::Damaged { .. })));
    assert!(!folder.path().join("p").exists());
}
