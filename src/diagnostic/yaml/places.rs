//! Where the nodes of a file stand, from the events of a parser that marks them.

use crate::diagnostic::{Fault, Source, Span};
use saphyr_parser::{Event, Marker, Parser, ScalarStyle};

/// Deepest nesting of lists and maps; serde_yaml stops at 128.
const DEEPEST: usize = 128;

/// A node by its place.
#[derive(Debug, Clone, PartialEq)]
pub struct Place {
    /// A scalar with its quotes; the first character of a list or map.
    pub span: Span,
    /// What stands there.
    pub content: Content,
}

/// What stands at a place.
#[derive(Debug, Clone, PartialEq)]
pub enum Content {
    /// Text with escapes resolved; `plain` without quotes; `absent` where nothing is written.
    #[allow(missing_docs)]
    Scalar {
        text: String,
        plain: bool,
        absent: bool,
    },
    /// Items.
    List(Vec<Place>),
    /// Keys and values one after the other.
    Map(Vec<Place>),
}

/// Reads the places of the only document of a file that serde_yaml has taken.
///
/// Anchors, aliases, tags and further documents are faults here; all of them are listed.
pub fn read(source: &Source) -> Result<Place, Vec<Fault>> {
    let mut builder = Builder {
        source,
        faults: Vec::new(),
        open: Vec::new(),
        root: None,
        documents: 0,
    };
    let mut parser = Parser::new_from_str(source.text()).keep_tags(true);
    while let Some(event) = parser.next_event() {
        match event {
            Ok((event, span)) => builder.event(event, span.start, span.end),
            Err(error) => {
                let span = at(source, *error.marker(), *error.marker());
                builder
                    .faults
                    .push(disagreement(source, span, error.info()));
                break;
            }
        }
    }
    builder.finish()
}

/// Refuses brackets nested too deep before serde_yaml sees them: the time that it takes until it
/// stops at 128 grows with the square of the depth.
pub fn not_too_deep(source: &Source) -> Result<(), Vec<Fault>> {
    let opens = |byte: &u8| matches!(byte, b'[' | b'{');
    if source.text().as_bytes().iter().filter(|b| opens(b)).count() <= DEEPEST {
        return Ok(());
    }
    let mut depth = 0_usize;
    for event in Parser::new_from_str(source.text()) {
        match event {
            Ok((Event::SequenceStart(..) | Event::MappingStart(..), span)) => {
                depth += 1;
                if depth > DEEPEST {
                    let span = at(source, span.start, span.end);
                    return Err(vec![super::syntax::too_deep(source, span)]);
                }
            }
            Ok((Event::SequenceEnd | Event::MappingEnd, _)) => depth = depth.saturating_sub(1),
            Ok(_) => {}
            // Whatever it is, the readers say it.
            Err(_) => break,
        }
    }
    Ok(())
}

/// The two parsers read the file differently.
pub fn disagreement(source: &Source, span: Span, detail: &str) -> Fault {
    source.fault(
        span,
        "yaml_ambiguous",
        format!("YAML that can be read in two ways ({detail})"),
        "one meaning",
        Some("write it more simply: one key a line, text in double quotes".to_owned()),
    )
}

struct Builder<'a> {
    source: &'a Source,
    faults: Vec<Fault>,
    open: Vec<Place>,
    root: Option<Place>,
    documents: usize,
}

impl Builder<'_> {
    fn event(&mut self, event: Event<'_>, start: Marker, end: Marker) {
        let span = at(self.source, start, end);
        match event {
            Event::DocumentStart(_) => self.document(span),
            Event::Alias(_) => {
                self.refuse(span, "alias", "an alias (`*`)");
                self.close(Place {
                    span,
                    content: Content::List(Vec::new()),
                });
            }
            Event::Scalar(text, style, anchor, tag) => {
                self.marks(span, anchor, tag.is_some());
                let plain = style == ScalarStyle::Plain;
                let span = match style {
                    ScalarStyle::SingleQuoted => within_quotes(self.source, span, '\''),
                    ScalarStyle::DoubleQuoted => within_quotes(self.source, span, '"'),
                    _ => span,
                };
                let absent = plain && start.index() == end.index();
                let content = Content::Scalar {
                    text: if absent {
                        String::new()
                    } else {
                        text.into_owned()
                    },
                    plain,
                    absent,
                };
                self.close(Place { span, content });
            }
            Event::SequenceStart(anchor, tag) => {
                self.marks(span, anchor, tag.is_some());
                self.start(span, Content::List(Vec::new()));
            }
            Event::MappingStart(anchor, tag) => {
                self.marks(span, anchor, tag.is_some());
                self.start(span, Content::Map(Vec::new()));
            }
            Event::SequenceEnd | Event::MappingEnd => {
                if let Some(place) = self.open.pop() {
                    self.close(place);
                }
            }
            Event::Nothing | Event::StreamStart | Event::StreamEnd | Event::DocumentEnd => {}
        }
    }

    fn document(&mut self, span: Span) {
        self.documents += 1;
        if self.documents == 2 {
            self.faults
                .push(super::syntax::second_document(self.source, span));
        }
    }

    fn marks(&mut self, span: Span, anchor: usize, tagged: bool) {
        if anchor > 0 {
            self.refuse(span, "anchor", "an anchor (`&`)");
        }
        if tagged {
            self.refuse(span, "tag", "a tag (`!`)");
        }
    }

    fn refuse(&mut self, span: Span, code: &'static str, found: &str) {
        self.faults.push(self.source.fault(
            span,
            code,
            found,
            "plain values: anchors, aliases, tags and merge keys are not used in these files",
            Some("write the value out where it is needed; put text in double quotes".to_owned()),
        ));
    }

    fn start(&mut self, span: Span, content: Content) {
        if self.open.len() == DEEPEST {
            self.faults.push(super::syntax::too_deep(self.source, span));
        }
        self.open.push(Place { span, content });
    }

    fn close(&mut self, place: Place) {
        match self.open.last_mut().map(|parent| &mut parent.content) {
            Some(Content::List(items) | Content::Map(items)) => items.push(place),
            Some(Content::Scalar { .. }) => {}
            None if self.documents < 2 => self.root = Some(place),
            None => {}
        }
    }

    fn finish(self) -> Result<Place, Vec<Fault>> {
        if !self.faults.is_empty() {
            return Err(self.faults);
        }
        let nothing = Span {
            line: 1,
            column: 1,
            length: 0,
        };
        self.root
            .ok_or_else(|| vec![disagreement(self.source, nothing, "no node was found")])
    }
}

/// The span up to the closing quote, where the reader's own runs on to the end of the line.
fn within_quotes(source: &Source, span: Span, quote: char) -> Span {
    let line = source.line(span.line);
    let mut inside = line.chars().skip(span.column).take(span.length).peekable();
    // The opening quote counts.
    let mut length = 1;
    while let Some(c) = inside.next() {
        length += 1;
        let escaped = match quote {
            '"' => c == '\\',
            _ => c == quote && inside.peek() == Some(&quote),
        };
        if escaped {
            inside.next();
            length += 1;
        } else if c == quote {
            return Span { length, ..span };
        }
    }
    span
}

/// A span within one line; one that goes on is cut at the end of its first line.
fn at(source: &Source, start: Marker, end: Marker) -> Span {
    let from = start.col();
    let length = if end.line() == start.line() {
        end.col().saturating_sub(from)
    } else {
        let line = source.line(start.line()).chars().count();
        line.saturating_sub(from)
    };
    Span {
        line: start.line(),
        column: from + 1,
        length,
    }
}
