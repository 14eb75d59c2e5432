//! Reelgate: incoming inspection of capacitor reels.
//!
//! The modules stand in the order the data flows; a module uses only those above it
//! (`tests/house.rs` enforces it). Parse once at the edge, compute in plain SI values
//! (hertz, ohm, farad, henry, volt, second, kelvin differences in degrees Celsius), format once
//! at the other edge. Files, clock and environment are touched in `ledger`, `bench` and `commands` alone.
#![forbid(unsafe_code)]
#![warn(missing_docs)]

pub mod quantity;
pub mod diagnostic;
pub mod keys;
pub mod site;
pub mod statistics;
pub mod label;
pub mod station;
pub mod sweep;
pub mod readings;
pub mod limits;
pub mod judgement;
pub mod lot;
pub mod record;
pub mod certificate;
pub mod ledger;
pub mod bench;
pub mod commands;
