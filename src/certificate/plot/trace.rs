//! Traces: what of a curve the eye can see. Clipped to the plot, thinned below the width of the pen,
//! and left out where earlier traces of the same colour already cover the paper.

use crate::certificate::canvas::{Area, Point};

/// Deviation from the measured points that no print shows, in points.
const TOLERANCE: f64 = 0.12;
/// Side of a cell of the coverage map: below the width of the thinnest pen.
const CELL: f64 = 0.45;
/// Parts of a cell that steps along a segment are counted in, as a power of two.
const FINE_BITS: u32 = 20;
const FINE: f64 = (1u32 << FINE_BITS) as f64;

/// Thins a polyline (Douglas and Peucker, 1973) so that no left-out point is further than the
/// tolerance from it.
pub(in crate::certificate) fn simplify(points: &[Point]) -> Vec<Point> {
    if points.len() < 3 {
        return points.to_vec();
    }
    let mut keep = vec![false; points.len()];
    let mut stack = vec![(0, points.len() - 1)];
    keep[0] = true;
    keep[points.len() - 1] = true;
    while let Some((first, last)) = stack.pop() {
        let segment = Segment::new(points[first], points[last]);
        let (mut farthest, mut index) = (TOLERANCE * TOLERANCE, None);
        for (i, point) in points.iter().enumerate().take(last).skip(first + 1) {
            let d = segment.squared_distance(*point);
            if d > farthest {
                farthest = d;
                index = Some(i);
            }
        }
        if let Some(i) = index {
            keep[i] = true;
            stack.push((first, i));
            stack.push((i, last));
        }
    }
    points
        .iter()
        .zip(keep)
        .filter_map(|(p, k)| k.then_some(*p))
        .collect()
}

/// What distances from a segment need.
struct Segment {
    start: Point,
    along: Point,
    /// One over the square of its length; 0 where that is 0.
    inverse: f64,
}

impl Segment {
    fn new(start: Point, end: Point) -> Self {
        let along = (end.0 - start.0, end.1 - start.1);
        let square = along.0 * along.0 + along.1 * along.1;
        Segment {
            start,
            along,
            inverse: if square > 0.0 { 1.0 / square } else { 0.0 },
        }
    }

    fn squared_distance(&self, p: Point) -> f64 {
        let (x, y) = (p.0 - self.start.0, p.1 - self.start.1);
        let t = ((x * self.along.0 + y * self.along.1) * self.inverse).clamp(0.0, 1.0);
        let (x, y) = (x - t * self.along.0, y - t * self.along.1);
        x * x + y * y
    }
}

/// At most four points a quarter point of width: first, lowest, highest, last. Sweeps of many more
/// points than the print has columns keep their outline.
pub(in crate::certificate) fn columns(points: &[Point]) -> Vec<Point> {
    const WIDTH: f64 = 0.25;
    let mut out: Vec<Point> = Vec::new();
    let mut start = 0;
    while start < points.len() {
        let column = (points[start].0 / WIDTH).floor();
        let end = points[start..]
            .iter()
            .position(|p| (p.0 / WIDTH).floor() != column)
            .map_or(points.len(), |n| start + n);
        let group = &points[start..end];
        if group.len() <= 4 {
            out.extend_from_slice(group);
        } else {
            let by_y = |a: &&Point, b: &&Point| a.1.total_cmp(&b.1);
            let extremes = [group.iter().min_by(by_y), group.iter().max_by(by_y)];
            out.push(group[0]);
            out.extend(extremes.into_iter().flatten());
            out.push(group[group.len() - 1]);
        }
        start = end;
    }
    out
}

/// Cuts a polyline at the edges of the area; points that are not finite interrupt it.
pub(in crate::certificate) fn clip(points: &[Point], area: Area) -> Vec<Vec<Point>> {
    let mut out: Vec<Vec<Point>> = Vec::new();
    let mut open = false;
    for pair in points.windows(2) {
        let Some((a, b)) = clip_segment(pair[0], pair[1], area) else {
            open = false;
            continue;
        };
        match out.last_mut() {
            Some(line) if open && a == pair[0] => line.push(b),
            _ => out.push(vec![a, b]),
        }
        open = b == pair[1];
    }
    out
}

/// The part of a segment within the area (Liang and Barsky, 1984).
fn clip_segment(a: Point, b: Point, area: Area) -> Option<(Point, Point)> {
    let (dx, dy) = (b.0 - a.0, b.1 - a.1);
    if ![a.0, a.1, b.0, b.1].iter().all(|v| v.is_finite()) {
        return None;
    }
    let (mut enter, mut leave) = (0.0f64, 1.0f64);
    let edges = [
        (-dx, a.0 - area.left),
        (dx, area.right - a.0),
        (-dy, a.1 - area.top),
        (dy, area.bottom - a.1),
    ];
    for (direction, room) in edges {
        if direction == 0.0 {
            if room < 0.0 {
                return None;
            }
        } else if direction < 0.0 {
            enter = enter.max(room / direction);
        } else {
            leave = leave.min(room / direction);
        }
    }
    if enter > leave {
        return None;
    }
    let at = |t: f64| (a.0 + t * dx, a.1 + t * dy);
    let start = if enter > 0.0 { at(enter) } else { a };
    let end = if leave < 1.0 { at(leave) } else { b };
    Some((start, end))
}

/// A map of the paper that traces already cover.
pub(in crate::certificate) struct Coverage {
    area: Area,
    columns: usize,
    rows: usize,
    covered: Vec<bool>,
}

impl Coverage {
    pub fn new(area: Area) -> Self {
        let cells = |length: f64| (length / CELL).ceil().clamp(1.0, 4000.0) as usize + 1;
        let (columns, rows) = (cells(area.width()), cells(area.height()));
        Coverage {
            area,
            columns,
            rows,
            covered: vec![false; columns * rows],
        }
    }

    /// Covers a segment; true where part of it lay on bare paper.
    fn cover(&mut self, a: Point, b: Point) -> bool {
        let length = (b.0 - a.0).abs().max((b.1 - a.1).abs());
        let steps = (length / (CELL * 0.5)).ceil().clamp(1.0, 8000.0) as i64;
        // Cells in fixed point: a step is an addition.
        let fixed = |from: f64, v: f64| ((v - from) / CELL * FINE) as i64;
        let (mut x, mut y) = (fixed(self.area.left, a.0), fixed(self.area.top, a.1));
        let (right, down) = (fixed(self.area.left, b.0), fixed(self.area.top, b.1));
        let (across, along) = ((right - x) / steps, (down - y) / steps);
        let mut fresh = false;
        for _ in 0..=steps {
            let column = ((x >> FINE_BITS).max(0) as usize).min(self.columns - 1);
            let row = ((y >> FINE_BITS).max(0) as usize).min(self.rows - 1);
            if let Some(cell) = self.covered.get_mut(row * self.columns + column) {
                fresh |= !*cell;
                *cell = true;
            }
            x += across;
            y += along;
        }
        fresh
    }

    /// The stretches of a polyline that show something new.
    pub fn visible(&mut self, line: &[Point]) -> Vec<Vec<Point>> {
        let mut out: Vec<Vec<Point>> = Vec::new();
        let mut open = false;
        for pair in line.windows(2) {
            if !self.cover(pair[0], pair[1]) {
                open = false;
                continue;
            }
            match out.last_mut() {
                Some(run) if open => run.push(pair[1]),
                _ => out.push(vec![pair[0], pair[1]]),
            }
            open = true;
        }
        out
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const AREA: Area = Area {
        left: 0.0,
        top: 0.0,
        right: 100.0,
        bottom: 50.0,
    };

    #[test]
    fn a_straight_line_needs_its_ends_only() {
        let line: Vec<Point> = (0..500)
            .map(|i| (f64::from(i), 2.0 * f64::from(i)))
            .collect();
        assert_eq!(simplify(&line), vec![(0.0, 0.0), (499.0, 998.0)]);
    }

    #[test]
    fn clipping_cuts_at_the_edge_and_gaps_interrupt() {
        let lines = clip(&[(-10.0, 25.0), (50.0, 25.0), (50.0, 75.0)], AREA);
        assert_eq!(lines, vec![vec![(0.0, 25.0), (50.0, 25.0), (50.0, 50.0)]]);
        let lines = clip(
            &[
                (1.0, 1.0),
                (2.0, 1.0),
                (f64::NAN, 1.0),
                (4.0, 1.0),
                (5.0, 1.0),
            ],
            AREA,
        );
        assert_eq!(lines.len(), 2);
        assert!(clip(&[(-5.0, -5.0), (-1.0, 80.0)], AREA).is_empty());
    }

    #[test]
    fn the_same_trace_again_shows_nothing_new() {
        let mut coverage = Coverage::new(AREA);
        let line = [(0.0, 10.0), (60.0, 30.0), (100.0, 5.0)];
        assert_eq!(coverage.visible(&line), vec![line.to_vec()]);
        assert!(coverage.visible(&line).is_empty());
    }

    proptest! {
        #[test]
        fn no_left_out_point_is_far_from_the_thinned_line(ys in prop::collection::vec(0.0f64..50.0, 2..200)) {
            let line: Vec<Point> = ys.iter().enumerate().map(|(i, y)| (i as f64 * 0.5, *y)).collect();
            let thin = simplify(&line);
            for p in &line {
                let d = thin.windows(2).map(|s| Segment::new(s[0], s[1]).squared_distance(*p)).fold(f64::INFINITY, f64::min);
                prop_assert!(d.sqrt() <= TOLERANCE + 1e-9);
            }
        }

        #[test]
        fn clipped_points_lie_in_the_area(points in prop::collection::vec((-300.0f64..300.0, -300.0f64..300.0), 2..60)) {
            for line in clip(&points, AREA) {
                for (x, y) in line {
                    prop_assert!((-1e-6..=100.0 + 1e-6).contains(&x) && (-1e-6..=50.0 + 1e-6).contains(&y));
                }
            }
        }
    }
}
