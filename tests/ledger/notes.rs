//! Signed notes and checkpoints (C2SP signed-note and tlog-checkpoint).

use crate::support::{ORIGIN, engineer, scratch, signer};
use proptest::prelude::*;
use reelgate::ledger::approval::{Approved, Statement};
use reelgate::ledger::{Checkpoint, Signer, Verifier, hex, witness};

fn head() -> Checkpoint {
    Checkpoint {
        origin: ORIGIN.to_owned(),
        size: 42,
        root: [5; 32],
    }
}

/// RFC 8032 section 7.1, test 1: secret and public key.
#[test]
fn keys_are_those_of_the_standard() {
    let secret: [u8; 32] = [
        0x9d, 0x61, 0xb1, 0x9d, 0xef, 0xfd, 0x5a, 0x60, 0xba, 0x84, 0x4a, 0xf4, 0x92, 0xec, 0x2c,
        0xc4, 0x44, 0x49, 0xc5, 0x69, 0x7b, 0x32, 0x69, 0x19, 0x70, 0x3b, 0xac, 0x03, 0x1c, 0xae,
        0x7f, 0x60,
    ];
    let signer = Signer::new("example.com/log", &secret).expect("a signer");
    let public = "d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a";
    assert_eq!(hex(&signer.verifier().public()), public);
}

#[test]
fn the_text_form() {
    let note = head().sign(&signer()).expect("a note");
    let lines: Vec<&str> = note.split('\n').collect();
    assert_eq!(
        lines[..4],
        [
            ORIGIN,
            "42",
            "BQUFBQUFBQUFBQUFBQUFBQUFBQUFBQUFBQUFBQUFBQU=",
            ""
        ]
    );
    assert!(lines[4].starts_with(&format!("\u{2014} {ORIGIN} ")));
    assert_eq!((lines[5], lines.len()), ("", 6));
    assert!(
        note.len() < 250,
        "{} bytes are too many for a small QR code",
        note.len()
    );
    assert_eq!(Checkpoint::open(&note, &signer().verifier()), Ok(head()));
}

#[test]
fn keys_in_text_form() {
    let verifier = signer().verifier();
    assert_eq!(Verifier::read(&verifier.text()), Ok(verifier.clone()));
    let text = verifier.text();
    for wrong in [
        "",
        "a+b",
        "a+00000000+AQ==",
        &text.replace(ORIGIN, "other"),
        &text.replacen('+', " ", 1),
    ] {
        assert!(Verifier::read(wrong).is_err(), "{wrong}");
    }
    for name in ["", "with space", "with+plus", "new\nline", "no\u{a0}break"] {
        assert!(Signer::new(name, &[1; 32]).is_err(), "{name:?}");
    }
    // A key of small order, under which any message has a valid signature.
    assert!(Verifier::new("weak", &[0; 32]).is_err());
}

#[test]
fn signatures_of_others_are_passed_over() {
    let text = head().text();
    let ours = signer().sign(&text).expect("a note");
    let theirs = engineer().sign(&text).expect("a note");
    let line = theirs.rsplit('\n').nth(1).expect("a line");
    let both = format!("{ours}{line}\n");
    assert_eq!(Checkpoint::open(&both, &signer().verifier()), Ok(head()));
    assert_eq!(Checkpoint::open(&both, &engineer().verifier()), Ok(head()));
    assert!(Checkpoint::open(&theirs, &signer().verifier()).is_err());
    // The right name with another key.
    let forger = Signer::new(ORIGIN, &[8; 32]).expect("a signer");
    let forged = head().sign(&forger).expect("a note");
    assert!(Checkpoint::open(&forged, &signer().verifier()).is_err());
}

#[test]
fn texts_that_are_no_checkpoint() {
    let key = signer();
    let root = "BQUFBQUFBQUFBQUFBQUFBQUFBQUFBQUFBQUFBQUFBQU=";
    for text in [
        "\n".to_owned(),
        format!("{ORIGIN}\n"),
        format!("{ORIGIN}\n042\n{root}\n"),
        format!("{ORIGIN}\n+42\n{root}\n"),
        format!("{ORIGIN}\n-1\n{root}\n"),
        format!("{ORIGIN}\n99999999999999999999\n{root}\n"),
        format!("{ORIGIN}\n42\nAAAA\n"),
        format!("\n42\n{root}\n"),
    ] {
        let note = key.sign(&text).expect("a note");
        assert!(
            Checkpoint::open(&note, &key.verifier()).is_err(),
            "{text:?}"
        );
    }
    assert!(key.sign("no newline").is_err());
    assert!(key.sign("a\ttab\n").is_err());
}

#[test]
fn approvals_say_what_they_are_for() {
    let statement = Statement {
        withdraws: false,
        ledger: ORIGIN.to_owned(),
        entries: 7,
        kind: Approved::Station,
        with: vec![(
            reelgate::ledger::sha256_hex(b"o"),
            "compensation/open 1.csv".to_owned(),
        )],
        file: "limits/parts/RG-0475-X7R.yaml".to_owned(),
        revision: None,
        sha256: reelgate::ledger::sha256_hex(b"x"),
        meaning: "approved".to_owned(),
    };
    let note = statement.sign(&engineer()).expect("a note");
    let key = engineer().verifier();
    assert_eq!(Statement::open(&note, &key), Ok(statement.clone()));
    assert!(statement.approves(ORIGIN, "limits/parts/RG-0475-X7R.yaml", b"x"));
    assert!(!statement.approves(ORIGIN, "limits/parts/RG-0475-X7R.yaml", b"y"));
    assert!(!statement.approves("other", "limits/parts/RG-0475-X7R.yaml", b"x"));
    assert!(!statement.approves(ORIGIN, "limits/parts/other.yaml", b"x"));
    // A checkpoint signed by the same key is no approval, and the other way round.
    let checkpoint = head().sign(&engineer()).expect("a note");
    assert!(Statement::open(&checkpoint, &key).is_err());
    assert!(Checkpoint::open(&note, &key).is_err());
    let injected = Statement {
        meaning: "x\nsha256: 00".to_owned(),
        ..statement.clone()
    };
    assert!(injected.sign(&engineer()).is_err());
    let silent = Statement {
        meaning: " ".to_owned(),
        ..statement
    };
    assert!(silent.sign(&engineer()).is_err());
}

#[test]
fn the_witness_file_grows() {
    let folder = scratch();
    let path = folder.path().join("witness.txt");
    assert_eq!(witness::read(&path).expect("none"), Vec::<String>::new());
    let mut notes = Vec::new();
    for size in 1..4 {
        let note = Checkpoint { size, ..head() }
            .sign(&signer())
            .expect("a note");
        witness::append(&path, &note).expect("appended");
        notes.push(note);
        assert_eq!(witness::read(&path).expect("notes"), notes);
    }
    std::fs::write(&path, "half a note\n").expect("written");
    assert!(witness::read(&path).is_err());
}

proptest! {
    #[test]
    fn a_changed_note_is_not_believed(place in any::<prop::sample::Index>(), bit in 0..7_u32) {
        let note = head().sign(&signer()).expect("a note");
        let mut bytes = note.clone().into_bytes();
        let place = place.index(bytes.len());
        bytes[place] ^= 1 << bit;
        if let Ok(text) = String::from_utf8(bytes) {
            prop_assert!(Checkpoint::open(&text, &signer().verifier()).is_err(), "{:?}", text);
        }
    }

    #[test]
    fn any_text_is_read_or_refused(text in any::<String>()) {
        prop_assert!(Checkpoint::open(&text, &signer().verifier()).is_err());
        prop_assert!(Verifier::read(&text).is_err());
    }
}
