//! What a source says.

use super::Trouble;
use serde::{Deserialize, Serialize};
use std::fmt;

/// What came from a source.
#[derive(Debug, Clone, PartialEq)]
pub enum Event {
    /// Nothing within the time.
    Nothing,
    /// A file grows and is not complete yet.
    #[allow(missing_docs)]
    Arriving { name: String, bytes: u64 },
    /// What the instrument is doing, in words.
    Step(String),
    /// A file that is left alone, and why; said once for each file.
    #[allow(missing_docs)]
    Ignored { name: String, why: String },
    /// A file that would be a sweep and stays unfinished or cannot be read; said once, and looked at
    /// further.
    #[allow(missing_docs)]
    Refused { name: String, why: Trouble },
    /// The source is gone; it is looked for further.
    Lost(Trouble),
    /// It is back.
    Recovered(String),
    /// A whole sweep.
    Sweep(Taken),
}

/// A whole sweep as it came.
#[derive(Debug, Clone, PartialEq)]
pub struct Taken {
    /// The file's name as it was saved, or the stem with its extension.
    pub name: String,
    /// What tells the reader how to read it, without the dot: `csv`, `s2p`.
    pub extension: String,
    /// The bytes that are judged and kept.
    pub bytes: Vec<u8>,
    /// How it is known to be whole.
    pub proof: Proof,
    /// To be kept, so that it is known again after an interruption.
    pub seen: Seen,
    /// SHA-256 of a sweep given before that was this one unfinished: that try is void.
    pub replaces: Option<String>,
}

/// How a sweep is known to be whole.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Proof {
    /// As long as the station file says or as the sweeps before, and closed by its writer.
    ClosedAndWhole,
    /// As long as the station file says or as the sweeps before, to its last line end.
    Whole,
    /// Reads without fault and did not change for the settling time.
    Settled,
    /// Does not read as a sweep; closed, or not changed for a long time. The reader's faults say what
    /// is wrong.
    Unreadable,
    /// Every answer of the instrument was whole, and all of one length.
    Answered,
}

impl fmt::Display for Proof {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Proof::ClosedAndWhole => "all its points, and closed by its writer",
            Proof::Whole => "all its points",
            Proof::Settled => "unchanged for the settling time",
            Proof::Unreadable => "not readable as a sweep",
            Proof::Answered => "every answer whole",
        })
    }
}

/// By what a file is known again.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Seen {
    /// The file's name in its folder.
    pub name: String,
    /// Its length.
    pub bytes: u64,
    /// Last change as the file system has it, in nanoseconds since 1970-01-01 UTC.
    pub modified: i64,
    /// SHA-256 of its bytes, where it was read.
    pub sha256: Option<String>,
}
