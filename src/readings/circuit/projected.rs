//! The dispersive circuit by variable projection (G. H. Golub and V. Pereyra, SIAM J. Numer. Anal. 10
//! (1973) 413; L. Kaufman, BIT 15 (1975) 49): given the dispersion exponent a, R0, L, 1/C1 and Rs are
//! had from linear least squares, so that the search is for one number.
//!
//! The constant-phase element is `κ v` with `v = (ω/ω1)^(a−1) e^(jπ(a−1)/2)` and `κ = 1/(ω1 C1)`: real
//! powers at all points and one angle. All products of the circuit's derivatives are therefore made
//! of a few sums over the points. The search ends with Gauss-Newton steps from the residuals
//! themselves, which the normal equations alone would leave short of digits.

use super::exponential::exp;
use super::marquardt::{Data, Minimum, Square, solve};
use super::model::{CAPACITANCE_AT, Circuit, MOST};
use crate::readings::grid::Axis;
use crate::statistics::lanes::{filled, product};
use num_complex::Complex64;
use std::f64::consts::{FRAC_PI_2, TAU};

/// Parameters of the circuit.
const R0: usize = 0;
const L: usize = 1;
const LN_C: usize = 2;
const EXPONENT: usize = 3;
const SKIN: usize = 4;

/// Steps after which the search is given up: it needs three or four.
const MOST_STEPS: usize = 12;
/// Longest step of the exponent.
const LONGEST: f64 = 0.1;
/// A minimum among few points is near enough to go on with all when the exponent moves less.
const NEAR: f64 = 1e-4;
/// A search is over when what it can still gain is less than this share of the sum of squares.
const OVER: f64 = 1e-12;

/// Derivatives with respect to the parameters in products with something.
type Gradient = [f64; SKIN + 1];

/// The points as the sums need them, all weighted with `u = 1/|Z|`: 1, ω, `√(f/1 MHz)`, Re Z, Im Z.
struct Points<'a> {
    axis: &'a Axis,
    u: Vec<f64>,
    omega: Vec<f64>,
    root: Vec<f64>,
    re: Vec<f64>,
    im: Vec<f64>,
}

/// Products over the points that do not depend on the exponent; those with Z for its real and its
/// imaginary part.
struct Fixed {
    u_u: f64,
    omega_omega: f64,
    root_u: f64,
    root_omega: f64,
    root_root: f64,
    u_z: Complex64,
    omega_z: Complex64,
    root_z: Complex64,
}

/// Products of one vector with those of the points.
struct Column {
    u: f64,
    omega: f64,
    root: f64,
    z: Complex64,
}

/// The weighted powers `e = u (ω/ω1)^(a−1)`, these times `ln(ω/ω1)`, and their products.
struct Moments {
    e: Vec<f64>,
    ln: Vec<f64>,
    e_with: Column,
    ln_with: Column,
    e_e: f64,
    e_ln: f64,
    ln_ln: f64,
}

/// The circuit's elements.
#[derive(Clone, Copy)]
struct State {
    r0: f64,
    l: f64,
    kappa: f64,
    a: f64,
    skin: f64,
}

impl State {
    /// Cosine and sine of the element's angle.
    fn angle(&self) -> (f64, f64) {
        let (sin, cos) = ((self.a - 1.0) * FRAC_PI_2).sin_cos();
        (cos, sin)
    }
}

/// Searches the minimum over the parameters of `free`, from the exponent of `start`; the others
/// stay. `None` where the way is not straight: Levenberg's and Marquardt's method is for that.
pub(super) fn minimise(data: &Data, start: &[f64], free: &[usize]) -> Option<Minimum> {
    // Without a capacitance nothing is left to be projected; what is not searched must not count.
    let absent = |k: usize| free.contains(&k) || start.get(k) == Some(&0.0);
    if !free.contains(&LN_C) || ![R0, L, EXPONENT, SKIN].into_iter().all(absent) {
        return None;
    }
    let mut a = *start.get(EXPONENT)?;
    if let Some(thin) = &data.thin {
        a = near(&Points::new(thin), a, free)?;
    }
    let points = Points::new(data);
    let fixed = points.fixed();
    let mut moments = points.moments(points.powers(a));
    let (mut state, mut last) = linear(&fixed, &moments, a, free)?;
    for _ in 0..MOST_STEPS {
        // The matrix may lag a step behind: the residuals say where the minimum is.
        points.turn(&mut moments.e, a, state.a);
        moments.ln = points.with_ln(&moments.e);
        a = state.a;
        let residual = points.residual(&moments.e, &state);
        let sum = square_sum(&residual);
        let gradient = points.gradient(&moments, &state, &residual);
        let normal = normal(&fixed, &moments, &state, free);
        let step = solve(&normal, free.len(), 0.0, &pick(free, &gradient.map(|g| -g)))?;
        let gain: f64 = free.iter().zip(&step).map(|(k, s)| -s * gradient[*k]).sum();
        let of = |k: usize| free.iter().position(|f| *f == k).map_or(0.0, |i| step[i]);
        if !sum.is_finite() || of(EXPONENT).abs() > LONGEST || of(LN_C).abs() > 1.0 {
            return None;
        }
        // Steps become shorter by a factor, or faster.
        let factor = if last == 0.0 {
            1.0
        } else {
            of(EXPONENT) / last
        };
        let over = gain <= OVER * sum
            || gain * factor * factor <= OVER * sum
            || sum <= OVER * OVER * data.residuals() as f64;
        last = of(EXPONENT);
        state = State {
            r0: state.r0 + of(R0),
            l: state.l + of(L),
            kappa: state.kappa * (-of(LN_C)).exp(),
            a: state.a + of(EXPONENT),
            skin: state.skin + of(SKIN),
        };
        let mut e = moments.e;
        points.turn(&mut e, a, state.a);
        a = state.a;
        moments = points.moments(e);
        if over {
            return end(data, &points, &fixed, &moments, &state, free, sum);
        }
    }
    None
}

fn square_sum([re, im]: &[Vec<f64>; 2]) -> f64 {
    product(re, re) + product(im, im)
}

/// The minimum with all that is known there; `None` where the last step did not go down.
fn end(
    data: &Data,
    points: &Points,
    fixed: &Fixed,
    moments: &Moments,
    state: &State,
    free: &[usize],
    before: f64,
) -> Option<Minimum> {
    let residual = points.residual(&moments.e, state);
    let square_sum = square_sum(&residual);
    let ln_c = -(TAU * CAPACITANCE_AT * state.kappa).ln();
    let [re, im] = residual;
    let both = re.into_iter().zip(im).take(data.impedance.len());
    (square_sum <= before * (1.0 + 1e-9)).then(|| Minimum {
        circuit: Circuit::Dispersive,
        parameters: vec![state.r0, state.l, ln_c, state.a, state.skin],
        free: free.to_vec(),
        square_sum,
        normal: normal(fixed, moments, state, free),
        converged: true,
        residual: both.map(|(re, im)| Complex64::new(re, im)).collect(),
        turned: pick(free, &project(fixed, moments, state, |z| Complex64::I * z)),
    })
}

/// The exponent of the minimum among few points.
fn near(points: &Points, start: f64, free: &[usize]) -> Option<f64> {
    let fixed = points.fixed();
    let mut moments = points.moments(points.powers(start));
    let mut a = start;
    for _ in 0..MOST_STEPS {
        let (state, step) = linear(&fixed, &moments, a, free)?;
        if step.abs() < NEAR {
            return Some(state.a);
        }
        let mut e = moments.e;
        points.turn(&mut e, a, state.a);
        moments = points.moments(e);
        a = state.a;
    }
    None
}

/// Linear least squares for R0, L, κ, Rs and the exponent's step, the circuit being linear in it
/// near `a`; `None` where the data do not determine them, or not as those of a capacitor.
fn linear(fixed: &Fixed, moments: &Moments, a: f64, free: &[usize]) -> Option<(State, f64)> {
    let unit = State {
        r0: 0.0,
        l: 0.0,
        kappa: 1.0,
        a,
        skin: 0.0,
    };
    let right = project(fixed, moments, &unit, |z| z);
    let matrix = normal(fixed, moments, &unit, free);
    let x = solve(&matrix, free.len(), 0.0, &pick(free, &right))?;
    let of = |k: usize| free.iter().position(|f| *f == k).map_or(0.0, |i| x[i]);
    // The derivative with respect to ln C1 is −κ v.
    let kappa = -of(LN_C);
    let step = of(EXPONENT) / kappa;
    let found = kappa > 0.0 && kappa.is_finite() && step.abs() <= LONGEST;
    found.then_some((
        State {
            r0: of(R0),
            l: of(L),
            kappa,
            a: a + step,
            skin: of(SKIN),
        },
        step,
    ))
}

fn pick(free: &[usize], all: &Gradient) -> [f64; MOST] {
    let mut picked = [0.0; MOST];
    for (p, k) in picked.iter_mut().zip(free) {
        *p = all[*k];
    }
    picked
}

/// `JᵀJ` of the free parameters, lower triangle.
fn normal(fixed: &Fixed, moments: &Moments, state: &State, free: &[usize]) -> Square {
    let (c, s) = state.angle();
    let (k, h) = (state.kappa, FRAC_PI_2);
    let (e, ln) = (&moments.e_with, &moments.ln_with);
    let mut all = [[0.0; SKIN + 1]; SKIN + 1];
    all[R0][R0] = fixed.u_u;
    all[L][L] = fixed.omega_omega;
    all[LN_C][R0] = -k * c * e.u;
    all[LN_C][L] = -k * s * e.omega;
    all[LN_C][LN_C] = k * k * moments.e_e;
    all[EXPONENT][R0] = k * (c * ln.u - h * s * e.u);
    all[EXPONENT][L] = k * (s * ln.omega + h * c * e.omega);
    all[EXPONENT][LN_C] = -k * k * moments.e_ln;
    all[EXPONENT][EXPONENT] = k * k * (moments.ln_ln + h * h * moments.e_e);
    all[SKIN][R0] = fixed.root_u;
    all[SKIN][L] = fixed.root_omega;
    all[SKIN][LN_C] = -k * (c + s) * e.root;
    all[SKIN][EXPONENT] = k * ((c + s) * ln.root + h * (c - s) * e.root);
    all[SKIN][SKIN] = 2.0 * fixed.root_root;
    let mut picked = [[0.0; MOST]; MOST];
    for (i, a) in free.iter().enumerate() {
        for (j, b) in free[..=i].iter().enumerate() {
            picked[i][j] = all[*a.max(b)][*a.min(b)];
        }
    }
    picked
}

/// `Jᵀ` of a linear function of the weighted data.
fn project(
    fixed: &Fixed,
    moments: &Moments,
    state: &State,
    of: impl Fn(Complex64) -> Complex64,
) -> Gradient {
    let root = of(fixed.root_z);
    let series = [of(fixed.u_z).re, of(fixed.omega_z).im, root.re + root.im];
    along(state, series, of(moments.e_with.z), of(moments.ln_with.z))
}

/// Products with the derivatives, from sums: of R0, L and Rs as they are, with `e` and with `e ln`
/// for the constant-phase element.
fn along(state: &State, series: [f64; 3], e: Complex64, ln: Complex64) -> Gradient {
    let (c, s) = state.angle();
    let k = state.kappa;
    let [r0, l, skin] = series;
    let of = |z: Complex64| c * z.re + s * z.im;
    let across = c * e.im - s * e.re;
    [r0, l, -k * of(e), k * (of(ln) + FRAC_PI_2 * across), skin]
}

impl<'a> Points<'a> {
    fn new(data: &Data<'a>) -> Points<'a> {
        let axis = data.axis;
        let weighted = |all: &[f64]| filled(data.weight.iter().zip(all).map(|(u, v)| u * v));
        let points = || data.impedance.iter().zip(&data.weight);
        Points {
            axis,
            u: filled(data.weight.iter().copied()),
            omega: weighted(&axis.omega),
            root: weighted(&axis.root),
            re: filled(points().map(|(z, u)| z.re * u)),
            im: filled(points().map(|(z, u)| z.im * u)),
        }
    }

    fn fixed(&self) -> Fixed {
        let of = |v: &[f64]| Complex64::new(product(v, &self.re), product(v, &self.im));
        Fixed {
            u_u: product(&self.u, &self.u),
            omega_omega: product(&self.omega, &self.omega),
            root_u: product(&self.root, &self.u),
            root_omega: product(&self.root, &self.omega),
            root_root: product(&self.root, &self.root),
            u_z: of(&self.u),
            omega_z: of(&self.omega),
            root_z: of(&self.root),
        }
    }

    /// `u (ω/ω1)^(a−1)`
    fn powers(&self, a: f64) -> Vec<f64> {
        let mut e = self.u.clone();
        for (e, ln) in e.iter_mut().zip(&self.axis.ln) {
            *e *= exp((a - 1.0) * ln);
        }
        e
    }

    /// From the powers with exponent `from` to those with exponent `to`.
    fn turn(&self, e: &mut Vec<f64>, from: f64, to: f64) {
        let step = to - from;
        let longest = step.abs() * self.axis.longest;
        // The series are exact to rounding.
        if longest < 1e-3 {
            self.turn_by(e, step, [24.0, 6.0, 2.0, 1.0]);
        } else if longest < 0.03 {
            self.turn_by(
                e,
                step,
                [40320.0, 5040.0, 720.0, 120.0, 24.0, 6.0, 2.0, 1.0],
            );
        } else {
            *e = self.powers(to);
        }
    }

    /// Multiplies by the series of `exp(step ln(ω/ω1))`, given by its factorials.
    fn turn_by<const N: usize>(&self, e: &mut [f64], step: f64, factorials: [f64; N]) {
        let series = factorials.map(|f| 1.0 / f);
        for (e, ln) in e.iter_mut().zip(&self.axis.ln) {
            let x = step * ln;
            let sum = series.iter().fold(0.0, |sum, c| sum * x + c);
            *e += *e * (x * sum);
        }
    }

    fn with_ln(&self, e: &[f64]) -> Vec<f64> {
        e.iter().zip(&self.axis.ln).map(|(e, ln)| e * ln).collect()
    }

    fn moments(&self, e: Vec<f64>) -> Moments {
        let ln = self.with_ln(&e);
        let with = |v: &[f64]| {
            let complex = Complex64::new(product(v, &self.re), product(v, &self.im));
            Column {
                u: product(v, &self.u),
                omega: product(v, &self.omega),
                root: product(v, &self.root),
                z: complex,
            }
        };
        Moments {
            e_with: with(&e),
            ln_with: with(&ln),
            e_e: product(&e, &e),
            e_ln: product(&e, &ln),
            ln_ln: product(&ln, &ln),
            e,
            ln,
        }
    }

    /// The weighted residuals' real and imaginary parts.
    fn residual(&self, e: &[f64], state: &State) -> [Vec<f64>; 2] {
        let (c, s) = state.angle();
        let (c, s) = (state.kappa * c, state.kappa * s);
        let skin = state.skin;
        let [mut re, mut im] = [self.re.clone(), self.im.clone()];
        for (((re, u), root), e) in re.iter_mut().zip(&self.u).zip(&self.root).zip(e) {
            *re = state.r0 * u + skin * root + c * e - *re;
        }
        for (((im, omega), root), e) in im.iter_mut().zip(&self.omega).zip(&self.root).zip(e) {
            *im = state.l * omega + skin * root + s * e - *im;
        }
        [re, im]
    }

    /// Half the gradient of the sum of squares.
    fn gradient(&self, moments: &Moments, state: &State, [re, im]: &[Vec<f64>; 2]) -> Gradient {
        let of = |v: &[f64]| Complex64::new(product(v, re), product(v, im));
        let series = [
            product(&self.u, re),
            product(&self.omega, im),
            product(&self.root, re) + product(&self.root, im),
        ];
        along(state, series, of(&moments.e), of(&moments.ln))
    }
}
