//! Histogram of one characteristic with its limits and nominal value.

use super::axis::{Axis, Kind, linear_below, linear_left, round_step};
use super::limit::{Side, limit};
use super::trace::clip;
use super::view::View;
use crate::certificate::canvas::{Area, Canvas, Pen};
use crate::certificate::ink::{
    ACCEPT, CONFORMING, CONFORMING_SOFT, NONCONFORMING, TEXT, UNDECIDED,
};
use crate::certificate::section::Characteristic;
use crate::record::PartVerdict;

/// Counts in bins of equal width.
#[derive(Debug, Clone, PartialEq)]
pub(in crate::certificate) struct Bins {
    pub first: f64,
    pub width: f64,
    pub counts: Vec<u32>,
}

/// Bins by the rule of Freedman and Diaconis (1981), 2·IQR·n^(−1/3), to a round width; 5 to 40 over
/// the range of the values.
pub(in crate::certificate) fn bins(values: &[f64]) -> Option<Bins> {
    let mut sorted: Vec<f64> = values.iter().copied().filter(|v| v.is_finite()).collect();
    sorted.sort_by(f64::total_cmp);
    let last = sorted.len().checked_sub(1)?;
    let (low, high) = (*sorted.first()?, *sorted.get(last)?);
    let range = high - low;
    let quartiles = sorted.get(last * 3 / 4)? - sorted.get(last / 4)?;
    let raw = 2.0 * quartiles / (sorted.len() as f64).cbrt();
    let width = if range > 0.0 {
        round_step(raw.clamp(range / 40.0, range / 5.0))
    } else {
        round_step(low.abs().max(1e-300) * 1e-3)
    };
    if !(width.is_finite() && width > 0.0) {
        return None;
    }
    let first = (low / width).floor() * width;
    let count = (((high - first) / width).floor() as usize + 1).min(64);
    let mut counts = vec![0u32; count];
    let mut bins = Bins {
        first,
        width,
        counts: Vec::new(),
    };
    for v in sorted {
        if let Some(count) = bins.index(v).and_then(|i| counts.get_mut(i.min(count - 1))) {
            *count += 1;
        }
    }
    bins.counts = counts;
    Some(bins)
}

impl Bins {
    /// The bin of a value, were there bins without end.
    fn index(&self, value: f64) -> Option<usize> {
        let place = ((value - self.first) / self.width).floor().max(0.0);
        place.is_finite().then_some(place as usize)
    }

    /// The bin of a value that was counted.
    fn place(&self, value: f64) -> Option<usize> {
        let last = self.counts.len().checked_sub(1)?;
        let end = self.first + self.width * self.counts.len() as f64;
        (value >= self.first && value <= end)
            .then(|| self.index(value))
            .flatten()
            .map(|i| i.min(last))
    }
}

/// Mean, standard deviation and greatest height of the normal curve, in the printed unit, where it is
/// to be drawn.
fn curve(bins: &Bins, c: &Characteristic) -> Option<(f64, f64, f64)> {
    let spread = c.statistics.and_then(|s| s.mean.zip(s.standard_deviation));
    let (mean, s) = spread.filter(|(_, s)| *s > 0.0 && c.normal())?;
    let (mean, s) = (c.scale.scaled(mean), c.scale.scaled(s));
    let height = c.values.len() as f64 * bins.width / (s * std::f64::consts::TAU.sqrt());
    height.is_finite().then_some((mean, s, height))
}

fn peak(bins: &Bins, c: &Characteristic) -> f64 {
    curve(bins, c).map_or(0.0, |(_, _, height)| height)
}

/// The normal distribution of the record's mean and standard deviation, as so many parts would
/// follow it; only where the test for normality does not speak against it.
fn normal(canvas: &mut Canvas, (x, y): (&Axis, &Axis), bins: &Bins, c: &Characteristic) {
    let Some((mean, s, height)) = curve(bins, c) else {
        return;
    };
    const STEPS: u32 = 80;
    let points = (0..=STEPS)
        .map(|k| {
            let value = mean + s * (f64::from(k) / f64::from(STEPS) - 0.5) * 8.0;
            let z = (value - mean) / s;
            (x.at(value), y.at(height * (-0.5 * z * z).exp()))
        })
        .collect::<Vec<_>>();
    let plot = Area {
        left: x.from,
        right: x.to,
        top: y.to,
        bottom: y.from,
    };
    canvas.lines(clip(&points, plot), Pen::solid(0.9, ACCEPT));
}

/// Draws the histogram into the area (axes included).
pub(in crate::certificate) fn histogram(canvas: &mut Canvas, area: Area, c: &Characteristic) {
    let plot = Area {
        left: area.left + 26.0,
        right: area.right - 4.0,
        top: area.top + 6.0,
        bottom: area.bottom - 16.0,
    };
    let scaled: Vec<f64> = c.values.iter().map(|v| c.scale.scaled(v.value)).collect();
    let marks: Vec<f64> = c.marks().iter().map(|m| c.scale.scaled(*m)).collect();
    let view = View::of_values(&scaled, &marks);
    let shown: Vec<f64> = scaled
        .iter()
        .copied()
        .filter(|v| view.contains(*v))
        .collect();
    let Some(bins) = bins(&shown) else { return };
    let end = bins.first + bins.width * bins.counts.len() as f64;
    let x = Axis {
        kind: Kind::Linear,
        low: view.low.min(bins.first),
        high: view.high.max(end),
        from: plot.left,
        to: plot.right,
    };
    let most = bins.counts.iter().copied().max().unwrap_or(1).max(1);
    let y = Axis {
        kind: Kind::Linear,
        low: 0.0,
        high: f64::from(most).max(peak(&bins, c)) * 1.12,
        from: plot.bottom,
        to: plot.top,
    };
    let second: Vec<f64> = c
        .values
        .iter()
        .filter(|v| c.in_second_group(v.part))
        .map(|v| c.scale.scaled(v.value))
        .collect();
    for (index, count) in bins.counts.iter().enumerate().filter(|(_, c)| **c > 0) {
        let left = bins.first + bins.width * index as f64;
        let bar = Area {
            left: x.at(left),
            right: x.at(left + bins.width),
            top: y.at(f64::from(*count)),
            bottom: plot.bottom,
        };
        canvas.fill_area(bar, CONFORMING_SOFT);
        let dark = second
            .iter()
            .filter(|v| bins.place(**v) == Some(index))
            .count();
        if dark > 0 {
            let top = y.at(dark as f64);
            canvas.fill_area(Area { top, ..bar }, CONFORMING);
        }
        canvas.frame(bar, Pen::solid(0.5, CONFORMING));
    }
    normal(canvas, (&x, &y), &bins, c);
    rug(canvas, &x, c, plot);
    linear_below(canvas, plot, &x);
    linear_left(canvas, plot, &y, f64::from(most).min(4.0));
    if let Some(nominal) = c
        .bound
        .nominal
        .map(|n| c.scale.scaled(n))
        .filter(|n| x.contains(*n))
    {
        let at = x.at(nominal);
        canvas.line((at, plot.top), (at, plot.bottom), Pen::dashed(0.7, TEXT));
    }
    for (bound, side) in [(c.bound.lower, Side::Left), (c.bound.upper, Side::Right)] {
        if let Some(at) = bound
            .map(|b| c.scale.scaled(b))
            .filter(|b| x.contains(*b))
            .map(|b| x.at(b))
        {
            limit(canvas, (at, plot.top), (at, plot.bottom), side);
        }
    }
}

/// Parts that are not conforming as ticks standing on the axis.
fn rug(canvas: &mut Canvas, x: &Axis, c: &Characteristic, plot: Area) {
    for (verdict, ink) in [
        (PartVerdict::Undecided, UNDECIDED),
        (PartVerdict::Nonconforming, NONCONFORMING),
    ] {
        let lines = c
            .values
            .iter()
            .filter(|v| v.verdict == verdict)
            .map(|v| c.scale.scaled(v.value))
            .filter(|v| x.contains(*v))
            .map(|v| vec![(x.at(v), plot.bottom), (x.at(v), plot.bottom - 9.0)])
            .collect();
        canvas.lines(lines, Pen::solid(1.0, ink));
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn one_value_and_equal_values_have_one_bin() {
        assert_eq!(bins(&[4.7]).expect("bins").counts, vec![1]);
        assert_eq!(bins(&[4.7, 4.7, 4.7]).expect("bins").counts, vec![3]);
        assert!(bins(&[]).is_none());
    }

    proptest! {
        #[test]
        fn every_value_is_counted_once(values in prop::collection::vec(-1e3f64..1e3, 1..300)) {
            let bins = bins(&values).expect("bins");
            prop_assert_eq!(bins.counts.iter().map(|c| *c as usize).sum::<usize>(), values.len());
        }
    }
}
