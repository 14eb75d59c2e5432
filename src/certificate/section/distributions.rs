//! Each characteristic as a histogram and on a normal probability plot.

use super::Characteristic;
use crate::certificate::canvas::{Area, Canvas};
use crate::certificate::figures::{ABSENT, chance};
use crate::certificate::flow::{Flow, SMALL, SMALL_LEADING};
use crate::certificate::plot::histogram::histogram;
use crate::certificate::plot::probability::probability;
use crate::certificate::structure::Role;

const SPACE: f64 = 22.0;
/// Fewer values have no distribution to draw.
pub(super) const FEWEST: usize = 3;
/// Room for a caption.
const BELOW: f64 = 16.0;

pub(in crate::certificate) fn distributions(flow: &mut Flow, characteristics: &[Characteristic]) {
    // Heading, what the drawings are, and four of them share a page of either paper.
    let height = (flow.sheet.bottom - flow.sheet.top - 84.0) / 4.0 - 62.0;
    if characteristics.iter().all(|c| c.values.len() < FEWEST) {
        flow.heading("Distributions", 40.0);
        flow.small("Fewer than three parts have a value: there is no distribution to draw. The readings stand in the parts table.");
        return;
    }
    flow.heading("Distributions", height + 80.0);
    flow.small(
        "Left: number of parts; the curve is a normal distribution of the same mean and standard deviation, drawn only where the values \
         do not speak against one; ticks on the axis are parts that are not conforming. Right: share of a normal population \
         below, %; values of one lie along the line, which is dashed where they do not. Hatched lines are limits, the dashed \
         upright line is the nominal value. Values that fill only a small part of the space between the limits are shown large.",
    );
    for c in characteristics {
        flow.subheading(&c.title(), height + BELOW);
        if c.values.len() < FEWEST {
            flow.small("Fewer than three values.");
            continue;
        }
        let area = flow.take(height);
        let half = (area.width() - SPACE) / 2.0;
        let left = Area {
            right: area.left + half,
            ..area
        };
        let right = Area {
            left: area.right - half,
            ..area
        };
        figure(flow, format!("Histogram. {}", c.in_words()), |page| {
            histogram(page, left, c);
        });
        let words = format!("Normal probability plot. {}", c.in_words());
        figure(flow, words, |page| probability(page, right, c));
        flow.y += 3.0;
        flow.paragraph_of(&caption(c), SMALL, SMALL_LEADING);
    }
}

/// A drawing with its words.
pub(super) fn figure(flow: &mut Flow, words: String, draw: impl FnOnce(&mut Canvas)) {
    let before = flow.enter(Role::Figure(words));
    draw(flow.page());
    flow.leave(before);
}

/// The limits and the values in words.
pub(in crate::certificate) fn caption(c: &Characteristic) -> String {
    let mut out = Vec::new();
    let unit = &c.scale.unit;
    for (word, value) in [
        ("lower", c.bound.lower),
        ("nominal", c.bound.nominal),
        ("upper", c.bound.upper),
    ] {
        if let Some(v) = value {
            out.push(format!("{word} {}", c.scale.exact(v)));
        }
    }
    if let Some(s) = c.statistics {
        out.push(format!("n {}", s.n));
        let figure = |v: Option<f64>| v.map_or_else(|| ABSENT.to_owned(), |v| c.scale.finer(v));
        out.push(format!("mean {}", figure(s.mean)));
        out.push(format!(
            "s {}",
            s.standard_deviation
                .map_or_else(|| ABSENT.to_owned(), |v| c.scale.spread(v))
        ));
    }
    let mut text = format!("{} ({unit}).", out.join(" · "));
    if let Some(p) = c.statistics.and_then(|s| s.normality_p_value) {
        let word = if c.normal() {
            "normal distribution not contradicted"
        } else {
            "not normally distributed"
        };
        text.push_str(&format!(" Anderson-Darling p {}: {word}.", chance(p)));
    }
    if let Some([light, dark]) = c.mixed.map(|m| m.groups.as_slice()) {
        text.push_str(&format!(
            " Two groups: {} parts light, {} parts dark (crosses).",
            light.parts.len(),
            dark.parts.len()
        ));
    }
    text
}
