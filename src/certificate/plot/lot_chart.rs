//! Lot means in sequence, with their control limits and their moving average.

use super::axis::{Axis, Kind, TICK, linear_left};
use super::limit::{Side, limit};
use super::trace::clip;
use super::view::{View, extent};
use crate::certificate::canvas::{Anchor, Area, Canvas, Pen, Point};
use crate::certificate::ink::{ACCEPT, CONFORMING, CONFORMING_SOFT, QUIET, TEXT};
use crate::certificate::section::Characteristic;
use crate::certificate::text::{elide, width};
use crate::record::LotChart;

/// Widest label of a lot.
const LABEL: f64 = 64.0;

/// Draws the chart into the area (axes included).
pub(in crate::certificate) fn lot_chart(
    canvas: &mut Canvas,
    area: Area,
    c: &Characteristic,
    chart: &LotChart,
) {
    let plot = Area {
        left: area.left + 34.0,
        right: area.right - 4.0,
        top: area.top + 5.0,
        bottom: area.bottom - 16.0,
    };
    let scaled = |v: f64| c.scale.scaled(v);
    let shown = chart.lots.iter().flat_map(|lot| {
        let s = lot.standard_deviation.unwrap_or(0.0);
        [scaled(lot.mean - s), scaled(lot.mean + s)]
    });
    let lines = chart.limits.into_iter().flatten().map(scaled);
    let values: Vec<f64> = shown.chain(lines).collect();
    let marks: Vec<f64> = c.marks().iter().map(|m| scaled(*m)).collect();
    let view = View::of_values(&values, &marks);
    let (low, high) = extent(values.iter().copied()).unwrap_or((view.low, view.high));
    let x = Axis {
        kind: Kind::Linear,
        low: 0.0,
        high: chart.lots.len() as f64 + 1.0,
        from: plot.left,
        to: plot.right,
    };
    let y = Axis {
        kind: Kind::Linear,
        low: view.low.min(low),
        high: view.high.max(high),
        from: plot.bottom,
        to: plot.top,
    };
    let level = |v: f64| y.at(scaled(v));
    let across = |at: f64| vec![(plot.left, at), (plot.right, at)];
    if let Some(centre) = chart.centre {
        canvas.lines(vec![across(level(centre))], Pen::solid(0.5, QUIET));
    }
    if let Some(limits) = chart.limits {
        let both = limits.map(|l| across(level(l))).to_vec();
        canvas.lines(both, Pen::dashed(0.7, TEXT));
    }
    average(canvas, plot, chart, &x, &level);
    for (index, lot) in chart.lots.iter().enumerate() {
        let at = (x.at(index as f64 + 1.0), level(lot.mean));
        if let Some(s) = lot.standard_deviation {
            let ends = [level(lot.mean - s), level(lot.mean + s)];
            canvas.line(
                (at.0, ends[0]),
                (at.0, ends[1]),
                Pen::solid(1.2, CONFORMING_SOFT),
            );
        }
        if index + 1 == chart.lots.len() {
            canvas.disc(at, 3.2, TEXT);
        } else {
            canvas.disc(at, 2.0, CONFORMING);
        }
    }
    for (bound, side) in [(c.bound.lower, Side::Below), (c.bound.upper, Side::Above)] {
        let inside = bound.filter(|b| y.contains(scaled(*b)));
        if let Some(at) = inside.map(level) {
            limit(canvas, (plot.left, at), (plot.right, at), side);
        }
    }
    names(canvas, plot, chart, &x);
    linear_left(canvas, plot, &y, 4.0);
}

/// The moving average as a line, its limits as dotted ones.
fn average(
    canvas: &mut Canvas,
    plot: Area,
    chart: &LotChart,
    x: &Axis,
    level: &impl Fn(f64) -> f64,
) {
    let line = |which: usize| -> Vec<Point> {
        let lots = chart.lots.iter().enumerate();
        lots.filter_map(|(index, lot)| {
            let value = lot.ewma?.get(which).copied()?;
            Some((x.at(index as f64 + 1.0), level(value)))
        })
        .collect()
    };
    canvas.lines(clip(&line(0), plot), Pen::solid(0.9, ACCEPT));
    for which in [1, 2] {
        canvas.lines(clip(&line(which), plot), Pen::dotted(0.8, ACCEPT));
    }
}

/// Numbers of the lots below the axis: the last, and those before it that there is room for.
fn names(canvas: &mut Canvas, plot: Area, chart: &LotChart, x: &Axis) {
    canvas.line(
        (plot.left, plot.bottom),
        (plot.right, plot.bottom),
        Pen::solid(0.7, TEXT),
    );
    let mut free = plot.right + 4.0;
    for (index, lot) in chart.lots.iter().enumerate().rev() {
        let at = x.at(index as f64 + 1.0);
        canvas.line(
            (at, plot.bottom),
            (at, plot.bottom + 3.0),
            Pen::solid(0.5, TEXT),
        );
        let text = elide(&lot.lot, TICK, LABEL);
        let half = width(&text, TICK) / 2.0;
        let centre = at.min(plot.right + 4.0 - half);
        if centre + half <= free && centre - half >= plot.left - 30.0 {
            canvas.text_at((centre, plot.bottom + 11.0), Anchor::Middle, TICK, &text);
            free = centre - half - 6.0;
        }
    }
}
