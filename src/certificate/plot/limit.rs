//! Limits in drawings: a line with hatching on the forbidden side.

use crate::certificate::canvas::{Canvas, Pen, Point};
use crate::certificate::ink::TEXT;

/// The forbidden side of a limit.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(in crate::certificate) enum Side {
    Above,
    Below,
    Left,
    Right,
}

const PITCH: f64 = 3.4;
const LENGTH: f64 = 3.4;

/// A limit from one point to another, with hatching on its forbidden side.
pub(in crate::certificate) fn limit(canvas: &mut Canvas, from: Point, to: Point, side: Side) {
    canvas.line(from, to, Pen::solid(0.9, TEXT));
    let length = (to.0 - from.0).hypot(to.1 - from.1);
    let count = (length / PITCH).floor().clamp(1.0, 400.0) as u32;
    let (dx, dy) = match side {
        Side::Above => (LENGTH * 0.6, -LENGTH),
        Side::Below => (-LENGTH * 0.6, LENGTH),
        Side::Left => (-LENGTH, LENGTH * 0.6),
        Side::Right => (LENGTH, -LENGTH * 0.6),
    };
    let strokes = (0..count)
        .map(|k| {
            let t = (f64::from(k) + 0.5) / f64::from(count);
            let at = (from.0 + t * (to.0 - from.0), from.1 + t * (to.1 - from.1));
            vec![at, (at.0 + dx, at.1 + dy)]
        })
        .collect();
    canvas.lines(strokes, Pen::solid(0.4, TEXT));
}
