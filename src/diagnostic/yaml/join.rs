//! Lays meaning upon places: one tree whose nodes say what they are and where they stand.

use super::meaning::Meaning;
use super::places::{Content, Place, disagreement};
use super::scalar;
use super::{Node, Shape};
use crate::diagnostic::{Fault, Source, Span};

/// One tree of both; a fault where the two differ.
pub fn join(source: &Source, meaning: Meaning, place: Place) -> Result<Node, Vec<Fault>> {
    node(source, meaning, place).map_err(|fault| vec![*fault])
}

fn node(source: &Source, meaning: Meaning, place: Place) -> Result<Node, Box<Fault>> {
    let span = place.span;
    let shape = match (meaning, place.content) {
        (Meaning::List(items), Content::List(places)) if items.len() == places.len() => {
            let pairs = items.into_iter().zip(places);
            let nodes = pairs.map(|(item, place)| node(source, item, place));
            Shape::List(nodes.collect::<Result<_, _>>()?)
        }
        (Meaning::Map(entries), Content::Map(places)) if entries.len() * 2 == places.len() => {
            map(source, entries, places)?
        }
        (
            meaning,
            Content::Scalar {
                text,
                plain,
                absent,
            },
        ) => scalar::shape(meaning, text, plain, absent)
            .map_err(|detail| Box::new(disagreement(source, span, detail)))?,
        _ => return Err(Box::new(disagreement(source, span, "lists and keys"))),
    };
    Ok(Node { span, shape })
}

fn map(
    source: &Source,
    entries: Vec<(Meaning, Meaning)>,
    places: Vec<Place>,
) -> Result<Shape, Box<Fault>> {
    let mut nodes = Vec::with_capacity(entries.len());
    let mut places = places.into_iter();
    for (key, value) in entries {
        let (Some(key_place), Some(value_place)) = (places.next(), places.next()) else {
            return Err(Box::new(disagreement(source, Span::default(), "keys")));
        };
        let key = node(source, key, key_place)?;
        let mut value = node(source, value, value_place)?;
        let absent = value.span.length == 0;
        if absent || matches!(value.shape, Shape::List(_) | Shape::Map(_)) {
            value.span = key.span;
        }
        nodes.push((key, value));
    }
    Ok(Shape::Map(nodes))
}
