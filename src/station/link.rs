//! The instrument on the network: which strings to send it, and how its answers are written.

use super::read::given;
use super::{
    Answer, ByteOrder, Column, ErrorQueue, Form, Identity, InstrumentLink, Layout, Wait, layout,
    watch,
};
use crate::diagnostic::yaml::{Node, Reader, Shape, shown};
use crate::diagnostic::{Span, excerpt};
use crate::quantity::Dimension;

const KEYS: [&str; 12] = [
    "tcp",
    "timeout",
    "ends_with",
    "identity",
    "setup",
    "trigger",
    "wait",
    "read",
    "finish",
    "errors",
    "abort",
    "points",
];

/// A number in an answer that is of no use here.
const SKIP: &str = "skip";

/// Longest order or question, in characters.
const LONGEST: usize = 250;

/// The link. `layout` is that of the file, where it has one.
pub fn read(
    reader: &mut Reader<'_>,
    node: &Node,
    layout: Option<&Layout>,
) -> Option<InstrumentLink> {
    let what = "`instrument_link`";
    let fields = reader.fields(node, what, &KEYS)?;
    let address = reader
        .required(&fields, "tcp", what, "\"192.0.2.17:5025\"")
        .and_then(|node| address(reader, node));
    let timeout = fields.get("timeout").map(|node| {
        let possible = |v: f64| (0.1..=600.0).contains(&v);
        let expected = "a time from 0.1 s to 600 s";
        reader.quantity_if(node, "`timeout`", Dimension::Time, possible, expected)
    });
    let ends = ["newline", "return_newline"];
    let ends_with = fields
        .get("ends_with")
        .map(|node| reader.one_of(node, "an end of a message", &ends));
    let identity = fields.get("identity").map(|node| identity(reader, node));
    let orders = |reader: &mut Reader<'_>, key: &str| {
        let node = fields.get(key);
        node.map(|node| orders(reader, node, &format!("`{key}`")))
    };
    let setup = orders(reader, "setup");
    let trigger = orders(reader, "trigger");
    let finish = orders(reader, "finish");
    let abort = orders(reader, "abort");
    let wait = fields.get("wait").map(|node| wait(reader, node));
    let example = "[{quantity: frequency, query: \"FREQ:DATA?\", format: ascii}, …]";
    let answers = reader
        .required(&fields, "read", what, example)
        .and_then(|node| answers(reader, node, layout));
    let errors = fields.get("errors").map(|node| errors(reader, node));
    let points = fields.get("points").map(|node| watch::points(reader, node));
    let (host, port) = address?;
    Some(InstrumentLink {
        host,
        port,
        timeout: given(timeout)?.unwrap_or(5.0),
        carriage_return: given(ends_with)? == Some(1),
        identity: given(identity)?,
        setup: given(setup)?.unwrap_or_default(),
        trigger: given(trigger)?.unwrap_or_default(),
        wait: given(wait)?,
        read: answers?,
        finish: given(finish)?.unwrap_or_default(),
        errors: given(errors)?,
        abort: given(abort)?.unwrap_or_default(),
        points: given(points)?,
    })
}

/// `host:port`; an IPv6 address stands in brackets.
fn address(reader: &mut Reader<'_>, node: &Node) -> Option<(String, u16)> {
    let text = reader.line(node, "`tcp`")?;
    let parts = text.rsplit_once(':').and_then(|(host, port)| {
        let bare = match host.strip_prefix('[') {
            Some(rest) => rest.strip_suffix(']')?,
            None => host,
        };
        let bracketed = bare.len() != host.len();
        let name = |c: char| c.is_ascii_alphanumeric() || matches!(c, '.' | '-' | '_');
        let numbers = |c: char| c.is_ascii_hexdigit() || matches!(c, ':' | '.' | '%');
        let good = !bare.is_empty() && bare.chars().all(|c| name(c) || bracketed && numbers(c));
        let digits = !port.is_empty() && port.bytes().all(|b| b.is_ascii_digit());
        let port = port.parse::<u16>().ok().filter(|&p| digits && p > 0)?;
        good.then(|| (bare.to_owned(), port))
    });
    if parts.is_none() {
        reader.fault(
            node.span,
            "bad_address",
            format!("{} for `tcp`", shown(node)),
            "name or address of the instrument, a colon and its port, from 1 to 65535",
            Some(
                "write for example \"192.0.2.17:5025\" or \"bench-2-analyser:5025\"; an IPv6 \
                 address stands in brackets"
                    .to_owned(),
            ),
        );
    }
    parts
}

/// A string that is sent: one line of printable ASCII (IEEE 488.2 messages are 7-bit text).
fn message(reader: &mut Reader<'_>, node: &Node, what: &str) -> Option<String> {
    let text = reader.line(node, what)?;
    let bad = text.chars().find(|c| !matches!(c, ' '..='~'));
    if bad.is_some() || text.len() > LONGEST {
        reader.fault(
            node.span,
            "bad_message",
            format!("`{}` for {what}", excerpt(&text)),
            format!("one line of at most {LONGEST} characters of ASCII"),
            Some("write it as the instrument's programming manual has it".to_owned()),
        );
        return None;
    }
    Some(text)
}

/// Whether a message asks for an answer: a `?` outside quotes.
fn asks(text: &str) -> bool {
    let mut quote = None;
    for c in text.chars() {
        match (quote, c) {
            (None, '"' | '\'') => quote = Some(c),
            (Some(open), c) if c == open => quote = None,
            (None, '?') => return true,
            _ => {}
        }
    }
    false
}

fn question(reader: &mut Reader<'_>, node: &Node, what: &str) -> Option<String> {
    let text = message(reader, node, what)?;
    if asks(&text) {
        return Some(text);
    }
    reader.fault(
        node.span,
        "not_a_question",
        format!(
            "`{}` for {what}, which the instrument does not answer",
            excerpt(&text)
        ),
        "a question: a message with `?`",
        Some("add the `?`, or move it to `trigger`".to_owned()),
    );
    None
}

/// Messages that are not answered, one or a list.
fn orders(reader: &mut Reader<'_>, node: &Node, what: &str) -> Option<Vec<String>> {
    let nodes: Vec<&Node> = match &node.shape {
        Shape::List(list) => list.iter().collect(),
        _ => vec![node],
    };
    let before = reader.count();
    let mut all = Vec::with_capacity(nodes.len());
    for node in nodes {
        let Some(text) = message(reader, node, what) else {
            continue;
        };
        if asks(&text) {
            reader.fault(
                node.span,
                "answer_unread",
                format!("the question `{}` in {what}", excerpt(&text)),
                "messages without an answer: one left unread is taken for that of the next question",
                Some(
                    "move it to `wait` or `read`, or put `identity` or `errors` in its place"
                        .to_owned(),
                ),
            );
        }
        all.push(text);
    }
    (reader.count() == before).then_some(all)
}

fn identity(reader: &mut Reader<'_>, node: &Node) -> Option<Identity> {
    let what = "`identity`";
    let fields = reader.fields(node, what, &["query", "contains"])?;
    let query = reader
        .required(&fields, "query", what, "\"*IDN?\"")
        .and_then(|node| question(reader, node, "`query`"));
    let contains = reader
        .required(&fields, "contains", what, "FA-0112")
        .and_then(|node| reader.line(node, "`contains`"));
    Some(Identity {
        query: query?,
        contains: contains?,
    })
}

fn wait(reader: &mut Reader<'_>, node: &Node) -> Option<Wait> {
    let what = "`wait`";
    let fields = reader.fields(node, what, &["query", "until", "every", "longest"])?;
    let query = reader
        .required(&fields, "query", what, "\"*OPC?\"")
        .and_then(|node| question(reader, node, "`query`"));
    let until = reader
        .required(&fields, "until", what, "\"1\"")
        .and_then(|node| reader.line(node, "`until`"));
    let mut time = |key: &str, (least, most): (f64, f64)| {
        fields.get(key).map(|node| {
            let possible = |v: f64| (least..=most).contains(&v);
            let expected = format!("a time from {least} s to {most} s");
            let label = format!("`{key}`");
            reader.quantity_if(node, &label, Dimension::Time, possible, &expected)
        })
    };
    let every = time("every", (0.01, 60.0));
    let longest = time("longest", (0.1, 36_000.0));
    Some(Wait {
        query: query?,
        until: until?,
        every: given(every)?.unwrap_or(0.1),
        longest: given(longest)?.unwrap_or(60.0),
    })
}

fn errors(reader: &mut Reader<'_>, node: &Node) -> Option<ErrorQueue> {
    let what = "`errors`";
    let fields = reader.fields(node, what, &["query", "none"])?;
    let query = reader
        .required(&fields, "query", what, "\"SYST:ERR?\"")
        .and_then(|node| question(reader, node, "`query`"));
    let none = reader
        .required(&fields, "none", what, "\"0\"")
        .and_then(|node| reader.line(node, "`none`"));
    Some(ErrorQueue {
        query: query?,
        none: none?,
    })
}

/// The questions after a measurement, and whether their answers make a sweep.
fn answers(reader: &mut Reader<'_>, node: &Node, layout: Option<&Layout>) -> Option<Vec<Answer>> {
    let Shape::List(nodes) = &node.shape else {
        reader.fault(
            node.span,
            "wrong_kind",
            format!("{} for `read`", node.shape.words()),
            "a list of questions",
            Some("put `- ` before each `{quantity: …, query: …, format: …}`".to_owned()),
        );
        return None;
    };
    let before = reader.count();
    let all: Vec<Answer> = nodes
        .iter()
        .filter_map(|node| answer(reader, node))
        .collect();
    if reader.count() > before {
        return None;
    }
    let columns: Vec<Column> = all
        .iter()
        .flat_map(|a| a.quantities.iter().flatten().copied())
        .collect();
    let twice = columns
        .iter()
        .enumerate()
        .find(|(i, c)| columns.iter().take(*i).any(|o| o == *c));
    if let Some((_, column)) = twice {
        let found = format!("`{}` read a second time", layout::name(*column));
        let expected = "each quantity once";
        reader.fault(node.span, "bad_columns", found, expected, None);
        return None;
    }
    if !layout::is_a_sweep(&columns) {
        reader.fault(
            node.span,
            "bad_columns",
            "answers that do not give an impedance against frequency",
            layout::EXPECTED,
            Some("add the missing quantity, or name what is not needed `skip`".to_owned()),
        );
        return None;
    }
    if let Some(layout) = layout {
        as_in_layout(reader, node.span, &columns, layout);
    }
    (reader.count() == before).then_some(all)
}

/// The columns of the file that is written are those of `layout`.
fn as_in_layout(reader: &mut Reader<'_>, span: Span, columns: &[Column], layout: &Layout) {
    let wanted: Vec<Column> = layout
        .columns
        .iter()
        .map(|(column, _)| *column)
        .filter(|column| *column != Column::Part)
        .collect();
    let same = wanted.len() == columns.len() && wanted.iter().all(|c| columns.contains(c));
    if same {
        return;
    }
    let list = |columns: &[Column]| {
        let names: Vec<_> = columns.iter().map(|c| layout::name(*c)).collect();
        names.join(" ")
    };
    reader.fault(
        span,
        "layout_does_not_suit",
        format!("answers with {}", list(columns)),
        format!("the quantities of `layout`: {}", list(&wanted)),
        Some(
            "correct one of the two; without `layout` the answers are in Hz, Ω, F, V, degrees, dB"
                .to_owned(),
        ),
    );
}

fn answer(reader: &mut Reader<'_>, node: &Node) -> Option<Answer> {
    let what = "an entry of `read`";
    let fields = reader.fields(node, what, &["quantity", "query", "format", "order"])?;
    let quantities = reader
        .required(&fields, "quantity", what, "frequency")
        .and_then(|node| quantities(reader, node));
    let query = reader
        .required(&fields, "query", what, "\"FREQ:DATA?\"")
        .and_then(|node| question(reader, node, "`query`"));
    let formats = ["ascii", "real32", "real64"];
    let format = reader
        .required(&fields, "format", what, "ascii")
        .and_then(|node| reader.one_of(node, "a format of an answer", &formats));
    let order = fields
        .get("order")
        .map(|node| reader.one_of(node, "an order of bytes", &["big", "little"]));
    match (format, fields.entry("order")) {
        (Some(0), Some((key, _))) => reader.fault(
            key.span,
            "no_effect",
            "`order` of an answer in ASCII",
            "`order` with `real32` and `real64` only",
            Some("delete it".to_owned()),
        ),
        (Some(1 | 2), None) => {
            // A wrong guess gives numbers that can look like measurements.
            reader.required(&fields, "order", what, "big");
        }
        _ => {}
    }
    let order = match given(order)? {
        Some(1) => ByteOrder::Little,
        _ => ByteOrder::Big,
    };
    let form = match format? {
        0 => Form::Ascii,
        1 => Form::Real32(order),
        _ => Form::Real64(order),
    };
    Some(Answer {
        quantities: quantities?,
        query: query?,
        form,
    })
}

/// One quantity, or those that take turns in the answer; `skip` passes a number over.
fn quantities(reader: &mut Reader<'_>, node: &Node) -> Option<Vec<Option<Column>>> {
    let nodes: Vec<&Node> = match &node.shape {
        Shape::List(list) => list.iter().collect(),
        _ => vec![node],
    };
    let names: Vec<&str> = layout::measured_names().chain([SKIP]).collect();
    let before = reader.count();
    let all: Vec<Option<Column>> = nodes
        .iter()
        .filter_map(|node| {
            let index = reader.one_of(node, "a quantity", &names)?;
            Some(names.get(index).and_then(|name| layout::column(name)))
        })
        .collect();
    if reader.count() == before && all.iter().all(Option::is_none) {
        reader.fault(
            node.span,
            "bad_columns",
            "an answer of which nothing is used",
            "at least one quantity",
            Some("delete the entry".to_owned()),
        );
    }
    (reader.count() == before).then_some(all)
}
