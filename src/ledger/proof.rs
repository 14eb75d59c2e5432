//! Proofs that an entry is in the ledger, in the text form of C2SP `tlog-proof`: index, inclusion
//! proof and checkpoint. With the entry and the ledger's public key, such a text can be checked
//! without the ledger and without this program.

use super::checkpoint::Checkpoint;
use super::digest::Hash;
use super::merkle::{leaf_hash, verify_inclusion};
use crate::keys::{NoteError, Verifier};
use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;

const FORM: &str = "c2sp.org/tlog-proof@v1";

/// More hashes than any proof has: a tree of 2^64 entries is 64 high.
const MAX_HASHES: usize = 64;

/// That an entry is in the tree of a checkpoint.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Proof {
    /// Index of the entry.
    pub index: u64,
    /// Inclusion proof, from the leaf's sibling upwards.
    pub hashes: Vec<Hash>,
    /// The signed checkpoint.
    pub checkpoint: String,
}

impl Proof {
    /// The text form.
    pub fn text(&self) -> String {
        let hashes: String = self
            .hashes
            .iter()
            .map(|hash| STANDARD.encode(hash) + "\n")
            .collect();
        format!(
            "{FORM}\nindex {}\n{hashes}\n{}",
            self.index, self.checkpoint
        )
    }

    /// Reads the text form; nothing is checked yet. Extra data, which nobody signs, is passed over.
    ///
    /// # Errors
    /// A text that is no such proof.
    pub fn read(text: &str) -> Result<Self, NoteError> {
        let bad = |why: &str| NoteError(format!("not a proof of a log entry: {why}"));
        let (head, checkpoint) = text
            .split_once("\n\n")
            .ok_or_else(|| bad("no empty line before the checkpoint"))?;
        let mut lines = head.split('\n').peekable();
        if lines.next() != Some(FORM) {
            return Err(bad("the first line is another"));
        }
        lines.next_if(|line| line.starts_with("extra "));
        let digits = lines.next().and_then(|line| line.strip_prefix("index "));
        let index = digits
            .and_then(|digits| digits.parse().ok())
            .filter(|index: &u64| Some(index.to_string().as_str()) == digits)
            .ok_or_else(|| bad("no index"))?;
        let hash = |line: &str| STANDARD.decode(line).ok().and_then(|b| b.try_into().ok());
        let hashes: Option<Vec<Hash>> = lines.take(MAX_HASHES + 1).map(hash).collect();
        let hashes = hashes
            .filter(|hashes| hashes.len() <= MAX_HASHES)
            .ok_or_else(|| bad("a line is no hash"))?;
        Ok(Proof {
            index,
            hashes,
            checkpoint: checkpoint.to_owned(),
        })
    }

    /// Checks that the entry with these bytes is in the tree of the checkpoint, and that the
    /// checkpoint is signed by the key.
    ///
    /// # Errors
    /// What does not hold.
    pub fn check(&self, entry: &[u8], verifier: &Verifier) -> Result<Checkpoint, NoteError> {
        let head = Checkpoint::open(&self.checkpoint, verifier)?;
        let leaf = leaf_hash(entry);
        if verify_inclusion(&leaf, self.index, head.size, &self.hashes, &head.root) {
            Ok(head)
        } else {
            Err(NoteError(format!(
                "the entry is not entry {} of the tree of {} entries that was signed",
                self.index, head.size
            )))
        }
    }
}
