//! What a walk over a file sees.

use crate::diagnostic::Span;

/// A node of a file: what it means and where it stands.
#[derive(Debug, Clone, PartialEq)]
pub struct Node {
    /// Where faults of this node are marked: a scalar itself, the key that holds a list or map.
    pub span: Span,
    /// What the node is.
    pub shape: Shape,
}

/// What a node is. Scalars carry their text as it stands in the file, quotes and escapes resolved.
#[derive(Debug, Clone, PartialEq)]
pub enum Shape {
    /// Nothing, `null` or `~`.
    Null,
    /// `true` or `false` without quotes.
    Bool(String),
    /// What YAML takes for a number: the text and its value.
    Number(String, f64),
    /// Text; `quoted` where it stands in quotes or a block.
    Text {
        /// The text.
        text: String,
        /// Whether the author marked it as text.
        quoted: bool,
    },
    /// A list.
    List(Vec<Node>),
    /// Keys and values in the order of the file, duplicates included.
    Map(Vec<(Node, Node)>),
}

impl Shape {
    /// The node in words, for "found …".
    pub fn words(&self) -> String {
        let excerpt = crate::diagnostic::excerpt;
        match self {
            Shape::Null => "nothing".to_owned(),
            Shape::Bool(text) => format!("`{text}`, which YAML takes for true or false"),
            Shape::Number(text, _) => format!("the number `{}`", excerpt(text)),
            Shape::Text { text, .. } if text.is_empty() => "an empty text".to_owned(),
            Shape::Text { text, .. } => format!("the text `{}`", excerpt(text)),
            Shape::List(_) => "a list".to_owned(),
            Shape::Map(_) => "keys with values".to_owned(),
        }
    }
}
