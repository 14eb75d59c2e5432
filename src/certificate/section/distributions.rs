//! A histogram for each characteristic.

use super::Characteristic;
use crate::certificate::canvas::Area;
use crate::certificate::figures::ABSENT;
use crate::certificate::flow::{Flow, SMALL};
use crate::certificate::plot::histogram::histogram;
use crate::certificate::text::{Style, wrap};

const HEIGHT: f64 = 132.0;
const SPACE: f64 = 22.0;
const TITLE: Style = Style::bold(9.2);

pub(in crate::certificate) fn distributions(flow: &mut Flow, characteristics: &[Characteristic]) {
    flow.heading("Distributions", HEIGHT + 60.0);
    let width = (flow.sheet.measure() - SPACE) / 2.0;
    for pair in characteristics.chunks(2) {
        let titles: Vec<Vec<String>> = pair
            .iter()
            .map(|c| wrap(&c.title(), TITLE, width))
            .collect();
        let captions: Vec<Vec<String>> = pair
            .iter()
            .map(|c| wrap(&caption(c), SMALL, width))
            .collect();
        let most = |all: &[Vec<String>]| all.iter().map(Vec::len).max().unwrap_or(0) as f64;
        let (above, below) = (most(&titles) * 12.0, most(&captions) * 10.5);
        let area = flow.take(above + HEIGHT + below + 14.0);
        for (index, c) in pair.iter().enumerate() {
            let left = area.left + index as f64 * (width + SPACE);
            for (n, line) in titles[index].iter().enumerate() {
                flow.page()
                    .text((left, area.top + 9.0 + n as f64 * 12.0), TITLE, line);
            }
            let plot = Area {
                left,
                right: left + width,
                top: area.top + above,
                bottom: area.top + above + HEIGHT,
            };
            if c.values.is_empty() {
                let at = (left, area.top + above + 20.0);
                flow.page().text(at, SMALL, "no values");
            } else {
                histogram(flow.page(), plot, c);
            }
            for (n, line) in captions[index].iter().enumerate() {
                let y = plot.bottom + 8.0 + n as f64 * 10.5;
                flow.page().text((left, y), SMALL, line);
            }
        }
    }
    flow.small(
        "Ordinate: number of parts. Hatched lines are limits, the dashed line is the nominal value; ticks on \
         the axis are parts that are not conforming. Where the values fill only a small part of the space between the \
         limits, the drawing shows the values large and the limits stand in the caption.",
    );
}

/// The limits and the values in words.
fn caption(c: &Characteristic) -> String {
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
    format!("{} ({unit})", out.join(" · "))
}
