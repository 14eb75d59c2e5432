//! Pure mathematics of lot decisions: sampling tables, capability, outliers.
//! Knows nothing of capacitors, files or verdicts.
//!
//! Everything is a function of its arguments. A statistic that does not exist is an
//! [`Undefined`] that says why: never a zero, never a NaN. The functions of [`distributions`] alone
//! follow the convention of floating-point mathematics: an argument outside the domain gives NaN.

pub mod capability;
pub mod distributions;
pub(crate) mod lanes;
pub mod lot_to_lot;
pub mod mixture;
pub mod normal_scores;
pub mod normality;
pub mod operating_characteristic;
pub mod outliers;
pub mod percentile;
mod quadrature;
pub mod random;
mod root;
pub mod sampling;
pub mod share;
pub mod summary;
pub mod switching;
pub mod tolerance;
mod undefined;
pub mod variables;

pub use undefined::Undefined;
