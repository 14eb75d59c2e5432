//! The structure of the document as PDF objects (ISO 32000-1, 14.7): structure elements, the runs of
//! marked content that they hold, and the way back from a page's run to its element.

use super::attach::{name, text_string};
use crate::certificate::flow::Flow;
use crate::certificate::structure::{Element, Kid, Role, Scope};
use lopdf::{Dictionary, Document, Object, ObjectId};
use std::collections::BTreeMap;

/// A link annotation.
pub(super) struct Link {
    pub annotation: ObjectId,
    pub page: ObjectId,
    /// The run that it stands in.
    pub run: Option<usize>,
}

/// A run as its page numbers it.
#[derive(Clone, Copy)]
struct Placed {
    page: ObjectId,
    number: i64,
}

/// Adds the tree and answers its root. `marked` are the runs of each page by number.
pub(super) fn tree(
    document: &mut Document,
    pages: &[ObjectId],
    flow: &Flow,
    marked: &[Vec<usize>],
    links: &[Link],
) -> Result<ObjectId, lopdf::Error> {
    let structure = &flow.structure;
    let root = document.new_object_id();
    let mut placed: Vec<Option<Placed>> = vec![None; structure.runs.len()];
    for (page, runs) in pages.iter().zip(marked) {
        for (number, run) in runs.iter().enumerate() {
            if let Some(place) = placed.get_mut(*run) {
                let number = number as i64;
                *place = Some(Placed {
                    page: *page,
                    number,
                });
            }
        }
    }
    let mut linked: BTreeMap<usize, Vec<&Link>> = BTreeMap::new();
    for link in links {
        let element = link.run.and_then(|run| structure.runs.get(run));
        linked
            .entry(element.copied().unwrap_or(0))
            .or_default()
            .push(link);
    }
    let kept = kept(&structure.elements, &placed);
    let ids: Vec<Option<ObjectId>> = kept
        .iter()
        .map(|keep| keep.then(|| document.new_object_id()))
        .collect();
    let id_of = |element: usize| ids.get(element).copied().flatten();
    // Keys of the way back: pages first, then links.
    let mut back: Vec<Object> = Vec::new();
    for (key, (page, runs)) in pages.iter().zip(marked).enumerate() {
        let elements = runs
            .iter()
            .map(|run| {
                let element = structure.runs.get(*run).copied().and_then(id_of);
                element.map_or(Object::Null, Object::Reference)
            })
            .collect();
        let elements = document.add_object(Object::Array(elements));
        back.push(Object::Integer(key as i64));
        back.push(Object::Reference(elements));
        let page = document.get_dictionary_mut(*page)?;
        page.set("StructParents", key as i64);
        page.set("Tabs", name("S"));
    }
    let mut next = pages.len() as i64;
    for (index, element) in structure.elements.iter().enumerate() {
        let Some(id) = id_of(index) else { continue };
        let parent = element.parent.and_then(id_of).unwrap_or(root);
        let page = first_page(element, &placed);
        let mut kids: Vec<Object> = element
            .kids
            .iter()
            .filter_map(|kid| match kid {
                Kid::Element(child) => id_of(*child).map(Object::Reference),
                Kid::Run(run) => content(placed.get(*run).copied().flatten()?, page),
            })
            .collect();
        for link in linked.get(&index).into_iter().flatten() {
            let holder = link_element(document, link, id);
            back.push(Object::Integer(next));
            back.push(Object::Reference(holder));
            document
                .get_dictionary_mut(link.annotation)?
                .set("StructParent", next);
            next += 1;
            kids.push(Object::Reference(holder));
        }
        let mut dictionary = dictionary(&element.role);
        dictionary.set("P", parent);
        if let Some(page) = page {
            dictionary.set("Pg", page);
        }
        dictionary.set("K", Object::Array(kids));
        document.set_object(id, dictionary);
    }
    let mut numbers = Dictionary::new();
    numbers.set("Nums", Object::Array(back));
    let numbers = document.add_object(numbers);
    let mut dictionary = Dictionary::new();
    dictionary.set("Type", name("StructTreeRoot"));
    if let Some(first) = id_of(0) {
        dictionary.set("K", first);
    }
    dictionary.set("ParentTree", numbers);
    dictionary.set("ParentTreeNextKey", next);
    document.set_object(root, dictionary);
    Ok(root)
}

/// Which elements hold anything; an empty cell counts, since its column would be missed.
fn kept(elements: &[Element], placed: &[Option<Placed>]) -> Vec<bool> {
    let mut kept: Vec<bool> = elements
        .iter()
        .map(|e| {
            let filled = e.kids.iter().any(
                |kid| matches!(kid, Kid::Run(run) if placed.get(*run).is_some_and(Option::is_some)),
            );
            filled || matches!(e.role, Role::Document | Role::Head(_) | Role::Cell)
        })
        .collect();
    // A child stands behind its parent: from the end on, every parent hears of its children.
    for (index, element) in elements.iter().enumerate().rev() {
        if kept.get(index) == Some(&true)
            && let Some(parent) = element.parent.and_then(|p| kept.get_mut(p))
        {
            *parent = true;
        }
    }
    kept
}

/// The page of an element's first run.
fn first_page(element: &Element, placed: &[Option<Placed>]) -> Option<ObjectId> {
    element.kids.iter().find_map(|kid| match kid {
        Kid::Run(run) => placed.get(*run).copied().flatten().map(|p| p.page),
        Kid::Element(_) => None,
    })
}

/// A run as a kid of its element, which is on that page.
fn content(at: Placed, page: Option<ObjectId>) -> Option<Object> {
    if page == Some(at.page) {
        return Some(Object::Integer(at.number));
    }
    let mut reference = Dictionary::new();
    reference.set("Type", name("MCR"));
    reference.set("Pg", at.page);
    reference.set("MCID", at.number);
    Some(Object::Dictionary(reference))
}

fn dictionary(role: &Role) -> Dictionary {
    let mut dictionary = Dictionary::new();
    dictionary.set("S", name(role.name()));
    match role {
        Role::Head(scope) => {
            let mut table = Dictionary::new();
            table.set("O", name("Table"));
            let scope = match scope {
                Scope::Column => "Column",
                Scope::Row => "Row",
            };
            table.set("Scope", name(scope));
            dictionary.set("A", table);
        }
        Role::Figure(words) => dictionary.set("Alt", text_string(words)),
        _ => {}
    }
    dictionary
}

fn link_element(document: &mut Document, link: &Link, parent: ObjectId) -> ObjectId {
    let mut reference = Dictionary::new();
    reference.set("Type", name("OBJR"));
    reference.set("Obj", link.annotation);
    let mut element = Dictionary::new();
    element.set("S", name("Link"));
    element.set("P", parent);
    element.set("Pg", link.page);
    element.set("K", vec![Object::Dictionary(reference)]);
    document.add_object(element)
}
