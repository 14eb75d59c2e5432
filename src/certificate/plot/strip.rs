//! The small drawing of one characteristic in a table row: limits, nominal, the lot's spread, and
//! every part as a tick.

use super::axis::{Axis, Kind};
use super::limit::{Side, limit};
use super::view::View;
use crate::certificate::canvas::{Area, Canvas, Pen};
use crate::certificate::ink::{CONFORMING, CONFORMING_SOFT, NONCONFORMING, RULE, TEXT, UNDECIDED};
use crate::certificate::section::Characteristic;
use crate::record::PartVerdict;

/// Draws the strip into the area.
pub(in crate::certificate) fn strip(canvas: &mut Canvas, area: Area, c: &Characteristic) {
    let values: Vec<f64> = c.values.iter().map(|v| v.value).collect();
    let view = View::with_limits(&values, &c.marks());
    let axis = Axis {
        kind: Kind::Linear,
        low: view.low,
        high: view.high,
        from: area.left + 6.0,
        to: area.right - 6.0,
    };
    let middle = (area.top + area.bottom) / 2.0;
    let half = (area.height() / 2.0 - 3.0).min(8.5);
    canvas.line(
        (axis.from, middle),
        (axis.to, middle),
        Pen::solid(0.5, RULE),
    );
    spread(canvas, &axis, c, middle);
    ticks(canvas, &axis, c, middle, half * 0.72);
    if let Some(nominal) = c.bound.nominal.filter(|n| axis.contains(*n)) {
        let x = axis.at(nominal);
        let diamond = vec![
            (x, middle - half - 1.0),
            (x + 2.2, middle - half + 1.6),
            (x, middle - half + 4.2),
            (x - 2.2, middle - half + 1.6),
        ];
        canvas.fill(diamond, TEXT);
    }
    for (bound, side) in [(c.bound.lower, Side::Left), (c.bound.upper, Side::Right)] {
        if let Some(x) = bound.map(|b| axis.at(b)) {
            limit(canvas, (x, middle - half), (x, middle + half), side);
        }
    }
}

/// Mean ± one standard deviation as a bar.
fn spread(canvas: &mut Canvas, axis: &Axis, c: &Characteristic, middle: f64) {
    let Some(s) = c.statistics else { return };
    let (Some(mean), Some(sd)) = (s.mean, s.standard_deviation) else {
        return;
    };
    let clamp = |v: f64| axis.at(v).clamp(axis.from, axis.to);
    let bar = Area {
        left: clamp(mean - sd),
        right: clamp(mean + sd),
        top: middle - 2.0,
        bottom: middle + 2.0,
    };
    if bar.width() > 0.0 {
        canvas.fill_area(bar, CONFORMING_SOFT);
    }
}

/// One tick a part; parts at the same place on paper share one. Beyond the edge: an arrowhead.
fn ticks(canvas: &mut Canvas, axis: &Axis, c: &Characteristic, middle: f64, half: f64) {
    let kinds = [
        (PartVerdict::Conforming, CONFORMING, 0.45, half * 0.75),
        (PartVerdict::Undecided, UNDECIDED, 0.8, half),
        (PartVerdict::Nonconforming, NONCONFORMING, 0.9, half),
    ];
    for (verdict, ink, pen, reach) in kinds {
        let mut places: Vec<i64> = c
            .values
            .iter()
            .filter(|v| v.verdict == verdict)
            .map(|v| (axis.at(v.value).clamp(axis.from - 5.0, axis.to + 5.0) * 4.0).round() as i64)
            .collect();
        places.sort_unstable();
        places.dedup();
        let mut lines = Vec::new();
        for x in places.into_iter().map(|p| p as f64 / 4.0) {
            if x < axis.from || x > axis.to {
                let (tip, back) = if x < axis.from {
                    (axis.from - 5.0, axis.from - 1.0)
                } else {
                    (axis.to + 5.0, axis.to + 1.0)
                };
                canvas.fill(
                    vec![(tip, middle), (back, middle - 2.6), (back, middle + 2.6)],
                    ink,
                );
            } else {
                lines.push(vec![(x, middle - reach), (x, middle + reach)]);
            }
        }
        canvas.lines(lines, Pen::solid(pen, ink));
    }
}
