//! The statistics against published tables, worked examples and high-precision references.
//!
//! The reference files stand in `tests/reference/statistics`; each names its source and how it was obtained.

mod capability;
mod distributions;
mod joint;
mod lot_to_lot;
mod mixture;
mod normality;
mod operating_characteristic;
mod outliers;
mod percentile;
mod reference;
mod robust;
mod sampling;
mod share;
mod simulation;
mod summary;
mod switching;
mod tolerance;
mod variables;
