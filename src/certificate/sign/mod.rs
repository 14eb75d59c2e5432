//! The electronic signature of a document: PAdES baseline, level B-B (ETSI EN 319 142-1), by a
//! certificate and key of the site.
//!
//! A signature is appended to the finished file, which stays as it is in front: the bytes that
//! the ledger knows are the beginning of the signed file. The same document, key and time give the
//! same bytes (deterministic ECDSA, RFC 6979).

mod append;
mod cms;
mod identity;

pub use identity::{Signatory, Signer, SignerError};

use append::Update;
use chrono::{DateTime, FixedOffset};

/// Why a document cannot be signed.
#[derive(Debug)]
pub enum SignError {
    /// It is not a document that this program wrote.
    Document(String),
    /// The signature has no DER form.
    Encoding(der::Error),
}

impl std::fmt::Display for SignError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            SignError::Document(why) => write!(f, "the document cannot be signed: {why}"),
            SignError::Encoding(e) => write!(f, "the signature cannot be encoded: {e}"),
        }
    }
}

impl std::error::Error for SignError {}

impl From<der::Error> for SignError {
    fn from(e: der::Error) -> Self {
        SignError::Encoding(e)
    }
}

/// Appends a signature over the whole file. `time` is what the signature states as its own.
///
/// # Errors
/// Bytes that are not an unsigned document of this program.
pub fn sign(
    pdf: Vec<u8>,
    signer: &Signer,
    time: DateTime<FixedOffset>,
) -> Result<Vec<u8>, SignError> {
    // Room for the signature: what one takes, and the few bytes by which its length may differ.
    let trial = cms::signed(signer, &[0; 32])?;
    let room = trial.len() + 16;
    let update = Update::of(&pdf, time, room).map_err(SignError::Document)?;
    let digest = update.digest(&pdf);
    let signature = cms::signed(signer, &digest)?;
    let mut out = pdf;
    out.extend(update.with(&signature).map_err(SignError::Document)?);
    Ok(out)
}

/// A document that carries a signature of [`sign`].
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Signed<'a> {
    /// The document before it was signed.
    pub document: &'a [u8],
    /// The certificate that it was signed with.
    pub by: Signatory,
}

/// Looks for the signature at the end of a document; `None` where there is none.
///
/// Whether the certificate is to be trusted is not looked at: programs that know the site's
/// authorities say so.
///
/// # Errors
/// In words: what does not hold. A file with anything but one such signature behind the document is
/// an error too.
pub fn examine(pdf: &[u8]) -> Option<Result<Signed<'_>, String>> {
    let (document, appended) = append::split(pdf)?;
    Some(hold(document, appended).map(|by| Signed { document, by }))
}

fn hold(document: &[u8], appended: &[u8]) -> Result<Signatory, String> {
    let found = append::read(appended)?;
    let update = Update::of(document, found.time, found.room)?;
    if update.with(&found.contents)? != appended {
        return Err("more was appended to it than a signature".to_owned());
    }
    cms::check(&found.contents, &update.digest(document))
}

/// The bytes that were issued: those in front of a signature that holds, else all.
pub fn as_issued(pdf: &[u8]) -> &[u8] {
    match examine(pdf) {
        Some(Ok(signed)) => signed.document,
        _ => pdf,
    }
}
