//! Electronic signatures, made with keys of the moment and validated by programs that are not ours:
//! pyHanko and pdfsig of poppler-utils.

use super::{archive::python, lots, rendered, tools};
use chrono::{DateTime, FixedOffset};
use reelgate::certificate::{Paper, Signer, as_issued, examine, render, sign};
use serde_json::Value;
use std::path::PathBuf;

/// Certificates and keys in a folder, as long as this lives.
struct Keys(tempfile::TempDir);

impl Keys {
    fn new() -> Keys {
        let folder = tempfile::tempdir().expect("temporary folder");
        let path = folder.path().to_owned();
        let script = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/tools/signing_keys.py");
        tools::run(
            python().to_str().expect("path"),
            &[script, path.to_str().expect("path")],
            &path,
        );
        Keys(folder)
    }

    fn path(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }

    fn bytes(&self, name: &str) -> Vec<u8> {
        std::fs::read(self.path(name)).unwrap_or_else(|e| panic!("{name}: {e}"))
    }

    fn signer(&self) -> Signer {
        Signer::read(&self.bytes("site.pem"), &self.bytes("site.key"), None).expect("a signer")
    }
}

fn time() -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339("2026-10-05T09:14:03+02:00").expect("a time")
}

/// A document that names its signer, unsigned and signed.
fn documents(signer: &Signer) -> (Vec<u8>, Vec<u8>) {
    let case = lots::rejected();
    let sources = reelgate::certificate::Sources {
        signature: Some(signer.signatory()),
        ..super::sources(&case)
    };
    let pdf = render(&case.record, &case.curves, &sources, Paper::A4)
        .expect("a document")
        .pdf;
    let signed = sign(pdf.clone(), signer, time()).expect("a signature");
    (pdf, signed)
}

fn validated(pdf: &[u8], keys: &Keys) -> Value {
    let saved = tools::save(pdf);
    let script = concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/tests/tools/signature_check.py"
    );
    let root = keys.path("site.pem");
    let said = tools::run(
        python().to_str().expect("path"),
        &[script, "FILE", root.to_str().expect("path")],
        &saved.path,
    );
    serde_json::from_str(&said).expect("JSON")
}

#[test]
fn two_outside_programs_accept_the_signature_and_it_covers_the_whole_file() {
    let keys = Keys::new();
    let (unsigned, signed) = documents(&keys.signer());
    assert!(signed.starts_with(&unsigned));
    let found = validated(&signed, &keys);
    for (what, expected) in [
        ("signatures", Value::from(1)),
        ("intact", true.into()),
        ("valid", true.into()),
        ("trusted", true.into()),
        ("bottom_line", true.into()),
        ("coverage", "ENTIRE_FILE".into()),
        ("digest", "sha256".into()),
        ("mechanism", "sha256_ecdsa".into()),
        // ETSI EN 319 142-1, 5.3: the form, and the time in the dictionary, not in the signature.
        ("subfilter", "/ETSI.CAdES.detached".into()),
        ("time", "2026-10-05T09:14:03+02:00".into()),
        (
            "attributes",
            serde_json::json!(["content_type", "message_digest", "signing_certificate_v2"]),
        ),
        ("unsigned_attributes", false.into()),
    ] {
        assert_eq!(found[what], expected, "{what} in {found}");
    }
    let saved = tools::save(&signed);
    let said = tools::run("pdfsig", &["-nocert", "FILE"], &saved.path);
    for words in [
        "Signature Validation: Signature is Valid.",
        "Total document signed",
        "ETSI.CAdES.detached",
        "SHA-256",
        "Goods-in, demonstration site",
    ] {
        assert!(said.contains(words), "{words} not in\n{said}");
    }
}

#[test]
fn a_signed_document_is_sound_still_and_says_who_signed() {
    let keys = Keys::new();
    let signer = keys.signer();
    let (_, signed) = documents(&signer);
    let saved = tools::save(&signed);
    tools::run("qpdf", &["--check", "FILE"], &saved.path);
    let text = tools::pages(&saved.path).join("\n");
    let bare: String = text.split_whitespace().collect();
    let by = signer.signatory();
    for fact in [&by.subject, &by.issuer, &by.serial, &by.sha256] {
        let fact: String = fact.split_whitespace().collect();
        assert!(bare.contains(&fact), "{fact}");
    }
    let found = super::archive::looked_at(&signed);
    assert_eq!(found["problems"], serde_json::json!([]));
    assert_eq!(found["pdfa_status"], "3B");
    // ISO 19005-3, 6.3.2 and 6.3.3: printed, not hidden, with an appearance that is a stream.
    let document = lopdf::Document::load_mem(&signed).expect("a PDF");
    let widgets: Vec<&lopdf::Dictionary> = document
        .objects
        .values()
        .filter_map(|o| o.as_dict().ok())
        .filter(|d| {
            d.get(b"Subtype")
                .and_then(|s| s.as_name())
                .is_ok_and(|s| s == b"Widget")
        })
        .collect();
    assert_eq!(widgets.len(), 1);
    let flags = widgets[0]
        .get(b"F")
        .and_then(|f| f.as_i64())
        .expect("flags");
    assert_eq!(flags & 4, 4);
    assert_eq!(flags & (1 | 2 | 32), 0);
    let look = widgets[0].get(b"AP").and_then(|a| a.as_dict()).expect("AP");
    let look = look.get(b"N").and_then(|n| n.as_reference()).expect("N");
    assert!(
        document
            .get_object(look)
            .and_then(|o| o.as_stream())
            .is_ok()
    );
}

#[test]
fn the_same_document_key_and_time_give_the_same_bytes() {
    let keys = Keys::new();
    let (first, second) = (documents(&keys.signer()), documents(&keys.signer()));
    assert!(first == second);
    let later = time() + chrono::Duration::seconds(1);
    assert!(sign(first.0, &keys.signer(), later).expect("a signature") != second.1);
}

#[test]
fn a_changed_byte_is_found_wherever_it_is() {
    let keys = Keys::new();
    let (unsigned, signed) = documents(&keys.signer());
    let held = examine(&signed).expect("a signature").expect("that holds");
    assert_eq!(held.document, unsigned);
    assert_eq!(&held.by, keys.signer().signatory());
    assert_eq!(as_issued(&signed), unsigned);
    assert!(examine(&unsigned).is_none());
    let places = (0..40).map(|k| k * (signed.len() - 1) / 39);
    let mut refused = 0;
    for at in places {
        let mut changed = signed.clone();
        changed[at] ^= 1;
        assert!(!matches!(examine(&changed), Some(Ok(_))), "byte {at}");
        assert!(as_issued(&changed) != unsigned, "byte {at}");
        refused += 1;
    }
    assert_eq!(refused, 40);
    // By the outside program too: a byte of a page, not of the file's structure.
    let mut changed = signed.clone();
    let at = unsigned.len() / 2;
    changed[at] ^= 1;
    let saved = tools::save(&changed);
    let said = tools::run("pdfsig", &["-nocert", "FILE"], &saved.path);
    assert!(said.contains("Digest Mismatch"), "{said}");
}

#[test]
fn what_is_appended_behind_the_signature_is_found() {
    let keys = Keys::new();
    let (_, signed) = documents(&keys.signer());
    for more in [
        &b"\n"[..],
        b"x",
        b"\n1 0 obj\n<<>>\nendobj\nstartxref\n0\n%%EOF",
    ] {
        let mut longer = signed.clone();
        longer.extend(more);
        assert!(!matches!(examine(&longer), Some(Ok(_))), "{more:?}");
    }
    // Another update that changes a page, and keeps the bytes of the document in front.
    let document = lopdf::Document::load_mem(&signed).expect("a PDF");
    let mut update = lopdf::IncrementalDocument::create_from(signed.clone(), document);
    let page = update
        .get_prev_documents()
        .page_iter()
        .next()
        .expect("a page");
    update
        .opt_clone_object_to_new_document(page)
        .expect("cloned");
    let mut longer = Vec::new();
    update.save_to(&mut longer).expect("saved");
    assert!(longer.starts_with(&signed));
    assert!(as_issued(&longer) == longer);
    assert_ne!(validated(&longer, &keys)["coverage"], "ENTIRE_FILE");
}

#[test]
fn certificates_and_keys_that_cannot_sign_are_refused_with_what_to_do() {
    let keys = Keys::new();
    let read = |certificate: &str, key: &str, passphrase: Option<&[u8]>| {
        let found = Signer::read(&keys.bytes(certificate), &keys.bytes(key), passphrase);
        found.map(|_| ()).map_err(|e| e.to_string())
    };
    assert_eq!(read("site.pem", "site.key", None), Ok(()));
    assert_eq!(
        read("site.pem", "encrypted.key", Some(b"correct horse")),
        Ok(())
    );
    for (certificate, key, passphrase, words) in [
        (
            "site.pem",
            "other.key",
            None,
            "is not the one of the certificate",
        ),
        (
            "site.pem",
            "encrypted.key",
            None,
            "is encrypted: name the file that holds its passphrase",
        ),
        (
            "site.pem",
            "encrypted.key",
            Some(&b"battery staple"[..]),
            "cannot be opened",
        ),
        ("site.pem", "sec1.key", None, "openssl pkcs8 -topk8"),
        ("site.pem", "damaged.key", None, "is damaged"),
        ("site.pem", "nothing.key", None, "is no private key"),
        ("site.pem", "site.pem", None, "is no private key"),
        ("site.pem", "rsa.key", None, "curve P-256"),
        ("site.pem", "p384.key", None, "curve P-256"),
        ("p384.pem", "p384.key", None, "curve P-256"),
        ("rsa.pem", "rsa.key", None, "curve P-256"),
        (
            "site.key",
            "site.key",
            None,
            "is no certificate in PEM form",
        ),
        ("nothing.key", "site.key", None, "is empty"),
    ] {
        let why = read(certificate, key, passphrase).expect_err(certificate);
        assert!(why.contains(words), "{certificate} {key}: {why}");
    }
    let at = |certificate: &str| {
        let signer = Signer::read(&keys.bytes(certificate), &keys.bytes("site.key"), None);
        let checked = signer.expect("a signer").valid_at(time());
        checked.map_err(|e| e.to_string())
    };
    assert_eq!(at("site.pem"), Ok(()));
    assert!(
        at("expired.pem")
            .expect_err("expired")
            .contains("was valid until 2021-12-31")
    );
    assert!(
        at("early.pem")
            .expect_err("early")
            .contains("is valid only from 2030-01-01")
    );
}

#[test]
fn what_is_no_document_of_the_program_is_not_signed() {
    let keys = Keys::new();
    let signer = keys.signer();
    let pdf = rendered(&lots::held_single(), Paper::A4).pdf;
    for bytes in [
        Vec::new(),
        b"%PDF-1.7\n".to_vec(),
        pdf[..pdf.len() / 2].to_vec(),
    ] {
        assert!(sign(bytes, &signer, time()).is_err());
    }
    let signed = sign(pdf, &signer, time()).expect("a signature");
    let again = sign(signed, &signer, time())
        .expect_err("twice")
        .to_string();
    assert!(again.contains("signed already"), "{again}");
}
