//! What stops YAML from being read, in words.

use crate::diagnostic::{Fault, Source, Span};

/// An error of serde_yaml as a fault with a place.
pub fn fault(source: &Source, error: &serde_yaml::Error) -> Vec<Fault> {
    let message = error.to_string();
    if message.contains("EOF while parsing") || says_nothing(source.text()) {
        return vec![empty(source)];
    }
    let span = error.location().map_or(start(), |location| Span {
        line: location.line(),
        column: location.column(),
        length: 1,
    });
    let span = visible(source, span);
    if message.contains("more than one document") {
        let line = second_start(source).unwrap_or(span);
        return vec![second_document(source, line)];
    }
    if message.contains("recursion limit") {
        return vec![too_deep(source, span)];
    }
    if message.contains("repetition limit") || message.contains("anchor") {
        return vec![source.fault(
            span,
            "alias",
            "aliases (`*`)",
            "plain values: anchors and aliases are not used in these files",
            Some("write the value out where it is needed".to_owned()),
        )];
    }
    let (found, hint) = explain(&message);
    vec![source.fault(
        span,
        "yaml_syntax",
        found,
        "YAML: one `key: value` a line, nested keys indented by two spaces",
        Some(hint.to_owned()),
    )]
}

/// Whether there are only comments and white space.
fn says_nothing(text: &str) -> bool {
    let mut lines = text.lines().map(str::trim);
    lines.all(|line| line.is_empty() || line.starts_with('#'))
}

/// More than one document in a file.
pub fn second_document(source: &Source, span: Span) -> Fault {
    source.fault(
        span,
        "second_document",
        "a second document begins here",
        "one document a file",
        Some("put it in a file of its own, or delete the line `---`".to_owned()),
    )
}

/// Lists and maps nested beyond reason.
pub fn too_deep(source: &Source, span: Span) -> Fault {
    source.fault(
        span,
        "too_deep",
        "lists or keys nested more than a hundred deep",
        "the few levels that such a file has",
        Some("check that this is the file you meant".to_owned()),
    )
}

fn empty(source: &Source) -> Fault {
    source.fault(
        start(),
        "empty_file",
        "an empty file",
        "keys with values",
        Some("check that the file was saved; start from a valid one".to_owned()),
    )
}

fn start() -> Span {
    Span {
        line: 1,
        column: 1,
        length: 1,
    }
}

/// A place that can be shown: an error past the last line is marked at the end of the last line
/// with text.
fn visible(source: &Source, span: Span) -> Span {
    let mut line = span.line;
    while line > 1 && source.line(line).trim().is_empty() {
        line -= 1;
    }
    if line == span.line {
        return span;
    }
    Span {
        line,
        column: source.line(line).trim_end().chars().count() + 1,
        length: 0,
    }
}

/// The `---` that begins the second document.
fn second_start(source: &Source) -> Option<Span> {
    let mut seen = false;
    for (index, line) in source.text().split('\n').enumerate() {
        let marker = line.trim_end();
        if seen && (marker == "---" || line.starts_with("--- ")) {
            return Some(Span {
                line: index + 1,
                column: 1,
                length: 3,
            });
        }
        seen |= !marker.is_empty() && !marker.starts_with('#');
    }
    None
}

/// What the parser's sentence means for the author of a file, and what to do.
fn explain(message: &str) -> (String, &'static str) {
    let known: [(&str, &str, &str); 9] = [
        (
            "mapping values are not allowed",
            "a second `:` in a value, or a key at the wrong indentation",
            "put text that contains `: ` in double quotes; align keys of one level",
        ),
        (
            "could not find expected ':'",
            "a line without `:` after its key",
            "write `key: value`, with a space after the colon",
        ),
        (
            "did not find expected ',' or",
            "a `{…}` or `[…]` that does not go on or close as it should",
            "separate entries by commas and close the bracket",
        ),
        (
            "did not find expected key",
            "a line that is no key of the level it stands at",
            "align keys of one level; put text that begins with a quote wholly in quotes",
        ),
        (
            "cannot start any token",
            "a character that cannot begin a value (such as `%`, `@` or a backquote)",
            "put the value in double quotes",
        ),
        (
            "did not find expected alphabetic or numeric",
            "`&` or `*` at the beginning of a value",
            "put the value in double quotes",
        ),
        (
            "while scanning a quoted scalar",
            "a quote that is never closed",
            "close the text with the quote it began with",
        ),
        (
            "unknown escape character",
            "a backslash sequence that YAML does not know",
            "double the backslash, or use single quotes",
        ),
        (
            "block sequence entries are not allowed",
            "a `- ` in a place where no list can begin",
            "begin the list on the line after its key, indented",
        ),
    ];
    let found = known.iter().find(|(sign, ..)| message.contains(sign));
    found.map_or_else(
        || {
            let detail = crate::diagnostic::printable(message);
            (
                format!("YAML that cannot be read ({detail})"),
                "compare the line with those above it: quotes, brackets, indentation",
            )
        },
        |(_, words, hint)| ((*words).to_owned(), *hint),
    )
}
