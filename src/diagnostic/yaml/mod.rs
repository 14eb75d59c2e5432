//! YAML with positions.
//!
//! serde_yaml decides what a file means (`meaning`); a second parser says where each node stands
//! (`places`); `join` lays one upon the other, and where the two disagree the file is refused.
//! Not understood, and said so: anchors, aliases, tags, merge keys, a second document.

mod join;
mod meaning;
mod node;
mod places;
mod reader;
mod scalar;
mod syntax;

pub use node::{Node, Shape};
pub use reader::{Fields, Reader, nearest, parse_date, parse_moment, shown};

use super::{Faults, Source};

/// Reads the text of a file into nodes that know where they stand.
pub fn parse(source: &Source) -> Result<Node, Faults> {
    let result = places::not_too_deep(source)
        .and_then(|()| meaning::read(source.text()).map_err(|error| syntax::fault(source, &error)))
        .and_then(|meaning| {
            let place = places::read(source)?;
            join::join(source, meaning, place)
        });
    result.map_err(|fault| {
        let mut all = source.hygiene().to_vec();
        all.extend(fault);
        Faults::new(all).unwrap_or_else(|| {
            Faults::of_file(source.path(), "yaml", "an unreadable file", "YAML", None)
        })
    })
}
