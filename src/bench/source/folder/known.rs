//! What was given already: each sweep is given once, over interruptions too.

use super::file::Given;
use super::look::Stamp;
use crate::bench::source::Seen;
use crate::ledger::Hash;
use std::collections::HashMap;

/// Files that need not be given again.
#[derive(Debug, Default)]
pub struct Known {
    /// States of files by name. The digest is there where the file was given.
    states: HashMap<String, Vec<(u64, i64, Option<Hash>)>>,
    /// Sweeps that were given, by their digest: name and stamp of the file.
    digests: HashMap<Hash, (String, Stamp)>,
}

impl Known {
    /// What a run has kept.
    pub fn of(seen: &[Seen]) -> Known {
        let mut known = Known::default();
        for seen in seen {
            let digest = seen.sha256.as_deref().and_then(digest);
            let state = (seen.bytes, seen.modified, digest);
            known
                .states
                .entry(seen.name.clone())
                .or_default()
                .push(state);
            if let Some(digest) = digest {
                let stamp = Stamp {
                    bytes: seen.bytes,
                    modified: seen.modified,
                    changed: 0,
                    inode: 0,
                };
                known.digests.insert(digest, (seen.name.clone(), stamp));
            }
        }
        known
    }

    /// A sweep was given.
    pub fn add(&mut self, name: &str, digest: Hash, stamp: Stamp) {
        self.digests.insert(digest, (name.to_owned(), stamp));
    }

    /// Whether a file was in this state, and what was given then (nothing, where it is older than the
    /// run).
    pub fn by_stamp(&self, name: &str, stamp: &Stamp) -> Option<Option<Given>> {
        let states = self.states.get(name)?;
        let (.., digest) = states
            .iter()
            .rev()
            .find(|(bytes, modified, _)| (*bytes, *modified) == (stamp.bytes, stamp.modified))?;
        Some(digest.map(|sha256| Given {
            sha256,
            bytes: stamp.bytes,
            modified: stamp.modified,
        }))
    }

    /// Whether there was a file of this name.
    pub fn has_name(&self, name: &str) -> bool {
        self.states.contains_key(name)
    }

    /// The file in which these bytes came.
    pub fn by_digest(&self, digest: &Hash) -> Option<(&str, Stamp)> {
        let (name, stamp) = self.digests.get(digest)?;
        Some((name.as_str(), *stamp))
    }
}

/// A digest from its hexadecimal form.
fn digest(text: &str) -> Option<Hash> {
    let mut hash = Hash::default();
    let text = text.as_bytes();
    if text.len() != hash.len() * 2 {
        return None;
    }
    for (byte, pair) in hash.iter_mut().zip(text.chunks(2)) {
        let pair = std::str::from_utf8(pair).ok()?;
        *byte = u8::from_str_radix(pair, 16).ok()?;
    }
    Some(hash)
}
