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

use super::neighbours::Neighbours;
use super::order::{median, order_statistic};
use crate::statistics::lanes::{dot, total};
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::f64::consts::LN_2;
use std::rc::Rc;

/// Points of one block.
const BLOCK: usize = 16;

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

/// The impedance of a sweep with its deviation from its neighbours and the noise along it.
#[derive(Debug, Clone)]
pub(super) struct Noise {
    /// Real parts in Ω.
    pub re: Vec<f64>,
    /// Imaginary parts in Ω.
    pub im: Vec<f64>,
    /// Squared magnitudes of the impedance in Ω².
    pub square: Vec<f64>,
    /// Squared deviations from the cubic through the neighbours, relative; NaN where there is none.
    pub deviation: Vec<f64>,
    /// Variance of the complex noise relative to |Z|²; 0 where there are too few points to show any.
    pub variance: Vec<f64>,
    neighbours: Rc<Neighbours>,
}

/// Estimates the noise of a sweep.
pub(super) fn estimate(sweep: &Sweep) -> Noise {
    let neighbours = Neighbours::of(&sweep.frequency);
    let re: Vec<f64> = sweep.impedance.iter().map(|z| z.re).collect();
    let im: Vec<f64> = sweep.impedance.iter().map(|z| z.im).collect();
    let square: Vec<f64> = re.iter().zip(&im).map(|(x, y)| x * x + y * y).collect();
    let deviation = neighbours.squared_deviations(&re, &im, &square);
    let variance = variance(&square, &deviation);
    Noise {
        re,
        im,
        square,
        deviation,
        variance,
        neighbours,
    }
}

/// Points by their squared deviation `d` and squared impedance `s`.
#[derive(Debug)]
struct Points {
    d: Vec<f64>,
    s: Vec<f64>,
    /// `1/s`
    inverse: Vec<f64>,
    /// One over the model's variance.
    weight: Vec<f64>,
    /// The clipped square over the model's, times the weight.
    excess: Vec<f64>,
}

impl Points {
    fn with_capacity(capacity: usize) -> Self {
        let list = || Vec::with_capacity(capacity);
        Points {
            d: list(),
            s: list(),
            inverse: list(),
            weight: list(),
            excess: list(),
        }
    }
}

/// Squared deviation that counts.
fn least(deviation: f64) -> f64 {
    deviation.max(LEAST * LEAST)
}

/// Squared impedance that can be divided by.
fn divisor(square: f64) -> f64 {
    square.max(f64::MIN_POSITIVE)
}

/// Relative variance `a + b/s + c s`.
#[derive(Debug, Clone, Copy)]
struct Model {
    a: f64,
    b: f64,
    c: f64,
}

impl Model {
    fn at(&self, s: f64, inverse: f64) -> f64 {
        self.a + self.b * inverse + self.c * s
    }

    /// One multiplicative round over the points.
    fn round(&mut self, points: &mut Points) {
        let Points {
            d,
            s,
            inverse,
            weight,
            excess,
        } = points;
        let known = d.iter().zip(s.iter().zip(inverse.iter()));
        for ((weight, excess), (d, (s, inverse))) in weight.iter_mut().zip(&mut *excess).zip(known)
        {
            let w = 1.0 / self.at(*s, *inverse);
            *weight = w;
            *excess = (d * w).min(CLIP) * w;
        }
        let factor = |above: f64, below: f64| above / (CLIPPED_MEAN * below);
        self.a *= factor(total(excess), total(weight));
        self.b *= factor(dot(excess, inverse), dot(weight, inverse));
        self.c *= factor(dot(excess, s), dot(weight, s));
    }
}

/// Relative variance of each point.
fn variance(square: &[f64], deviation: &[f64]) -> Vec<f64> {
    let n = square.len();
    if n < 4 {
        return vec![0.0; n];
    }
    let model = fit(square, deviation);
    let mut all: Vec<f64> = square
        .iter()
        .map(|s| divisor(*s))
        .map(|s| model.at(s, 1.0 / s))
        .collect();
    let size = n.div_ceil((n / BLOCK).max(1));
    for (block, deviation) in all.chunks_mut(size).zip(deviation.chunks(size)) {
        let factor = excess(block, deviation);
        if factor > 1.0 {
            block.iter_mut().for_each(|v| *v *= factor);
        }
    }
    all
}

fn fit(square: &[f64], deviation: &[f64]) -> Model {
    let stride = square.len().div_ceil(FITTED);
    let mut points = Points::with_capacity(FITTED);
    let all = square.iter().zip(deviation).step_by(stride);
    for (s, d) in all.map(|(s, d)| (divisor(*s), least(*d))) {
        points.d.push(d);
        points.s.push(s);
        points.inverse.push(1.0 / s);
    }
    points.weight.resize(points.d.len(), 0.0);
    points.excess.resize(points.d.len(), 0.0);
    // Begin with each floor as the points show it where it would rule alone: the fifth with the
    // smallest and the fifth with the largest impedance.
    let fifth = points.s.len().div_ceil(5);
    let low = order_statistic(points.s.iter().copied(), fifth - 1);
    let high = order_statistic(points.s.iter().copied(), points.s.len() - fifth);
    let pairs = || points.d.iter().zip(&points.s);
    let lowest = pairs().filter(|(_, s)| **s <= low).take(fifth);
    let highest = pairs().rev().filter(|(_, s)| **s >= high).take(fifth);
    let mut model = Model {
        a: median(points.d.iter().copied()) / LN_2,
        b: median(lowest.map(|(d, s)| d * s)) / LN_2,
        c: median(highest.map(|(d, s)| d / s)) / LN_2,
    };
    for _ in 0..ROUNDS {
        model.round(&mut points);
    }
    model
}

/// The factor by which a block's variance exceeds the model's (at least 1), by the median.
fn excess(model: &[f64], deviation: &[f64]) -> f64 {
    // Counting is quicker than selecting, and tells whether there is anything to select.
    let (mut known, mut within) = (0, 0);
    for (m, d) in model.iter().zip(deviation) {
        known += usize::from(!d.is_nan());
        within += usize::from(least(*d) <= LN_2 * m && !d.is_nan());
    }
    if known == 0 || within > known / 2 {
        return 1.0;
    }
    let ratios = model.iter().zip(deviation).filter(|(_, d)| !d.is_nan());
    let ratio = median(ratios.map(|(m, d)| least(*d) / m)) / LN_2;
    if ratio > 1.0 { ratio } else { 1.0 }
}

impl Noise {
    /// Complex rms noise of a point relative to its impedance.
    pub fn at(&self, point: usize) -> f64 {
        self.variance_at(point).sqrt()
    }

    /// The least squared impedance in Ω², infinite where there is none.
    pub fn least(&self) -> f64 {
        let less = |least: f64, s: &f64| if *s < least { *s } else { least };
        self.square.iter().fold(f64::INFINITY, less)
    }

    fn variance_at(&self, point: usize) -> f64 {
        self.variance.get(point).copied().unwrap_or(0.0)
    }

    /// Whether a point's relative noise is more than a level.
    pub fn exceeds(&self, point: usize, level: f64) -> bool {
        self.variance_at(point) > level * level
    }

    /// How many points are usable.
    pub fn usable_points(&self) -> usize {
        let limit = super::UNUSABLE * super::UNUSABLE;
        self.variance.iter().filter(|v| **v < limit).count()
    }

    /// Whether a point's noise lets anything be said about it.
    pub fn usable(&self, point: usize) -> bool {
        self.variance_at(point) < super::UNUSABLE * super::UNUSABLE
    }

    /// Complex deviation of a point of this noise's sweep from the cubic through its neighbours,
    /// over the larger of both magnitudes, scaled to the noise of one point; and what
    /// interpolation alone can make of it. `None` where there is no cubic.
    pub fn deviation(&self, sweep: &Sweep, point: usize) -> Option<(Complex64, f64)> {
        self.neighbours.deviation(sweep, point)
    }
}
