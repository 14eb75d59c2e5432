//! Single sampling by attributes: ISO 2859-1:1999, indexed by AQL for lot-by-lot inspection.
//!
//! Code letter from lot size and inspection level (10.1, Table 1); plan from code letter, AQL and severity
//! (10.3, Tables 2-A, 2-B, 2-C). An arrow is followed to the first plan in its direction, whose own
//! sample size is then used; the code letter of a [`Plan`] is the one after arrows.

mod tables;

use super::Undefined;
use serde::{Deserialize, Serialize};
use std::fmt;
use std::str::FromStr;
use tables::{CODE_LETTERS, LETTERS, NORMAL, REDUCED, SIZE_S, SIZES, SIZES_REDUCED, TIGHTENED, V};

/// The preferred AQLs up to 10, in percent nonconforming (or nonconformities per 100 items).
///
/// Above 10 the series goes on for nonconformities per 100 items alone, of which a part has at most one here.
pub const AQL_SERIES: [f64; 16] = [
    0.010, 0.015, 0.025, 0.040, 0.065, 0.10, 0.15, 0.25, 0.40, 0.65, 1.0, 1.5, 2.5, 4.0, 6.5, 10.0,
];

/// The smallest lot of Table 1.
pub const LOT_MIN: u64 = 2;

/// How far a number may be from an AQL of the series, relatively, to be taken for it: a percentage that went
/// through a ratio and back is off by a rounding.
const AQL_ROUNDING: f64 = 1e-9;

/// Inspection level of Table 1.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[allow(missing_docs)]
pub enum InspectionLevel {
    S1,
    S2,
    S3,
    S4,
    I,
    II,
    III,
}

/// Severity of inspection, ISO 2859-1:1999 clause 9.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
#[allow(missing_docs)]
pub enum Severity {
    Normal,
    Tightened,
    Reduced,
}

/// A word that is none of a fixed list.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct UnknownWord {
    #[allow(missing_docs)]
    pub found: String,
    /// The words that there are, as `normal, tightened, reduced`.
    pub expected: &'static str,
}

impl fmt::Display for UnknownWord {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(
            f,
            "found {:?}, expected one of {}",
            self.found, self.expected
        )
    }
}

impl std::error::Error for UnknownWord {}

impl InspectionLevel {
    /// In the order of Table 1.
    pub const ALL: [Self; 7] = [
        Self::S1,
        Self::S2,
        Self::S3,
        Self::S4,
        Self::I,
        Self::II,
        Self::III,
    ];

    fn column(self) -> usize {
        self as usize
    }
}

impl fmt::Display for InspectionLevel {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::S1 => "S-1",
            Self::S2 => "S-2",
            Self::S3 => "S-3",
            Self::S4 => "S-4",
            Self::I => "I",
            Self::II => "II",
            Self::III => "III",
        })
    }
}

impl FromStr for InspectionLevel {
    type Err = UnknownWord;

    fn from_str(text: &str) -> Result<Self, UnknownWord> {
        let known = Self::ALL.into_iter().find(|l| l.to_string() == text);
        known.ok_or_else(|| UnknownWord {
            found: text.to_owned(),
            expected: "S-1, S-2, S-3, S-4, I, II, III",
        })
    }
}

impl Severity {
    /// All three, as the standard lists them.
    pub const ALL: [Self; 3] = [Self::Normal, Self::Tightened, Self::Reduced];

    /// The table that holds its plans, as `ISO 2859-1:1999 Table 2-A`.
    pub fn table(self) -> &'static str {
        match self {
            Self::Normal => "ISO 2859-1:1999 Table 2-A",
            Self::Tightened => "ISO 2859-1:1999 Table 2-B",
            Self::Reduced => "ISO 2859-1:1999 Table 2-C",
        }
    }
}

impl fmt::Display for Severity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::Normal => "normal",
            Self::Tightened => "tightened",
            Self::Reduced => "reduced",
        })
    }
}

impl FromStr for Severity {
    type Err = UnknownWord;

    fn from_str(text: &str) -> Result<Self, UnknownWord> {
        let known = Self::ALL.into_iter().find(|s| s.to_string() == text);
        known.ok_or_else(|| UnknownWord {
            found: text.to_owned(),
            expected: "normal, tightened, reduced",
        })
    }
}

/// Sample size code letter: A to R without I and O, and S, which only an arrow leads to.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[allow(missing_docs)]
pub enum CodeLetter {
    A,
    B,
    C,
    D,
    E,
    F,
    G,
    H,
    J,
    K,
    L,
    M,
    N,
    P,
    Q,
    R,
    S,
}

impl CodeLetter {
    /// In the order of the tables.
    pub const ALL: [Self; 17] = [
        Self::A,
        Self::B,
        Self::C,
        Self::D,
        Self::E,
        Self::F,
        Self::G,
        Self::H,
        Self::J,
        Self::K,
        Self::L,
        Self::M,
        Self::N,
        Self::P,
        Self::Q,
        Self::R,
        Self::S,
    ];

    fn row(self) -> usize {
        self as usize
    }

    fn of_row(row: usize) -> Option<Self> {
        Self::ALL.get(row).copied()
    }

    /// Sample size of the letter's row. S has one under tightened inspection alone.
    pub fn sample_size(self, severity: Severity) -> Option<u64> {
        match (self, severity) {
            (Self::S, Severity::Tightened) => Some(SIZE_S),
            (_, Severity::Reduced) => SIZES_REDUCED.get(self.row()).copied(),
            _ => SIZES.get(self.row()).copied(),
        }
    }
}

impl fmt::Display for CodeLetter {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        fmt::Debug::fmt(self, f)
    }
}

impl FromStr for CodeLetter {
    type Err = UnknownWord;

    fn from_str(text: &str) -> Result<Self, UnknownWord> {
        let known = Self::ALL.into_iter().find(|l| l.to_string() == text);
        known.ok_or_else(|| UnknownWord {
            found: text.to_owned(),
            expected: "A, B, C, D, E, F, G, H, J, K, L, M, N, P, Q, R, S",
        })
    }
}

/// A single sampling plan: inspect n items; accept the lot at Ac or fewer nonconforming, reject it
/// at Re or more.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Plan {
    /// Of the plan used, after arrows.
    pub letter: CodeLetter,
    /// Sample size.
    pub n: u64,
    /// Acceptance number.
    pub ac: u64,
    /// Rejection number, Ac + 1.
    pub re: u64,
}

impl Plan {
    /// The plan in a lot of that many items: where the sample would equal or exceed the lot, every item is
    /// inspected (ISO 2859-1:1999 10.3, footnote to the tables), with the same acceptance number.
    pub fn for_lot(self, lot: u64) -> Self {
        Self {
            n: self.n.min(lot),
            ..self
        }
    }
}

/// Column of an AQL in percent in [`AQL_SERIES`].
pub fn aql_index(aql: f64) -> Option<usize> {
    AQL_SERIES
        .iter()
        .position(|known| (aql - known).abs() <= AQL_ROUNDING * known)
}

/// The nearest AQL of the series below and above a number that is not in it; of one that is, its neighbours.
pub fn neighbouring_aqls(aql: f64) -> (Option<f64>, Option<f64>) {
    let below = |known: &&f64| **known < aql * (1.0 - AQL_ROUNDING);
    let above = |known: &&f64| **known > aql * (1.0 + AQL_ROUNDING);
    (
        AQL_SERIES.iter().rev().find(below).copied(),
        AQL_SERIES.iter().find(above).copied(),
    )
}

/// Code letter of a lot of that many items, Table 1.
///
/// # Errors
/// [`Undefined::LotTooSmall`] for a lot below [`LOT_MIN`].
pub fn code_letter(lot: u64, level: InspectionLevel) -> Result<CodeLetter, Undefined> {
    if lot < LOT_MIN {
        return Err(Undefined::LotTooSmall {
            smallest: LOT_MIN,
            found: lot,
        });
    }
    CODE_LETTERS
        .iter()
        .find(|(largest, _)| lot <= *largest)
        .and_then(|(_, letters)| letters.get(level.column()))
        .and_then(|letter| CodeLetter::from_str(char::from(*letter).encode_utf8(&mut [0; 4])).ok())
        .ok_or(Undefined::NoPlan)
}

/// The plan for a code letter and an AQL in percent, arrows followed; Tables 2-A, 2-B, 2-C.
///
/// # Errors
/// [`Undefined::AqlNotInSeries`]; [`Undefined::NoPlan`] for the letter S other than tightened at AQL 0.025.
pub fn single_sampling(
    letter: CodeLetter,
    aql: f64,
    severity: Severity,
) -> Result<Plan, Undefined> {
    let column = aql_index(aql).ok_or(Undefined::AqlNotInSeries { found: aql })?;
    let ac = |letter: CodeLetter| match cell(letter, column, severity) {
        Some(ac) => u64::try_from(ac).ok(),
        None => None,
    };
    let start = letter.row();
    let down = || (start..=LETTERS).find_map(plan_row(&ac));
    let up = || (0..start).rev().find_map(plan_row(&ac));
    // An arrow that has no plan in its direction turns round: the table has one in the other.
    let found = match cell(letter, column, severity) {
        None => None,
        Some(V) => down().or_else(up),
        Some(_) => plan_row(&ac)(start).or_else(up).or_else(down),
    };
    let (letter, ac) = found.ok_or(Undefined::NoPlan)?;
    let n = letter.sample_size(severity).ok_or(Undefined::NoPlan)?;
    Ok(Plan {
        letter,
        n,
        ac,
        re: ac + 1,
    })
}

/// The plan for a lot: [`code_letter`], [`single_sampling`] and [`Plan::for_lot`] in one.
///
/// # Errors
/// As those.
pub fn plan_for(
    lot: u64,
    level: InspectionLevel,
    aql: f64,
    severity: Severity,
) -> Result<Plan, Undefined> {
    let letter = code_letter(lot, level)?;
    Ok(single_sampling(letter, aql, severity)?.for_lot(lot))
}

/// The plan of the next tighter AQL for the same code letter, which the switching score asks for
/// (ISO 2859-1:1999 9.3.3.2); none below AQL 0.010.
pub fn one_step_tighter(letter: CodeLetter, aql: f64, severity: Severity) -> Option<Plan> {
    let tighter = neighbouring_aqls(aql).0?;
    single_sampling(letter, tighter, severity).ok()
}

/// The cell as printed: an acceptance number or an arrow.
fn cell(letter: CodeLetter, column: usize, severity: Severity) -> Option<i8> {
    if letter == CodeLetter::S {
        let only = severity == Severity::Tightened && AQL_SERIES.get(column) == Some(&0.025);
        return only.then_some(1);
    }
    let table = match severity {
        Severity::Normal => &NORMAL,
        Severity::Tightened => &TIGHTENED,
        Severity::Reduced => &REDUCED,
    };
    table.get(letter.row())?.get(column).copied()
}

fn plan_row(
    ac: &impl Fn(CodeLetter) -> Option<u64>,
) -> impl Fn(usize) -> Option<(CodeLetter, u64)> + '_ {
    |row| {
        let letter = CodeLetter::of_row(row)?;
        Some((letter, ac(letter)?))
    }
}
