//! Faults as people read them on a terminal, and as programs read them.

use super::{Fault, Faults, Quote, printable, wrap};
use annotate_snippets::{AnnotationKind, Element, Group, Level, Renderer, Snippet};
use std::ops::Range;
use unicode_width::UnicodeWidthStr;

/// Columns that a rendering keeps to.
const WIDTH: usize = 80;
/// Columns of a quoted line that are shown; the rest belongs to the line number and frame.
const LINE_WIDTH: usize = 70;

/// All faults of a file: place, line with caret, what was found and expected, what to do.
///
/// Fits 80 columns. Nothing from the file reaches the terminal but characters that are seen.
pub fn render(faults: &Faults, colour: bool) -> String {
    let renderer = if colour {
        Renderer::styled()
    } else {
        Renderer::plain()
    };
    let renderer = renderer.term_width(WIDTH);
    let mut text = String::new();
    for fault in faults {
        text.push_str(&one(fault, &renderer));
        text.push_str("\n\n");
    }
    if faults.more() > 0 {
        let more = faults.more();
        text.push_str(&format!("… and {more} more faults in this file\n\n"));
    }
    text
}

/// All faults of a file as a list of objects: code, path, line, column, quote, found, expected,
/// hint. A last object with code `more` counts those beyond the first hundred.
pub fn as_json(faults: &Faults) -> serde_json::Value {
    let mut list: Vec<_> = faults.iter().map(object).collect();
    if faults.more() > 0 {
        list.push(serde_json::json!({"code": "more", "count": faults.more()}));
    }
    serde_json::Value::Array(list)
}

fn object(fault: &Fault) -> serde_json::Value {
    serde_json::json!({
        "code": fault.code,
        "path": fault.path,
        "line": (fault.line > 0).then_some(fault.line),
        "column": (fault.column > 0).then_some(fault.column),
        "quoted": fault.quote.as_ref().map(|q| &q.text),
        "found": fault.found,
        "expected": fault.expected,
        "hint": fault.hint,
    })
}

fn one(fault: &Fault, renderer: &Renderer) -> String {
    let path = printable(&fault.path);
    let title = message(&fault.found, "error: ".len());
    let mut elements: Vec<Element<'_>> = Vec::new();
    let shown = fault.quote.as_ref().map(window);
    if let Some((line, span)) = &shown {
        elements.push(
            Snippet::source(line.as_str())
                .line_start(fault.line)
                .path(path.as_str())
                .fold(false)
                .annotation(AnnotationKind::Primary.span(span.clone()))
                .into(),
        );
    } else {
        elements.push(annotate_snippets::Origin::path(path.as_str()).into());
    }
    let margin = fault.line.to_string().len() + " = expected: ".len();
    if !fault.expected.is_empty() {
        let level = Level::NOTE.with_name("expected");
        elements.push(level.message(message(&fault.expected, margin)).into());
    }
    if let Some(hint) = &fault.hint {
        elements.push(Level::HELP.message(message(hint, margin)).into());
    }
    let group = Group::with_title(Level::ERROR.primary_title(title)).elements(elements);
    shift_column(renderer.render(&[group]), fault, &path)
}

/// The library counts the column within the window shown; the fault knows that of the file.
fn shift_column(text: String, fault: &Fault, path: &str) -> String {
    let Some(start) = text.find(&format!("{path}:{}:", fault.line)) else {
        return text;
    };
    let from = start + format!("{path}:{}:", fault.line).len();
    let rest = text.get(from..).unwrap_or_default();
    let digits = rest.chars().take_while(char::is_ascii_digit).count();
    let head = text.get(..from).unwrap_or_default();
    let tail = rest.get(digits..).unwrap_or_default();
    format!("{head}{}{tail}", fault.column)
}

/// Wrapped text for a message that starts after `margin` columns.
fn message(text: &str, margin: usize) -> String {
    wrap(&printable(text), WIDTH.saturating_sub(margin)).join("\n")
}

/// The part of a line that fits, printable, with the marked bytes.
fn window(quote: &Quote) -> (String, Range<usize>) {
    let chars: Vec<char> = quote.text.chars().collect();
    let piece = |range: Range<usize>| -> String {
        printable(
            &chars
                .get(range)
                .unwrap_or_default()
                .iter()
                .collect::<String>(),
        )
    };
    let mut first = 0;
    while first < quote.from
        && piece(first..quote.from).width() > LINE_WIDTH / 2
        && piece(first..chars.len()).width() > LINE_WIDTH
    {
        first += 1;
    }
    let mut last = chars.len();
    while last > quote.from && piece(first..last).width() > LINE_WIDTH {
        last -= 1;
    }
    let head = if first > 0 { "…" } else { "" };
    let tail = if last < chars.len() { "…" } else { "" };
    let before = format!("{head}{}", piece(first..quote.from));
    let marked = piece(quote.from..quote.to.clamp(quote.from, last.max(quote.from)));
    let after = piece(quote.to.min(last).max(quote.from)..last);
    let start = before.len();
    let end = start + marked.len();
    (format!("{before}{marked}{after}{tail}"), start..end)
}
