//! Pure mathematics of lot decisions: sampling tables, capability, outliers.
//! Knows nothing of capacitors, files or verdicts.
//!
//! Everything is a function of its arguments. A statistic that does not exist is an
//! [`Undefined`] that says why: never a zero, never a NaN. The functions of [`distributions`] alone
//! follow the convention of floating-point mathematics: an argument outside the domain gives NaN.

pub mod capability;
pub mod distributions;
pub mod operating_characteristic;
pub mod outliers;
mod root;
pub mod sampling;
pub mod summary;
mod undefined;

pub use undefined::Undefined;
