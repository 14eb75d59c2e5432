//! Keys and what they sign: notes in the text form of C2SP `signed-note`, with Ed25519.
//!
//! The ledger signs its checkpoints with a key of its own; quality engineers sign approvals with
//! theirs, whose public halves a site file lists.

mod note;
mod private;

pub use note::{NoteError, Signer, Verifier};
pub use private::{SHORTEST_PASSPHRASE, decrypt, encrypt};
