//! The operator's run at the bench.
//!
//! `source` is where sweeps come from: a folder in which an analyser's software saves them, or an
//! instrument on the network.

pub mod source;
