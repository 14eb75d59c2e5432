//! Readings against limits: the verdict on a reading, a try, a part.
//!
//! No files, no statistics of lots, no lot. Unrounded values are judged; a value that could not be had is
//! never conforming.

mod bench;
mod conformance;
mod part;
mod tries;
mod zone;

pub use bench::{Ability, BenchAbility, abilities, undecidable};
pub use conformance::{Risks, acceptance_window, conformance_probability, global_risks};
pub(crate) use part::AGEING_UNKNOWN;
pub use part::{AttemptRecord, JudgedTry, PartRecord, judge_part, judge_try};
pub use tries::{Standing, TryOutcome, standing};
pub use zone::{ReadingRecord, judge_reading, zone};

use serde::{Deserialize, Serialize};

/// Verdict on a part, a try or a reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum PartVerdict {
    /// Inside every limit, by the decision rule in force.
    Conforming,
    /// Outside a limit, by the decision rule in force.
    Nonconforming,
    /// Inside the guard band of a limit under the decision rule in force.
    Undecided,
    /// No valid sweep of a capacitor, or a bounded characteristic that the sweep does not hold.
    Unmeasured,
}

impl PartVerdict {
    /// As files and tables spell it.
    pub fn name(self) -> &'static str {
        match self {
            PartVerdict::Conforming => "conforming",
            PartVerdict::Nonconforming => "nonconforming",
            PartVerdict::Undecided => "undecided",
            PartVerdict::Unmeasured => "unmeasured",
        }
    }

    /// The verdict on the whole from verdicts on its pieces: a proven nonconformity outweighs a
    /// missing value, a missing value an undecided one.
    pub fn of_all(verdicts: impl IntoIterator<Item = PartVerdict>) -> PartVerdict {
        let weight = |v: &PartVerdict| match v {
            PartVerdict::Conforming => 0,
            PartVerdict::Undecided => 1,
            PartVerdict::Unmeasured => 2,
            PartVerdict::Nonconforming => 3,
        };
        verdicts
            .into_iter()
            .max_by_key(weight)
            .unwrap_or(PartVerdict::Unmeasured)
    }
}
