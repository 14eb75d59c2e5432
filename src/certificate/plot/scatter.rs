//! One characteristic against another, with the ellipse beyond which a part is unlike its lot.

use super::axis::{Axis, Kind, TICK, linear_below, linear_left};
use super::limit::{Side, limit};
use super::run_chart::dots;
use super::trace::clip;
use super::view::{View, extent};
use crate::certificate::canvas::{Area, Canvas, Pen, Point};
use crate::certificate::ink::{ACCEPT, NONCONFORMING};
use crate::certificate::section::Characteristic;
use crate::certificate::section::scatter::Core;
use crate::certificate::text::width;
use crate::record::PartVerdict;

/// A part with both values, in the units of the axes.
pub(in crate::certificate) struct Pair<'a> {
    pub part: &'a str,
    pub at: Point,
    pub verdict: PartVerdict,
    /// Belongs to the second of two populations.
    pub second: bool,
    /// Unlike its lot.
    pub outlier: bool,
}

/// Draws the plot into the area (axes included).
pub(in crate::certificate) fn scatter(
    canvas: &mut Canvas,
    area: Area,
    (x_of, y_of): (&Characteristic, &Characteristic),
    pairs: &[Pair],
    core: Option<&Core>,
) {
    let plot = Area {
        left: area.left + 34.0,
        right: area.right - 4.0,
        top: area.top + 6.0,
        bottom: area.bottom - 16.0,
    };
    let ellipse = core.map_or_else(Vec::new, Core::ellipse);
    let axis = |of: &Characteristic, pick: fn(&Point) -> f64, from: f64, to: f64| {
        let values: Vec<f64> = pairs
            .iter()
            .map(|p| pick(&p.at))
            .chain(
                extent(ellipse.iter().map(pick))
                    .into_iter()
                    .flat_map(|e| [e.0, e.1]),
            )
            .collect();
        let marks: Vec<f64> = of.marks().iter().map(|m| of.scale.scaled(*m)).collect();
        let view = View::of_values(&values, &marks);
        Axis {
            kind: Kind::Linear,
            low: view.low,
            high: view.high,
            from,
            to,
        }
    };
    let x = axis(x_of, |p| p.0, plot.left, plot.right);
    let y = axis(y_of, |p| p.1, plot.bottom, plot.top);
    let place = |p: Point| (x.at(p.0), y.at(p.1));
    let outline: Vec<Point> = ellipse.iter().map(|p| place(*p)).collect();
    canvas.lines(clip(&outline, plot), Pen::solid(0.9, ACCEPT));
    let held = |p: Point| {
        let at = place(p);
        (
            at.0.clamp(plot.left, plot.right),
            at.1.clamp(plot.top, plot.bottom),
        )
    };
    dots(
        canvas,
        pairs.iter().map(|p| (p.verdict, p.second, held(p.at))),
    );
    named(canvas, plot, pairs, held);
    for (bound, side) in [
        (x_of.bound.lower, Side::Left),
        (x_of.bound.upper, Side::Right),
    ] {
        let inside = bound
            .map(|b| x_of.scale.scaled(b))
            .filter(|b| x.contains(*b));
        if let Some(at) = inside.map(|b| x.at(b)) {
            limit(canvas, (at, plot.top), (at, plot.bottom), side);
        }
    }
    for (bound, side) in [
        (y_of.bound.lower, Side::Below),
        (y_of.bound.upper, Side::Above),
    ] {
        let inside = bound
            .map(|b| y_of.scale.scaled(b))
            .filter(|b| y.contains(*b));
        if let Some(at) = inside.map(|b| y.at(b)) {
            limit(canvas, (plot.left, at), (plot.right, at), side);
        }
    }
    linear_below(canvas, plot, &x);
    linear_left(canvas, plot, &y, 6.0);
}

/// A ring around every part that is unlike its lot, and its number where there is room.
fn named(canvas: &mut Canvas, plot: Area, pairs: &[Pair], held: impl Fn(Point) -> Point) {
    let mut taken: Vec<Area> = Vec::new();
    for pair in pairs.iter().filter(|p| p.outlier) {
        let at = held(pair.at);
        canvas.ring(at, 4.2, Pen::solid(0.9, NONCONFORMING));
        let wide = width(pair.part, TICK);
        let left = if at.0 + 7.0 + wide < plot.right {
            at.0 + 7.0
        } else {
            at.0 - 7.0 - wide
        };
        let label = Area {
            left,
            right: left + wide,
            top: at.1 - 4.0,
            bottom: at.1 + 4.5,
        };
        let free = taken.iter().all(|t| {
            label.left > t.right
                || label.right < t.left
                || label.top > t.bottom
                || label.bottom < t.top
        });
        if free && wide < 60.0 {
            canvas.text((left, at.1 + 2.6), TICK.ink(NONCONFORMING), pair.part);
            taken.push(label);
        }
    }
}
