//! No bytes bring a reader down, and what it finds can always be shown.

use super::{FAULTY, LIMITS, LOT, SITE, STATION};
use proptest::prelude::*;
use reelgate::diagnostic::{Faults, as_json};
use reelgate::{limits, lot, site, station};
use unicode_width::UnicodeWidthStr;

fn showable(faults: Option<Faults>) {
    let Some(faults) = faults else { return };
    assert!(faults.count() > 0);
    for line in faults.to_string().lines() {
        assert!(line.width() <= 84, "{line}");
        assert!(!line.chars().any(char::is_control), "{line:?}");
    }
    assert!(as_json(&faults).is_array());
}

fn read_all(bytes: &[u8]) {
    showable(limits::read("a.yaml", bytes).err());
    showable(station::read("a.yaml", bytes).err());
    showable(lot::read("a.yaml", bytes).err());
    showable(site::read("a.yaml", bytes).err());
}

/// A file with pieces cut out, doubled, or overwritten with what YAML and quantities are made of.
fn mangled() -> impl Strategy<Value = String> {
    let files = prop_oneof![
        Just(LIMITS),
        Just(FAULTY),
        Just(STATION),
        Just(LOT),
        Just(SITE)
    ];
    let piece = prop_oneof![
        "[ \\[\\]{}:,&*!|>'\"%@`#?~<=.\\-\n0-9a-zµΩ±°]{0,6}",
        Just("\u{feff}".to_owned()),
        Just("\r\n".to_owned()),
        Just("---\n".to_owned()),
        Just("? ".to_owned()),
        Just("\\U0010FFFF".to_owned()),
        any::<String>(),
    ];
    let cut = (any::<prop::sample::Index>(), 0_usize..40, piece);
    (files, prop::collection::vec(cut, 1..6)).prop_map(|(file, cuts)| {
        let mut chars: Vec<char> = file.chars().collect();
        for (at, length, piece) in cuts {
            let from = at.index(chars.len().max(1)).min(chars.len());
            let to = (from + length).min(chars.len());
            chars.splice(from..to, piece.chars());
        }
        chars.into_iter().collect()
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(400))]

    #[test]
    fn arbitrary_bytes(bytes in prop::collection::vec(any::<u8>(), 0..300)) {
        read_all(&bytes);
    }

    #[test]
    fn arbitrary_text(text in "\\PC{0,200}") {
        read_all(text.as_bytes());
    }

    #[test]
    fn yaml_like_text(text in "([ \\[\\]{}:,&*!|>'\"%@`#?~<=.\\-\n0-9a-c]|: |- |\n  ){0,60}") {
        read_all(text.as_bytes());
    }

    #[test]
    fn mangled_files(text in mangled()) {
        read_all(text.as_bytes());
    }
}

#[test]
fn every_beginning_of_a_file() {
    for file in [LIMITS, STATION, LOT, SITE] {
        for length in 0..file.len() {
            read_all(&file.as_bytes()[..length]);
        }
    }
}
