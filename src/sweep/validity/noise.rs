//! How noisy a sweep is, from the sweep itself.
//!
//! The impedance of a part is smooth on the scale of a few points, so what a point differs by from
//! the cubic through its four neighbours is noise. Its variance relative to |Z|² is modelled as
//! `a + b/|Z|² + c|Z|²`: proportional noise, a floor of the smaller quantity (near resonance) and a
//! floor of the larger one (where the difference of two channels is small). That is the form that
//! the sensitivities of all five methods have. The fit is by maximum likelihood for exponentially
//! distributed squares (Févotte, Bertin and Durrieu, Neural Computation 21 (2009) 793, equation for
//! the multiplicative update), with large squares clipped so that outliers stay out; where a block
//! of points is noisier than the model, the block counts.

use crate::sweep::Sweep;
use num_complex::Complex64;
use std::f64::consts::LN_2;

/// Points of one block.
const BLOCK: usize = 16;

/// Neighbours farther apart than this in ln f say nothing about a point between them.
const WIDEST: f64 = 0.6;

/// No sweep is taken for less noisy than its digits (relative).
const LEAST: f64 = 1e-6;

/// So many points are enough for the model.
const FITTED: usize = 128;

/// Rounds of the fit; what is left to do then is less than a block's own scatter.
const ROUNDS: usize = 16;

/// Squares count at most so many times the model's …
const CLIP: f64 = 1.5;
/// … which leaves this share of the mean of an exponential distribution, `1 - exp(-CLIP)`.
const CLIPPED_MEAN: f64 = 0.776_869_839_851_570_2;

/// Deviation of each point from its neighbours, and the noise along the sweep.
#[derive(Debug, Clone)]
pub(super) struct Noise {
    /// Complex difference to the cubic through the neighbours over the larger of both
    /// magnitudes, scaled to the noise of one point; not finite where there is no cubic.
    pub deviation: Vec<Complex64>,
    /// What interpolation alone can make of the deviation, relative.
    pub interpolation: Vec<f64>,
    /// Complex rms noise relative to |Z|; 0 where the sweep is too coarse to show any.
    relative: Vec<f64>,
}

/// Estimates the noise of a sweep.
pub(super) fn estimate(sweep: &Sweep) -> Noise {
    let n = sweep.impedance.len();
    let position: Vec<f64> = sweep.frequency.iter().map(|f| f.ln()).collect();
    let mut deviation = vec![Complex64::new(f64::NAN, f64::NAN); n];
    let mut interpolation = vec![f64::INFINITY; n];
    let windows = position.windows(5).zip(sweep.impedance.windows(5));
    let targets = deviation.iter_mut().zip(&mut interpolation).skip(2);
    for ((x, z), (deviation, interpolation)) in windows.zip(targets) {
        if let (&[x0, x1, x2, x3, x4], &[z0, z1, z2, z3, z4]) = (x, z) {
            let step = (x4 - x0) / 4.0;
            let widest = (x1 - x0).max(x2 - x1).max(x3 - x2).max(x4 - x3);
            if widest > WIDEST {
                continue;
            }
            let w = weights([x0 - x2, x1 - x2, x3 - x2, x4 - x2]);
            let expected = z0 * w[0] + z1 * w[1] + z3 * w[2] + z4 * w[3];
            let gain = (1.0 + w.iter().map(|w| w * w).sum::<f64>()).sqrt();
            let size = z2.norm_sqr().max(expected.norm_sqr()).sqrt();
            *deviation = (z2 - expected) / (size * gain);
            let largest = z0.norm_sqr().max(z4.norm_sqr()).sqrt().max(size);
            *interpolation = (step * step) * (step * step) / 6.0 * largest / size;
        }
    }
    let relative = relative(sweep, &deviation);
    Noise {
        deviation,
        interpolation,
        relative,
    }
}

/// Weights of four points for the value of their cubic at 0 (Lagrange).
fn weights(x: [f64; 4]) -> [f64; 4] {
    let [a, b, c, d] = x;
    [
        b * c * d / ((b - a) * (c - a) * (d - a)),
        a * c * d / ((a - b) * (c - b) * (d - b)),
        a * b * d / ((a - c) * (b - c) * (d - c)),
        a * b * c / ((a - d) * (b - d) * (c - d)),
    ]
}

/// A point with its squared deviation `d` and squared impedance `s`.
#[derive(Debug, Clone, Copy)]
struct Square {
    d: f64,
    s: f64,
    /// `1/s`: divisions are what the fit would spend its time on.
    inverse: f64,
}

/// Relative variance `a + b/s + c s`.
#[derive(Debug, Clone, Copy)]
struct Model {
    a: f64,
    b: f64,
    c: f64,
}

impl Model {
    fn at(&self, point: &Square) -> f64 {
        self.a + self.b * point.inverse + self.c * point.s
    }

    /// One multiplicative round over the points.
    fn round(&mut self, points: &[Square]) {
        let (mut above, mut below) = ([0.0; 3], [0.0; 3]);
        for point in points {
            let model = self.at(point);
            let weight = 1.0 / model;
            let excess = (point.d * weight).min(CLIP) / CLIPPED_MEAN * weight;
            for ((above, below), term) in
                above
                    .iter_mut()
                    .zip(&mut below)
                    .zip([1.0, point.inverse, point.s])
            {
                *above += term * excess;
                *below += term * weight;
            }
        }
        let [a, b, c] = above;
        let [p, q, r] = below;
        self.a *= a / p;
        self.b *= b / q;
        self.c *= c / r;
    }
}

fn relative(sweep: &Sweep, deviation: &[Complex64]) -> Vec<f64> {
    let square = |(d, z): (&Complex64, &Complex64)| {
        let s = z.norm_sqr().max(f64::MIN_POSITIVE);
        Square {
            d: d.norm_sqr().max(LEAST * LEAST),
            s,
            inverse: 1.0 / s,
        }
    };
    let all: Vec<Square> = deviation.iter().zip(&sweep.impedance).map(square).collect();
    let known: Vec<Square> = all.iter().copied().filter(|p| p.d.is_finite()).collect();
    if known.len() < 4 {
        return vec![0.0; all.len()];
    }
    let model = fit(&known);
    let local = blocks(deviation, &all, &model);
    let mut next = 0;
    all.iter()
        .enumerate()
        .map(|(i, point)| {
            while local.get(next).is_some_and(|(end, _)| *end <= i) && next + 1 < local.len() {
                next += 1;
            }
            let factor = local.get(next).map_or(1.0, |(_, factor)| *factor);
            (model.at(point) * factor).sqrt()
        })
        .collect()
}

fn fit(known: &[Square]) -> Model {
    let stride = known.len().div_ceil(FITTED);
    let points: Vec<Square> = known.iter().copied().step_by(stride).collect();
    // Begin with each floor as the points show it where it would rule alone.
    let mut points = points;
    points.sort_by(|p, q| p.s.total_cmp(&q.s));
    let fifth = points.len().div_ceil(5);
    let (low, high) = (points.iter().take(fifth), points.iter().rev().take(fifth));
    let mut model = Model {
        a: median(points.iter().map(|p| p.d)) / LN_2,
        b: median(low.map(|p| p.d * p.s)) / LN_2,
        c: median(high.map(|p| p.d / p.s)) / LN_2,
    };
    for _ in 0..ROUNDS {
        model.round(&points);
    }
    model
}

/// Blocks by their end, each with the factor by which its variance exceeds the model (at least 1).
fn blocks(deviation: &[Complex64], all: &[Square], model: &Model) -> Vec<(usize, f64)> {
    let n = all.len();
    let size = n.div_ceil((n / BLOCK).max(1)).max(1);
    let chunks = deviation.chunks(size).zip(all.chunks(size));
    chunks
        .enumerate()
        .map(|(at, (deviation, points))| {
            let known = deviation.iter().zip(points).filter(|(d, _)| d.is_finite());
            let ratio = median(known.map(|(_, p)| p.d / model.at(p))) / LN_2;
            ((at + 1) * size, if ratio > 1.0 { ratio } else { 1.0 })
        })
        .collect()
}

fn median(values: impl Iterator<Item = f64>) -> f64 {
    let mut values: Vec<f64> = values.collect();
    let middle = values.len() / 2;
    if values.is_empty() {
        return f64::NAN;
    }
    *values.select_nth_unstable_by(middle, f64::total_cmp).1
}

impl Noise {
    /// Complex rms noise of a point relative to its impedance.
    pub fn at(&self, point: usize) -> f64 {
        self.relative.get(point).copied().unwrap_or(0.0)
    }

    /// Whether a point's noise lets anything be said about it.
    pub fn usable(&self, point: usize) -> bool {
        self.at(point) < super::UNUSABLE
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn weights_reproduce_a_cubic() {
        let x = [-2.1, -0.9, 1.2, 2.0];
        let cubic = |x: f64| 1.0 + x * (2.0 + x * (3.0 + x * 4.0));
        let sum: f64 = weights(x).iter().zip(x).map(|(w, x)| w * cubic(x)).sum();
        assert!((sum - 1.0).abs() < 1e-12);
    }
}
