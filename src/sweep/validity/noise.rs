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

use super::jumps::beyond;
use super::neighbours::Neighbours;
use super::order::{FEW, at_place_of_few, median, order_statistic};
use super::{FLOOR, UNUSABLE};
use crate::statistics::lanes::{Kernel, LANES, Simd, Singles, wide};
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::array::from_fn;
use std::cell::Cell;
use std::cmp::Ordering;
use std::f64::consts::LN_2;
use std::rc::Rc;

/// Points of one block, or up to twice as many.
const BLOCK: usize = 16;

/// No sweep is taken for less noisy than its digits (relative).
const LEAST: f64 = 1e-6;

/// So many points are enough for the model.
const FITTED: usize = 128;

/// Rounds of the fit; what is left to do then is less than a block's own scatter.
const ROUNDS: usize = 16;

/// A round that moves the points' variances by less than this, relative, is the last.
const SETTLED: f32 = 3e-3;

/// Squares count at most so many times the model's …
const CLIP: f32 = 1.5;
/// … which leaves this share of the mean of an exponential distribution, `1 - exp(-CLIP)`.
const CLIPPED_MEAN: f32 = 0.776_869_84;

/// The impedance of a sweep with its deviation from its neighbours and the noise along it.
#[derive(Debug)]
pub(super) struct Noise {
    columns: Columns,
    extremes: Extremes,
    neighbours: Rc<Neighbours>,
}

/// Columns of a sweep, one behind the other.
#[derive(Debug)]
struct Columns {
    points: usize,
    values: Vec<f64>,
}

/// Columns of [`Columns`].
const COLUMNS: usize = 5;

/// A thread keeps the memory of the last sweep for the next, up to so many values.
const KEPT: usize = 1 << 16;

thread_local! {
    static SPARE: Cell<Vec<f64>> = const { Cell::new(Vec::new()) };
}

impl Columns {
    /// Room for so many points; what stands in it is of no account.
    fn of(points: usize) -> Self {
        let mut values = SPARE.try_with(Cell::take).unwrap_or_default();
        values.resize(COLUMNS * points, 0.0);
        Columns { points, values }
    }

    fn column(&self, at: usize) -> &[f64] {
        let from = at * self.points;
        self.values
            .get(from..from + self.points)
            .unwrap_or_default()
    }

    fn all(&mut self) -> [&mut [f64]; COLUMNS] {
        let mut rest = self.values.as_mut_slice();
        let points = self.points;
        from_fn(|_| {
            let (column, others) = std::mem::take(&mut rest).split_at_mut(points);
            rest = others;
            column
        })
    }
}

impl Drop for Columns {
    fn drop(&mut self) {
        let values = std::mem::take(&mut self.values);
        if values.len() <= KEPT {
            // A thread that ends keeps nothing.
            let _ = SPARE.try_with(|spare| spare.set(values));
        }
    }
}

/// Estimates the noise of a sweep.
pub(super) fn estimate(sweep: &Sweep) -> Noise {
    let neighbours = Neighbours::of(&sweep.frequency);
    let mut columns = Columns::of(sweep.impedance.len());
    let extremes = wide(Estimate {
        impedance: &sweep.impedance,
        neighbours: &neighbours,
        columns: columns.all(),
    });
    Noise {
        columns,
        extremes,
        neighbours,
    }
}

/// What makes the columns of a sweep.
struct Estimate<'a> {
    impedance: &'a [Complex64],
    neighbours: &'a Neighbours,
    columns: [&'a mut [f64]; COLUMNS],
}

impl Kernel for Estimate<'_> {
    type Output = Extremes;

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) -> Extremes {
        let [re, im, square, deviation, variance] = self.columns;
        split(self.impedance, re, im, square);
        self.neighbours
            .squared_deviations(re, im, square, deviation);
        spread(simd, square, deviation, variance);
        Extremes::of(re, square, deviation, variance)
    }
}

/// Real and imaginary parts and squared magnitudes.
#[inline(always)]
fn split(impedance: &[Complex64], re: &mut [f64], im: &mut [f64], square: &mut [f64]) {
    let targets = re.iter_mut().zip(im).zip(square);
    for (z, ((re, im), square)) in impedance.iter().zip(targets) {
        (*re, *im) = (z.re, z.im);
        *square = z.re * z.re + z.im * z.im;
    }
}

/// Points by their squared deviation `d` and squared impedance `s`. Seven digits are plenty for what is a
/// statistical estimate, so that twice as many are worked on at once; to have them in range, `s` is in a unit
/// of its own. Behind the last point stand some that do not count.
struct Points {
    count: usize,
    /// That of `s`, in Ω².
    unit: f64,
    d: [f32; FITTED],
    s: [f32; FITTED],
    /// `1/s`
    inverse: [f32; FITTED],
    /// 1 for a point, 0 for none.
    counts: [f32; FITTED],
    /// The fifth of the points with the least `s` is not above this, that with the largest not below.
    fifths: [f32; 2],
}

/// The range of `s`.
const RANGE: f64 = 1e18;

impl Points {
    /// Points evenly taken out of all, at most `FITTED`.
    #[inline(always)]
    fn of(square: &[f64], deviation: &[f64]) -> Self {
        let stride = square.len().div_ceil(FITTED).max(1);
        let count = square.len().div_ceil(stride);
        let squares = || square.iter().step_by(stride).copied();
        let fifth = count.div_ceil(5);
        let low = order_statistic(squares(), fifth.saturating_sub(1));
        let high = order_statistic(squares(), count - fifth);
        let unit = (low.sqrt() * high.sqrt()).clamp(f64::MIN_POSITIVE, f64::MAX);
        let scaled = |s: f64| less(RANGE, more(1.0 / RANGE, s / unit)) as f32;
        let mut points = Points {
            count,
            unit,
            d: [1.0; FITTED],
            s: [1.0; FITTED],
            inverse: [1.0; FITTED],
            counts: [0.0; FITTED],
            fifths: [low, high].map(scaled),
        };
        let targets = points
            .d
            .iter_mut()
            .zip(&mut points.s)
            .zip(&mut points.counts);
        let all = squares().zip(deviation.iter().step_by(stride));
        for (((d, s), counts), (square, deviation)) in targets.zip(all) {
            *d = more(LEAST * LEAST, *deviation) as f32;
            *s = scaled(square);
            *counts = 1.0;
        }
        for (inverse, s) in points.inverse.iter_mut().zip(&points.s) {
            *inverse = 1.0 / s;
        }
        points
    }
}

/// Relative variance `a + b/s + c s`.
#[derive(Debug, Clone, Copy)]
struct Model {
    a: f32,
    b: f32,
    c: f32,
}

/// The median of what is made of the points whose `s` a condition takes, of so many at most.
#[inline(always)]
fn median_of<S: Simd>(
    simd: S,
    points: impl Iterator<Item = (f32, f32)>,
    takes: impl Fn(f32) -> bool,
    most: usize,
    of: impl Fn(f32, f32) -> f32,
) -> f32 {
    let mut values = [f32::INFINITY; FEW];
    let mut count = 0;
    let taken = points.filter(|(_, s)| takes(*s)).take(most);
    for (value, (d, s)) in values.iter_mut().zip(taken) {
        *value = of(d, s);
        count += 1;
    }
    at_place_of_few(simd, &values, count, count / 2)
}

impl Model {
    /// Begins with each floor as the points show it where it would rule alone: the fifth with the
    /// smallest and the fifth with the largest impedance.
    #[inline(always)]
    fn first<S: Simd>(simd: S, points: &Points) -> Self {
        let known = || {
            let known = points.d.iter().copied().zip(points.s.iter().copied());
            known.take(points.count)
        };
        let [low, high] = points.fifths;
        let fifth = points.count.div_ceil(5);
        let factor = 1.0 / std::f32::consts::LN_2;
        Model {
            a: factor * median(known().map(|(d, _)| f64::from(d))) as f32,
            b: factor * median_of(simd, known(), |s| s <= low, fifth, |d, s| d * s),
            c: factor * median_of(simd, known().rev(), |s| s >= high, fifth, |d, s| d / s),
        }
    }

    /// One multiplicative round over the points; how far it moves the points' variances on average, relative.
    #[inline(always)]
    fn round<S: Simd>(&mut self, simd: S, points: &Points) -> f32 {
        let Model { a, b, c } = *self;
        let [of_all, of_low, of_high, clip] = [a, b, c, CLIP].map(|v| Singles::all(simd, v));
        let mut sums = [[Singles::all(simd, 0.0); 3]; 2];
        let lists = [&points.d, &points.s, &points.inverse, &points.counts];
        let [d, s, inverse, counts] = lists.map(|list| list.as_chunks::<LANES>().0);
        let known = d.iter().zip(s).zip(inverse.iter().zip(counts));
        for ((d, s), (inverse, counts)) in known.take(points.count.div_ceil(LANES)) {
            let [d, s, inverse, counts] = [d, s, inverse, counts].map(|v| Singles::of(simd, v));
            let model = of_all.plus(of_low.times(inverse)).plus(of_high.times(s));
            let weight = counts.over(model);
            let excess = d.times(weight).at_most(clip).times(weight);
            for ([even, over, times], value) in sums.iter_mut().zip([weight, excess]) {
                *even = even.plus(value);
                *over = over.plus(value.times(inverse));
                *times = times.plus(value.times(s));
            }
        }
        let [weights, excesses] = sums.map(|sums| sums.map(Singles::sum));
        let factors: [f32; 3] = from_fn(|k| excesses[k] / (CLIPPED_MEAN * weights[k]));
        // Each term's part in the points' variances.
        let parts = [a * weights[0], b * weights[1], c * weights[2]];
        let moved: [f32; 3] = from_fn(|k| parts[k] * (factors[k] - 1.0).abs());
        self.a *= factors[0];
        self.b *= factors[1];
        self.c *= factors[2];
        moved.iter().sum::<f32>() / points.count as f32
    }

    /// That of a sweep, by its points.
    #[inline(always)]
    fn of<S: Simd>(simd: S, points: &Points) -> Self {
        let mut model = Model::first(simd, points);
        for _ in 0..ROUNDS {
            if model.round(simd, points) < SETTLED {
                break;
            }
        }
        model
    }
}

/// Variance of each point in Ω²: that of the model, or that of the point's block where it is more.
#[inline(always)]
fn spread<S: Simd>(simd: S, square: &[f64], deviation: &[f64], variance: &mut [f64]) {
    let n = square.len();
    if n < 4 {
        variance.fill(0.0);
        return;
    }
    let points = Points::of(square, deviation);
    let model = Model::of(simd, &points);
    let a = f64::from(model.a);
    let (b, c) = (
        f64::from(model.b) * points.unit,
        f64::from(model.c) / points.unit,
    );
    for (v, s) in variance.iter_mut().zip(square) {
        *v = b + s * (a + c * s);
    }
    let size = n.div_ceil((n / BLOCK).max(1));
    let blocks = square.chunks(size).zip(deviation.chunks(size));
    for (variance, (square, deviation)) in variance.chunks_mut(size).zip(blocks) {
        let factor = excess(simd, variance, square, deviation);
        if factor > 1.0 {
            variance.iter_mut().for_each(|v| *v *= factor);
        }
    }
}

/// The factor by which a block's variance exceeds the model's (at least 1), by the median.
#[inline(always)]
fn excess<S: Simd>(simd: S, model: &[f64], square: &[f64], deviation: &[f64]) -> f64 {
    // Counting is quicker than selecting, and tells whether there is anything to select.
    let (mut known, mut within) = (0u32, 0u32);
    let all = || model.iter().zip(square).zip(deviation);
    for ((m, s), d) in all() {
        let limit = LN_2 * m;
        known += u32::from(!d.is_nan());
        within += u32::from(d * s <= limit && LEAST * LEAST * s <= limit);
    }
    if known == 0 || within > known / 2 {
        return 1.0;
    }
    let mut ratios = [f32::INFINITY; FEW];
    for (ratio, ((m, s), d)) in ratios.iter_mut().zip(all()) {
        let times = (more(LEAST * LEAST, *d) * s / m) as f32;
        *ratio = if d.is_nan() { f32::INFINITY } else { times };
    }
    let middle = at_place_of_few(simd, &ratios, model.len(), known as usize / 2);
    f64::from(middle) / LN_2
}

/// What most checks ask of all points, answered at once.
#[derive(Debug, Clone, Copy)]
struct Extremes {
    /// The least squared impedance in Ω², infinite where there is none.
    square: f64,
    /// The least resistance in Ω.
    resistance: f64,
    /// The most that a point's variance is above that of a noise of `FLOOR`, in Ω²; NaN where one is not finite.
    noise: f64,
    /// The most that a point's deviation is beyond what `jumps` lets pass.
    deviation: f64,
}

impl Extremes {
    #[inline(always)]
    fn of(re: &[f64], square: &[f64], deviation: &[f64], variance: &[f64]) -> Self {
        if re.len() < LANES {
            Self::by::<1>(re, square, deviation, variance)
        } else {
            Self::by::<LANES>(re, square, deviation, variance)
        }
    }

    /// By so many points at a time, of which there must be as many; the last ones may be looked at twice.
    #[inline(always)]
    fn by<const N: usize>(re: &[f64], square: &[f64], deviation: &[f64], variance: &[f64]) -> Self {
        let mut seen = Seen::<N>::default();
        let points = re.as_chunks::<N>().0.iter().zip(square.as_chunks::<N>().0);
        let known = deviation.as_chunks::<N>().0.iter();
        for ((re, s), (d, v)) in points.zip(known.zip(variance.as_chunks::<N>().0)) {
            seen.look(re, s, d, v);
        }
        if let (Some(re), Some(s), Some(d), Some(v)) = (
            re.last_chunk(),
            square.last_chunk(),
            deviation.last_chunk(),
            variance.last_chunk(),
        ) {
            seen.look(re, s, d, v);
        }
        Extremes {
            square: seen.square.into_iter().fold(f64::INFINITY, less),
            resistance: seen.resistance.into_iter().fold(f64::INFINITY, less),
            noise: seen.noise.into_iter().fold(f64::NEG_INFINITY, more)
                + seen.broken.iter().sum::<f64>(),
            deviation: seen.deviation.into_iter().fold(f64::NEG_INFINITY, more),
        }
    }
}

/// Extremes of each lane.
struct Seen<const N: usize> {
    square: [f64; N],
    resistance: [f64; N],
    noise: [f64; N],
    deviation: [f64; N],
    /// Not zero where a variance is not finite.
    broken: [f64; N],
}

impl<const N: usize> Default for Seen<N> {
    #[inline(always)]
    fn default() -> Self {
        Seen {
            square: [f64::INFINITY; N],
            resistance: [f64::INFINITY; N],
            noise: [f64::NEG_INFINITY; N],
            deviation: [f64::NEG_INFINITY; N],
            broken: [0.0; N],
        }
    }
}

impl<const N: usize> Seen<N> {
    #[inline(always)]
    fn look(&mut self, re: &[f64; N], s: &[f64; N], d: &[f64; N], v: &[f64; N]) {
        self.square = from_fn(|i| less(self.square[i], s[i]));
        self.resistance = from_fn(|i| less(self.resistance[i], re[i]));
        self.noise = from_fn(|i| more(self.noise[i], v[i] - FLOOR * FLOOR * s[i]));
        self.deviation = from_fn(|i| more(self.deviation[i], beyond(d[i], s[i], v[i])));
        self.broken = from_fn(|i| self.broken[i] + 0.0 * v[i]);
    }
}

/// The lesser of two, the first where the second is not a number.
#[inline(always)]
fn less(a: f64, b: f64) -> f64 {
    if b < a { b } else { a }
}

/// The greater of two, the first where the second is not a number.
#[inline(always)]
fn more(a: f64, b: f64) -> f64 {
    if b > a { b } else { a }
}

impl Noise {
    /// Real parts in Ω.
    pub fn re(&self) -> &[f64] {
        self.columns.column(0)
    }

    /// Imaginary parts in Ω.
    pub fn im(&self) -> &[f64] {
        self.columns.column(1)
    }

    /// Squared magnitudes of the impedance in Ω².
    pub fn square(&self) -> &[f64] {
        self.columns.column(2)
    }

    /// Squared deviations from the cubic through the neighbours, relative; NaN where there is none.
    pub fn deviation(&self) -> &[f64] {
        self.columns.column(3)
    }

    /// Variance of the complex noise in Ω²; 0 where there are too few points to show any.
    pub fn variance(&self) -> &[f64] {
        self.columns.column(4)
    }

    /// The cubics of the sweep's frequency list.
    pub fn neighbours(&self) -> &Rc<Neighbours> {
        &self.neighbours
    }

    /// Complex rms noise of a point relative to its impedance.
    pub fn at(&self, point: usize) -> f64 {
        let (variance, square) = self.point(point);
        (variance / square.max(f64::MIN_POSITIVE)).sqrt()
    }

    /// The least squared impedance in Ω², infinite where there is none.
    pub fn least(&self) -> f64 {
        self.extremes.square
    }

    /// Whether any point has a negative resistance.
    pub fn is_negative_anywhere(&self) -> bool {
        self.extremes.resistance < 0.0
    }

    /// Whether any point's relative noise is more than `FLOOR`.
    pub fn is_noisy_anywhere(&self) -> bool {
        !matches!(
            self.extremes.noise.partial_cmp(&0.0),
            Some(Ordering::Less | Ordering::Equal)
        )
    }

    /// Whether any point deviates by more than `jumps` lets pass.
    pub fn jumps_anywhere(&self) -> bool {
        self.extremes.deviation > 0.0
    }

    /// Variance and squared impedance in Ω².
    fn point(&self, point: usize) -> (f64, f64) {
        let of = |values: &[f64]| values.get(point).copied().unwrap_or(0.0);
        (of(self.variance()), of(self.square()))
    }

    /// Whether a point's relative noise is more than a level.
    pub fn exceeds(&self, point: usize, level: f64) -> bool {
        let (variance, square) = self.point(point);
        variance > level * level * square
    }

    /// How many points are usable.
    pub fn usable_points(&self) -> usize {
        if self.is_noisy_anywhere() {
            (0..self.columns.points).filter(|&i| self.usable(i)).count()
        } else {
            self.columns.points
        }
    }

    /// Whether a point's noise lets anything be said about it.
    pub fn usable(&self, point: usize) -> bool {
        let (variance, square) = self.point(point);
        variance < UNUSABLE * UNUSABLE * square
    }

    /// Complex deviation of a point of this noise's sweep from the cubic through its neighbours,
    /// over the larger of both magnitudes, scaled to the noise of one point; and what
    /// interpolation alone can make of it. `None` where there is no cubic.
    pub fn deviation_of(&self, sweep: &Sweep, point: usize) -> Option<(Complex64, f64)> {
        self.neighbours.deviation(sweep, point)
    }
}
