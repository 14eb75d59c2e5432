//! The master tables of ISO 2859-1:1999, single sampling: 2-A (normal), 2-B (tightened), 2-C (reduced).
//!
//! Rows are code letters A to R, columns the AQLs 0.010 to 10; a number is the acceptance number Ac
//! (Re = Ac + 1), `V` an arrow down (use the first plan below), `U` an arrow up (the first plan
//! above). Tables 2-A and 2-B are the same as MIL-STD-105E Tables II-A and II-B. Table 2-C stands
//! here from memory of the standard, and was compared with a reprint of its columns AQL 1.0, 4.0 and
//! 10 in the national edition NTE INEN-ISO 2859-1; the other columns follow by the diagonals. Sample sizes
//! and places of the plans are those of MIL-STD-105E Table II-C; each Ac lies in the gap that the latter
//! leaves between its Ac and Re, and its plans with Ac 0, Re 2 are an arrow down here.

pub(super) const LETTERS: usize = 16;
pub(super) const COLUMNS: usize = 16;

/// Arrow down.
pub(super) const V: i8 = -1;
/// Arrow up.
pub(super) const U: i8 = -2;

pub(super) type Table = [[i8; COLUMNS]; LETTERS];

/// Table 2-A.
#[rustfmt::skip]
pub(super) const NORMAL: Table = [
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  V], // A
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V], // B
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  1], // C
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  1,  2], // D
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  1,  2,  3], // E
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  1,  2,  3,  5], // F
    [ V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  1,  2,  3,  5,  7], // G
    [ V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  1,  2,  3,  5,  7, 10], // H
    [ V,  V,  V,  V,  V,  V,  0,  U,  V,  1,  2,  3,  5,  7, 10, 14], // J
    [ V,  V,  V,  V,  V,  0,  U,  V,  1,  2,  3,  5,  7, 10, 14, 21], // K
    [ V,  V,  V,  V,  0,  U,  V,  1,  2,  3,  5,  7, 10, 14, 21,  U], // L
    [ V,  V,  V,  0,  U,  V,  1,  2,  3,  5,  7, 10, 14, 21,  U,  U], // M
    [ V,  V,  0,  U,  V,  1,  2,  3,  5,  7, 10, 14, 21,  U,  U,  U], // N
    [ V,  0,  U,  V,  1,  2,  3,  5,  7, 10, 14, 21,  U,  U,  U,  U], // P
    [ 0,  U,  V,  1,  2,  3,  5,  7, 10, 14, 21,  U,  U,  U,  U,  U], // Q
    [ U,  U,  1,  2,  3,  5,  7, 10, 14, 21,  U,  U,  U,  U,  U,  U], // R
];

/// Table 2-B without its row S (n = 3150), which has one plan, Ac 1 at AQL 0.025.
#[rustfmt::skip]
pub(super) const TIGHTENED: Table = [
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V], // A
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  V], // B
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  V,  V], // C
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  V,  V,  1], // D
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  V,  V,  1,  2], // E
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  V,  V,  1,  2,  3], // F
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  V,  V,  1,  2,  3,  5], // G
    [ V,  V,  V,  V,  V,  V,  V,  V,  0,  V,  V,  1,  2,  3,  5,  8], // H
    [ V,  V,  V,  V,  V,  V,  V,  0,  V,  V,  1,  2,  3,  5,  8, 12], // J
    [ V,  V,  V,  V,  V,  V,  0,  V,  V,  1,  2,  3,  5,  8, 12, 18], // K
    [ V,  V,  V,  V,  V,  0,  V,  V,  1,  2,  3,  5,  8, 12, 18,  U], // L
    [ V,  V,  V,  V,  0,  V,  V,  1,  2,  3,  5,  8, 12, 18,  U,  U], // M
    [ V,  V,  V,  0,  V,  V,  1,  2,  3,  5,  8, 12, 18,  U,  U,  U], // N
    [ V,  V,  0,  V,  V,  1,  2,  3,  5,  8, 12, 18,  U,  U,  U,  U], // P
    [ V,  0,  V,  V,  1,  2,  3,  5,  8, 12, 18,  U,  U,  U,  U,  U], // Q
    [ 0,  U,  V,  1,  2,  3,  5,  8, 12, 18,  U,  U,  U,  U,  U,  U], // R
];

/// Table 2-C.
#[rustfmt::skip]
pub(super) const REDUCED: Table = [
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  V], // A
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V], // B
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  V], // C
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  V,  1], // D
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  V,  1,  2], // E
    [ V,  V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  V,  1,  2,  3], // F
    [ V,  V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  V,  1,  2,  3,  5], // G
    [ V,  V,  V,  V,  V,  V,  V,  0,  U,  V,  V,  1,  2,  3,  5,  6], // H
    [ V,  V,  V,  V,  V,  V,  0,  U,  V,  V,  1,  2,  3,  5,  6,  8], // J
    [ V,  V,  V,  V,  V,  0,  U,  V,  V,  1,  2,  3,  5,  6,  8, 10], // K
    [ V,  V,  V,  V,  0,  U,  V,  V,  1,  2,  3,  5,  6,  8, 10,  U], // L
    [ V,  V,  V,  0,  U,  V,  V,  1,  2,  3,  5,  6,  8, 10,  U,  U], // M
    [ V,  V,  0,  U,  V,  V,  1,  2,  3,  5,  6,  8, 10,  U,  U,  U], // N
    [ V,  0,  U,  V,  V,  1,  2,  3,  5,  6,  8, 10,  U,  U,  U,  U], // P
    [ 0,  U,  U,  V,  1,  2,  3,  5,  6,  8, 10,  U,  U,  U,  U,  U], // Q
    [ U,  U,  U,  1,  2,  3,  5,  6,  8, 10,  U,  U,  U,  U,  U,  U], // R
];

/// Sample sizes of normal and tightened inspection, letters A to R.
#[rustfmt::skip]
pub(super) const SIZES: [u64; LETTERS] = [2, 3, 5, 8, 13, 20, 32, 50, 80, 125, 200, 315, 500, 800, 1250, 2000];

/// Sample sizes of reduced inspection, letters A to R.
#[rustfmt::skip]
pub(super) const SIZES_REDUCED: [u64; LETTERS] = [2, 2, 2, 3, 5, 8, 13, 20, 32, 50, 80, 125, 200, 315, 500, 800];

/// Sample size of letter S, tightened inspection at AQL 0.025 alone.
pub(super) const SIZE_S: u64 = 3150;

/// Table 1: the largest lot of each row and its code letters for S-1, S-2, S-3, S-4, I, II, III.
#[rustfmt::skip]
pub(super) const CODE_LETTERS: [(u64, [u8; 7]); 15] = [
    (       8, *b"AAAAAAB"),
    (      15, *b"AAAAABC"),
    (      25, *b"AABBBCD"),
    (      50, *b"ABBCCDE"),
    (      90, *b"BBCCCEF"),
    (     150, *b"BBCDDFG"),
    (     280, *b"BCDEEGH"),
    (     500, *b"BCDEFHJ"),
    (    1200, *b"CCEFGJK"),
    (    3200, *b"CDEGHKL"),
    (   10000, *b"CDFGJLM"),
    (   35000, *b"CDFHKMN"),
    (  150000, *b"DEGJLNP"),
    (  500000, *b"DEGJMPQ"),
    (u64::MAX, *b"DEHKNQR"),
];
