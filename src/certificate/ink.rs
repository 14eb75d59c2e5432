//! The few colours of the document, in sRGB.
//!
//! Each also differs in lightness from those it stands beside, and none is the only carrier of a
//! meaning: verdicts have a word and a shape, limits have hatching, curves have a stroke of their own.

/// A colour, components 0 to 1.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Ink(pub f64, pub f64, pub f64);

pub(super) const TEXT: Ink = Ink(0.09, 0.13, 0.16);
pub(super) const QUIET: Ink = Ink(0.36, 0.41, 0.45);
pub(super) const RULE: Ink = Ink(0.72, 0.75, 0.77);
/// Lines of a plot's grid: there when looked for.
pub(super) const GRID: Ink = Ink(0.86, 0.88, 0.89);
pub(super) const PAPER: Ink = Ink(1.0, 1.0, 1.0);
/// Readings that conform: present, not loud.
pub(super) const CONFORMING: Ink = Ink(0.45, 0.58, 0.63);
pub(super) const CONFORMING_SOFT: Ink = Ink(0.76, 0.83, 0.85);
pub(super) const ACCEPT: Ink = Ink(0.04, 0.36, 0.42);
pub(super) const NONCONFORMING: Ink = Ink(0.70, 0.16, 0.06);
pub(super) const UNDECIDED: Ink = Ink(0.58, 0.38, 0.0);
pub(super) const UNMEASURED: Ink = Ink(0.45, 0.45, 0.45);
