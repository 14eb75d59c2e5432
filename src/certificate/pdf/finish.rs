//! What an archive document needs beside its pages: identification, description, output intent,
//! language, bookmarks, links, attachments, and ids that depend on nothing but the content.

use super::attach::{Attachment, attach, name, text_string};
use super::write::Written;
use super::{file, tags, xmp};
use crate::certificate::canvas::Item;
use crate::certificate::flow::{Bookmark, Flow, Place};
use crate::certificate::paper::Sheet;
use chrono::{DateTime, FixedOffset};
use lopdf::{Dictionary, Document, Object, ObjectId, Stream};

/// Made by `srgb.py` beside this file.
static SRGB: &[u8] = include_bytes!("srgb.icc");

/// The archive standard that a file is written to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(in crate::certificate) enum Conformance {
    /// ISO 19005-3, level B: with attachments.
    A3b,
    /// ISO 19005-1, level B: without attachments.
    A1b,
}

impl Conformance {
    pub fn part(self) -> u8 {
        match self {
            Conformance::A3b => 3,
            Conformance::A1b => 1,
        }
    }
}

/// Metadata.
#[derive(Debug, Clone)]
pub(in crate::certificate) struct Description {
    pub title: String,
    pub subject: String,
    pub author: String,
    pub producer: String,
    pub date: Option<DateTime<FixedOffset>>,
}

impl Description {
    /// With what no XML can hold replaced, so that both forms of the metadata agree.
    fn printable(&self) -> Description {
        Description {
            title: xmp::printable(&self.title),
            subject: xmp::printable(&self.subject),
            author: xmp::printable(&self.author),
            producer: xmp::printable(&self.producer),
            date: self.date,
        }
    }
}

/// What `finish` adds.
pub(in crate::certificate) struct Finish<'a> {
    pub flow: &'a Flow,
    pub description: &'a Description,
    pub attachments: &'a [Attachment],
    pub conformance: Conformance,
}

/// Completes the document and answers its bytes.
pub(in crate::certificate) fn finish(
    written: Written,
    with: &Finish,
) -> Result<Vec<u8>, lopdf::Error> {
    let Written {
        mut document,
        marked,
    } = written;
    let description = with.description.printable();
    let page_ids: Vec<ObjectId> = document.page_iter().collect();
    let date = description.date.map(pdf_date);
    document.version = match with.conformance {
        Conformance::A3b => "1.7".to_owned(),
        Conformance::A1b => "1.4".to_owned(),
    };
    tidy_pages(&mut document, &page_ids)?;
    let links = links(&mut document, &page_ids, with.flow)?;
    let tree = tags::tree(&mut document, &page_ids, with.flow, &marked, &links)?;
    let metadata = metadata(&mut document, &description, with.conformance);
    let intent = output_intent(&mut document);
    let outlines = outlines(&mut document, &page_ids, with.flow);
    let files = match with.conformance {
        Conformance::A3b => attach(&mut document, with.attachments, date.as_deref()),
        Conformance::A1b => {
            cid_sets(&mut document);
            Vec::new()
        }
    };
    let catalog = document.catalog_mut()?;
    catalog.set("Metadata", metadata);
    catalog.set("StructTreeRoot", tree);
    let mut marks = Dictionary::new();
    marks.set("Marked", true);
    catalog.set("MarkInfo", marks);
    catalog.set("OutputIntents", vec![Object::Dictionary(intent)]);
    catalog.set("Lang", text_string("en"));
    catalog.set("PageLayout", name("SinglePage"));
    catalog.set("PageMode", name("UseNone"));
    let mut preferences = Dictionary::new();
    preferences.set("DisplayDocTitle", true);
    catalog.set("ViewerPreferences", preferences);
    if let Some(outlines) = outlines {
        catalog.set("Outlines", outlines);
        catalog.set("PageMode", name("UseOutlines"));
    }
    if !files.is_empty() {
        let specifications = files.iter().map(|(_, id)| Object::Reference(*id)).collect();
        catalog.set("AF", Object::Array(specifications));
        let names = files
            .iter()
            .flat_map(|(file, id)| [text_string(file), Object::Reference(*id)])
            .collect();
        let mut tree = Dictionary::new();
        tree.set("Names", Object::Array(names));
        let mut trees = Dictionary::new();
        trees.set("EmbeddedFiles", tree);
        catalog.set("Names", trees);
    }
    information(&mut document, &description, date.as_deref());
    bytes(document, with.conformance)
}

/// Writes the file, with an id made from its content.
fn bytes(mut document: Document, conformance: Conformance) -> Result<Vec<u8>, lopdf::Error> {
    file::compress(&mut document);
    match conformance {
        Conformance::A3b => Ok(file::bytes(&document)),
        // Part 1 knows no object streams.
        Conformance::A1b => {
            let mut without = Vec::new();
            document.trailer.remove(b"ID");
            document.save_to(&mut without)?;
            document.trailer.set("ID", file::identifiers(&without));
            let mut out = Vec::new();
            document.save_to(&mut out)?;
            Ok(out)
        }
    }
}

/// `D:20261005091403+02'00'` (ISO 32000-1, 7.9.4).
fn pdf_date(date: DateTime<FixedOffset>) -> String {
    let offset = date.format("%:z").to_string().replace(':', "'");
    format!("D:{}{offset}'", date.format("%Y%m%d%H%M%S"))
}

/// Leaves out resources and boxes that say nothing.
fn tidy_pages(document: &mut Document, pages: &[ObjectId]) -> Result<(), lopdf::Error> {
    for page in pages {
        let dictionary = document.get_dictionary_mut(*page)?;
        dictionary.remove(b"Annots");
        let resources = dictionary.get(b"Resources")?.as_reference()?;
        let resources = document.get_dictionary_mut(resources)?;
        for key in ["XObject", "ExtGState", "Shading"] {
            resources.remove(key.as_bytes());
        }
    }
    Ok(())
}

/// Link annotations; printed, without a border, to a place on a page. Answers them with the
/// runs that they stand in.
fn links(
    document: &mut Document,
    pages: &[ObjectId],
    flow: &Flow,
) -> Result<Vec<tags::Link>, lopdf::Error> {
    let mut all = Vec::new();
    for (page, canvas) in pages.iter().zip(&flow.pages) {
        let mut annotations = Vec::new();
        let mut within = None;
        for item in &canvas.items {
            if let Item::Run(run) = item {
                within = *run;
            }
            let Item::Link { area, to } = item else {
                continue;
            };
            let Some(destination) = flow
                .anchors
                .get(to)
                .and_then(|place| destination(pages, place, &flow.sheet))
            else {
                continue;
            };
            let height = flow.sheet.height;
            let corners = [
                area.left,
                height - area.bottom,
                area.right,
                height - area.top,
            ];
            let mut link = Dictionary::new();
            link.set("Type", name("Annot"));
            link.set("Subtype", name("Link"));
            link.set("Rect", corners.map(number).to_vec());
            link.set("Border", vec![Object::Integer(0); 3]);
            link.set("F", 4);
            link.set("Dest", destination);
            link.set("Contents", text_string(&to.replace(':', " ")));
            let annotation = document.add_object(link);
            annotations.push(Object::Reference(annotation));
            all.push(tags::Link {
                annotation,
                page: *page,
                run: within,
            });
        }
        if !annotations.is_empty() {
            document
                .get_dictionary_mut(*page)?
                .set("Annots", annotations);
        }
    }
    Ok(all)
}

fn number(value: f64) -> Object {
    Object::Real(((value * 100.0).round() / 100.0) as f32)
}

/// A place as a destination, a little above it.
fn destination(pages: &[ObjectId], place: &Place, sheet: &Sheet) -> Option<Object> {
    let page = *pages.get(place.page)?;
    let top = (sheet.height - place.y + 12.0).min(sheet.height);
    Some(Object::Array(vec![
        Object::Reference(page),
        name("XYZ"),
        Object::Null,
        number(top),
        Object::Null,
    ]))
}

fn metadata(
    document: &mut Document,
    description: &Description,
    conformance: Conformance,
) -> ObjectId {
    let mut dictionary = Dictionary::new();
    dictionary.set("Type", name("Metadata"));
    dictionary.set("Subtype", name("XML"));
    let packet = xmp::packet(description, conformance).into_bytes();
    // Readable without decompression, as ISO 19005-1, 6.7.2 demands.
    document.add_object(Stream::new(dictionary, packet).with_compression(false))
}

fn output_intent(document: &mut Document) -> Dictionary {
    let mut profile = Dictionary::new();
    profile.set("N", 3);
    let profile = document.add_object(Stream::new(profile, SRGB.to_vec()));
    let mut intent = Dictionary::new();
    intent.set("Type", name("OutputIntent"));
    intent.set("S", name("GTS_PDFA1"));
    intent.set(
        "OutputConditionIdentifier",
        text_string("sRGB IEC61966-2.1"),
    );
    intent.set("Info", text_string("sRGB IEC61966-2.1"));
    intent.set("DestOutputProfile", profile);
    intent
}

/// Bookmarks, one level, in reading order.
fn outlines(document: &mut Document, pages: &[ObjectId], flow: &Flow) -> Option<ObjectId> {
    let entries: Vec<(&Bookmark, Object)> = flow
        .bookmarks
        .iter()
        .filter_map(|b| Some((b, destination(pages, &b.place, &flow.sheet)?)))
        .collect();
    let root = document.new_object_id();
    let ids: Vec<ObjectId> = entries.iter().map(|_| document.new_object_id()).collect();
    for (index, ((bookmark, destination), id)) in entries.into_iter().zip(&ids).enumerate() {
        let mut entry = Dictionary::new();
        entry.set("Title", text_string(&bookmark.title));
        entry.set("Parent", root);
        entry.set("Dest", destination);
        if let Some(previous) = index.checked_sub(1).and_then(|i| ids.get(i)) {
            entry.set("Prev", *previous);
        }
        if let Some(next) = ids.get(index + 1) {
            entry.set("Next", *next);
        }
        document.set_object(*id, entry);
    }
    let mut outlines = Dictionary::new();
    outlines.set("Type", name("Outlines"));
    outlines.set("First", *ids.first()?);
    outlines.set("Last", *ids.last()?);
    outlines.set("Count", i64::try_from(ids.len()).unwrap_or(0));
    document.set_object(root, outlines);
    Some(root)
}

/// The document information dictionary: only what the XMP packet says too.
fn information(document: &mut Document, description: &Description, date: Option<&str>) {
    let mut information = Dictionary::new();
    information.set("Title", text_string(&description.title));
    information.set("Subject", text_string(&description.subject));
    information.set("Author", text_string(&description.author));
    information.set("Creator", text_string(&description.producer));
    information.set("Producer", text_string(&description.producer));
    if let Some(date) = date {
        information.set("CreationDate", text_string(date));
        information.set("ModDate", text_string(date));
    }
    let old = document.trailer.get(b"Info").and_then(Object::as_reference);
    match old {
        Ok(id) => document.set_object(id, information),
        Err(_) => {
            let id = document.add_object(information);
            document.trailer.set("Info", id);
        }
    }
}

/// Marks every glyph of the embedded programs as present: a font subset must say so in part 1
/// of the standard (ISO 19005-1, 6.3.5).
fn cid_sets(document: &mut Document) {
    let descriptors: Vec<(ObjectId, usize)> = document
        .objects
        .iter()
        .filter_map(|(id, object)| {
            let dictionary = object.as_dict().ok()?;
            let program = dictionary.get(b"FontFile2").ok()?.as_reference().ok()?;
            let program = document.get_object(program).ok()?.as_stream().ok()?;
            Some((*id, glyph_count(&program.get_plain_content().ok()?)?))
        })
        .collect();
    for (id, glyphs) in descriptors {
        let mut bits = vec![0xFFu8; glyphs / 8];
        if glyphs % 8 > 0 {
            bits.push(!(0xFFu8 >> (glyphs % 8)));
        }
        let set = document.add_object(Stream::new(Dictionary::new(), bits));
        if let Ok(descriptor) = document.get_dictionary_mut(id) {
            descriptor.set("CIDSet", set);
        }
    }
}

/// Number of glyphs in a TrueType program: `maxp`, bytes 4 and 5.
fn glyph_count(program: &[u8]) -> Option<usize> {
    let tables = usize::from(u16::from_be_bytes(program.get(4..6)?.try_into().ok()?));
    (0..tables).find_map(|index| {
        let entry = program.get(12 + 16 * index..28 + 16 * index)?;
        if entry.get(..4)? != b"maxp" {
            return None;
        }
        let offset =
            usize::try_from(u32::from_be_bytes(entry.get(8..12)?.try_into().ok()?)).ok()?;
        let count = program.get(offset + 4..offset + 6)?;
        Some(usize::from(u16::from_be_bytes(count.try_into().ok()?)))
    })
}
