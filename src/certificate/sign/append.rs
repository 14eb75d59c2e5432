//! The incremental update that a signature is (ISO 32000-1, 7.5.6 and 12.8; ISO 19005-3, 6.4.3): a field
//! that is not to be seen, with an appearance all the same, the signature with its byte range over the whole file,
//! and a cross-reference stream.

use crate::certificate::pdf::object;
use chrono::{DateTime, FixedOffset};
use lopdf::{Dictionary, Document, Object, ObjectId};
use sha2::{Digest, Sha256};

const END: &[u8] = b"%%EOF";
/// Between the document and what is appended.
const BEGIN: &[u8] = b"\n";
const FORM: &[u8] = b"/SubFilter /ETSI.CAdES.detached";
const CONTENTS: &[u8] = b"/Contents <";
const TIME: &[u8] = b"/M (D:";
/// How the time is written, `20261005091403+02'00'`.
const TIME_FORM: &str = "%Y%m%d%H%M%S%:z";
/// Signatures of more bytes than this are none of ours.
const MOST: usize = 1 << 18;

/// The appended bytes in two pieces, around the signature with its angle brackets.
pub(super) struct Update {
    before: Vec<u8>,
    after: Vec<u8>,
    /// Bytes that the signature may have.
    room: usize,
}

/// What an update says of itself.
pub(super) struct Found {
    pub time: DateTime<FixedOffset>,
    pub room: usize,
    /// Zeros behind the signature included.
    pub contents: Vec<u8>,
}

impl Update {
    /// The update of a document with room for a signature of so many bytes.
    ///
    /// # Errors
    /// In words: what is not as in a document of this program.
    pub(super) fn of(
        document: &[u8],
        time: DateTime<FixedOffset>,
        room: usize,
    ) -> Result<Update, String> {
        let file = Base::of(document)?;
        let mut out = Piece {
            bytes: BEGIN.to_vec(),
            from: document.len(),
            places: Vec::new(),
        };
        let next = |n: u32| (file.size + n, 0);
        let (signature, field, look) = (next(0), next(1), next(2));
        out.object(file.root, &file.catalog(field));
        out.object(file.page, &file.first_page(field));
        out.object(field, &widget(signature, look, file.page));
        out.begin(look);
        out.bytes.extend(
            b"<</Type /XObject/Subtype /Form/BBox [0 0 0 0]/Resources <<>>/Length 0>>stream\n\nendstream",
        );
        out.end();
        out.begin(signature);
        out.bytes
            .extend(b"<</Type /Sig/Filter /Adobe.PPKLite/SubFilter /ETSI.CAdES.detached");
        let form = time.format(TIME_FORM).to_string().replace(':', "'");
        out.bytes.extend(TIME);
        out.bytes.extend(format!("{form}')").bytes());
        // The byte range stands in front of the signature, and its digits do not depend on it.
        let hole = 2 * room + 2;
        let head = out.here() + "/ByteRange []".len() + RANGE + CONTENTS.len() - 1;
        let tail_from = head + hole;
        let mut after = Piece {
            bytes: b">>".to_vec(),
            from: tail_from,
            places: out.places.clone(),
        };
        after.end();
        file.references(&mut after, next(3).0);
        let range = format!("0 {head} {tail_from} {}", after.bytes.len());
        out.bytes
            .extend(format!("/ByteRange [{range:<RANGE$}]").bytes());
        // The angle bracket belongs to the signature.
        out.bytes.extend(&CONTENTS[..CONTENTS.len() - 1]);
        Ok(Update {
            before: out.bytes,
            after: after.bytes,
            room,
        })
    }

    /// SHA-256 of document and update but for the signature.
    pub(super) fn digest(&self, document: &[u8]) -> [u8; 32] {
        let mut hash = Sha256::new();
        hash.update(document);
        hash.update(&self.before);
        hash.update(&self.after);
        hash.finalize().into()
    }

    /// The appended bytes with the signature, zeros behind it.
    ///
    /// # Errors
    /// A signature that is longer than its room.
    pub(super) fn with(&self, signature: &[u8]) -> Result<Vec<u8>, String> {
        if signature.len() > self.room {
            return Err("the signature is longer than the room for it".to_owned());
        }
        let mut filled = signature.to_vec();
        filled.resize(self.room, 0);
        let mut out = self.before.clone();
        object::hexadecimal(&mut out, &filled);
        out.extend(&self.after);
        Ok(out)
    }
}

/// Width of the four numbers of a byte range.
const RANGE: usize = 44;

/// Cuts a file behind the last but one end-of-file mark: the document, and what was appended;
/// `None` where that holds no signature.
pub(super) fn split(pdf: &[u8]) -> Option<(&[u8], &[u8])> {
    let last = find_last(pdf, END)?;
    let end = find_last(pdf.get(..last)?, END)? + END.len();
    let (document, appended) = pdf.split_at_checked(end)?;
    let signature = appended.starts_with(BEGIN) && find(appended, FORM).is_some();
    signature.then_some((document, appended))
}

/// Time, room and contents of an update.
///
/// # Errors
/// In words.
pub(super) fn read(appended: &[u8]) -> Result<Found, String> {
    let none = || "what was appended to it is no signature".to_owned();
    let after = |mark: &[u8]| {
        let at = find(appended, mark)?;
        appended.get(at + mark.len()..)
    };
    let time = after(TIME)
        .and_then(|rest| rest.get(..20))
        .and_then(|text| std::str::from_utf8(text).ok())
        .map(|text| text.replace('\'', ":"))
        .and_then(|text| DateTime::parse_from_str(&text, TIME_FORM).ok())
        .ok_or_else(none)?;
    let rest = after(CONTENTS).ok_or_else(none)?;
    let digits = rest
        .iter()
        .position(|b| *b == b'>')
        .and_then(|end| rest.get(..end))
        .filter(|digits| digits.len() % 2 == 0 && digits.len() <= 2 * MOST)
        .ok_or_else(none)?;
    let contents: Option<Vec<u8>> = digits
        .chunks(2)
        .map(|pair| u8::from_str_radix(std::str::from_utf8(pair).ok()?, 16).ok())
        .collect();
    let contents = contents.ok_or_else(none)?;
    Ok(Found {
        time,
        room: contents.len(),
        contents,
    })
}

fn find(bytes: &[u8], what: &[u8]) -> Option<usize> {
    bytes.windows(what.len()).position(|w| w == what)
}

fn find_last(bytes: &[u8], what: &[u8]) -> Option<usize> {
    bytes.windows(what.len()).rposition(|w| w == what)
}

/// What of a document is appended to.
struct Base {
    root: ObjectId,
    catalog: Dictionary,
    page: ObjectId,
    first_page: Dictionary,
    /// Numbers of objects begin to be free here.
    size: u32,
    /// Information dictionary and identifier, of the trailer.
    info: Option<Object>,
    id: Option<Object>,
    /// Where its cross-references are.
    references_at: usize,
    digest: [u8; 16],
}

impl Base {
    fn of(bytes: &[u8]) -> Result<Base, String> {
        let wrong = |e: lopdf::Error| format!("it cannot be read ({e})");
        let not_ours = || "it is not a document of this program".to_owned();
        let document = Document::load_mem(bytes).map_err(wrong)?;
        let root = document.trailer.get(b"Root").map_err(wrong)?;
        let root = root.as_reference().map_err(wrong)?;
        let catalog = document.get_dictionary(root).map_err(wrong)?.clone();
        if catalog.has(b"AcroForm") {
            return Err("it is signed already".to_owned());
        }
        let page = document.page_iter().next().ok_or_else(not_ours)?;
        let first_page = document.get_dictionary(page).map_err(wrong)?.clone();
        let size = document.trailer.get(b"Size").and_then(Object::as_i64);
        let size = u32::try_from(size.map_err(wrong)?)
            .ok()
            .filter(|size| *size < u32::MAX - 8)
            .ok_or_else(not_ours)?;
        let tail = find_last(bytes, b"startxref").ok_or_else(not_ours)?;
        let tail = bytes.get(tail..).and_then(|t| std::str::from_utf8(t).ok());
        let references_at = tail
            .and_then(|text| text.split_whitespace().nth(1)?.parse().ok())
            .ok_or_else(not_ours)?;
        let mut digest = [0; 16];
        digest.copy_from_slice(&Sha256::digest(bytes)[..16]);
        Ok(Base {
            root,
            catalog,
            page,
            first_page,
            size,
            info: document.trailer.get(b"Info").ok().cloned(),
            id: document.trailer.get(b"ID").ok().cloned(),
            references_at,
            digest,
        })
    }

    /// The catalog with a form of one field (ISO 32000-1, 12.7.2): signatures are there, and only
    /// appending is allowed.
    fn catalog(&self, field: ObjectId) -> Dictionary {
        let mut form = Dictionary::new();
        form.set("Fields", vec![Object::Reference(field)]);
        form.set("SigFlags", 3);
        let mut catalog = self.catalog.clone();
        catalog.set("AcroForm", form);
        catalog
    }

    fn first_page(&self, field: ObjectId) -> Dictionary {
        let mut page = self.first_page.clone();
        let mut annotations = match page.get(b"Annots") {
            Ok(Object::Array(all)) => all.clone(),
            _ => Vec::new(),
        };
        annotations.push(Object::Reference(field));
        page.set("Annots", annotations);
        page
    }

    /// The cross-reference stream of what was appended, as object `own`, and the end of the file.
    fn references(&self, out: &mut Piece, own: u32) {
        let at = out.here();
        let mut places = out.places.clone();
        places.push((own, at));
        places.sort_unstable();
        let mut index = Vec::new();
        let mut entries = Vec::new();
        for (id, place) in places {
            index.extend([Object::from(i64::from(id)), Object::from(1i64)]);
            entries.push(1u8);
            entries.extend(u32::try_from(place).unwrap_or(u32::MAX).to_be_bytes());
            entries.extend([0, 0]);
        }
        let mut dictionary = Dictionary::new();
        dictionary.set("Type", Object::Name(b"XRef".to_vec()));
        dictionary.set("Size", i64::from(own) + 1);
        dictionary.set("W", [1, 4, 2].map(|w: i64| Object::from(w)).to_vec());
        dictionary.set("Index", index);
        dictionary.set("Prev", self.references_at as i64);
        dictionary.set("Root", self.root);
        if let Some(info) = &self.info {
            dictionary.set("Info", info.clone());
        }
        // The first identifier stays, the second is that of this state of the file.
        if let Some(first) = self.id.as_ref().and_then(|id| id.as_array().ok()?.first()) {
            let second = Object::String(self.digest.to_vec(), lopdf::StringFormat::Hexadecimal);
            dictionary.set("ID", vec![first.clone(), second]);
        }
        dictionary.set("Length", entries.len() as i64);
        out.begin((own, 0));
        object::dictionary(&mut out.bytes, &dictionary);
        out.bytes.extend(b"stream\n");
        out.bytes.extend(entries);
        out.bytes.extend(b"\nendstream");
        out.end();
        out.bytes.extend(format!("startxref\n{at}\n").bytes());
        out.bytes.extend(END);
    }
}

/// The field with its widget: printed as all annotations of an archive document, locked, of no size.
fn widget(signature: ObjectId, look: ObjectId, page: ObjectId) -> Dictionary {
    let name = |text: &str| Object::Name(text.as_bytes().to_vec());
    let mut appearance = Dictionary::new();
    appearance.set("N", look);
    let mut widget = Dictionary::new();
    widget.set("Type", name("Annot"));
    widget.set("Subtype", name("Widget"));
    widget.set("FT", name("Sig"));
    widget.set("T", Object::string_literal("Signature"));
    widget.set(
        "TU",
        Object::string_literal("Electronic signature of the document"),
    );
    widget.set("V", signature);
    widget.set("F", 4 + 128);
    widget.set("Rect", vec![Object::Integer(0); 4]);
    widget.set("AP", appearance);
    widget.set("P", page);
    widget
}

/// Bytes with the places of the objects in them.
struct Piece {
    bytes: Vec<u8>,
    /// Place of the first byte in the file.
    from: usize,
    places: Vec<(u32, usize)>,
}

impl Piece {
    fn here(&self) -> usize {
        self.from + self.bytes.len()
    }

    fn begin(&mut self, (id, generation): ObjectId) {
        if !self.places.iter().any(|(known, _)| *known == id) {
            self.places.push((id, self.here()));
        }
        self.bytes
            .extend(format!("{id} {generation} obj\n").bytes());
    }

    fn end(&mut self) {
        self.bytes.extend(b"\nendobj\n");
    }

    fn object(&mut self, id: ObjectId, dictionary: &Dictionary) {
        self.begin(id);
        object::dictionary(&mut self.bytes, dictionary);
        self.end();
    }
}
