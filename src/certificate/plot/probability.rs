//! Normal probability plot: the values against the share of a normal population below them. Values of
//! a normal population lie on a straight line.

use super::axis::{Axis, Kind, TICK, linear_below};
use super::limit::{Side, limit};
use super::run_chart::dots;
use super::trace::clip;
use super::view::View;
use crate::certificate::canvas::{Anchor, Area, Canvas, Pen};
use crate::certificate::ink::{ACCEPT, GRID, TEXT};
use crate::certificate::section::Characteristic;
use crate::statistics::distributions::normal_quantile;
use crate::statistics::normal_scores::normal_scores;

/// Shares with a line of the grid, in percent.
const SHARES: [f64; 11] = [
    0.1, 1.0, 5.0, 10.0, 25.0, 50.0, 75.0, 90.0, 95.0, 99.0, 99.9,
];

/// Draws the plot into the area (axes included).
pub(in crate::certificate) fn probability(canvas: &mut Canvas, area: Area, c: &Characteristic) {
    let plot = Area {
        left: area.left + 30.0,
        right: area.right - 4.0,
        top: area.top + 6.0,
        bottom: area.bottom - 16.0,
    };
    let scaled: Vec<f64> = c.values.iter().map(|v| c.scale.scaled(v.value)).collect();
    let marks: Vec<f64> = c.marks().iter().map(|m| c.scale.scaled(*m)).collect();
    let view = View::of_values(&scaled, &marks);
    let scores = normal_scores(c.values.len());
    let reach = scores.last().copied().unwrap_or(0.0).max(1.0) * 1.06;
    let x = Axis {
        kind: Kind::Linear,
        low: view.low,
        high: view.high,
        from: plot.left,
        to: plot.right,
    };
    let y = Axis {
        kind: Kind::Linear,
        low: -reach,
        high: reach,
        from: plot.bottom,
        to: plot.top,
    };
    shares(canvas, plot, &y);
    line(canvas, plot, (&x, &y), c);
    let mut sorted: Vec<_> = c.values.iter().collect();
    sorted.sort_by(|a, b| a.value.total_cmp(&b.value));
    let places = sorted.iter().zip(&scores).map(|(v, score)| {
        let at = x.at(c.scale.scaled(v.value)).clamp(plot.left, plot.right);
        (v.verdict, c.in_second_group(v.part), (at, y.at(*score)))
    });
    dots(canvas, places);
    for (bound, side) in [(c.bound.lower, Side::Left), (c.bound.upper, Side::Right)] {
        let inside = bound.map(|b| c.scale.scaled(b)).filter(|b| x.contains(*b));
        if let Some(at) = inside.map(|b| x.at(b)) {
            limit(canvas, (at, plot.top), (at, plot.bottom), side);
        }
    }
    linear_below(canvas, plot, &x);
}

/// Lines and labels of the shares.
fn shares(canvas: &mut Canvas, plot: Area, y: &Axis) {
    let mut free = f64::INFINITY;
    for share in SHARES {
        let score = normal_quantile(share / 100.0);
        if !y.contains(score) {
            continue;
        }
        let at = y.at(score);
        canvas.line((plot.left, at), (plot.right, at), Pen::solid(0.3, GRID));
        if at + 8.0 < free {
            let text = crate::certificate::figures::plain(share);
            canvas.text_at((plot.left - 5.0, at + 2.5), Anchor::End, TICK, &text);
            free = at;
        }
    }
    canvas.line(
        (plot.left, plot.top),
        (plot.left, plot.bottom),
        Pen::solid(0.7, TEXT),
    );
}

/// The normal population of the record's mean and standard deviation; dashed where the values are
/// not of one.
fn line(canvas: &mut Canvas, plot: Area, (x, y): (&Axis, &Axis), c: &Characteristic) {
    let spread = c.statistics.and_then(|s| s.mean.zip(s.standard_deviation));
    let Some((mean, s)) = spread else { return };
    let place = |score: f64| (x.at(c.scale.scaled(mean + s * score)), y.at(score));
    let pen = if c.normal() {
        Pen::solid(0.8, ACCEPT)
    } else {
        Pen::dashed(0.8, ACCEPT)
    };
    canvas.lines(clip(&[place(y.low), place(y.high)], plot), pen);
}
