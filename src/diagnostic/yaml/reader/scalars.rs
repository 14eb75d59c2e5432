//! Scalars as texts, names, numbers, quantities and times.

use super::super::scalar::{is_decimal, is_plain_decimal, is_read_otherwise};
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
        let text = self.scalar(node, what)?;
        let clear = match &node.shape {
            Shape::Text { quoted, .. } => *quoted || !is_read_otherwise(text),
            Shape::Number(..) => is_plain_decimal(text),
            _ => false,
        };
        if !clear {
            self.needs_quotes(node, text, what);
            return None;
        }
        if text.trim().is_empty() {
            let found = format!("an empty text for {what}");
            self.fault(node.span, "empty_text", found, "a text", None);
            return None;
        }
        if text.chars().count() > LONGEST_TEXT {
            let found = format!("a text of {} characters for {what}", text.chars().count());
            let expected = format!("at most {LONGEST_TEXT} characters");
            self.fault(node.span, "text_too_long", found, expected, None);
            return None;
        }
        Some(text.to_owned())
    }

    /// A text of one line without invisible characters, as records and screens can show it.
    pub fn line(&mut self, node: &Node, what: &str) -> Option<String> {
        let text = self.text(node, what)?;
        let shown = crate::diagnostic::printable(&text);
        if shown != text {
            self.fault(
                node.span,
                "hidden_character",
                format!("an invisible character in {what} `{}`", excerpt(&text)),
                "one line of visible characters",
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
                format!("{found} for {what}"),
                format!(
                    "a name that a file can have everywhere: letters A-Z a-z, digits, `-`, `_`, \
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
                format!("{found} for {what}"),
                "a path inside its folder, with `/` between steps",
                Some(if text.ends_with('/') {
                    "leave the last `/` out".to_owned()
                } else {
                    "write for example `sweeps` or `compensation/open.csv`".to_owned()
                }),
            );
            return None;
        }
        Some(text)
    }

    /// One of some words; answers its index.
    pub fn one_of(&mut self, node: &Node, what: &str, words: &[&str]) -> Option<usize> {
        let text = self.scalar(node, what)?;
        let index = words.iter().position(|word| *word == text);
        if index.is_none() {
            self.unknown(
                node.span,
                "unknown_value",
                text,
                &format!("not {what}"),
                words,
            );
        }
        index
    }

    /// A finite decimal number without a unit.
    pub fn number(&mut self, node: &Node, what: &str) -> Option<f64> {
        let text = self.scalar(node, what)?;
        match &node.shape {
            Shape::Number(_, value) if is_decimal(text) && value.is_finite() => Some(*value),
            shape => {
                let found = format!("{} for {what}", shape.words());
                let hint = number_hint(shape);
                self.fault(node.span, "not_a_number", found, "a number", hint);
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
        let found = format!("{} for {what}", node.shape.words());
        let expected = format!("a number from {least} to {most}");
        self.fault(node.span, "out_of_range", found, expected, None);
        None
    }

    /// A whole number in a closed range.
    pub fn integer(&mut self, node: &Node, what: &str, (least, most): (u64, u64)) -> Option<u64> {
        let text = self.scalar(node, what)?;
        let found = format!("{} for {what}", node.shape.words());
        let expected = format!("a whole number from {least} to {most}");
        if !matches!(node.shape, Shape::Number(..)) {
            let hint = number_hint(&node.shape);
            self.fault(node.span, "not_a_number", found, expected, hint);
            return None;
        }
        let whole = if is_plain_decimal(text) {
            text.parse::<u64>().ok()
        } else {
            None
        };
        let value = whole.filter(|value| (least..=most).contains(value));
        if value.is_none() {
            self.fault(node.span, "out_of_range", found, expected, None);
        }
        value
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
        let found = format!("{} for {what}", shown(node));
        let hint = (dimension == Dimension::Ratio && !has_sign(node))
            .then(|| "write the sign `%` if percent was meant".to_owned());
        self.fault(node.span, "impossible_value", found, expected, hint);
        None
    }

    /// A share with its sign, `%` or `ppm`: a bare 0.2 may be meant as 0.2 or as 0.2 %.
    pub fn share_if(
        &mut self,
        node: &Node,
        what: &str,
        possible: impl Fn(f64) -> bool,
        expected: &str,
    ) -> Option<f64> {
        let value = self.quantity_if(node, what, Dimension::Ratio, possible, expected)?;
        if has_sign(node) {
            return Some(value);
        }
        self.fault(
            node.span,
            "share_without_sign",
            format!("{} for {what}, without the sign of a share", shown(node)),
            format!("{expected}, with its sign"),
            Some("write `%` or `ppm` behind the number".to_owned()),
        );
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
        let day = parse_date(self.scalar(node, what)?);
        if day.is_none() {
            self.not_a_time(
                node,
                what,
                "a day that exists, as year-month-day: `2026-03-02`",
            );
        }
        day
    }

    /// A moment with its offset from UTC, `2026-10-05T07:50:00+02:00`.
    pub fn moment(&mut self, node: &Node, what: &str) -> Option<DateTime<FixedOffset>> {
        let moment = parse_moment(self.scalar(node, what)?);
        if moment.is_none() {
            self.not_a_time(
                node,
                what,
                "day, time and offset from UTC: `2026-10-05T07:50:00+02:00`",
            );
        }
        moment
    }

    /// The value is of the wrong kind for a moment or day.
    pub fn not_a_time(&mut self, node: &Node, what: &str, expected: &str) {
        let hint = "write it as in the example; the offset is that of the bench's clock";
        let hint = expected.contains("offset").then(|| hint.to_owned());
        let found = format!("{} for {what}", node.shape.words());
        self.fault(node.span, "not_a_time", found, expected, hint);
    }

    fn quantity_text<'n>(&mut self, node: &'n Node, what: &str) -> Option<&'n str> {
        let text = self.scalar(node, what)?;
        match &node.shape {
            Shape::Text { .. } => Some(text),
            Shape::Number(..) if is_decimal(text) => Some(text),
            _ => {
                let found = format!("{} for {what}", node.shape.words());
                let expected = "a decimal number with its unit";
                self.fault(node.span, "not_a_quantity", found, expected, None);
                None
            }
        }
    }

    /// The text of a scalar as it stands in the file; anything else is a fault.
    pub fn scalar<'n>(&mut self, node: &'n Node, what: &str) -> Option<&'n str> {
        match &node.shape {
            Shape::Text { text, .. } | Shape::Number(text, _) | Shape::Bool(text) => Some(text),
            Shape::Null => {
                let hint = Some("write the value, or delete the key".to_owned());
                let found = format!("no value for {what}");
                self.fault(node.span, "missing_value", found, "a value", hint);
                None
            }
            Shape::List(_) | Shape::Map(_) => {
                let found = format!("{} for {what}", node.shape.words());
                self.fault(node.span, "wrong_kind", found, "one value", None);
                None
            }
        }
    }

    fn parsed<T>(&mut self, span: Span, what: &str, read: Result<T, QuantityError>) -> Option<T> {
        match read {
            Ok(value) => Some(value),
            Err(error) => {
                let found = format!("{what}: {}", error.found);
                self.fault(span, "not_a_quantity", found, error.expected, error.hint);
                None
            }
        }
    }

    fn needs_quotes(&mut self, node: &Node, text: &str, what: &str) {
        let text = excerpt(text);
        self.fault(
            node.span,
            "needs_quotes",
            format!("`{text}` for {what}: YAML readers may take it for something else"),
            "a text",
            Some(format!("put quotes around it: \"{text}\"")),
        );
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

/// Whether a share says what it is a share of: hundred or a million.
fn has_sign(node: &Node) -> bool {
    let sign = |text: &str| text.contains(['%', '‰', '％']) || text.to_lowercase().contains("pp");
    matches!(&node.shape, Shape::Text { text, .. } if sign(text))
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
