//! What the ledger and whoever checks it read back: records, entries, notes, proofs, keys.

use reelgate::ledger::approval::Statement;
use reelgate::ledger::{Checkpoint, Entry, Proof, Signer, Verifier};
use reelgate::lot::PastLot;
use reelgate::record::{from_bytes, to_bytes};
use std::sync::LazyLock;

/// A record as JSON.
pub fn record(bytes: &[u8]) {
    let Ok(record) = from_bytes(bytes) else {
        return;
    };
    PastLot::of(&record);
    let written = to_bytes(&record).expect("a record can be written");
    let again = from_bytes(&written).expect("a record reads what it writes");
    assert_eq!(to_bytes(&again).expect("written before"), written);
}

/// The bytes of an entry.
pub fn entry(bytes: &[u8]) {
    let Ok(text) = std::str::from_utf8(bytes) else {
        return;
    };
    let index = text
        .split_once("\"index\":")
        .and_then(|(_, rest)| rest.split_once(','))
        .and_then(|(digits, _)| digits.parse().ok());
    let Ok(entry) = Entry::read(index.unwrap_or(0), text) else {
        return;
    };
    assert_eq!(entry.bytes().expect("an entry can be written"), text);
    assert!(!entry.act.kind().is_empty());
}

/// The key of the corpus; its secret is known to everybody.
static KEY: LazyLock<Signer> =
    LazyLock::new(|| Signer::new("bench/test", &[7; 32]).expect("a key"));
static VERIFIER: LazyLock<Verifier> = LazyLock::new(|| KEY.verifier());

/// A signed note, a checkpoint, a proof, a statement of approval or a key.
pub fn note(bytes: &[u8]) {
    let Ok(text) = std::str::from_utf8(bytes) else {
        return;
    };
    if let Ok(opened) = VERIFIER.open(text) {
        assert!(text.starts_with(opened) && opened.ends_with('\n'));
    }
    if let Ok(head) = Checkpoint::open(text, &VERIFIER) {
        again(&head.text());
    }
    if let Ok(proof) = Proof::read(text) {
        let written = proof.text();
        assert_eq!(Proof::read(&written).as_ref(), Ok(&proof));
        assert!(proof.check(b"", &VERIFIER).is_err());
    }
    if let Ok(key) = Verifier::read(text) {
        assert_eq!(Verifier::read(&key.text()).as_ref(), Ok(&key));
    }
    if let Ok(key) = Signer::read(text) {
        assert_eq!(
            Signer::read(&key.secret_text()).map(|k| k.verifier()),
            Ok(key.verifier())
        );
    }
    // What a text says once it is signed; signing costs more than the rest together.
    if text.starts_with("reelgate ") || text.split('\n').nth(1).is_some_and(is_size) {
        again(text);
    }
}

fn is_size(line: &str) -> bool {
    !line.is_empty() && line.bytes().all(|b| b.is_ascii_digit())
}

/// Signs a text and reads it as a checkpoint and as a statement.
fn again(text: &str) {
    let Ok(signed) = KEY.sign(text) else { return };
    assert_eq!(VERIFIER.open(&signed), Ok(text));
    if let Ok(head) = Checkpoint::open(&signed, &VERIFIER) {
        // Lines after the third are passed over.
        assert!(text.starts_with(&head.text()), "{text:?}");
    }
    if let Ok(statement) = Statement::open(&signed, &VERIFIER) {
        let signed = statement.sign(&KEY);
        assert_eq!(
            signed.and_then(|note| Statement::open(&note, &VERIFIER)),
            Ok(statement)
        );
    }
}
