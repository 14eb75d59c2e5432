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
//! terms are offered in order, as columns that sweeps of the same frequencies share, and solved by
//! Cholesky's factor of the normal equations, so that all nested models come from one pass; where the
//! noise leaves too few digits for that, by modified Gram-Schmidt. Models are averaged with Akaike
//! weights, and their disagreement is part of the uncertainty (Burnham and Anderson, Model Selection
//! and Multimodel Inference, 2nd ed., 4.3.2).
//! Noisy data so get a stiff curve, clean data a supple one, without thresholds on particular parts.

mod basis;
mod curve;
mod design;
mod scatter;

pub(super) use scatter::{Points, noise};

use super::sizes::sizes;
use crate::statistics::lanes::{Kernel, LANES, Lanes, Simd, chunks, wide};
use crate::sweep::Sweep;
use basis::{Basis, Course, MOST, Term};
use curve::{Curve, Point};
use design::{Added, Design};
use num_complex::Complex64;
use scatter::noise_ratio;
use std::cell::RefCell;
use std::f64::consts::LN_10;
use std::ops::Range;
use std::rc::Rc;
use std::sync::LazyLock;

/// Width of the stretch that carries a reading, as ln of the frequency ratio (0.8 decade).
pub(super) const WIDTH: f64 = 0.8 * LN_10;
/// Fewest points of a stretch where the sweep has them.
const FEWEST: usize = 5;
/// Information that one more parameter must bring: Akaike's 2 and a little more, because the noise
/// levels themselves come from the same few points.
const PENALTY: f64 = 2.3;
/// Models so much worse than the best (weight below 5 %) end the search.
const HOPELESS: f64 = 6.0;

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
    basis: Rc<Basis>,
    curve: Curve,
    /// Upper triangular factor of the weighted columns of the basis, column after column.
    triangle: Vec<f64>,
    /// Of the weighted data on the orthonormal columns.
    projections: Vec<f64>,
    models: Vec<Model>,
    /// Noise of ln|Z| and of the phase as the weights have it; their ratio is what counts.
    noise: [f64; 2],
}

/// `WIDTH` and half of it as frequency ratios.
static FACTORS: LazyLock<(f64, f64)> = LazyLock::new(|| (WIDTH.exp(), WIDTH.exp().sqrt()));

/// The points within `WIDTH` around a frequency: shifted inwards at an end of the sweep, and at
/// least `FEWEST` points where the sweep has them.
pub(super) fn stretch(sweep: &Sweep, centre: f64) -> Range<usize> {
    let points = &sweep.frequency;
    let (Some(first), Some(last)) = (points.first(), points.last()) else {
        return 0..0;
    };
    let (whole, half) = *FACTORS;
    let low = (centre / half).min(last / whole).max(*first);
    let high = (low * whole).max(centre * half).min(*last);
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
    /// Fits the points of `range`.
    ///
    /// `None` where they do not determine a curve: fewer than two points, or values that are not
    /// finite or zero.
    pub(super) fn new(sweep: &Sweep, range: Range<usize>) -> Option<LocalFit> {
        let frequency = sweep.frequency.get(range.clone())?;
        let impedance = sweep.impedance.get(range.clone())?;
        if impedance.len() < 2 {
            return None;
        }
        let (basis, noise, selection) = ROOM.with_borrow_mut(|room| {
            let course = wide(Looking {
                impedance,
                room: &mut room.points,
            })?;
            let [re, im, square, size] = &room.points;
            let points = Points {
                re,
                im,
                square,
                size,
            };
            let basis = Basis::of(frequency, course);
            let noise = noise_ratio(points);
            let quickly = Selecting {
                basis: &basis,
                points,
                noise,
                room: &mut room.design,
            };
            let selection = wide(quickly).or_else(|| {
                let exactly = Selecting {
                    basis: &basis,
                    points,
                    noise,
                    room: &mut room.design,
                };
                exactly.search(|design| design.add_exactly())
            })?;
            room.keep_little();
            Some((basis, noise, selection))
        })?;
        let Selection {
            triangle,
            projections,
            models,
        } = selection;
        let mut fit = LocalFit {
            basis,
            curve: Curve::default(),
            triangle,
            projections,
            models,
            noise,
        };
        fit.weigh()?;
        fit.curve = fit.averaged()?;
        Some(fit)
    }

    /// Akaike weights from the criteria; `None` where there is no model.
    fn weigh(&mut self) -> Option<()> {
        let criteria = self.models.iter().map(|m| m.weight);
        let best = criteria.fold(f64::INFINITY, f64::min);
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
        let coefficients = target.get_mut(..p)?;
        backwards(&self.triangle, coefficients);
        backwards(self.basis.triangle(), coefficients);
        let finite = coefficients.iter().all(|c| c.is_finite());
        finite.then(|| Curve::new(self.basis.course.terms(), coefficients))
    }

    /// Z in Ω at a frequency inside the stretch.
    pub(super) fn impedance(&self, frequency: f64) -> Complex64 {
        self.curve.impedance(self.ln(frequency))
    }

    /// dZ/d ln f in Ω.
    pub(super) fn slope(&self, frequency: f64) -> Complex64 {
        self.curve.slope(self.ln(frequency))
    }

    /// Re Z in Ω at a frequency, and at one after another that is higher by the same factor.
    pub(super) fn resistances(&self, from: f64, factor: f64) -> impl Iterator<Item = f64> {
        self.curve.resistances(self.ln(from), factor.ln())
    }

    /// Standard uncertainty, from scatter and choice of model, of the quantity whose derivatives
    /// with respect to R and X are the real and imaginary part of `gradient`.
    pub(super) fn sigma(&self, frequency: f64, gradient: Complex64) -> f64 {
        let at = Point::new(frequency / self.basis.centre);
        self.spread(|term| dot(at.value(term), gradient))
    }

    /// The same of a quantity that depends on R, X (`gradient`) and on their slopes (`of_slope`).
    pub(super) fn sigma_with_slope(
        &self,
        frequency: f64,
        gradient: Complex64,
        of_slope: Complex64,
    ) -> f64 {
        let at = Point::new(frequency / self.basis.centre);
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

    fn ln(&self, frequency: f64) -> f64 {
        (frequency / self.basis.centre).ln()
    }

    fn spread(&self, functional: impl Fn(Term) -> f64) -> f64 {
        let p = self.projections.len();
        let (mut solved, mut value, mut length) = ([0.0; MOST], [0.0; MOST], [0.0; MOST]);
        let terms = self.basis.course.terms();
        for (solved, term) in solved.iter_mut().zip(&terms[..p]) {
            *solved = functional(*term);
        }
        forwards(self.basis.triangle(), &mut solved[..p]);
        forwards(&self.triangle, &mut solved[..p]);
        let (mut sum, mut square) = (0.0, 0.0);
        for k in 0..p {
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

/// Solves `R x = b` for the packed upper triangle R with reciprocals on its diagonal, from `b` to `x` in
/// place.
fn backwards(triangle: &[f64], x: &mut [f64]) {
    for k in (0..x.len()).rev() {
        let column = column(triangle, k);
        let value = x[k] * column[k];
        for (x, entry) in x.iter_mut().zip(&column[..k]) {
            *x -= entry * value;
        }
        x[k] = value;
    }
}

/// Solves `Rᵀ x = b`, likewise.
fn forwards(triangle: &[f64], x: &mut [f64]) {
    for k in 0..x.len() {
        let column = column(triangle, k);
        let known: f64 = column[..k].iter().zip(&*x).map(|(a, b)| a * b).sum();
        x[k] = (x[k] - known) * column[k];
    }
}

/// Real product of two vectors of the complex plane.
fn dot(a: Complex64, b: Complex64) -> f64 {
    a.re * b.re + a.im * b.im
}

/// Room for the numbers of a stretch, to be used again for the next.
#[derive(Default)]
struct Room {
    /// Real and imaginary parts, |Z|² and |Z|.
    points: [Vec<f64>; 4],
    design: design::Room,
}

/// More than so many numbers of a stretch are not kept.
const MOST_KEPT: usize = 1 << 17;

impl Room {
    fn keep_little(&mut self) {
        if self.design.len() > MOST_KEPT {
            *self = Room::default();
        }
    }
}

thread_local! {
    static ROOM: RefCell<Room> = RefCell::default();
}

/// Writes real and imaginary parts, |Z|² and |Z|, and sees what the stretch shows; `None` where an
/// impedance is zero or no number.
struct Looking<'a> {
    impedance: &'a [Complex64],
    room: &'a mut [Vec<f64>; 4],
}

impl Kernel for Looking<'_> {
    type Output = Option<Course>;

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) -> Option<Course> {
        let n = self.impedance.len();
        for column in &mut *self.room {
            column.resize(n, 0.0);
        }
        let [re, im, square, size] = self.room;
        if !sizes(self.impedance, re, im, square, size) {
            return None;
        }
        let mut along = Lanes::all(simd, 0.0);
        for (im, size) in chunks(im).iter().zip(chunks(size)) {
            along = along.plus(Lanes::of(simd, im).over(Lanes::of(simd, size)));
        }
        let mut along = along.sum();
        for i in n - n % LANES..n {
            along += im[i] / size[i];
        }
        Some(if -along > 0.95 * n as f64 {
            Course::Capacitive
        } else {
            Course::Resonant
        })
    }
}

/// Takes terms in order while they can still bring information.
struct Selecting<'a> {
    basis: &'a Basis,
    points: Points<'a>,
    noise: [f64; 2],
    room: &'a mut design::Room,
}

/// The terms taken. The models' weights are their criteria yet.
struct Selection {
    triangle: Vec<f64>,
    projections: Vec<f64>,
    models: Vec<Model>,
}

impl Kernel for Selecting<'_> {
    type Output = Option<Selection>;

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) -> Option<Selection> {
        self.search(|design| design.add(simd))
    }
}

impl Selecting<'_> {
    /// `None` where the terms' products have not the digits for it: clean sweeps.
    #[inline(always)]
    fn search(self, mut add: impl FnMut(&mut Design) -> Added) -> Option<Selection> {
        let mut models = Vec::with_capacity(MOST);
        let mut design = Design::new(self.basis, self.points, self.noise, self.room);
        let rows = design.rows();
        // Below this the residual is the rounding of ten-digit files, not information.
        let floor = design.rest * 1e-20 + f64::MIN_POSITIVE;
        let least = self.basis.course.fewest().min(rows / 2);
        let mut best = f64::INFINITY;
        let mut since_best = 0;
        for terms in 1..=MOST {
            if terms + 2 > rows {
                break;
            }
            match add(&mut design) {
                Added::One => {}
                Added::None => break,
                Added::TooFewDigits => return None,
            }
            if terms < least {
                continue;
            }
            let (n, freedom) = (rows as f64, (rows - terms) as f64);
            let rss = design.rest;
            let penalty = PENALTY * terms as f64 * n / (freedom - 1.0).max(1.0);
            let criterion = n * rss.max(floor).ln() + penalty;
            models.push(Model {
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
        Some(Selection {
            triangle: design.triangle,
            projections: design.projections,
            models,
        })
    }
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
        let fit = LocalFit::new(&sweep, 0..41).expect("a fit");
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
        let fit = LocalFit::new(&sweep, 0..points).expect("a fit");
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
    fn terms_by_their_products_are_those_by_columns() {
        // Both courses, 0.1 % of something else at every point.
        for (resonance, course) in [(1e9, Course::Capacitive), (4e4, Course::Resonant)] {
            let l = 1.0 / ((TAU * resonance).powi(2) * 1e-6);
            let mut sweep = sweep(41, |s| 0.01 + s * l + (s * 1e-6).inv());
            for (i, z) in sweep.impedance.iter_mut().enumerate() {
                let i = i as f64;
                *z *= Complex64::new(1.0 + 1e-3 * (37.0 * i).sin(), 1e-3 * (53.0 * i).cos());
            }
            let mut room = Room::default();
            let found = wide(Looking {
                impedance: &sweep.impedance,
                room: &mut room.points,
            });
            assert_eq!(found, Some(course));
            let basis = Basis::of(&sweep.frequency, course);
            let [re, im, square, size] = &room.points;
            let points = Points {
                re,
                im,
                square,
                size,
            };
            let mut select = |exactly: bool| {
                let selecting = Selecting {
                    basis: &basis,
                    points,
                    noise: [1.0, 0.4],
                    room: &mut room.design,
                };
                if exactly {
                    selecting.search(|design| design.add_exactly())
                } else {
                    wide(selecting)
                }
            };
            let quick = select(false).expect("digits enough");
            let exact = select(true).expect("a fit");
            assert!(quick.models.len() >= 4);
            assert_eq!(quick.models.len(), exact.models.len());
            // Rounding is 1e-16 of the data's squares, of which the noise is a millionth.
            for (a, b) in quick.models.iter().zip(&exact.models) {
                assert!(
                    (a.weight - b.weight).abs() < 1e-4,
                    "{} {}",
                    a.weight,
                    b.weight
                );
                assert!((a.variance / b.variance - 1.0).abs() < 1e-6);
            }
            let length = exact.projections.iter().map(|p| p * p).sum::<f64>().sqrt();
            for (a, b) in quick.projections.iter().zip(&exact.projections) {
                assert!((a - b).abs() < 1e-10 * length, "{a} {b}");
            }
            for (a, b) in quick.triangle.iter().zip(&exact.triangle) {
                assert!((a - b).abs() < 1e-8 * (1.0 + b.abs()), "{a} {b}");
            }
        }
    }

    #[test]
    fn too_few_points_or_values_that_are_none_give_no_fit() {
        let mut sweep = sweep(12, series);
        assert!(LocalFit::new(&sweep, 3..4).is_none());
        assert!(LocalFit::new(&sweep, 5..40).is_none());
        assert!(LocalFit::new(&sweep, 0..2).is_some());
        sweep.impedance[4] = Complex64::ZERO;
        assert!(LocalFit::new(&sweep, 0..12).is_none());
        sweep.impedance[4] = Complex64::new(f64::NAN, 0.0);
        assert!(LocalFit::new(&sweep, 0..12).is_none());
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
