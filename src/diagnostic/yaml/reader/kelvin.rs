//! Differences of temperature, and shares per kelvin.

use super::super::{Node, Shape};
use super::Reader;
use super::scalars::shown;
use crate::quantity::Dimension;

impl Reader<'_> {
    /// A difference of temperature in K: `0.5 K` or `0.5 °C`.
    pub fn temperature_difference_if(
        &mut self,
        node: &Node,
        what: &str,
        possible: impl Fn(f64) -> bool,
        expected: &str,
    ) -> Option<f64> {
        let written = match &node.shape {
            Shape::Text { text, .. } => text.trim_end().strip_suffix('K'),
            _ => None,
        };
        let in_degrees = written.map(|number| replaced(node, format!("{number}°C")));
        let value = self.quantity_if(
            in_degrees.as_ref().unwrap_or(node),
            what,
            Dimension::Temperature,
            |_| true,
            expected,
        )?;
        if possible(value) {
            return Some(value);
        }
        let found = format!("{} for {what}", shown(node));
        self.fault(node.span, "impossible_value", found, expected, None);
        None
    }

    /// A share per kelvin: `0.1 %/K`, `-200 ppm/K`, `±30 ppm/°C`; the sign of the last is its
    /// magnitude.
    pub fn share_per_kelvin_if(
        &mut self,
        node: &Node,
        what: &str,
        possible: impl Fn(f64) -> bool,
        expected: &str,
    ) -> Option<f64> {
        let share = match &node.shape {
            Shape::Text { text, .. } => before_kelvin(text),
            _ => None,
        };
        let Some(share) = share else {
            let found = format!("{} for {what}", shown(node));
            let hint = "write `/K` behind the share: `0.1 %/K`, `30 ppm/K`".to_owned();
            self.fault(node.span, "not_per_kelvin", found, expected, Some(hint));
            return None;
        };
        let share = share.trim().trim_start_matches(['±', '+']);
        let value = self.share_if(&replaced(node, share.to_owned()), what, |_| true, expected)?;
        if possible(value) {
            return Some(value);
        }
        let found = format!("{} for {what}", shown(node));
        self.fault(node.span, "impossible_value", found, expected, None);
        None
    }
}

/// What stands before `/K`, `/°C`, `per K`: a difference is as many kelvins as degrees Celsius.
fn before_kelvin(text: &str) -> Option<&str> {
    let text = text.trim_end();
    let unit = ["K", "°C", "C"];
    let per = unit
        .iter()
        .find_map(|unit| text.strip_suffix(unit))?
        .trim_end();
    per.strip_suffix('/').or_else(|| per.strip_suffix("per"))
}

/// A text in the place of another.
fn replaced(node: &Node, text: String) -> Node {
    Node {
        span: node.span,
        shape: Shape::Text {
            text,
            quoted: false,
        },
    }
}
