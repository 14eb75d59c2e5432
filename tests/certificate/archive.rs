//! The pages by a validator of the archive standard that is not ours.
//!
//! The validator knows part 1 level B (ISO 19005-1), so the same pages are written to that part,
//! without attachments. What part 3 adds (associated files) is checked in `structure`.
//! Debian packages: libpdfbox2-java, libactivation-java, libjaxb-api-java, default-jre-headless.

use super::{PAPERS, cases, lots, rendered, sources, tools};
use reelgate::certificate::{Paper, render_archive_twin};
use reelgate::record;
use serde_json::Value;
use std::path::{Path, PathBuf};

const CLASSES: &str = "/usr/share/java/preflight.jar:/usr/share/java/pdfbox2.jar:\
                       /usr/share/java/fontbox2.jar:/usr/share/java/xmpbox.jar:\
                       /usr/share/java/commons-logging.jar:/usr/share/java/javax.activation.jar:\
                       /usr/share/java/jaxb-api.jar";

#[test]
fn a_validator_accepts_the_pages_as_part_1_level_b() {
    for (name, case) in cases() {
        // One lot on the other paper will do: it is the same code.
        let papers = if name == "rejected" {
            &PAPERS[..]
        } else {
            &PAPERS[..1]
        };
        for paper in papers {
            let twin = render_archive_twin(&case.record, &case.curves, &sources(&case), *paper)
                .expect("a document");
            let saved = tools::save(&twin.pdf);
            let said = tools::run(
                "java",
                &[
                    "-cp",
                    CLASSES,
                    "org.apache.pdfbox.preflight.Validator_A1b",
                    "FILE",
                ],
                &saved.path,
            );
            assert!(
                said.contains("is a valid PDF/A-1b file"),
                "{name} {paper:?}: {said}"
            );
        }
    }
}

/// Python with the packages of `tests/requirements.txt`; `tests/run` sets it up.
pub fn python() -> PathBuf {
    match std::env::var_os("REELGATE_PYTHON") {
        Some(python) => python.into(),
        None => Path::new(env!("CARGO_MANIFEST_DIR")).join(".venv/bin/python"),
    }
}

/// What pikepdf and zxing-cpp find in a document.
pub fn looked_at(pdf: &[u8]) -> Value {
    let saved = tools::save(pdf);
    let pages = tools::pages(&saved.path).len();
    let last = pages.to_string();
    let picture = saved.folder.path().join("last");
    let prefix = picture.to_str().expect("path").to_owned();
    let first = pages.saturating_sub(1).max(1).to_string();
    tools::run(
        "pdftoppm",
        &[
            "-r", "150", "-png", "-f", &first, "-l", &last, "FILE", &prefix,
        ],
        &saved.path,
    );
    let mut arguments = vec![
        concat!(
            env!("CARGO_MANIFEST_DIR"),
            "/tests/tools/certificate_check.py"
        )
        .to_owned(),
        saved.path.to_str().expect("path").to_owned(),
    ];
    for entry in std::fs::read_dir(saved.folder.path()).expect("folder") {
        let path = entry.expect("entry").path();
        if path.extension().is_some_and(|e| e == "png") {
            arguments.push(path.to_str().expect("path").to_owned());
        }
    }
    let arguments: Vec<&str> = arguments.iter().map(String::as_str).collect();
    let python = python();
    let said = tools::run(python.to_str().expect("path"), &arguments, &saved.path);
    serde_json::from_str(&said).expect("JSON")
}

#[test]
fn another_library_reads_the_same_identification_metadata_attachments_and_code() {
    for case in [lots::rejected(), lots::hostile()] {
        let found = looked_at(&rendered(&case, Paper::A4).pdf);
        assert_eq!(found["problems"], serde_json::json!([]));
        assert_eq!(found["pdfa_status"], "3B");
        // Both forms of the metadata agree, as the standard demands.
        let xmp = &found["metadata"];
        assert_eq!(
            found["title"],
            xmp["{http://purl.org/dc/elements/1.1/}title"]
        );
        assert_eq!(
            found["subject"],
            xmp["{http://purl.org/dc/elements/1.1/}description"]
        );
        assert_eq!(
            found["producer"],
            xmp["{http://ns.adobe.com/pdf/1.3/}Producer"]
        );
        let files = &found["attachments"];
        for (name, relationship, mime) in [
            ("record.json", "/Data", "application/json"),
            ("results.csv", "/Data", "text/csv"),
            ("limits.yaml", "/Source", "application/yaml"),
            ("station.yaml", "/Source", "application/yaml"),
        ] {
            assert_eq!(files[name]["relationship"], relationship, "{name}");
            assert_eq!(files[name]["mime"], mime, "{name}");
        }
        let json = record::to_bytes(&case.record).expect("bytes");
        let expected = format!(
            "record {}\nsha256 {}\n",
            case.record.record,
            record::sha256(&json)
        );
        assert_eq!(found["codes"], serde_json::json!([expected]));
    }
}
