//! A document as the bytes of a file with the means of PDF 1.5: what is not a stream is packed into
//! compressed object streams (ISO 32000-1, 7.5.7), and so is the cross-reference table (7.5.8). A
//! tagged document has thousands of small objects.

use super::content::natural;
use super::object::{dictionary, value};
use flate2::Compression;
use flate2::write::ZlibEncoder;
use lopdf::{Dictionary, Document, Object, Stream, StringFormat};
use rayon::prelude::*;
use sha2::{Digest, Sha256};
use std::io::Write;

/// Of 1 to 9; 6 takes twice the time for files a thirtieth shorter.
const LEVEL: u32 = 4;

/// Objects in one object stream.
const PACKED: usize = 400;

/// Length of a file identifier in bytes.
const ID: usize = 16;

/// Compresses every stream that may be and is not; each for itself, so that the number of cores
/// does not show.
pub(super) fn compress(document: &mut Document) {
    let mut plain: Vec<&mut Stream> = document
        .objects
        .values_mut()
        .filter_map(|object| object.as_stream_mut().ok())
        .filter(|s| s.allows_compression && !s.dict.has(b"Filter"))
        .collect();
    plain.par_iter_mut().for_each(|stream| squeeze(stream));
}

/// Compresses a stream where that saves anything.
fn squeeze(stream: &mut Stream) {
    let room = Vec::with_capacity(stream.content.len() / 2);
    let mut encoder = ZlibEncoder::new(room, Compression::new(LEVEL));
    let written = encoder.write_all(&stream.content);
    let Ok(short) = written.and_then(|()| encoder.finish()) else {
        return;
    };
    if short.len() + b"/Filter/FlateDecode".len() < stream.content.len() {
        let filter = Object::Name(b"FlateDecode".to_vec());
        stream.dict.set("Filter", filter);
        stream.set_content(short);
    }
}

/// The identifier that goes with the content, twice: as a file has it that was never changed.
pub(super) fn identifiers(content: &[u8]) -> Object {
    let digest = Sha256::digest(content);
    let id = digest.iter().take(ID).copied().collect();
    let id = Object::String(id, StringFormat::Hexadecimal);
    Object::Array(vec![id.clone(), id])
}

/// Where an object is, as an entry of the cross-reference stream (ISO 32000-1, table 18).
#[derive(Clone, Copy)]
enum At {
    Offset(u32),
    Within { pack: u32, index: u16 },
}

/// The file; its streams stay as they are. The document has objects of generation 0 only.
pub(super) fn bytes(document: &Document) -> Vec<u8> {
    let mut out = format!("%PDF-{}\n", document.version).into_bytes();
    // Four bytes above 127, so that no transfer takes the file for text (ISO 19005-3, 6.1.2).
    out.extend_from_slice(b"%\xE2\xE3\xCF\xD3\n");
    let mut places: Vec<(u32, At)> = Vec::with_capacity(document.objects.len());
    let mut small: Vec<(u32, &Object)> = Vec::new();
    for ((id, _), object) in &document.objects {
        match object {
            Object::Stream(stream) => {
                places.push((*id, At::Offset(out.len() as u32)));
                indirect(&mut out, *id, stream);
            }
            _ => small.push((*id, object)),
        }
    }
    let packs: Vec<Stream> = small.par_chunks(PACKED).map(pack).collect();
    let mut next = document.max_id + 1;
    for (objects, pack) in small.chunks(PACKED).zip(packs) {
        for (index, (id, _)) in objects.iter().enumerate() {
            let index = index as u16;
            places.push((*id, At::Within { pack: next, index }));
        }
        places.push((next, At::Offset(out.len() as u32)));
        indirect(&mut out, next, &pack);
        next += 1;
    }
    let start = out.len();
    places.push((next, At::Offset(start as u32)));
    places.sort_by_key(|(id, _)| *id);
    let mut trailer = document.trailer.clone();
    trailer.set("ID", identifiers(&out));
    trailer.set("Type", Object::Name(b"XRef".to_vec()));
    trailer.set("Size", i64::from(next) + 1);
    trailer.set("W", [1, 4, 2].map(Object::Integer).to_vec());
    trailer.set("Index", sections(&places));
    let mut table = Stream::new(trailer, entries(&places));
    squeeze(&mut table);
    indirect(&mut out, next, &table);
    out.extend_from_slice(format!("startxref\n{start}\n%%EOF").as_bytes());
    out
}

/// Numbers of the objects as pairs of a first number and a count.
fn sections(places: &[(u32, At)]) -> Vec<Object> {
    let following = |a: &(u32, At), b: &(u32, At)| a.0 + 1 == b.0;
    let runs = places.chunk_by(following);
    runs.filter_map(|run| Some([i64::from(run.first()?.0), run.len() as i64]))
        .flatten()
        .map(Object::Integer)
        .collect()
}

fn entries(places: &[(u32, At)]) -> Vec<u8> {
    let mut out = Vec::with_capacity(7 * places.len());
    for (_, at) in places {
        let (kind, second, third) = match *at {
            At::Offset(offset) => (1u8, offset, 0u16),
            At::Within { pack, index } => (2, pack, index),
        };
        out.push(kind);
        out.extend_from_slice(&second.to_be_bytes());
        out.extend_from_slice(&third.to_be_bytes());
    }
    out
}

/// Objects in an object stream.
fn pack(objects: &[(u32, &Object)]) -> Stream {
    let (mut content, mut body) = (Vec::new(), Vec::new());
    for (id, object) in objects {
        natural(&mut content, u64::from(*id));
        content.push(b' ');
        natural(&mut content, body.len() as u64);
        content.push(b' ');
        value(&mut body, object);
        body.push(b'\n');
    }
    let mut dictionary = Dictionary::new();
    dictionary.set("Type", Object::Name(b"ObjStm".to_vec()));
    dictionary.set("N", objects.len() as i64);
    dictionary.set("First", content.len() as i64);
    content.append(&mut body);
    let mut stream = Stream::new(dictionary, content);
    squeeze(&mut stream);
    stream
}

/// A stream as an object of its own.
fn indirect(out: &mut Vec<u8>, id: u32, stream: &Stream) {
    natural(out, u64::from(id));
    out.extend_from_slice(b" 0 obj\n");
    dictionary(out, &stream.dict);
    out.extend_from_slice(b"stream\n");
    out.extend_from_slice(&stream.content);
    out.extend_from_slice(b"\nendstream\nendobj\n");
}

#[cfg(test)]
mod tests {
    use super::*;
    use lopdf::ObjectId;
    use proptest::prelude::*;

    fn small() -> impl Strategy<Value = Object> {
        let text = prop::collection::vec(any::<u8>(), 0..12);
        let leaf = prop_oneof![
            Just(Object::Null),
            any::<bool>().prop_map(Object::Boolean),
            any::<i32>().prop_map(|v| Object::Integer(v.into())),
            // A whole number would be read as an integer.
            (-250_000i32..250_000).prop_map(|v| Object::Real((2 * v + 1) as f32 / 64.0)),
            prop::collection::vec(1u8..=255, 1..12).prop_map(Object::Name),
            text.clone()
                .prop_map(|t| Object::String(t, StringFormat::Literal)),
            text.prop_map(|t| Object::String(t, StringFormat::Hexadecimal)),
            (1u32..9).prop_map(|id| Object::Reference((id, 0))),
        ];
        leaf.prop_recursive(3, 24, 5, |inner| {
            let entry = ("[A-Za-z]{1,6}", inner.clone());
            let entries = prop::collection::vec(entry, 0..5);
            prop_oneof![
                prop::collection::vec(inner, 0..5).prop_map(Object::Array),
                entries.prop_map(|all| {
                    Object::Dictionary(all.into_iter().map(|(k, v)| (k.into_bytes(), v)).collect())
                }),
            ]
        })
    }

    proptest! {
        #[test]
        fn another_reader_finds_every_object_as_it_was(
            objects in prop::collection::vec(small(), 1..900),
            content in prop::collection::vec(any::<u8>(), 0..600),
        ) {
            let mut document = Document::with_version("1.7");
            let mut catalog = Dictionary::new();
            catalog.set("Type", Object::Name(b"Catalog".to_vec()));
            let catalog = document.add_object(catalog);
            document.trailer.set("Root", catalog);
            let ids: Vec<ObjectId> = objects.iter().map(|o| document.add_object(o.clone())).collect();
            // A number that is not used.
            document.new_object_id();
            let stream = document.add_object(Stream::new(Dictionary::new(), content.clone()));
            compress(&mut document);
            let file = bytes(&document);
            prop_assert_eq!(&file, &bytes(&document));
            let read = Document::load_mem(&file).expect("a document");
            for (id, object) in ids.iter().zip(&objects) {
                prop_assert_eq!(read.objects.get(id), Some(object));
            }
            let found = read.get_object(stream).and_then(Object::as_stream).expect("the stream");
            prop_assert_eq!(found.get_plain_content().expect("its content"), content);
        }
    }
}
