//! The records: archive, store, Merkle tree, verification, and what they survive.

mod acts;
mod archive;
mod export;
mod faults;
mod many;
mod merkle;
mod notes;
mod opening;
mod support;
mod tamper;
mod trust;
