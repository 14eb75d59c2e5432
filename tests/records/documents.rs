//! The PDF beside the ledger: signed, with characters that it cannot show, and on a disk that is full.

use super::site::{Site, run};
use serde_json::Value;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

/// Certificates and keys of the moment in a folder of the site.
fn keys(site: &Site) {
    let folder = site.file("keys");
    fs::create_dir_all(&folder).expect("a folder");
    let python = std::env::var_os("REELGATE_PYTHON").map_or_else(
        || Path::new(env!("CARGO_MANIFEST_DIR")).join(".venv/bin/python"),
        PathBuf::from,
    );
    let made = Command::new(python)
        .arg("tests/tools/signing_keys.py")
        .arg(&folder)
        .status();
    assert!(made.expect("Python runs").success());
}

fn judged(site: &Site, more: &[&str]) -> Value {
    let args = [&["judge", "--format", "json", "lots/26K-0001"], more].concat();
    let (status, out, err) = run(site, &args);
    assert_eq!(status, Some(3), "{err}");
    serde_json::from_str(&out).expect("a record")
}

const SIGNED: [&str; 4] = [
    "--sign-certificate",
    "keys/site.pem",
    "--sign-key",
    "keys/site.key",
];

#[test]
fn a_signed_record_is_proven_restored_reissued_exported_and_shown() {
    let site = Site::new();
    keys(&site);
    let record = judged(&site, &SIGNED);
    let pdf = site.certificate(&record, "pdf");
    let bytes = fs::read(&pdf).expect("a PDF");
    let form = b"/SubFilter /ETSI.CAdES.detached";
    let signed = |bytes: &[u8]| bytes.windows(form.len()).any(|w| w == form);
    assert!(signed(&bytes));
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
    let path = pdf.to_str().expect("a path").to_owned();
    assert_eq!(site.json(&["records", "verify", &path])["proven"], true);

    // Without its signature it is the document that the ledger knows, too.
    let end = b"%%EOF";
    let first = bytes
        .windows(end.len())
        .position(|w| w == end)
        .expect("an end")
        + end.len();
    fs::write(&pdf, &bytes[..first]).expect("written");
    assert_eq!(site.json(&["records", "verify"])["proven"], true);

    // Lost and judged again, it is what it was.
    fs::remove_file(&pdf).expect("removed");
    assert_eq!(judged(&site, &SIGNED), record);
    assert!(fs::read(&pdf).expect("a PDF") == bytes);

    let name = record["record"].as_str().expect("a name");
    let text = site.ok(&["records", "show", name]);
    assert!(text.contains("Signed by: "), "{text}");
    assert!(
        text.contains("Goods-in, demonstration site")
            || text.contains("Goods-in\\, demonstration site")
    );

    let reissue = [
        &["records", "reissue", name, "--reason", "mailed"][..],
        &SIGNED[..],
    ]
    .concat();
    site.ok(&reissue);
    assert!(signed(
        &fs::read(site.certificate(&record, "copy-1.pdf")).expect("a copy")
    ));
    let export = site.json(&["records", "export", name, "package"]);
    assert_eq!(export["certificate"], true);
    assert!(fs::read(site.file("package/data/certificate.pdf")).expect("a PDF") == bytes);
    assert_eq!(site.json(&["records", "verify"])["proven"], true);

    // One bit, in the document and in the signature.
    for at in [bytes.len() / 3, bytes.len() - 2000] {
        let mut changed = bytes.clone();
        changed[at] ^= 1;
        fs::write(&pdf, changed).expect("written");
        let wrong = site.wrong(&[]);
        assert!(
            wrong.iter().any(|(code, place)| {
                (code == "signature_invalid" || code == "certificate_unreadable")
                    && place.contains(name)
            }),
            "{wrong:?}"
        );
    }
}

#[test]
fn the_site_file_names_certificate_and_key() {
    let site = Site::new();
    keys(&site);
    fs::write(
        site.file("limits/site.yaml"),
        "site: Goods-in, hall 2\nsigning: {certificate: keys/site.pem, key: keys/site.key}\n",
    )
    .expect("written");
    let record = judged(&site, &[]);
    let name = record["record"].as_str().expect("a name");
    assert!(site.ok(&["records", "show", name]).contains("Signed by: "));
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
}

#[test]
fn a_key_that_cannot_sign_stops_before_anything_is_recorded() {
    let site = Site::new();
    keys(&site);
    for (certificate, key, more, words) in [
        (
            "site.pem",
            "other.key",
            None,
            "keys/other.key: the key for signing is not the one of the certificate",
        ),
        (
            "site.pem",
            "encrypted.key",
            None,
            "keys/encrypted.key: the key for signing is encrypted",
        ),
        (
            "site.pem",
            "encrypted.key",
            Some("wrong.txt"),
            "keys/encrypted.key: the key for signing cannot be opened",
        ),
        (
            "site.pem",
            "gone.key",
            None,
            "keys/gone.key: cannot be read, so nothing is signed",
        ),
        (
            "expired.pem",
            "site.key",
            None,
            "keys/expired.pem: the certificate for signing was valid until 2021-12-31",
        ),
        ("rsa.pem", "rsa.key", None, "curve P-256"),
    ] {
        let (certificate, key) = (format!("keys/{certificate}"), format!("keys/{key}"));
        let passphrase = more.map(|name| format!("keys/{name}"));
        let mut args = vec![
            "judge",
            "lots/26K-0001",
            "--sign-certificate",
            &certificate,
            "--sign-key",
            &key,
        ];
        if let Some(passphrase) = &passphrase {
            args.extend(["--sign-passphrase", passphrase]);
        }
        let err = site.fails(&args);
        assert!(err.contains(words), "{err}");
        assert!(!site.file("records").exists(), "{words}");
    }
    let opened = [
        "--sign-certificate",
        "keys/site.pem",
        "--sign-key",
        "keys/encrypted.key",
        "--sign-passphrase",
        "keys/passphrase.txt",
    ];
    judged(&site, &opened);
    let half = site.fails(&["judge", "lots/26K-0001", "--sign-key", "keys/site.key"]);
    assert!(half.contains("--sign-certificate"), "{half}");
}

#[test]
fn what_the_pdf_cannot_show_as_it_is_is_warned_of() {
    let site = Site::new();
    let file = site.file("lots/26K-0001/lot.yaml");
    let text = fs::read_to_string(&file).expect("a lot file");
    fs::write(
        &file,
        text.replace("supplier: SUP-041", "supplier: \"部品 قطعة 😀\""),
    )
    .expect("written");
    let (status, _, err) = run(&site, &["judge", "lots/26K-0001"]);
    assert_eq!(status, Some(3), "{err}");
    assert!(
        err.contains("warning: The typeface of the PDF lacks "),
        "{err}"
    );
    for code in ["U+90E8", "U+0642", "U+1F600"] {
        assert!(err.contains(code), "{code} not in {err}");
    }
    // Once: judged again it is the record that is there.
    let (_, _, err) = run(&site, &["judge", "lots/26K-0001"]);
    assert_eq!(err, "");
}

#[cfg(target_os = "linux")]
#[test]
fn a_disk_that_is_full_leaves_no_half_pdf_and_judging_again_mends_it() {
    let site = Site::new();
    let record = judged(&site, &[]);
    let whole = fs::read(site.certificate(&record, "pdf")).expect("a PDF");
    let largest_other = sizes(&site.file("records"))
        .into_iter()
        .filter(|(path, _)| path.extension().is_none_or(|e| e != "pdf"))
        .map(|(_, size)| size)
        .max()
        .expect("files");
    assert!(whole.len() as u64 > largest_other + 4096, "{largest_other}");
    fs::remove_dir_all(site.file("records")).expect("removed");
    // A limit on the size of a file stands for the disk: below the PDF, above all else. The signal
    // that goes with it is ignored, so that the write fails as on a full disk.
    let kibibytes = (largest_other + 2048) / 1024;
    let output = Command::new("bash")
        .args([
            "-c",
            &format!("trap '' XFSZ; ulimit -f {kibibytes}; exec \"$0\" judge lots/26K-0001"),
        ])
        .arg(env!("CARGO_BIN_EXE_reelgate"))
        .current_dir(site.file("."))
        .env("REELGATE_NOW", "2026-11-02T08:00:00+01:00")
        .output()
        .expect("bash runs");
    let err = String::from_utf8_lossy(&output.stderr).into_owned();
    assert_eq!(output.status.code(), Some(4), "{err}");
    assert!(
        err.contains("recorded, but") && err.contains("could not be written"),
        "{err}"
    );
    let left: Vec<PathBuf> = sizes(&site.file("records/certificates"))
        .into_iter()
        .map(|(path, _)| path)
        .collect();
    assert!(
        left.iter()
            .all(|path| path.extension().is_some_and(|e| e == "json")),
        "{left:?}"
    );
    let (status, _, err) = run(&site, &["judge", "lots/26K-0001"]);
    assert_eq!(status, Some(3), "{err}");
    let again = sizes(&site.file("records/certificates"));
    assert!(again.iter().any(|(path, size)| {
        path.extension().is_some_and(|e| e == "pdf") && size.abs_diff(whole.len() as u64) < 4096
    }));
    assert_eq!(site.json(&["records", "verify"])["proven"], true);
}

/// All files below a folder with their sizes.
#[cfg(target_os = "linux")]
fn sizes(folder: &Path) -> Vec<(PathBuf, u64)> {
    let mut out = Vec::new();
    let Ok(entries) = fs::read_dir(folder) else {
        return out;
    };
    for entry in entries {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            out.extend(sizes(&path));
        } else {
            out.push((path.clone(), fs::metadata(&path).expect("a file").len()));
        }
    }
    out
}
