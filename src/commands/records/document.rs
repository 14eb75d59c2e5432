//! What a PDF lot record carries: its JSON record and the proof that it is in the ledger.

use crate::certificate::{PROOF_NAME, RECORD_NAME};
use lopdf::{Dictionary, Document, Object};

/// Larger files are no PDF lot records.
pub const MOST_BYTES: u64 = 256 << 20;

/// The two attachments that can be checked.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Carried {
    pub record: Vec<u8>,
    pub proof: String,
}

/// Reads the attachments of a PDF.
///
/// # Errors
/// In words: what is not as in a PDF lot record.
pub fn carried(pdf: &[u8]) -> Result<Carried, String> {
    let document = Document::load_mem(pdf).map_err(|e| format!("is no readable PDF ({e})"))?;
    let attached = |name: &str| {
        document
            .objects
            .values()
            .filter_map(|object| object.as_dict().ok())
            .filter(|file| file.has_type(b"Filespec") && is_named(file, name))
            .find_map(|file| content(&document, file))
            .ok_or_else(|| format!("carries no {name}"))
    };
    let record = attached(RECORD_NAME)?;
    let proof = String::from_utf8(attached(PROOF_NAME)?)
        .map_err(|_| format!("carries a {PROOF_NAME} that is no text"))?;
    Ok(Carried { record, proof })
}

fn is_named(file: &Dictionary, name: &str) -> bool {
    matches!(file.get(b"UF"), Ok(Object::String(bytes, _)) if bytes == name.as_bytes())
}

fn content(document: &Document, file: &Dictionary) -> Option<Vec<u8>> {
    let embedded = file.get(b"EF").ok()?.as_dict().ok()?;
    let id = embedded.get(b"F").ok()?.as_reference().ok()?;
    let stream = document.get_object(id).ok()?.as_stream().ok()?;
    if stream.dict.has(b"Filter") {
        stream.decompressed_content().ok()
    } else {
        Some(stream.content.clone())
    }
}
