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
    let base = (area.top + area.bottom) / 2.0 + 3.0;
    canvas.line((axis.from, base), (axis.to, base), Pen::solid(0.5, RULE));
    spread(canvas, &axis, c, base + 3.2);
    ticks(canvas, &axis, c, base);
    if let Some(nominal) = c.bound.nominal.filter(|n| axis.contains(*n)) {
        let (x, y) = (axis.at(nominal), base - REACH - 3.0);
        let diamond = vec![(x, y - 2.6), (x + 2.2, y), (x, y + 2.6), (x - 2.2, y)];
        canvas.fill(diamond, TEXT);
    }
    for (bound, side) in [(c.bound.lower, Side::Left), (c.bound.upper, Side::Right)] {
        if let Some(x) = bound.map(|b| axis.at(b)) {
            limit(canvas, (x, base - REACH), (x, base + 6.0), side);
        }
    }
}

/// Height of a tick above the line.
const REACH: f64 = 9.0;

/// Mean ± one standard deviation as a bar with the mean across it.
fn spread(canvas: &mut Canvas, axis: &Axis, c: &Characteristic, middle: f64) {
    let Some(s) = c.statistics else { return };
    let (Some(mean), Some(sd)) = (s.mean, s.standard_deviation) else {
        return;
    };
    let clamp = |v: f64| axis.at(v).clamp(axis.from, axis.to);
    let bar = Area {
        left: clamp(mean - sd),
        right: clamp(mean + sd),
        top: middle - 1.4,
        bottom: middle + 1.4,
    };
    if bar.width() > 0.0 {
        canvas.fill_area(bar, CONFORMING_SOFT);
    }
    if axis.contains(mean) {
        let x = axis.at(mean);
        canvas.line((x, middle - 2.4), (x, middle + 2.4), Pen::solid(0.8, TEXT));
    }
}

/// One tick a part; parts at the same place on paper share one. Beyond the edge: an arrowhead.
fn ticks(canvas: &mut Canvas, axis: &Axis, c: &Characteristic, base: f64) {
    let kinds = [
        (PartVerdict::Conforming, CONFORMING, 0.3, REACH * 0.72),
        (PartVerdict::Undecided, UNDECIDED, 0.8, REACH),
        (PartVerdict::Nonconforming, NONCONFORMING, 0.9, REACH),
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
                    vec![(tip, base - 3.0), (back, base - 5.6), (back, base - 0.4)],
                    ink,
                );
            } else {
                lines.push(vec![(x, base), (x, base - reach)]);
            }
        }
        canvas.lines(lines, Pen::solid(pen, ink));
    }
}
