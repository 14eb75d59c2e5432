//! Run chart: the values of one characteristic in measuring order.

use super::axis::{Axis, Kind, linear_below, linear_left};
use super::limit::{Side, limit};
use super::view::View;
use crate::certificate::canvas::{Area, Canvas, Mark, Pen, Point};
use crate::certificate::ink::{CONFORMING, QUIET, TEXT};
use crate::certificate::section::Characteristic;
use crate::record::PartVerdict;
use std::collections::BTreeSet;

/// Draws the chart into the area; `parts` is the number of parts in the record.
pub(in crate::certificate) fn run_chart(
    canvas: &mut Canvas,
    area: Area,
    c: &Characteristic,
    parts: usize,
) {
    let plot = Area {
        left: area.left + 34.0,
        right: area.right - 4.0,
        top: area.top + 5.0,
        bottom: area.bottom - 16.0,
    };
    let scaled: Vec<f64> = c.values.iter().map(|v| c.scale.scaled(v.value)).collect();
    let marks: Vec<f64> = c.marks().iter().map(|m| c.scale.scaled(*m)).collect();
    let view = View::of_values(&scaled, &marks);
    let x = Axis {
        kind: Kind::Linear,
        low: 0.0,
        high: parts as f64 + 1.0,
        from: plot.left,
        to: plot.right,
    };
    let y = Axis {
        kind: Kind::Linear,
        low: view.low,
        high: view.high,
        from: plot.bottom,
        to: plot.top,
    };
    let level = |v: f64| y.at(c.scale.scaled(v));
    let inside = |v: &f64| y.contains(c.scale.scaled(*v));
    if let Some(mean) = c.statistics.and_then(|s| s.mean).filter(inside) {
        let at = level(mean);
        canvas.line((plot.left, at), (plot.right, at), Pen::solid(0.5, QUIET));
    }
    if let Some(nominal) = c.bound.nominal.filter(inside) {
        let at = level(nominal);
        canvas.line((plot.left, at), (plot.right, at), Pen::dashed(0.6, TEXT));
    }
    points(canvas, c, &x, &y);
    for (bound, side) in [(c.bound.lower, Side::Below), (c.bound.upper, Side::Above)] {
        if let Some(at) = bound.filter(inside).map(level) {
            limit(canvas, (plot.left, at), (plot.right, at), side);
        }
    }
    linear_below(canvas, plot, &x);
    linear_left(canvas, plot, &y, 4.0);
}

/// Dots; parts that are not conforming have the mark of their verdict; values off the chart stand
/// at its edge.
fn points(canvas: &mut Canvas, c: &Characteristic, x: &Axis, y: &Axis) {
    let places = c.values.iter().map(|v| {
        let at = (
            x.at(v.order as f64 + 1.0),
            y.at(c.scale.scaled(v.value)).clamp(y.to, y.from),
        );
        (v.verdict, c.in_second_group(v.part), at)
    });
    dots(canvas, places);
}

/// One dot a part, darker in the second of two populations; parts at the same place on paper share
/// one. Parts that are not conforming have the mark of their verdict.
pub(in crate::certificate) fn dots(
    canvas: &mut Canvas,
    places: impl Iterator<Item = (PartVerdict, bool, Point)>,
) {
    let mut seen = BTreeSet::new();
    let mut first = Vec::new();
    let mut other = Vec::new();
    let mut marks = Vec::new();
    for (verdict, second, at) in places {
        match verdict {
            PartVerdict::Nonconforming => marks.push((Mark::Bad, at)),
            PartVerdict::Undecided => marks.push((Mark::Doubt, at)),
            _ => {
                let cell = ((at.0 * 3.0).round() as i64, (at.1 * 3.0).round() as i64);
                if !seen.insert((second, cell)) {
                    continue;
                }
                let dot = vec![(at.0 - 1.0, at.1), (at.0 + 1.0, at.1)];
                if second {
                    other.push(vec![(at.0, at.1 - 1.6), (at.0, at.1 + 1.6)]);
                    other.push(vec![(at.0 - 1.6, at.1), (at.0 + 1.6, at.1)]);
                } else {
                    first.push(dot);
                }
            }
        }
    }
    canvas.lines(first, Pen::solid(2.0, CONFORMING));
    canvas.lines(other, Pen::solid(0.7, TEXT));
    for (mark, at) in marks {
        canvas.mark(mark, at, 5.0);
    }
}
