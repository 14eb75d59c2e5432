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

use crate::sweep::Sweep;
use num_complex::Complex64;
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
    /// Of the averaged model.
    coefficients: Vec<f64>,
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

impl LocalFit {
    /// Fits the points of `range` around the frequency `centre` in Hz.
    ///
    /// `None` where they do not determine a curve: fewer than two points, or values that are not
    /// finite or zero.
    pub(super) fn new(sweep: &Sweep, range: Range<usize>, centre: f64) -> Option<LocalFit> {
        let frequency = sweep.frequency.get(range.clone())?;
        let impedance = sweep.impedance.get(range)?;
        let n = frequency.len();
        if n < 2
            || impedance
                .iter()
                .any(|z| !(z.norm_sqr() > 0.0 && z.norm_sqr().is_finite()))
        {
            return None;
        }
        let noise = noise_ratio(impedance);
        let capacitive: f64 = impedance.iter().map(|z| -z.im / z.norm()).sum();
        let (basis, least): (&'static [Term], usize) = if capacitive > 0.95 * n as f64 {
            (&CAPACITIVE, 2)
        } else {
            (&RESONANT, 3)
        };
        let mut design = Design::new(frequency, impedance, centre, noise);
        let mut fit = LocalFit {
            centre,
            basis,
            coefficients: Vec::new(),
            triangle: Vec::with_capacity(basis.len() * (basis.len() + 1) / 2),
            projections: Vec::with_capacity(basis.len()),
            models: Vec::with_capacity(basis.len()),
            noise,
        };
        fit.select(&mut design, least)?;
        fit.average();
        fit.coefficients
            .iter()
            .all(|c| c.is_finite())
            .then_some(fit)
    }

    /// Takes terms in order while they can still bring information.
    fn select(&mut self, design: &mut Design, least: usize) -> Option<()> {
        let rows = design.residual.len();
        let total = square_sum(&design.residual);
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
            let rss = square_sum(&design.residual);
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

    /// Coefficients of the averaged model by back substitution.
    fn average(&mut self) {
        let p = self.projections.len();
        let mut target: Vec<f64> = (0..p)
            .map(|k| {
                let share: f64 = self
                    .models
                    .iter()
                    .filter(|m| m.terms > k)
                    .map(|m| m.weight)
                    .sum();
                self.projections[k] * share
            })
            .collect();
        for k in (0..p).rev() {
            let column = column(&self.triangle, k);
            let value = target[k] / column[k];
            for (t, entry) in target.iter_mut().zip(&column[..k]) {
                *t -= entry * value;
            }
            target[k] = value;
        }
        self.coefficients = target;
    }

    /// Z in Ω at a frequency inside the stretch.
    pub(super) fn impedance(&self, frequency: f64) -> Complex64 {
        let at = Point::new(frequency / self.centre);
        self.coefficients
            .iter()
            .zip(self.basis)
            .map(|(c, b)| c * at.value(*b))
            .sum()
    }

    /// dZ/d ln f in Ω.
    pub(super) fn slope(&self, frequency: f64) -> Complex64 {
        let at = Point::new(frequency / self.centre);
        self.coefficients
            .iter()
            .zip(self.basis)
            .map(|(c, b)| c * at.slope(*b))
            .sum()
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
        let (mut solved, mut value, mut length) = ([0.0; 13], [0.0; 13], [0.0; 13]);
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

/// Highest power of `u` in a term.
const HIGHEST: usize = 4;

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
            // 1/(j y), spelt out: it is the hot path.
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

/// The weighted least-squares problem while it is being solved.
struct Design {
    points: Vec<Point>,
    /// `1/Z` with the reciprocal noise of ln|Z| and phase: `dZ/Z = d ln|Z| + j dθ`.
    inverse: Vec<Complex64>,
    weight: [f64; 2],
    /// Orthonormal columns, one after the other; rows: ln|Z| of all points, then phase.
    columns: Vec<f64>,
    residual: Vec<f64>,
}

impl Design {
    fn new(frequency: &[f64], impedance: &[Complex64], centre: f64, noise: [f64; 2]) -> Design {
        let n = frequency.len();
        let weight = noise.map(|sigma| 1.0 / sigma);
        let mut residual = vec![weight[0]; n];
        residual.resize(2 * n, 0.0);
        Design {
            points: frequency.iter().map(|f| Point::new(f / centre)).collect(),
            inverse: impedance.iter().map(Complex64::inv).collect(),
            weight,
            columns: Vec::with_capacity(2 * n * 9),
            residual,
        }
    }

    /// Orthogonalises one more term, appends its column of the triangle and takes its share out of
    /// the residual. `None` where the points do not tell it from the terms before.
    fn add(&mut self, term: Term, triangle: &mut Vec<f64>) -> Option<f64> {
        let rows = self.residual.len();
        let n = rows / 2;
        let start = self.columns.len();
        self.columns.resize(start + rows, 0.0);
        let (earlier, new) = self.columns.split_at_mut(start);
        for (i, (point, inverse)) in self.points.iter().zip(&self.inverse).enumerate() {
            let row = point.value(term) * inverse;
            new[i] = row.re * self.weight[0];
            new[n + i] = row.im * self.weight[1];
        }
        let before = square_sum(new).sqrt();
        let entries = triangle.len();
        for column in earlier.chunks_exact(rows) {
            let share = product(column, new);
            for (value, e) in new.iter_mut().zip(column) {
                *value -= share * e;
            }
            triangle.push(share);
        }
        let norm = square_sum(new).sqrt();
        if norm.is_nan() || norm <= before * 1e-10 {
            triangle.truncate(entries);
            return None;
        }
        new.iter_mut().for_each(|v| *v /= norm);
        triangle.push(norm);
        let projection = product(new, &self.residual);
        for (value, c) in self.residual.iter_mut().zip(new.iter()) {
            *value -= projection * c;
        }
        Some(projection)
    }
}

/// Sum of products in four lanes, so that it needs no more time than memory does.
fn product(a: &[f64], b: &[f64]) -> f64 {
    let mut lanes = [0.0; 4];
    let (a4, b4) = (a.chunks_exact(4), b.chunks_exact(4));
    let rest: f64 = a4
        .remainder()
        .iter()
        .zip(b4.remainder())
        .map(|(x, y)| x * y)
        .sum();
    for (x, y) in a4.zip(b4) {
        for lane in 0..4 {
            lanes[lane] += x[lane] * y[lane];
        }
    }
    lanes.iter().sum::<f64>() + rest
}

fn square_sum(a: &[f64]) -> f64 {
    product(a, a)
}

/// Standard deviations of the noise of ln|Z| and of the phase (rad), from third differences of
/// neighbouring points (median of absolute values: neither a smooth course nor a single jump counts
/// as noise). `None` for too few points.
pub(super) fn noise(impedance: &[Complex64]) -> Option<[f64; 2]> {
    if impedance.len() < 9 {
        return None;
    }
    let size: Vec<f64> = impedance.iter().map(Complex64::norm_sqr).collect();
    let ln: Vec<f64> = size.iter().map(|s| 0.5 * s.ln()).collect();
    let magnitude = ln.windows(2).map(|l| l[1] - l[0]).collect();
    // The sine of the step serves for the step: what it lacks is smooth.
    let phase = impedance
        .windows(2)
        .zip(size.windows(2))
        .map(|(z, s)| (z[1].im * z[0].re - z[1].re * z[0].im) / (s[0] * s[1]).sqrt())
        .collect();
    let of_steps = |steps: Vec<f64>| -> f64 {
        let mut all: Vec<f64> = steps
            .windows(3)
            .map(|s| (s[2] - 2.0 * s[1] + s[0]).abs())
            .collect();
        let middle = all.len() / 2;
        // 1.4826: median absolute value to standard deviation; 20 = 1² + 3² + 3² + 1².
        1.4826 / 20f64.sqrt() * *all.select_nth_unstable_by(middle, f64::total_cmp).1
    };
    Some([of_steps(magnitude), of_steps(phase)])
}

/// The two relative to the larger one, kept between 1:10 and 10:1; 1:1 where nothing is known.
fn noise_ratio(impedance: &[Complex64]) -> [f64; 2] {
    let [magnitude, phase] = noise(impedance).unwrap_or([1.0, 1.0]);
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
