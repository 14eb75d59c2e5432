//! What is known of one file of the folder.

use super::decide::State;
use super::look::Stamp;
use super::whole::{Expected, Shape};
use crate::ledger::Hash;
use std::time::{Duration, Instant};

/// A sweep that was given under this name.
#[derive(Debug, Clone, Copy)]
pub struct Given {
    /// Digest of its bytes.
    pub sha256: Hash,
    /// How many there were.
    pub bytes: u64,
    /// Last change of the file then.
    pub modified: i64,
}

/// The bytes of a file as they were last read.
#[derive(Debug)]
pub struct Read {
    /// The file's version then.
    pub version: u64,
    /// Its stamp.
    pub stamp: Stamp,
    /// Its bytes.
    pub bytes: Vec<u8>,
    /// Their digest.
    pub sha256: Hash,
    /// What they hold, where they read as a sweep.
    pub shape: Option<Shape>,
}

/// A file of the folder.
#[derive(Debug)]
pub struct File {
    /// As last seen.
    pub stamp: Stamp,
    /// When it was first seen, or first changed after it was given.
    pub since: Instant,
    /// When the last change was seen.
    pub changed: Instant,
    /// Counts the changes.
    pub version: u64,
    /// Closed by its writer, nothing written since.
    pub closed: bool,
    /// Written, and not yet closed.
    pub writing: bool,
    /// There before the run, in this state or another.
    pub old: bool,
    /// The last sweep that was given under this name.
    pub given: Option<Given>,
    /// The bytes as last read.
    pub read: Option<Read>,
    /// The version of which something was said already.
    pub told: Option<u64>,
    /// The length that was last told.
    pub arriving: u64,
    /// Since when it cannot be read.
    pub barred: Option<Instant>,
    /// The listing in which it was last seen.
    pub listing: u64,
}

impl File {
    /// A file that is seen for the first time.
    pub fn new(stamp: Stamp, now: Instant) -> File {
        File {
            stamp,
            since: now,
            changed: now,
            version: 0,
            closed: false,
            writing: false,
            old: false,
            given: None,
            read: None,
            told: None,
            arriving: 0,
            barred: None,
            listing: 0,
        }
    }

    /// Something about the file changed.
    pub fn change(&mut self, now: Instant) {
        self.version += 1;
        self.changed = now;
    }

    /// What the decision needs.
    pub fn state(&self, read: &Read, expected: &Expected, again: bool, settle: Duration) -> State {
        State {
            length: read.shape.as_ref().map(|shape| expected.of(shape)),
            empty: read.bytes.is_empty(),
            again,
            closed: self.closed,
            writing: self.writing,
            overwritten: self.old || self.given.is_some(),
            quiet: self.changed.elapsed(),
            settle,
        }
    }
}
