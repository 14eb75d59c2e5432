//! Approvals of limit and station files: a statement signed by a quality engineer's key.
//!
//! What is signed names the purpose, the ledger, the file and its digest, so that a signature
//! cannot be taken for that of another file, another site or another act.

use super::digest::sha256_hex;
use crate::keys::{NoteError, Signer, Verifier};

const PURPOSE: &str = "reelgate approval 1";

/// What an approval says.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Statement {
    /// Origin of the ledger that it is for.
    pub ledger: String,
    /// Path below the site's folder, with `/`: `limits/parts/RG-0475-X7R.yaml`.
    pub file: String,
    pub revision: Option<String>,
    /// Of the file's bytes.
    pub sha256: String,
    /// What the signature means, in the words of the person who signs.
    pub meaning: String,
}

impl Statement {
    /// Signs it; the note that an [`super::Act::Approval`] carries.
    ///
    /// # Errors
    /// A field that holds a line break or another control character.
    pub fn sign(&self, signer: &Signer) -> Result<String, NoteError> {
        signer.sign(&self.text()?)
    }

    /// The statement of a note that the verifier's key has signed.
    ///
    /// # Errors
    /// A note that does not verify, or that is not an approval.
    pub fn open(note: &str, verifier: &Verifier) -> Result<Self, NoteError> {
        Self::parse(verifier.open(note)?)
    }

    /// Whether it approves these very bytes for this ledger under this name.
    pub fn approves(&self, ledger: &str, file: &str, bytes: &[u8]) -> bool {
        self.ledger == ledger && self.file == file && self.sha256 == sha256_hex(bytes)
    }

    fn text(&self) -> Result<String, NoteError> {
        let revision = self.revision.as_deref().unwrap_or("");
        let fields: [&str; 5] = [
            &self.ledger,
            &self.file,
            revision,
            &self.sha256,
            &self.meaning,
        ];
        if fields.iter().any(|field| field.contains(char::is_control)) {
            return Err(NoteError(
                "an approval holds no line breaks and no control characters".to_owned(),
            ));
        }
        if self.meaning.trim().is_empty() {
            return Err(NoteError("an approval says what it means".to_owned()));
        }
        Ok(format!(
            "{PURPOSE}\nledger: {}\nfile: {}\nrevision: {revision}\nsha256: {}\nmeaning: {}\n",
            self.ledger, self.file, self.sha256, self.meaning
        ))
    }

    fn parse(text: &str) -> Result<Self, NoteError> {
        let bad = || NoteError("the note is not an approval".to_owned());
        let mut lines = text.split('\n');
        if lines.next() != Some(PURPOSE) {
            return Err(bad());
        }
        let mut field = |name: &str| {
            let line = lines.next().and_then(|line| line.strip_prefix(name));
            line.and_then(|line| line.strip_prefix(": "))
                .map(str::to_owned)
                .ok_or_else(bad)
        };
        let statement = Statement {
            ledger: field("ledger")?,
            file: field("file")?,
            revision: Some(field("revision")?).filter(|r| !r.is_empty()),
            sha256: field("sha256")?,
            meaning: field("meaning")?,
        };
        if lines.next() != Some("") || lines.next().is_some() {
            return Err(bad());
        }
        // What nobody could have signed with this program is not taken either.
        if statement.text()? != text {
            return Err(bad());
        }
        Ok(statement)
    }
}
