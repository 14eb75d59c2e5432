//! Axes: values to points on the page, ticks, labels.

use crate::certificate::canvas::{Anchor, Area, Canvas, Pen};
use crate::certificate::figures::{plain, prefix};
use crate::certificate::ink::{GRID, QUIET, TEXT};
use crate::certificate::text::{Style, width};

/// How values lie along an axis.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(in crate::certificate) enum Kind {
    Linear,
    /// Decades of equal length; low and high are positive.
    Log,
}

/// One axis: `low` lies at `from`, `high` at `to` (points on the page).
#[derive(Debug, Clone, Copy)]
pub(in crate::certificate) struct Axis {
    pub kind: Kind,
    pub low: f64,
    pub high: f64,
    pub from: f64,
    pub to: f64,
}

impl Axis {
    /// Where a value lies; outside the axis for values outside its range.
    pub fn at(&self, value: f64) -> f64 {
        let position = |v: f64| match self.kind {
            Kind::Linear => v,
            Kind::Log => v.max(f64::MIN_POSITIVE).log10(),
        };
        let (low, high) = (position(self.low), position(self.high));
        let span = high - low;
        if span.abs() < f64::MIN_POSITIVE {
            return self.from;
        }
        self.from + (position(value) - low) / span * (self.to - self.from)
    }

    pub fn contains(&self, value: f64) -> bool {
        value >= self.low && value <= self.high
    }
}

pub(in crate::certificate) const TICK: Style = Style::regular(7.6).ink(QUIET);

/// Round tick values, about `wanted` of them, within the range.
pub(in crate::certificate) fn round_ticks(low: f64, high: f64, wanted: f64) -> Vec<f64> {
    let step = round_step((high - low) / wanted);
    if !(step.is_finite() && step > 0.0) {
        return Vec::new();
    }
    let first = (low / step).ceil();
    (0..64)
        .map(|k| (first + f64::from(k)) * step)
        .take_while(|v| *v <= high + step * 1e-9)
        .collect()
}

/// The nearest of 1, 2, 5 × 10ⁿ at or above.
pub(in crate::certificate) fn round_step(raw: f64) -> f64 {
    if !(raw.is_finite() && raw > 0.0) {
        return f64::NAN;
    }
    let decade = 10f64.powf(raw.log10().floor());
    let lead = raw / decade;
    let round = [1.0, 2.0, 5.0, 10.0]
        .into_iter()
        .find(|s| lead <= s * (1.0 + 1e-9))
        .unwrap_or(10.0);
    round * decade
}

/// Powers of ten within the range, and the 2 … 9 multiples between.
fn decades(low: f64, high: f64) -> (Vec<f64>, Vec<f64>) {
    let first = low.log10().floor().clamp(-300.0, 300.0) as i32;
    let last = high.log10().ceil().clamp(-300.0, 300.0) as i32;
    let inside = |v: &f64| *v >= low * (1.0 - 1e-9) && *v <= high * (1.0 + 1e-9);
    let powers = (first..=last).map(|e| 10f64.powi(e));
    let major = powers.clone().filter(inside).collect();
    let minor = powers
        .flat_map(|p| (2..10).map(move |k| p * f64::from(k)))
        .filter(inside)
        .collect();
    (major, minor)
}

/// Grid and labels of a log-log plot.
pub(in crate::certificate) fn log_grid(
    canvas: &mut Canvas,
    area: Area,
    (x, x_unit): (&Axis, &str),
    (y, y_unit): (&Axis, &str),
) {
    let (major, minor) = decades(x.low, x.high);
    let fine = Pen::solid(0.25, GRID);
    let strong = Pen::solid(0.5, GRID);
    let vertical = |values: &[f64]| {
        values
            .iter()
            .map(|v| vec![(x.at(*v), area.top), (x.at(*v), area.bottom)])
            .collect::<Vec<_>>()
    };
    canvas.lines(vertical(&minor), fine);
    canvas.lines(vertical(&major), strong);
    let labelled = labelled(&major, &minor);
    let mut free = area.left - 12.0;
    for value in &labelled {
        let text = tick(*value, x_unit);
        let half = width(&text, TICK) / 2.0;
        if x.at(*value) - half > free {
            canvas.text_at(
                (x.at(*value), area.bottom + 10.0),
                Anchor::Middle,
                TICK,
                &text,
            );
            free = x.at(*value) + half + 4.0;
        }
    }
    let (major, minor) = decades(y.low, y.high);
    let horizontal = |values: &[f64]| {
        values
            .iter()
            .map(|v| vec![(area.left, y.at(*v)), (area.right, y.at(*v))])
            .collect::<Vec<_>>()
    };
    canvas.lines(horizontal(&minor), fine);
    canvas.lines(horizontal(&major), strong);
    let mut free = f64::INFINITY;
    for value in self::labelled(&major, &minor) {
        let at = y.at(value);
        if at + 4.0 < free {
            canvas.text_at(
                (area.left - 4.0, at + 2.5),
                Anchor::End,
                TICK,
                &tick(value, y_unit),
            );
            free = at - 5.0;
        }
    }
    canvas.frame(area, Pen::solid(0.7, TEXT));
}

/// Which ticks carry a label: the decades, or all where there are fewer than two.
fn labelled(major: &[f64], minor: &[f64]) -> Vec<f64> {
    let mut all = major.to_vec();
    if major.len() < 2 {
        all.extend_from_slice(minor);
        all.sort_by(f64::total_cmp);
    }
    all
}

fn tick(value: f64, unit: &str) -> String {
    let (exponent, letter) = prefix(value);
    format!(
        "{} {letter}{unit}",
        plain_tick(value * 10f64.powi(-exponent))
    )
}

fn plain_tick(value: f64) -> String {
    plain(format!("{value:.3e}").parse().unwrap_or(value))
}

/// Ticks and labels below a linear axis. Values are in the printed unit.
pub(in crate::certificate) fn linear_below(canvas: &mut Canvas, area: Area, axis: &Axis) {
    canvas.line(
        (area.left, area.bottom),
        (area.right, area.bottom),
        Pen::solid(0.7, TEXT),
    );
    let mut free = area.left - 24.0;
    for value in round_ticks(axis.low, axis.high, 6.0) {
        let at = axis.at(value);
        canvas.line(
            (at, area.bottom),
            (at, area.bottom + 3.0),
            Pen::solid(0.5, TEXT),
        );
        let text = plain_tick_fine(value);
        let half = width(&text, TICK) / 2.0;
        if at - half > free {
            canvas.text_at((at, area.bottom + 11.0), Anchor::Middle, TICK, &text);
            free = at + half + 5.0;
        }
    }
}

/// Ticks and labels left of a linear axis.
pub(in crate::certificate) fn linear_left(
    canvas: &mut Canvas,
    area: Area,
    axis: &Axis,
    wanted: f64,
) {
    canvas.line(
        (area.left, area.top),
        (area.left, area.bottom),
        Pen::solid(0.7, TEXT),
    );
    for value in round_ticks(axis.low, axis.high, wanted) {
        let at = axis.at(value);
        canvas.line(
            (area.left - 3.0, at),
            (area.left, at),
            Pen::solid(0.5, TEXT),
        );
        canvas.text_at(
            (area.left - 5.0, at + 2.5),
            Anchor::End,
            TICK,
            &plain_tick_fine(value),
        );
    }
}

/// A tick of a linear axis: rounding dust from its making is not shown.
fn plain_tick_fine(value: f64) -> String {
    let rounded: f64 = format!("{value:.6e}").parse().unwrap_or(value);
    plain(if rounded.abs() < 1e-12 { 0.0 } else { rounded })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_within() {
        let ticks = round_ticks(4.1, 5.3, 6.0);
        assert_eq!(
            ticks
                .iter()
                .map(|t| plain_tick_fine(*t))
                .collect::<Vec<_>>(),
            ["4.2", "4.4", "4.6", "4.8", "5", "5.2"]
        );
        assert!(round_ticks(1.0, 1.0, 6.0).is_empty());
        assert!(round_ticks(f64::NAN, 1.0, 6.0).is_empty());
    }

    #[test]
    fn a_log_axis_gives_every_decade_the_same_length() {
        let axis = Axis {
            kind: Kind::Log,
            low: 1e2,
            high: 1e7,
            from: 0.0,
            to: 500.0,
        };
        assert!((axis.at(1e3) - 100.0).abs() < 1e-9);
        assert!((axis.at(1e6) - 400.0).abs() < 1e-9);
    }
}
