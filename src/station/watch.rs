//! The folder in which the analyser's own software saves sweeps.

use super::Watch;
use super::read::given;
use crate::diagnostic::yaml::{Node, Reader, Shape};
use crate::quantity::Dimension;

/// How long a file must not change where nothing else shows that it is complete, in seconds.
const SETTLE: f64 = 0.5;

/// Most points that a sweep can be said to have.
const MOST_POINTS: u64 = 1_000_000;

/// The folder, what its sweeps are called and when they are complete.
pub fn read(reader: &mut Reader<'_>, node: &Node) -> Option<Watch> {
    let what = "`watch`";
    let fields = reader.fields(node, what, &["folder", "pattern", "settle", "points"])?;
    let folder = reader
        .required(&fields, "folder", what, "sweeps")
        .and_then(|node| reader.line(node, "`folder`"));
    let patterns = fields.get("pattern").map(|node| patterns(reader, node));
    let settle = fields.get("settle").map(|node| {
        let possible = |v: f64| (0.0..=60.0).contains(&v);
        let expected = "a time from 0 s to 60 s";
        reader.quantity_if(node, "`settle`", Dimension::Time, possible, expected)
    });
    let points = fields.get("points").map(|node| points(reader, node));
    Some(Watch {
        folder: folder?,
        patterns: given(patterns)?.unwrap_or_default(),
        settle: given(settle)?.unwrap_or(SETTLE),
        points: given(points)?,
    })
}

/// How many points a whole sweep has.
pub fn points(reader: &mut Reader<'_>, node: &Node) -> Option<u32> {
    let points = reader.integer(node, "`points`", (2, MOST_POINTS))?;
    u32::try_from(points).ok()
}

/// One pattern or a list of them.
fn patterns(reader: &mut Reader<'_>, node: &Node) -> Option<Vec<String>> {
    let nodes: Vec<&Node> = match &node.shape {
        Shape::List(list) => list.iter().collect(),
        _ => vec![node],
    };
    if nodes.is_empty() {
        reader.fault(
            node.span,
            "missing_value",
            "an empty list for `pattern`",
            "at least one pattern",
            Some("write for example `pattern: \"*.csv\"`, or delete the key".to_owned()),
        );
    }
    let mut patterns = Vec::with_capacity(nodes.len());
    let mut complete = !nodes.is_empty();
    for node in nodes {
        let Some(pattern) = reader.line(node, "`pattern`") else {
            complete = false;
            continue;
        };
        if pattern.contains(['/', '\\', '[', ']', '{', '}']) {
            reader.fault(
                node.span,
                "bad_pattern",
                format!("`{pattern}` for `pattern`"),
                "a file name in which `*` stands for any characters and `?` for one",
                Some("write for example \"*.csv\"; the folder stands in `folder`".to_owned()),
            );
            complete = false;
            continue;
        }
        patterns.push(pattern);
    }
    complete.then_some(patterns)
}
