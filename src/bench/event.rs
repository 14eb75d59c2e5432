//! What happens in a run, as its journal has it: one line of JSON an event.
//!
//! A run is what its events make of it: reading the lines again brings it back to where it stopped.

use super::source::Seen;
use crate::judgement::PartVerdict;
use crate::lot::LotVerdict;
use serde::{Deserialize, Serialize};

/// Version of the journal's lines.
pub const JOURNAL: u32 = 1;

/// One line of a journal.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Line {
    /// When, RFC 3339 with offset.
    pub at: String,
    #[allow(missing_docs)]
    #[serde(flatten)]
    pub event: Event,
}

/// What the operator is asked because the limit file demands it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
#[allow(missing_docs)]
pub enum Question {
    Temperature,
    Drive,
    LastHeat,
}

/// What a check of the jig measures.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
#[allow(missing_docs)]
pub enum CheckKind {
    Open,
    Short,
    Reference,
}

impl CheckKind {
    /// As journals and file names spell it.
    pub fn name(self) -> &'static str {
        match self {
            CheckKind::Open => "open",
            CheckKind::Short => "short",
            CheckKind::Reference => "reference",
        }
    }
}

/// What a run begins with.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct Began {
    pub journal: u32,
    pub program: String,
    pub lot: String,
    pub part: String,
    pub quantity: u64,
    pub supplier: Option<String>,
    pub date_code: Option<String>,
    pub order: Option<String>,
    /// The label as typed, where one scan held it all.
    pub label: Option<String>,
    /// Every scan as typed.
    pub scans: Vec<String>,
    pub operator: String,
    pub station: String,
    /// The positions are drawn with it.
    pub seed: u64,
    /// Parts that the plan demands.
    pub parts: u64,
    /// SHA-256 of the limit file that the plan is from.
    pub limits_sha256: String,
    pub revision: String,
    /// What lay in the watched folder then.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub baseline: Option<Vec<Seen>>,
}

/// One thing that happened.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(tag = "event", rename_all = "snake_case")]
#[allow(missing_docs)]
pub enum Event {
    Began(Began),
    Answered {
        question: Question,
        text: String,
    },
    /// A sweep of a part is on the disk.
    Swept {
        part: String,
        attempt: u32,
        /// Relative to the lot folder.
        file: String,
        sha256: String,
        /// The name that it came with.
        from: String,
        verdict: PartVerdict,
        class: Option<String>,
        #[serde(default, skip_serializing_if = "Option::is_none")]
        seen: Option<Seen>,
    },
    /// The file of a try turned out to have been unfinished.
    Unfinished {
        part: String,
        attempt: u32,
    },
    /// A sweep that nothing waited for; it is kept beside and counts for nothing.
    NotUsed {
        file: String,
        sha256: String,
        from: String,
        #[serde(default, skip_serializing_if = "Option::is_none")]
        seen: Option<Seen>,
    },
    /// What lay in the watched folder when it was first looked at, where that was later than the beginning.
    Baseline {
        seen: Vec<Seen>,
    },
    /// A sweep of a check is on the disk.
    Checked {
        check: CheckKind,
        file: String,
        sha256: String,
        from: String,
        good: bool,
        /// What was found.
        found: String,
        #[serde(default, skip_serializing_if = "Option::is_none")]
        seen: Option<Seen>,
    },
    /// The operator wants the jig checked now.
    CheckAsked,
    /// The operator says that the last sweep was of a part in the wrong place.
    Misplaced {
        part: String,
        attempt: u32,
    },
    /// The operator measures a nonconforming part once more, as the limit file allows.
    Again {
        part: String,
    },
    /// The operator leaves an unmeasured part as it is.
    GivenUp {
        part: String,
    },
    /// Another person goes on.
    Operator {
        operator: String,
    },
    /// The plan demands this many parts now.
    Demanded {
        parts: u64,
        limits_sha256: String,
        revision: String,
    },
    Paused,
    Resumed,
    /// No more sweeps are wanted; from here on only judging and recording are left.
    Closing,
    Ended {
        record: String,
        verdict: LotVerdict,
    },
}

/// A line of the journal, with its line feed.
///
/// # Errors
/// Those of JSON, which these types do not have.
pub fn encode(line: &Line) -> serde_json::Result<Vec<u8>> {
    let mut bytes = serde_json::to_vec(line)?;
    bytes.push(b'\n');
    Ok(bytes)
}

/// The lines of a journal and the length of what can be relied on: a last line without its line feed was
/// being written when the machine stopped, and never took effect.
///
/// # Errors
/// The number of a line that is none, and why.
pub fn decode(bytes: &[u8]) -> Result<(Vec<Line>, usize), (usize, String)> {
    let whole = bytes
        .iter()
        .rposition(|b| *b == b'\n')
        .map_or(0, |at| at + 1);
    let lines = bytes[..whole].split_inclusive(|b| *b == b'\n').enumerate();
    let read =
        lines.map(|(i, line)| serde_json::from_slice(line).map_err(|e| (i + 1, e.to_string())));
    Ok((read.collect::<Result<_, _>>()?, whole))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn line(event: Event) -> Line {
        Line {
            at: "2026-10-05T09:12:00+02:00".to_owned(),
            event,
        }
    }

    #[test]
    fn a_torn_last_line_never_happened() {
        let lines = [
            line(Event::CheckAsked),
            line(Event::Again {
                part: "017".to_owned(),
            }),
        ];
        let bytes: Vec<u8> = lines
            .iter()
            .flat_map(|l| encode(l).expect("JSON"))
            .collect();
        let first = encode(&lines[0]).expect("JSON").len();
        for end in 0..=bytes.len() {
            let (read, whole) = decode(&bytes[..end]).expect("lines");
            let count = usize::from(end >= first) + usize::from(end == bytes.len());
            assert_eq!(read, lines[..count]);
            assert!(whole <= end && whole == [0, first, bytes.len()][count]);
        }
    }

    #[test]
    fn a_damaged_line_is_named() {
        let mut bytes = encode(&line(Event::Paused)).expect("JSON");
        bytes.extend_from_slice(b"{\"at\": nothing}\n");
        assert_eq!(decode(&bytes).expect_err("line 2").0, 2);
    }
}
