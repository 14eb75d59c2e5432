//! The structure for screen readers, as poppler's pdfinfo and pdftotext of another library read it.

use super::{cases, lots, rendered, tools};
use lopdf::{Dictionary, Document, Object, ObjectId};
use reelgate::certificate::Paper;
use std::collections::BTreeSet;

fn structure_text(pdf: &[u8]) -> String {
    let saved = tools::save(pdf);
    tools::run("pdfinfo", &["-struct-text", "FILE"], &saved.path)
}

#[test]
fn an_outside_program_reads_headings_tables_and_drawings_in_order() {
    let case = lots::rejected();
    let pdf = rendered(&case, Paper::A4).pdf;
    let text = structure_text(&pdf);
    let mut from = 0;
    // Document order is reading order.
    for piece in [
        "\"REJECT\"",
        "\"Sampling\"",
        "\"Characteristics\"",
        "\"Reasons\"",
        "\"Curves\"",
        "\"Distributions\"",
        "\"In measuring order\"",
        "\"Statistics\"",
        "\"Parts\"",
        "\"Limit file\"",
        "\"Integrity\"",
        "\"Signatures\"",
    ] {
        let at = text[from..].find(piece);
        from += at.unwrap_or_else(|| panic!("{piece} is not behind the one before"));
    }
    for kind in [
        "H1", "H2", "P (", "Table", "TR", "TH", "TD", "Figure", "Link",
    ] {
        assert!(text.contains(kind), "no {kind}");
    }
    // Heads and feet of pages are no content.
    assert!(!text.contains("page 1 of"), "the running foot is read");
    let saved = tools::save(&pdf);
    let info = tools::run("pdfinfo", &["FILE"], &saved.path);
    let tagged = info
        .lines()
        .find(|l| l.starts_with("Tagged:"))
        .expect("a line");
    assert!(tagged.ends_with("yes"), "{tagged}");
}

/// All dictionaries of structure elements.
fn elements(document: &Document) -> Vec<&Dictionary> {
    document
        .objects
        .values()
        .filter_map(|o| o.as_dict().ok())
        .filter(|d| d.has(b"S") && d.has(b"P") && d.has(b"K"))
        .collect()
}

#[test]
fn every_reading_is_in_a_cell_and_every_drawing_has_words() {
    let case = lots::rejected();
    let pdf = rendered(&case, Paper::A4).pdf;
    let document = Document::load_mem(&pdf).expect("a PDF");
    let of = |kind: &[u8]| {
        elements(&document)
            .into_iter()
            .filter(|d| {
                d.get(b"S")
                    .and_then(Object::as_name)
                    .is_ok_and(|s| s == kind)
            })
            .collect::<Vec<_>>()
    };
    assert!(of(b"TD").len() > 125 * 5, "{}", of(b"TD").len());
    for head in of(b"TH") {
        let scope = head
            .get(b"A")
            .and_then(Object::as_dict)
            .expect("attributes");
        let scope = scope
            .get(b"Scope")
            .and_then(Object::as_name)
            .expect("scope");
        assert!(scope == b"Row" || scope == b"Column");
    }
    let figures = of(b"Figure");
    // Five strips, two curve plots, five histograms, five probability plots, a scatter, five run charts, two
    // operating characteristics, a code; marks besides.
    assert!(figures.len() >= 26, "{}", figures.len());
    for figure in figures {
        let words = figure.get(b"Alt").and_then(Object::as_str).expect("words");
        assert!(!words.is_empty());
    }
    // A nonconforming reading is marked by weight, shape and colour: who hears it is told.
    let said = structure_text(&pdf);
    let row = said
        .split_once("\"4.159")
        .or_else(|| said.split_once("4.159"))
        .expect("a reading");
    assert!(row.0.ends_with('"') || row.0.len() > 100);
}

/// Marked-content numbers of a page's content, and whether anything is drawn outside of all.
fn marks(document: &Document, page: ObjectId) -> (Vec<i64>, bool) {
    let content = document.get_page_content(page);
    let content = lopdf::content::Content::decode(&content).expect("operations");
    let (mut depth, mut numbers, mut bare) = (0, Vec::new(), false);
    for operation in content.operations {
        match operation.operator.as_str() {
            "BDC" => {
                depth += 1;
                let properties = operation.operands[1].as_dict().expect("properties");
                numbers.push(
                    properties
                        .get(b"MCID")
                        .and_then(Object::as_i64)
                        .expect("MCID"),
                );
            }
            "BMC" => depth += 1,
            "EMC" => depth -= 1,
            "Tj" | "TJ" | "f" | "S" | "s" | "B" | "f*" => bare |= depth == 0,
            _ => {}
        }
        assert!(
            (0..=1).contains(&depth),
            "marked content within marked content"
        );
    }
    assert_eq!(depth, 0);
    (numbers, bare)
}

#[test]
fn all_content_is_marked_once_and_the_way_back_leads_to_its_element() {
    for (name, case) in cases() {
        let pdf = rendered(&case, Paper::A4).pdf;
        let document = Document::load_mem(&pdf).expect("a PDF");
        let catalog = document.catalog().expect("catalog");
        let root = catalog
            .get(b"StructTreeRoot")
            .and_then(Object::as_reference)
            .expect("root");
        let root = document.get_dictionary(root).expect("root");
        let tree = root
            .get(b"ParentTree")
            .and_then(Object::as_reference)
            .expect("tree");
        let tree = document.get_dictionary(tree).expect("tree");
        let numbers = tree
            .get(b"Nums")
            .and_then(Object::as_array)
            .expect("numbers");
        let value = |key: i64| {
            numbers
                .chunks(2)
                .find(|pair| pair[0].as_i64().is_ok_and(|k| k == key))
                .map(|pair| pair[1].as_reference().expect("reference"))
        };
        let mut reached = BTreeSet::new();
        for (index, page) in document.get_pages() {
            let (mcids, bare) = marks(&document, page);
            assert!(
                !bare,
                "{name}: page {index} draws outside of all marked content"
            );
            let expected: Vec<i64> = (0..mcids.len() as i64).collect();
            assert_eq!(mcids, expected, "{name} page {index}");
            let page = document.get_dictionary(page).expect("page");
            let key = page
                .get(b"StructParents")
                .and_then(Object::as_i64)
                .expect("key");
            let owners = document
                .get_object(value(key).expect("entry"))
                .expect("array");
            let owners = owners.as_array().expect("array");
            assert_eq!(owners.len(), mcids.len(), "{name} page {index}");
            for owner in owners {
                reached.insert(owner.as_reference().expect("an element"));
            }
            for link in page
                .get(b"Annots")
                .and_then(Object::as_array)
                .into_iter()
                .flatten()
            {
                let link = document
                    .get_dictionary(link.as_reference().expect("link"))
                    .expect("link");
                let key = link
                    .get(b"StructParent")
                    .and_then(Object::as_i64)
                    .expect("key");
                let element = document
                    .get_dictionary(value(key).expect("entry"))
                    .expect("element");
                let kind = element.get(b"S").and_then(Object::as_name);
                assert!(kind.is_ok_and(|k| k == b"Link"));
                assert!(link.has(b"Contents"));
            }
        }
        for id in reached {
            let element = document.get_dictionary(id).expect("element");
            let kind = element.get(b"S").and_then(Object::as_name).expect("kind");
            assert!(
                ![&b"Document"[..], b"Table", b"TR"].contains(&kind),
                "{name}: content in a group"
            );
        }
    }
}
