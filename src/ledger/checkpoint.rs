//! Checkpoints of the ledger: origin, size and root of its Merkle tree in the text form of C2SP
//! `tlog-checkpoint`, signed as a note by the ledger's key.
//!
//! Whoever keeps one (a printed certificate, a mail, a witness file) can prove later whether the
//! ledger still begins with the entries it then had.

use super::digest::Hash;
use crate::keys::{NoteError, Signer, Verifier};
use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;

/// The head of a ledger at one size.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Checkpoint {
    /// Which ledger.
    pub origin: String,
    /// Number of entries.
    pub size: u64,
    /// Merkle tree hash over them.
    pub root: Hash,
}

impl Checkpoint {
    /// The three lines.
    pub fn text(&self) -> String {
        let root = STANDARD.encode(self.root);
        format!("{}\n{}\n{root}\n", self.origin, self.size)
    }

    /// The signed note.
    #[allow(missing_docs)]
    pub fn sign(&self, signer: &Signer) -> Result<String, NoteError> {
        signer.sign(&self.text())
    }

    /// Reads a note that the verifier's key has signed.
    ///
    /// # Errors
    /// A note that does not verify, or whose text is not a checkpoint.
    pub fn open(note: &str, verifier: &Verifier) -> Result<Self, NoteError> {
        Self::parse(verifier.open(note)?)
    }

    /// The text without its signatures. Lines after the third are extensions, which are passed over.
    fn parse(text: &str) -> Result<Self, NoteError> {
        let bad = |why: &str| NoteError(format!("not a checkpoint: {why}"));
        let mut lines = text.split('\n');
        let origin = lines.next().filter(|line| !line.is_empty());
        let origin = origin.ok_or_else(|| bad("no origin"))?;
        let digits = lines.next().unwrap_or("");
        let size: u64 = digits.parse().map_err(|_| bad("no size"))?;
        if size.to_string() != digits {
            return Err(bad("the size is not in its plain form"));
        }
        let root = STANDARD.decode(lines.next().unwrap_or(""));
        let root = root.ok().and_then(|bytes| bytes.try_into().ok());
        Ok(Checkpoint {
            origin: origin.to_owned(),
            size,
            root: root.ok_or_else(|| bad("no root hash"))?,
        })
    }
}
