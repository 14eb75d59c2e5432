//! Scalars as texts, names, numbers, quantities and times.

use super::super::scalar::{is_decimal, is_old_boolean, is_plain_decimal};
use super::{Node, Reader, Shape};
use crate::diagnostic::{Span, excerpt, file_name};
use crate::quantity::{self, Dimension, QuantityError, Tolerance};
use chrono::{DateTime, FixedOffset, NaiveDate};

/// Longest text of one field, in characters.
const LONGEST_TEXT: usize = 1000;

impl Reader<'_> {
    /// A text. What YAML takes for a number stays as it stands where that is unambiguous
    /// (`3` is "3", `3.10` is "3.10"); otherwise quotes are asked for.
    pub fn text(&mut self, node: &Node, what: &str) -> Option<String> {
        let text = match &node.shape {
            Shape::Null => return None,
            Shape::Text { text, quoted } if *quoted || !is_old_boolean(text) => text,
            Shape::Number(text, _) if is_plain_decimal(text) => text,
            Shape::Text { text, .. } | Shape::Number(text, _) | Shape::Bool(text) => {
                self.needs_quotes(node, text, what);
                return None;
            }
            Shape::List(_) | Shape::Map(_) => {
                self.wrong_kind(node, what);
                return None;
            }
        };
        if text.trim().is_empty() {
            self.fault(node.span, "empty_text", "an empty text", what, None);
            return None;
        }
        if text.chars().count() > LONGEST_TEXT {
            let found = format!("a text of {} characters", text.chars().count());
            let expected = format!("{what} of at most {LONGEST_TEXT} characters");
            self.fault(node.span, "text_too_long", found, expected, None);
            return None;
        }
        Some(text.clone())
    }

    /// A text of one line without invisible characters, as records and screens can show it.
    pub fn line(&mut self, node: &Node, what: &str) -> Option<String> {
        let text = self.text(node, what)?;
        let shown = crate::diagnostic::printable(&text);
        if shown != text {
            self.fault(
                node.span,
                "hidden_character",
                format!("an invisible character in `{}`", excerpt(&text)),
                format!("{what} in one line of visible characters"),
                Some("type the text anew".to_owned()),
            );
            return None;
        }
        Some(text)
    }

    /// A text that becomes the name of a file or folder.
    pub fn name(&mut self, node: &Node, what: &str) -> Option<String> {
        let text = self.text(node, what)?;
        if let Some(found) = file_name::fault_of(&text) {
            self.fault(
                node.span,
                "name_not_safe",
                found,
                format!(
                    "{what} that can name a file everywhere: letters A-Z a-z, digits, `-`, `_`, \
                     `.`, `+`, single spaces inside, at most {} characters",
                    file_name::LONGEST
                ),
                Some("replace other characters by `-`".to_owned()),
            );
            return None;
        }
        Some(text)
    }

    /// A path inside a folder, written with `/`.
    pub fn path(&mut self, node: &Node, what: &str) -> Option<String> {
        let text = self.text(node, what)?;
        if let Some(found) = file_name::fault_of_path(&text) {
            self.fault(
                node.span,
                "path_not_safe",
                found,
                format!("{what}: a path inside its folder, with `/` between steps"),
                Some("write for example `compensation/open.csv`".to_owned()),
            );
            return None;
        }
        Some(text)
    }

    /// One of some words; answers its index.
    pub fn one_of(&mut self, node: &Node, what: &str, words: &[&str]) -> Option<usize> {
        let text = match &node.shape {
            Shape::Null => return None,
            Shape::Text { text, .. } | Shape::Number(text, _) | Shape::Bool(text) => text,
            Shape::List(_) | Shape::Map(_) => {
                self.wrong_kind(node, what);
                return None;
            }
        };
        let index = words.iter().position(|word| word == text);
        if index.is_none() {
            self.unknown(node.span, "unknown_value", text, &format!("not {what}"), words);
        }
        index
    }

    /// A finite decimal number without a unit.
    pub fn number(&mut self, node: &Node, what: &str) -> Option<f64> {
        match &node.shape {
            Shape::Null => None,
            Shape::Number(text, value) if is_decimal(text) && value.is_finite() => Some(*value),
            Shape::List(_) | Shape::Map(_) => {
                self.wrong_kind(node, what);
                None
            }
            shape => {
                let found = shape.words();
                let hint = number_hint(shape);
                self.fault(node.span, "not_a_number", found, format!("{what}: a number"), hint);
                None
            }
        }
    }

    /// A number in a closed range; the ends are given as they are to be shown.
    pub fn number_within(
        &mut self,
        node: &Node,
        what: &str,
        (least, most): (f64, f64),
    ) -> Option<f64> {
        let value = self.number(node, what)?;
        if value >= least && value <= most {
            return Some(value);
        }
        let expected = format!("{what} from {least} to {most}");
        self.fault(node.span, "out_of_range", node.shape.words(), expected, None);
        None
    }

    /// A whole number in a closed range.
    pub fn integer(&mut self, node: &Node, what: &str, (least, most): (u64, u64)) -> Option<u64> {
        let expected = format!("{what}: a whole number from {least} to {most}");
        if let Shape::Number(text, _) = &node.shape {
            let whole = if is_plain_decimal(text) { text.parse::<u64>().ok() } else { None };
            if let Some(value) = whole.filter(|value| (least..=most).contains(value)) {
                return Some(value);
            }
            self.fault(node.span, "out_of_range", node.shape.words(), expected, None);
            return None;
        }
        if matches!(node.shape, Shape::List(_) | Shape::Map(_)) {
            self.wrong_kind(node, what);
        } else if !matches!(node.shape, Shape::Null) {
            let hint = number_hint(&node.shape);
            self.fault(node.span, "not_a_number", node.shape.words(), expected, hint);
        }
        None
    }

    /// A number with a unit, in SI.
    pub fn quantity(&mut self, node: &Node, what: &str, dimension: Dimension) -> Option<f64> {
        let text = self.quantity_text(node, what)?;
        let read = quantity::parse(text, dimension);
        self.parsed(node.span, what, read)
    }

    /// A quantity in an interval. `expected` says what is possible: "a positive resistance".
    pub fn quantity_if(
        &mut self,
        node: &Node,
        what: &str,
        dimension: Dimension,
        possible: impl Fn(f64) -> bool,
        expected: &str,
    ) -> Option<f64> {
        let value = self.quantity(node, what, dimension)?;
        if possible(value) {
            return Some(value);
        }
        let found = format!("{what} {}", shown(node));
        let hint = (dimension == Dimension::Ratio && value > 1.0 && !has_percent(node))
            .then(|| "write the sign `%` if percent was meant".to_owned());
        self.fault(node.span, "impossible_value", found, expected, hint);
        None
    }

    /// A tolerance around a nominal value.
    pub fn tolerance(
        &mut self,
        node: &Node,
        dimension: Dimension,
        nominal: Option<f64>,
    ) -> Option<Tolerance> {
        let text = self.quantity_text(node, "`tolerance`")?;
        let read = quantity::parse_tolerance(text, dimension, nominal);
        self.parsed(node.span, "`tolerance`", read)
    }

    /// A window of two limits.
    pub fn window(&mut self, node: &Node, what: &str, dimension: Dimension) -> Option<(f64, f64)> {
        let text = self.quantity_text(node, what)?;
        let read = quantity::parse_window(text, dimension);
        let (lower, upper) = self.parsed(node.span, what, read)?;
        if lower <= upper {
            return Some((lower, upper));
        }
        let found = format!("{what} {} from high to low", shown(node));
        self.fault(node.span, "reversed", found, "the lower limit first", None);
        None
    }

    /// A calendar day, `2026-03-02`.
    pub fn date(&mut self, node: &Node, what: &str) -> Option<NaiveDate> {
        let text = self.text(node, what)?;
        let day = parse_date(&text);
        if day.is_none() {
            self.not_a_time(node, "a day that exists, as year-month-day: `2026-03-02`");
        }
        day
    }

    /// A moment with its offset from UTC, `2026-10-05T07:50:00+02:00`.
    pub fn moment(&mut self, node: &Node, what: &str) -> Option<DateTime<FixedOffset>> {
        let text = self.text(node, what)?;
        let moment = parse_moment(&text);
        if moment.is_none() {
            self.not_a_time(
                node,
                "day, time and offset from UTC: `2026-10-05T07:50:00+02:00`",
            );
        }
        moment
    }

    /// The value is of the wrong kind for a moment or day.
    pub fn not_a_time(&mut self, node: &Node, expected: &str) {
        let hint = "write it as in the example; the offset is that of the bench's clock";
        let hint = expected.contains("offset").then(|| hint.to_owned());
        self.fault(node.span, "not_a_time", node.shape.words(), expected, hint);
    }

    fn quantity_text<'n>(&mut self, node: &'n Node, what: &str) -> Option<&'n str> {
        match &node.shape {
            Shape::Null => None,
            Shape::Text { text, .. } => Some(text),
            Shape::Number(text, _) if is_decimal(text) => Some(text),
            Shape::Number(..) | Shape::Bool(_) => {
                let found = node.shape.words();
                let expected = format!("{what} as a decimal number with its unit");
                self.fault(node.span, "not_a_quantity", found, expected, None);
                None
            }
            Shape::List(_) | Shape::Map(_) => {
                self.wrong_kind(node, what);
                None
            }
        }
    }

    fn parsed<T>(&mut self, span: Span, what: &str, read: Result<T, QuantityError>) -> Option<T> {
        match read {
            Ok(value) => Some(value),
            Err(error) => {
                let expected = format!("{what}: {}", error.expected);
                self.fault(span, "not_a_quantity", error.found, expected, error.hint);
                None
            }
        }
    }

    fn needs_quotes(&mut self, node: &Node, text: &str, what: &str) {
        let text = excerpt(text);
        self.fault(
            node.span,
            "needs_quotes",
            format!("`{text}`, which YAML readers can take for a number, true or false"),
            format!("{what}: a text"),
            Some(format!("put quotes around it: \"{text}\"")),
        );
    }

    fn wrong_kind(&mut self, node: &Node, what: &str) {
        let found = node.shape.words();
        self.fault(node.span, "wrong_kind", found, format!("{what}: one value"), None);
    }
}

/// A scalar as it stands, for use inside a sentence.
pub fn shown(node: &Node) -> String {
    match &node.shape {
        Shape::Text { text, .. } | Shape::Number(text, _) | Shape::Bool(text) => {
            format!("`{}`", excerpt(text))
        }
        other => other.words(),
    }
}

fn has_percent(node: &Node) -> bool {
    matches!(&node.shape, Shape::Text { text, .. } if text.contains('%'))
}

fn number_hint(shape: &Shape) -> Option<String> {
    let (Shape::Text { text, .. } | Shape::Number(text, _)) = shape else {
        return None;
    };
    let quoted = matches!(shape, Shape::Text { quoted: true, .. });
    Some(if quoted && is_plain_decimal(text) {
        "take the quotes away".to_owned()
    } else if text.contains('%') {
        "write the number alone, without `%`".to_owned()
    } else if text.contains([',', ' ', '_', '\'']) {
        "write it without separators, with a point for decimals".to_owned()
    } else if text.starts_with('0') && text.len() > 1 {
        "write it in decimal, without leading zeros".to_owned()
    } else {
        "write a decimal number such as 4000 or 0.65".to_owned()
    })
}

/// A day, year-month-day with all digits.
pub fn parse_date(text: &str) -> Option<NaiveDate> {
    let day = NaiveDate::parse_from_str(text, "%Y-%m-%d").ok()?;
    (text.len() == 10 && day.format("%Y-%m-%d").to_string() == text).then_some(day)
}

/// A moment with offset, RFC 3339.
pub fn parse_moment(text: &str) -> Option<DateTime<FixedOffset>> {
    DateTime::parse_from_rfc3339(text).ok()
}
