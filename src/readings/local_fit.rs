//! The one estimator of all readings: a causal least-squares fit of Z over a short stretch of a sweep.
//!
//! The impedance of a capacitor is, whatever the part, a real-coefficient function of `s = jω` whose
//! poles lie on the negative real axis (resistance, inductance and relaxing capacitance in any
//! connection). Near a frequency it is therefore well written in terms `u^a s^b` with real
//! coefficients, `u = ln s = ln(f/f0) + jπ/2`: `1/s` is a capacitance, `u/s` its dispersion, 1 a
//! resistance, `s` an inductance. Because the coefficients are real, R and X support each other as
//! the Kramers-Kronig relations demand, which halves the scatter of a fit to X alone.
//!
//! Residuals are weighted in ln|Z| and in phase by the noise that each shows in the stretch. The
//! terms are offered in order and orthogonalised (modified Gram-Schmidt), so that all nested models
//! come from one pass; models are averaged with Akaike weights, and their disagreement is part of
//! the uncertainty (Burnham and Anderson, Model Selection and Multimodel Inference, 2nd ed., 4.3.2).
//! Noisy data so get a stiff curve, clean data a supple one, without thresholds on particular parts.

use super::grid::{LN_AT, grid};
use crate::statistics::lanes::{LANES, product, sum};
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::array::from_fn;
use std::f64::consts::{FRAC_PI_2, LN_10};
use std::ops::Range;

/// Width of the stretch that carries a reading, as ln of the frequency ratio (0.8 decade).
pub(super) const WIDTH: f64 = 0.8 * LN_10;
/// Fewest points of a stretch where the sweep has them.
const FEWEST: usize = 5;
/// Information that one more parameter must bring: Akaike's 2 and a little more, because the noise
/// levels themselves come from the same few points.
const PENALTY: f64 = 2.5;
/// Models so much worse than the best (weight below 0.3 %) end the search.
const HOPELESS: f64 = 12.0;

/// A term `u^power_u s^power_s`.
#[derive(Debug, Clone, Copy)]
struct Term {
    power_u: i32,
    power_s: i32,
}

const fn term(power_u: i32, power_s: i32) -> Term {
    Term { power_u, power_s }
}

/// For the capacitive branch: capacitance, dispersion, resistance, inductance, then remainders.
const CAPACITIVE: [Term; 13] = [
    term(0, -1),
    term(1, -1),
    term(0, 0),
    term(0, 1),
    term(2, -1),
    term(1, 0),
    term(1, 1),
    term(3, -1),
    term(2, 0),
    term(2, 1),
    term(4, -1),
    term(3, 0),
    term(3, 1),
];

/// Around and above resonance: inductance, capacitance, resistance, then remainders.
const RESONANT: [Term; 13] = [
    term(0, 1),
    term(0, -1),
    term(0, 0),
    term(1, -1),
    term(1, 0),
    term(1, 1),
    term(2, -1),
    term(2, 0),
    term(2, 1),
    term(3, -1),
    term(3, 0),
    term(3, 1),
    term(4, -1),
];

/// A nested model: its number of terms, Akaike weight and residual variance.
#[derive(Debug, Clone, Copy)]
struct Model {
    terms: usize,
    weight: f64,
    variance: f64,
}

/// A fitted stretch of a sweep.
#[derive(Debug, Clone)]
pub(super) struct LocalFit {
    centre: f64,
    basis: &'static [Term],
    curve: Curve,
    /// Upper triangular factor of the weighted design matrix, column after column.
    triangle: Vec<f64>,
    /// Of the weighted data on the orthonormal columns.
    projections: Vec<f64>,
    models: Vec<Model>,
    /// Noise of ln|Z| and of the phase as the weights have it; their ratio is what counts.
    noise: [f64; 2],
}

/// The points within `WIDTH` around a frequency: shifted inwards at an end of the sweep, and at
/// least `FEWEST` points where the sweep has them.
pub(super) fn stretch(sweep: &Sweep, centre: f64) -> Range<usize> {
    let points = &sweep.frequency;
    let (Some(first), Some(last)) = (points.first(), points.last()) else {
        return 0..0;
    };
    let whole = WIDTH.exp();
    let low = (centre / whole.sqrt()).min(last / whole).max(*first);
    let high = (low * whole).max(centre * whole.sqrt()).min(*last);
    let slack = 1.0 + 1e-9;
    let start = points.partition_point(|f| f * slack < low);
    let end = points.partition_point(|f| *f <= high * slack);
    grown(points, start..end, centre, FEWEST)
}

/// Adds neighbours, the nearer one first, until there are `fewest` points.
pub(super) fn grown(
    points: &[f64],
    range: Range<usize>,
    centre: f64,
    fewest: usize,
) -> Range<usize> {
    let Range { mut start, mut end } = range;
    while end - start < fewest.min(points.len()) {
        let below = start.checked_sub(1).map(|i| centre / points[i]);
        let above = points.get(end).map(|f| f / centre);
        match (below, above) {
            (Some(b), Some(a)) if a < b => end += 1,
            (Some(_), _) => start -= 1,
            (None, Some(_)) => end += 1,
            (None, None) => break,
        }
    }
    start..end
}

/// Whether squares of impedances are finite and not zero.
pub(super) fn sound(squares: &[f64]) -> bool {
    // All are looked at, which is quicker than to stop at one.
    squares
        .iter()
        .fold(true, |sound, s| sound & (*s > 0.0) & (*s < f64::INFINITY))
}

impl LocalFit {
    /// Fits the points of `range` around the frequency `centre` in Hz.
    ///
    /// `None` where they do not determine a curve: fewer than two points, or values that are not
    /// finite or zero.
    pub(super) fn new(sweep: &Sweep, range: Range<usize>, centre: f64) -> Option<LocalFit> {
        let frequency = sweep.frequency.get(range.clone())?;
        let impedance = sweep.impedance.get(range.clone())?;
        let n = frequency.len();
        let square: Vec<f64> = impedance.iter().map(Complex64::norm_sqr).collect();
        if n < 2 || !sound(&square) {
            return None;
        }
        let grid = grid(&sweep.frequency, range.clone());
        let ln_centre = (centre / LN_AT).ln();
        let ln = grid.all.ln.get(range)?.iter().map(|ln| ln - ln_centre);
        let size: Vec<f64> = square.iter().map(|s| s.sqrt()).collect();
        let noise = noise_ratio(impedance, &square, &size);
        let capacitive: f64 = impedance.iter().zip(&size).map(|(z, s)| -z.im / s).sum();
        let (basis, least): (&'static [Term], usize) = if capacitive > 0.95 * n as f64 {
            (&CAPACITIVE, 2)
        } else {
            (&RESONANT, 3)
        };
        let mut design = Design::new(ln.collect(), frequency, impedance, &square, centre, noise);
        let mut fit = LocalFit {
            centre,
            basis,
            curve: Curve::default(),
            triangle: Vec::with_capacity(basis.len() * (basis.len() + 1) / 2),
            projections: Vec::with_capacity(basis.len()),
            models: Vec::with_capacity(basis.len()),
            noise,
        };
        fit.select(&mut design, least)?;
        fit.curve = fit.averaged()?;
        Some(fit)
    }

    /// Takes terms in order while they can still bring information.
    fn select(&mut self, design: &mut Design, least: usize) -> Option<()> {
        let rows = 2 * design.points;
        let total = design.rest;
        // Below this the residual is the rounding of ten-digit files, not information.
        let floor = total * 1e-20 + f64::MIN_POSITIVE;
        let least = least.min(rows / 2);
        let mut best = f64::INFINITY;
        let mut since_best = 0;
        for (k, term) in self.basis.iter().enumerate() {
            let terms = k + 1;
            if terms + 2 > rows {
                break;
            }
            let Some(projection) = design.add(*term, &mut self.triangle) else {
                break;
            };
            self.projections.push(projection);
            if terms < least {
                continue;
            }
            let (n, freedom) = (rows as f64, (rows - terms) as f64);
            let rss = design.rest;
            let penalty = PENALTY * terms as f64 * n / (freedom - 1.0).max(1.0);
            let criterion = n * rss.max(floor).ln() + penalty;
            self.models.push(Model {
                terms,
                weight: criterion,
                variance: rss / freedom,
            });
            if criterion < best {
                (best, since_best) = (criterion, 0);
            } else {
                since_best += 1;
            }
            if since_best >= 3 && criterion > best + HOPELESS {
                break;
            }
        }
        let mut sum = 0.0;
        for model in &mut self.models {
            model.weight = (-0.5 * (model.weight - best)).exp();
            sum += model.weight;
        }
        self.models.iter_mut().for_each(|m| m.weight /= sum);
        (sum.is_finite() && sum > 0.0).then_some(())
    }

    /// The averaged model, its coefficients by back substitution; `None` where one is not finite.
    fn averaged(&self) -> Option<Curve> {
        let p = self.projections.len();
        let mut target = [0.0; MOST];
        // Weight of the models that have the term: from the last term to the first.
        let (mut share, mut models) = (0.0, self.models.iter().rev().peekable());
        for k in (0..p).rev() {
            while let Some(model) = models.next_if(|m| m.terms > k) {
                share += model.weight;
            }
            target[k] = self.projections[k] * share;
        }
        for k in (0..p).rev() {
            let column = column(&self.triangle, k);
            let value = target[k] / column[k];
            for (t, entry) in target.iter_mut().zip(&column[..k]) {
                *t -= entry * value;
            }
            target[k] = value;
        }
        let coefficients = target.get(..p)?;
        let finite = coefficients.iter().all(|c| c.is_finite());
        finite.then(|| Curve::new(self.basis, coefficients))
    }

    /// Hz
    pub(super) fn centre(&self) -> f64 {
        self.centre
    }

    /// Z in Ω at a frequency inside the stretch.
    pub(super) fn impedance(&self, frequency: f64) -> Complex64 {
        self.curve.impedance((frequency / self.centre).ln())
    }

    /// dZ/d ln f in Ω.
    pub(super) fn slope(&self, frequency: f64) -> Complex64 {
        self.curve.slope((frequency / self.centre).ln())
    }

    /// Re Z in Ω at `ln`, the logarithm of the frequency over the centre.
    pub(super) fn resistance(&self, ln: f64) -> f64 {
        self.curve.resistance(ln)
    }

    /// Standard uncertainty, from scatter and choice of model, of the quantity whose derivatives
    /// with respect to R and X are the real and imaginary part of `gradient`.
    pub(super) fn sigma(&self, frequency: f64, gradient: Complex64) -> f64 {
        let at = Point::new(frequency / self.centre);
        self.spread(|term| dot(at.value(term), gradient))
    }

    /// The same of a quantity that depends on R, X (`gradient`) and on their slopes (`of_slope`).
    pub(super) fn sigma_with_slope(
        &self,
        frequency: f64,
        gradient: Complex64,
        of_slope: Complex64,
    ) -> f64 {
        let at = Point::new(frequency / self.centre);
        self.spread(|term| dot(at.value(term), gradient) + dot(at.slope(term), of_slope))
    }

    /// Standard deviation of one point's Z about the curve, along `direction` (of length 1).
    pub(super) fn point_scatter(&self, z: Complex64, direction: Complex64) -> f64 {
        let variance: f64 = self.models.iter().map(|m| m.weight * m.variance).sum();
        let along = z / z.norm();
        let across = along * Complex64::I;
        let share =
            (self.noise[0] * dot(along, direction)).hypot(self.noise[1] * dot(across, direction));
        variance.sqrt() * z.norm() * share
    }

    fn spread(&self, functional: impl Fn(Term) -> f64) -> f64 {
        let p = self.projections.len();
        let (mut solved, mut value, mut length) = ([0.0; MOST], [0.0; MOST], [0.0; MOST]);
        let (mut sum, mut square) = (0.0, 0.0);
        for k in 0..p {
            let column = column(&self.triangle, k);
            let known: f64 = column[..k].iter().zip(&solved).map(|(a, b)| a * b).sum();
            solved[k] = (functional(self.basis[k]) - known) / column[k];
            sum += solved[k] * self.projections[k];
            square += solved[k] * solved[k];
            (value[k], length[k]) = (sum, square);
        }
        let mean: f64 = self
            .models
            .iter()
            .map(|m| m.weight * value[m.terms - 1])
            .sum();
        self.models
            .iter()
            .map(|m| {
                let apart = value[m.terms - 1] - mean;
                m.weight * (m.variance * length[m.terms - 1] + apart * apart).sqrt()
            })
            .sum()
    }
}

/// Column `k` of a packed upper triangle.
fn column(triangle: &[f64], k: usize) -> &[f64] {
    let start = k * (k + 1) / 2;
    &triangle[start..=start + k]
}

/// Real product of two vectors of the complex plane.
fn dot(a: Complex64, b: Complex64) -> f64 {
    a.re * b.re + a.im * b.im
}

/// Highest power of `u` in a term, and most terms.
const HIGHEST: usize = 4;
const MOST: usize = CAPACITIVE.len();

/// A fitted curve `Σ c u^a s^b`, written out in the real variable `x = ln(f/centre)`: for b = −1, 0
/// and 1 the real and the imaginary part of `Σ c (x + jπ/2)^a` as polynomials in x.
#[derive(Debug, Clone, Default)]
struct Curve {
    re: [[f64; HIGHEST + 1]; 3],
    im: [[f64; HIGHEST + 1]; 3],
}

impl Curve {
    fn new(basis: &[Term], coefficients: &[f64]) -> Curve {
        let mut curve = Curve::default();
        for (c, term) in coefficients.iter().zip(basis) {
            let b = (term.power_s + 1) as usize;
            let a = term.power_u as usize;
            // (x + jh)^a = Σ C(a, m) (jh)^(a − m) x^m, from m = a down.
            let mut factor = Complex64::new(*c, 0.0);
            for m in (0..=a).rev() {
                curve.re[b][m] += factor.re;
                curve.im[b][m] += factor.im;
                factor *= Complex64::new(0.0, FRAC_PI_2 * m as f64 / (a - m + 1) as f64);
            }
        }
        curve
    }

    /// `P₋₁/s + P₀ + P₁ s` with s = jy.
    fn impedance(&self, x: f64) -> Complex64 {
        let y = x.exp();
        let [re, im] = [&self.re, &self.im].map(|p| p.map(|p| polynomial(&p, x)));
        Complex64::new(
            im[0] / y + re[1] - im[2] * y,
            -re[0] / y + im[1] + re[2] * y,
        )
    }

    fn resistance(&self, x: f64) -> f64 {
        let y = x.exp();
        polynomial(&self.im[0], x) / y + polynomial(&self.re[1], x) - polynomial(&self.im[2], x) * y
    }

    /// dZ/dx: dy/dx = y.
    fn slope(&self, x: f64) -> Complex64 {
        let y = x.exp();
        let [re, im] = [&self.re, &self.im].map(|p| p.map(|p| polynomial(&p, x)));
        let [d_re, d_im] = [&self.re, &self.im].map(|p| p.map(|p| derivative(&p, x)));
        Complex64::new(
            (d_im[0] - im[0]) / y + d_re[1] - (d_im[2] + im[2]) * y,
            (re[0] - d_re[0]) / y + d_im[1] + (d_re[2] + re[2]) * y,
        )
    }
}

fn polynomial(p: &[f64; HIGHEST + 1], x: f64) -> f64 {
    p.iter().rev().fold(0.0, |sum, c| sum * x + c)
}

fn derivative(p: &[f64; HIGHEST + 1], x: f64) -> f64 {
    (1..p.len())
        .rev()
        .fold(0.0, |sum, m| sum * x + m as f64 * p[m])
}

/// Powers of `u`, and `s`, at one frequency, relative to the centre.
struct Point {
    u: [Complex64; HIGHEST + 1],
    s: Complex64,
}

impl Point {
    fn new(ratio: f64) -> Point {
        let mut u = [Complex64::ONE; HIGHEST + 1];
        let first = Complex64::new(ratio.ln(), FRAC_PI_2);
        for power in 1..=HIGHEST {
            u[power] = u[power - 1] * first;
        }
        Point {
            u,
            s: Complex64::new(0.0, ratio),
        }
    }

    fn s_power(&self, power: i32) -> Complex64 {
        match power {
            0 => Complex64::ONE,
            1 => self.s,
            _ => Complex64::new(0.0, -1.0 / self.s.im),
        }
    }

    fn u_power(&self, power: i32) -> Complex64 {
        self.u[power as usize]
    }

    fn value(&self, term: Term) -> Complex64 {
        self.u_power(term.power_u) * self.s_power(term.power_s)
    }

    /// d/d ln f of the term.
    fn slope(&self, term: Term) -> Complex64 {
        let a = f64::from(term.power_u);
        let b = f64::from(term.power_s);
        let lower = if term.power_u > 0 {
            a * self.u_power(term.power_u - 1)
        } else {
            Complex64::ZERO
        };
        (lower + b * self.u_power(term.power_u)) * self.s_power(term.power_s)
    }
}

/// `u^power s^b / Z` at all points, for one b: the next term of the chain is `u` times this one.
struct Chain {
    power: i32,
    /// Real and imaginary parts.
    values: Vec<[f64; 2]>,
}

impl Chain {
    fn of(values: impl Iterator<Item = [f64; 2]>) -> Chain {
        Chain {
            power: 0,
            values: values.collect(),
        }
    }

    fn raise(&mut self, ln: &[f64]) {
        self.power += 1;
        for (value, x) in self.values.iter_mut().zip(ln) {
            let [re, im] = *value;
            *value = [re * x - im * FRAC_PI_2, im * x + re * FRAC_PI_2];
        }
    }
}

/// The weighted least-squares problem while it is being solved. Rows: ln|Z| and phase of each point.
struct Design {
    points: usize,
    /// ln(f/centre)
    ln: Vec<f64>,
    /// For b = −1, 0, 1: `dZ/Z = d ln|Z| + j dθ`.
    chains: [Chain; 3],
    /// Reciprocal noise of ln|Z| and of the phase.
    weight: [f64; 2],
    /// Orthonormal columns, one after the other.
    columns: Vec<f64>,
    residual: Vec<f64>,
    /// Sum of squares of the residual.
    rest: f64,
}

impl Design {
    fn new(
        ln: Vec<f64>,
        frequency: &[f64],
        impedance: &[Complex64],
        square: &[f64],
        centre: f64,
        noise: [f64; 2],
    ) -> Design {
        let n = frequency.len();
        let weight = noise.map(|sigma| 1.0 / sigma);
        let rows = (2 * n).next_multiple_of(LANES);
        let mut residual = Vec::with_capacity(rows);
        residual.extend((0..n).flat_map(|_| [weight[0], 0.0]));
        residual.resize(rows, 0.0);
        let plain: Vec<[f64; 2]> = impedance
            .iter()
            .zip(square)
            .map(|(z, square)| {
                let inverse = 1.0 / square;
                [z.re * inverse, -z.im * inverse]
            })
            .collect();
        let over_centre = 1.0 / centre;
        let with = |k: &dyn Fn([f64; 2], f64) -> [f64; 2]| {
            let both = plain.iter().zip(frequency);
            Chain::of(both.map(|(z, f)| k(*z, *f)))
        };
        // 1/s = −j/y
        let over = with(&|[re, im], f| {
            let over = centre / f;
            [im * over, -re * over]
        });
        let times = with(&|[re, im], f| {
            let y = f * over_centre;
            [-im * y, re * y]
        });
        Design {
            points: n,
            ln,
            chains: [
                over,
                Chain {
                    power: 0,
                    values: plain,
                },
                times,
            ],
            weight,
            columns: Vec::with_capacity(rows * MOST),
            rest: n as f64 * weight[0] * weight[0],
            residual,
        }
    }

    /// Orthogonalises one more term, appends its column of the triangle and takes its share out of
    /// the residual. `None` where the points do not tell it from the terms before.
    fn add(&mut self, term: Term, triangle: &mut Vec<f64>) -> Option<f64> {
        let rows = self.residual.len();
        let chain = self.chains.get_mut((term.power_s + 1) as usize)?;
        while chain.power < term.power_u {
            chain.raise(&self.ln);
        }
        let start = self.columns.len();
        let weight = self.weight;
        let weighted = |[re, im]: &[f64; 2]| [re * weight[0], im * weight[1]];
        self.columns.extend(chain.values.iter().flat_map(weighted));
        self.columns.resize(start + rows, 0.0);
        let (earlier, new) = self.columns.split_at_mut(start);
        let entries = triangle.len();
        let mut earlier = earlier.chunks_exact(rows);
        let (square, mut projection);
        if let Some(mut column) = earlier.next() {
            let mut share = product(column, new);
            for next in earlier {
                triangle.push(share);
                share = take(new, share, column, next);
                column = next;
            }
            triangle.push(share);
            [square, projection] = take_last(new, share, column, &self.residual);
        } else {
            (square, projection) = (product(new, new), product(new, &self.residual));
        }
        // What was taken and what is left are at right angles.
        let taken: f64 = triangle[entries..].iter().map(|share| share * share).sum();
        if square.is_nan() || square <= (square + taken) * 1e-20 {
            triangle.truncate(entries);
            return None;
        }
        let norm = square.sqrt();
        triangle.push(norm);
        projection /= norm;
        self.rest = explain(&mut self.residual, projection, new, 1.0 / norm);
        Some(projection)
    }
}

/// Takes `share` of `column` out of `of`; the product of what is left with `next`.
fn take(of: &mut [f64], share: f64, column: &[f64], next: &[f64]) -> f64 {
    let mut lanes = [0.0; LANES];
    let both = column
        .as_chunks::<LANES>()
        .0
        .iter()
        .zip(next.as_chunks::<LANES>().0);
    for (of, (column, next)) in of.as_chunks_mut::<LANES>().0.iter_mut().zip(both) {
        let left: [f64; LANES] = from_fn(|i| of[i] - share * column[i]);
        *of = left;
        lanes = from_fn(|i| lanes[i] + left[i] * next[i]);
    }
    sum(lanes)
}

/// Takes `share` of `column` out of `of`; the products of what is left with itself and with `other`.
fn take_last(of: &mut [f64], share: f64, column: &[f64], other: &[f64]) -> [f64; 2] {
    let (mut squares, mut products) = ([0.0; LANES], [0.0; LANES]);
    let both = column
        .as_chunks::<LANES>()
        .0
        .iter()
        .zip(other.as_chunks::<LANES>().0);
    for (of, (column, other)) in of.as_chunks_mut::<LANES>().0.iter_mut().zip(both) {
        let left: [f64; LANES] = from_fn(|i| of[i] - share * column[i]);
        *of = left;
        squares = from_fn(|i| squares[i] + left[i] * left[i]);
        products = from_fn(|i| products[i] + left[i] * other[i]);
    }
    [sum(squares), sum(products)]
}

/// Scales `column` by `factor` and takes `share` of that out of `of`; the sum of squares of what is
/// left.
fn explain(of: &mut [f64], share: f64, column: &mut [f64], factor: f64) -> f64 {
    let mut lanes = [0.0; LANES];
    let columns = column.as_chunks_mut::<LANES>().0;
    for (of, column) in of.as_chunks_mut::<LANES>().0.iter_mut().zip(columns) {
        let scaled: [f64; LANES] = from_fn(|i| column[i] * factor);
        *column = scaled;
        let left: [f64; LANES] = from_fn(|i| of[i] - share * scaled[i]);
        *of = left;
        lanes = from_fn(|i| lanes[i] + left[i] * left[i]);
    }
    sum(lanes)
}

/// Standard deviations of the noise of ln|Z| and of the phase (rad), from third differences of
/// neighbouring points (median of absolute values: neither a smooth course nor a single jump counts
/// as noise). `None` for too few points.
///
/// `square` and `size` are |Z|² and |Z|.
pub(super) fn noise(impedance: &[Complex64], square: &[f64], size: &[f64]) -> Option<[f64; 2]> {
    if impedance.len() < 9 {
        return None;
    }
    // ln|Z₁| − ln|Z₀| = artanh((|Z₁|² − |Z₀|²)/(|Z₁|² + |Z₀|²))
    let mut steps: Vec<f64> = square
        .windows(2)
        .map(|s| (s[1] - s[0]) / (s[1] + s[0]))
        .collect();
    if steps.iter().all(|t| t.abs() < SMALL) {
        steps.iter_mut().for_each(|t| *t = small_artanh(*t));
    } else {
        steps.iter_mut().for_each(|t| *t = t.atanh());
    }
    let magnitude = of_steps(&steps);
    steps.clear();
    // The sine of the step serves for the step: what it lacks is smooth.
    let steps_of_phase = impedance
        .windows(2)
        .zip(size.windows(2))
        .map(|(z, s)| (z[1].im * z[0].re - z[1].re * z[0].im) / (s[0] * s[1]));
    steps.extend(steps_of_phase);
    Some([magnitude, of_steps(&steps)])
}

/// Up to here a step's series is exact to 1e-12, and what it lacks is smooth.
const SMALL: f64 = 0.2;

/// artanh by its series up to t¹³.
fn small_artanh(t: f64) -> f64 {
    let q = t * t;
    let series = [13.0, 11.0, 9.0, 7.0, 5.0, 3.0, 1.0];
    t * series.iter().fold(0.0, |sum, k| sum * q + 1.0 / k)
}

fn of_steps(steps: &[f64]) -> f64 {
    // Numbers that are not negative are in the order of their bits.
    let mut all: Vec<u64> = steps
        .windows(3)
        .map(|s| (s[2] - 2.0 * s[1] + s[0]).abs().to_bits())
        .collect();
    let middle = all.len() / 2;
    // 1.4826: median absolute value to standard deviation; 20 = 1² + 3² + 3² + 1².
    1.4826 / 20f64.sqrt() * f64::from_bits(*all.select_nth_unstable(middle).1)
}

/// The two relative to the larger one, kept between 1:10 and 10:1; 1:1 where nothing is known.
fn noise_ratio(impedance: &[Complex64], square: &[f64], size: &[f64]) -> [f64; 2] {
    let [magnitude, phase] = noise(impedance, square, size).unwrap_or([1.0, 1.0]);
    let largest = magnitude.max(phase);
    if !(largest > 0.0 && largest.is_finite()) {
        return [1.0, 1.0];
    }
    [(magnitude / largest).max(0.1), (phase / largest).max(0.1)]
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    fn sweep(points: usize, z: impl Fn(Complex64) -> Complex64) -> Sweep {
        let frequency: Vec<f64> = (0..points)
            .map(|i| 1e4 * 10f64.powf(i as f64 / 50.0))
            .collect();
        let impedance = frequency
            .iter()
            .map(|f| z(Complex64::new(0.0, TAU * f)))
            .collect();
        Sweep {
            frequency,
            impedance,
            level: None,
        }
    }

    fn series(s: Complex64) -> Complex64 {
        0.01 + s * 1e-9 + (s * 1e-6).inv()
    }

    #[test]
    fn a_series_circuit_comes_back_exactly() {
        let sweep = sweep(41, series);
        let fit = LocalFit::new(&sweep, 0..41, 2.5e4).expect("a fit");
        let f = 2.345e4;
        let exact = series(Complex64::new(0.0, TAU * f));
        assert!((fit.impedance(f) - exact).norm() < 1e-10 * exact.norm());
        // dZ/d ln f = jωL − 1/(jωC)
        let s = Complex64::new(0.0, TAU * f);
        let slope = s * 1e-9 - (s * 1e-6).inv();
        assert!((fit.slope(f) - slope).norm() < 1e-9 * slope.norm());
        assert!(fit.sigma(f, Complex64::ONE) < 1e-9 * exact.norm());
    }

    #[test]
    fn noise_is_scatter_and_not_course() {
        // Uniform noise of 1 % of |Z| and 2 mrad (standard deviations) about a pure capacitance,
        // from a 64-bit congruential generator: X scatters like the mean of the points.
        let points = 41;
        let mut sweep = sweep(points, |s| (s * 1e-6).inv());
        let mut state = 1u64;
        let mut uniform = || {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1_442_695_040_888_963_407);
            ((state >> 11) as f64 / (1u64 << 53) as f64 - 0.5) * 12f64.sqrt()
        };
        for z in &mut sweep.impedance {
            *z *= Complex64::from_polar(1.0 + 0.01 * uniform(), 2e-3 * uniform());
        }
        let centre = 1e4 * 10f64.powf(0.4);
        let fit = LocalFit::new(&sweep, 0..points, centre).expect("a fit");
        let x = fit.impedance(centre).im;
        let sigma = fit.sigma(centre, Complex64::I);
        let of_mean = x.abs() * 0.01 / (points as f64).sqrt();
        assert!(
            (0.7..1.6).contains(&(sigma / of_mean)),
            "{sigma:e} {of_mean:e}"
        );
        assert!(fit.sigma(centre, Complex64::ONE) < 0.5 * sigma);
        let scatter = |direction| fit.point_scatter(Complex64::new(0.0, x), direction) / x.abs();
        assert!((0.7..1.4).contains(&(scatter(Complex64::I) / 0.01)));
        assert!((0.7..1.4).contains(&(scatter(Complex64::ONE) / 2e-3)));
    }

    #[test]
    fn too_few_points_or_values_that_are_none_give_no_fit() {
        let mut sweep = sweep(12, series);
        assert!(LocalFit::new(&sweep, 3..4, 1e4).is_none());
        assert!(LocalFit::new(&sweep, 5..40, 1e4).is_none());
        assert!(LocalFit::new(&sweep, 0..2, 1e4).is_some());
        sweep.impedance[4] = Complex64::ZERO;
        assert!(LocalFit::new(&sweep, 0..12, 1e4).is_none());
        sweep.impedance[4] = Complex64::new(f64::NAN, 0.0);
        assert!(LocalFit::new(&sweep, 0..12, 1e4).is_none());
    }

    #[test]
    fn a_stretch_keeps_its_width_at_the_ends_and_grows_where_points_are_rare() {
        let dense = sweep(251, series);
        for centre in [1e4, 1.2e4, 1e6, 9.9e8] {
            let range = stretch(&dense, centre);
            assert!((40..=41).contains(&range.len()), "{centre}: {range:?}");
        }
        let rare = Sweep {
            frequency: vec![1e2, 1e3, 1e4, 1e5, 1e6, 1e7],
            impedance: vec![Complex64::ONE; 6],
            level: None,
        };
        assert_eq!(stretch(&rare, 2e5), 1..6);
        assert_eq!(stretch(&rare, 1e2), 0..5);
    }
}
