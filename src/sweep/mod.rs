//! Sweep files: bytes to complex impedance against frequency.
//!
//! Readers find out how a file is written; methods turn what the instrument delivers into
//! impedance. A file that cannot be read without guessing yields faults, never numbers.

mod arrange;
mod compensation;
mod cut;
mod delimited;
mod faults;
mod file;
mod method;
mod naming;
mod network;
mod raw;
mod text;
pub mod touchstone;
pub mod validity;

pub use compensation::Standards;
pub use delimited::heading_scale;
pub use file::{Extent, extent, read_file, read_standard};
pub use naming::{is_sweep_file, natural_order, order};
pub use network::{Network, Parameter};

use crate::diagnostic::Note;
use num_complex::Complex64;

/// Complex impedance of one part against frequency.
///
/// Frequencies are in hertz, finite, positive, strictly ascending; impedances in ohm, finite; the
/// two (and `level`, where there) have the same length, at least 2.
#[derive(Debug, Clone, PartialEq)]
pub struct Sweep {
    /// Hz
    pub frequency: Vec<f64>,
    /// Ω
    pub impedance: Vec<Complex64>,
    /// Voltage across the part in V rms, where the sweep carries it (two-channel files).
    pub level: Option<Vec<f64>>,
}

/// One try at one part: the sweep, or why there is none.
#[derive(Debug, Clone, PartialEq)]
pub struct Attempt {
    /// The part's number within the sample, as the file's stem or the `part` column has it.
    pub part: String,
    /// 1 for the first try, 2 for `017~2`, …
    pub attempt: u32,
    /// File name relative to the lot folder, with `/` between folders.
    pub file: String,
    /// SHA-256 of the file's bytes, lower-case hexadecimal.
    pub sha256: String,
    /// The sweep, or the faults that leave the part unmeasured (at least one).
    pub sweep: Result<Sweep, Vec<Note>>,
    /// What was found out or mended on reading (delimiter, sorting …).
    pub notes: Vec<Note>,
}

/// A file as it lies on the disk.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RawFile {
    /// Name relative to the lot folder, with `/` between folders.
    pub name: String,
    /// The bytes, untouched.
    pub bytes: Vec<u8>,
}
