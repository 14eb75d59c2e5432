//! Files carried inside the PDF (ISO 32000-1, 7.11.4; associated as ISO 19005-3, 6.8 demands).

use lopdf::{Dictionary, Document, Object, ObjectId, Stream, StringFormat};

/// A file to carry.
#[derive(Debug, Clone)]
pub(in crate::certificate) struct Attachment {
    /// Plain file name.
    pub name: String,
    /// MIME type.
    pub mime: &'static str,
    /// `Data`: what the document shows; `Source`: what it was made from.
    pub relationship: &'static str,
    pub description: String,
    pub bytes: Vec<u8>,
}

/// A text string in UTF-16 with a byte-order mark (ISO 32000-1, 7.9.2.2), or plain ASCII.
pub(super) fn text_string(text: &str) -> Object {
    if text.is_ascii() && !text.bytes().any(|b| b < 0x20) {
        return Object::String(text.as_bytes().to_vec(), StringFormat::Literal);
    }
    let mut bytes = vec![0xFE, 0xFF];
    bytes.extend(text.encode_utf16().flat_map(u16::to_be_bytes));
    Object::String(bytes, StringFormat::Hexadecimal)
}

/// A name object.
pub(super) fn name(text: &str) -> Object {
    Object::Name(text.as_bytes().to_vec())
}

/// Puts the files in and answers the file specifications in name order, with their names.
pub(super) fn attach(
    document: &mut Document,
    attachments: &[Attachment],
    date: Option<&str>,
) -> Vec<(String, ObjectId)> {
    let mut out: Vec<(String, ObjectId)> = attachments
        .iter()
        .map(|a| (a.name.clone(), file_specification(document, a, date)))
        .collect();
    out.sort();
    out
}

fn file_specification(document: &mut Document, a: &Attachment, date: Option<&str>) -> ObjectId {
    let mut params = Dictionary::new();
    params.set("Size", i64::try_from(a.bytes.len()).unwrap_or(i64::MAX));
    if let Some(date) = date {
        params.set("ModDate", text_string(date));
    }
    let mut embedded = Dictionary::new();
    embedded.set("Type", name("EmbeddedFile"));
    embedded.set("Subtype", name(a.mime));
    embedded.set("Params", params);
    let stream = document.add_object(Stream::new(embedded, a.bytes.clone()));
    let mut files = Dictionary::new();
    files.set("F", stream);
    files.set("UF", stream);
    let mut specification = Dictionary::new();
    specification.set("Type", name("Filespec"));
    specification.set("F", text_string(&a.name));
    specification.set("UF", text_string(&a.name));
    specification.set("Desc", text_string(&a.description));
    specification.set("AFRelationship", name(a.relationship));
    specification.set("EF", files);
    document.add_object(specification)
}
