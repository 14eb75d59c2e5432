//! What a fuzz target does with bytes, one function for each parser: it may refuse them or take
//! them, and what it takes must be sound. `tests/fuzz_corpus.rs` calls the same functions.
//!
//! A function panics where a parser breaks its word.

mod ledgers;
mod people;
mod sweeps;
mod texts;

pub use ledgers::{entry, note, record};
pub use people::{limits, lot, site, station};
pub use sweeps::{delimited, touchstone};
pub use texts::{label, quantity};

use std::sync::atomic::AtomicBool;

/// Whether the checks that cost more than reading are made of every input.
pub static THOROUGH: AtomicBool = AtomicBool::new(false);

/// A target: its name, which is that of its corpus, and its function.
pub type Target = (&'static str, fn(&[u8]));

/// Every target.
pub const TARGETS: [Target; 11] = [
    ("limits", limits),
    ("station", station),
    ("lot", lot),
    ("site", site),
    ("delimited", delimited),
    ("touchstone", touchstone),
    ("label", label),
    ("quantity", quantity),
    ("record", record),
    ("entry", entry),
    ("note", note),
];
