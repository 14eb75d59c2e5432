//! Approvals of limit, station and site files: a statement signed by the key of a person.
//!
//! What is signed names the purpose, the ledger, how long it was, the file and its digest, so that a
//! signature cannot be taken for that of another file, another site, another act or another time.

use super::digest::sha256_hex;
use crate::keys::{NoteError, Signer, Verifier};

const PURPOSE: &str = "reelgate approval 1";
const WITHDRAWAL: &str = "reelgate withdrawal 1";

/// What kind of file is approved.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Approved {
    Limits,
    Station,
    Site,
}

impl Approved {
    /// Role of the file among the objects of an entry.
    pub fn role(self) -> &'static str {
        match self {
            Approved::Limits => "limits",
            Approved::Station => "station",
            Approved::Site => "site",
        }
    }

    fn of(role: &str) -> Option<Self> {
        [Approved::Limits, Approved::Station, Approved::Site]
            .into_iter()
            .find(|kind| kind.role() == role)
    }
}

/// What an approval, or the withdrawal of one, says.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Statement {
    /// The approval is taken back.
    pub withdraws: bool,
    /// Origin of the ledger that it is for.
    pub ledger: String,
    /// How many entries the ledger had when it was signed: a copy that is entered again after
    /// another statement about the file does not count.
    pub entries: u64,
    pub kind: Approved,
    /// Path below the site's folder, with `/`: `limits/parts/RG-0475-X7R.yaml`.
    pub file: String,
    pub revision: Option<String>,
    /// Of the file's bytes.
    pub sha256: String,
    /// Files that the file names and that belong to it (sweeps of compensation standards): digest
    /// and name.
    pub with: Vec<(String, String)>,
    /// What the signature means, or why the approval is taken back, in the words of the person who
    /// signs.
    pub meaning: String,
}

impl Statement {
    /// Signs it; the note that an entry carries.
    ///
    /// # Errors
    /// A field that holds a line break or another control character; no meaning.
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

    /// What a note says, whoever signed it.
    ///
    /// # Errors
    /// A note that is not an approval.
    pub fn unproven(note: &str) -> Result<Self, NoteError> {
        let end = note.rfind("\n\n").map_or(0, |at| at + 1);
        Self::parse(note.get(..end).unwrap_or_default())
    }

    /// Whether it is about these very bytes for this ledger under this name.
    pub fn approves(&self, ledger: &str, file: &str, bytes: &[u8]) -> bool {
        self.ledger == ledger && self.file == file && self.sha256 == sha256_hex(bytes)
    }

    fn text(&self) -> Result<String, NoteError> {
        let revision = self.revision.as_deref().unwrap_or("");
        let mut fields = vec![
            &self.ledger[..],
            &self.file,
            revision,
            &self.sha256,
            &self.meaning,
        ];
        for (digest, name) in &self.with {
            fields.extend([&digest[..], name]);
        }
        if fields.iter().any(|field| field.contains(char::is_control)) {
            return Err(NoteError(
                "an approval holds no line breaks and no control characters".to_owned(),
            ));
        }
        if self.meaning.trim().is_empty() {
            return Err(NoteError("an approval says what it means".to_owned()));
        }
        let with: String = self
            .with
            .iter()
            .map(|(digest, name)| format!("with: {digest} {name}\n"))
            .collect();
        Ok(format!(
            "{}\nledger: {}\nentries: {}\nkind: {}\nfile: {}\nrevision: {revision}\nsha256: {}\n{with}meaning: {}\n",
            if self.withdraws { WITHDRAWAL } else { PURPOSE },
            self.ledger,
            self.entries,
            self.kind.role(),
            self.file,
            self.sha256,
            self.meaning
        ))
    }

    fn parse(text: &str) -> Result<Self, NoteError> {
        let bad = || NoteError("the note is not an approval".to_owned());
        let mut lines = text.split('\n').peekable();
        let withdraws = match lines.next() {
            Some(PURPOSE) => false,
            Some(WITHDRAWAL) => true,
            _ => return Err(bad()),
        };
        let mut field = |name: &str| {
            let line = lines.next().and_then(|line| line.strip_prefix(name));
            line.and_then(|line| line.strip_prefix(": "))
                .map(str::to_owned)
                .ok_or_else(bad)
        };
        let ledger = field("ledger")?;
        let digits = field("entries")?;
        let entries: u64 = digits.parse().map_err(|_| bad())?;
        let kind = Approved::of(&field("kind")?).ok_or_else(bad)?;
        let file = field("file")?;
        let revision = Some(field("revision")?).filter(|r| !r.is_empty());
        let sha256 = field("sha256")?;
        let mut with = Vec::new();
        while let Some(line) = lines.next_if(|line| line.starts_with("with: ")) {
            let pair = line.strip_prefix("with: ").and_then(|l| l.split_once(' '));
            let (digest, name) = pair.ok_or_else(bad)?;
            with.push((digest.to_owned(), name.to_owned()));
        }
        let meaning = lines.next().and_then(|line| line.strip_prefix("meaning: "));
        let statement = Statement {
            withdraws,
            ledger,
            entries,
            kind,
            file,
            revision,
            sha256,
            with,
            meaning: meaning.ok_or_else(bad)?.to_owned(),
        };
        // There is one way to write a statement.
        if statement.text()? == text {
            Ok(statement)
        } else {
            Err(bad())
        }
    }
}
