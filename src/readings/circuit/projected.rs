//! The dispersive circuit by variable projection (G. H. Golub and V. Pereyra, SIAM J. Numer. Anal. 10
//! (1973) 413; L. Kaufman, BIT 15 (1975) 49): given the dispersion exponent a, R0, L, 1/C1 and Rs are
//! had from linear least squares, so that the search is for one number.
//!
//! The constant-phase element is `κ v` with `v = (ω/ωm)^(a−1) e^(jπ(a−1)/2)`, ωm the middle of the
//! sweep: real powers at all points and one angle. All products of the circuit's derivatives are
//! therefore made of a few sums over the points; those at an exponent nearby follow from sums with
//! powers of ln(ω/ωm) by their series, without the points. Two steps remain to be taken at the
//! points: the sums, and at the end one Gauss-Newton step from the residuals themselves, which the
//! normal equations alone would leave short of digits.

use super::data::{Course, Data};
use super::exponential::{SERIES, exp};
use super::marquardt::{Factor, Minimum};
use super::model::{CAPACITANCE_AT, Circuit, MOST};
use crate::statistics::lanes::{Kernel, LANES, Lanes, Simd, chunks, chunks_mut, wide};
use num_complex::Complex64;
use std::array::from_fn;
use std::f64::consts::{FRAC_PI_2, TAU};

/// Parameters of the circuit.
const R0: usize = 0;
const L: usize = 1;
const LN_C: usize = 2;
const EXPONENT: usize = 3;
const SKIN: usize = 4;
const ALL: usize = 5;
/// Those that are not negative in a part, in the order in which they are left out.
const NOT_NEGATIVE: [usize; 4] = [SKIN, EXPONENT, R0, L];

/// Steps after which the search is given up: it needs three or four.
const MOST_STEPS: usize = 12;
/// Longest step of the exponent.
const LONGEST: f64 = 0.1;
/// Sums serve for exponents so near, times the reach of ln ω: the first term that their series lack
/// is below 1e-9 then.
const NEAR: f64 = 0.03;
/// A search among the sums is over when the exponent moves less, times the reach of ln ω.
const STILL: f64 = 1e-7;
/// A search is over when what it gained is less than this share of the sum of squares, or of what
/// rounding leaves of it.
const OVER: f64 = 1e-12;
const ROUNDING: f64 = 1e-18;

/// Sums with powers of ln(ω/ωm) from 0.
const ORDERS: usize = 5;
const SQUARE_ORDERS: usize = ORDERS + 2;

/// Vectors that the search needs room for.
pub(super) const VECTORS: usize = 4;

/// Something for each parameter.
type Each = [f64; ALL];
/// Products of the derivatives, lower triangle.
type Normal = [[f64; ALL]; ALL];

/// The search's points, sums, and room for the passes over the points.
struct Search<'a> {
    data: &'a Data<'a>,
    fixed: Fixed,
    moments: Moments,
    /// The weighted powers `u (ω/ωm)^(a−1)` at the exponent of the moments, `u = 1/|Z|`.
    powers: &'a mut [f64],
    /// The weighted residuals' real and imaginary parts, and the weighted powers there.
    residual: [&'a mut [f64]; 3],
}

/// Sums over the points, weighted with 1/|Z|², that do not depend on the exponent: products among
/// 1, ω and `√(f/1 MHz)`, and of these with Re Z and Im Z.
struct Fixed {
    one_one: f64,
    omega_omega: f64,
    root_one: f64,
    root_omega: f64,
    root_root: f64,
    one_z: Complex64,
    omega_z: Complex64,
    root_z: Complex64,
}

/// Sums over the points, weighted with 1/|Z|², of the powers `e = (ω/ωm)^(a−1)` times
/// `ln(ω/ωm)^k` with 1, ω, the root, Re Z, Im Z, and of e² times `ln(ω/ωm)^k`.
struct Moments {
    /// The exponent a.
    at: f64,
    one: [f64; ORDERS],
    omega: [f64; ORDERS],
    root: [f64; ORDERS],
    re: [f64; ORDERS],
    im: [f64; ORDERS],
    square: [f64; SQUARE_ORDERS],
}

/// The sums at one exponent: with e and with e ln(ω/ωm); of e² also with the square of the
/// logarithm.
struct Sums {
    one: [f64; 2],
    omega: [f64; 2],
    root: [f64; 2],
    z: [Complex64; 2],
    square: [f64; 3],
}

/// The circuit's elements.
#[derive(Debug, Clone, Copy)]
struct State {
    r0: f64,
    l: f64,
    /// `1/(ωm C)` with the capacitance at ωm.
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

    /// The first element that is negative.
    fn negative(&self) -> Option<usize> {
        let values = [self.r0, self.l, 0.0, self.a, self.skin];
        NOT_NEGATIVE.into_iter().find(|k| values[*k] < 0.0)
    }

    fn moved(&self, step: &Each) -> State {
        State {
            r0: self.r0 + step[R0],
            l: self.l + step[L],
            kappa: self.kappa * (-step[LN_C]).exp(),
            a: self.a + step[EXPONENT],
            skin: self.skin + step[SKIN],
        }
    }
}

/// The minimum with no element negative: one that would be is left out. The search begins at the
/// exponent `start`.
///
/// `vectors` are room for the work, each as long as a column of the data. `None` where the way is not
/// straight: Levenberg's and Marquardt's method is for that.
pub(super) fn minimise(data: &Data, vectors: [&mut [f64]; VECTORS], start: f64) -> Option<Minimum> {
    let mut search = Search::new(data, vectors, start);
    let (mut free, mut a) = ([true; ALL], start);
    // Each time round but the last one element less.
    for _ in 0..=NOT_NEGATIVE.len() {
        let state = search.nearest(a, &free)?;
        let mut negative = state.negative();
        a = state.a;
        if negative.is_none() {
            let (state, square_sum) = search.polished(state, &free)?;
            negative = state.negative();
            a = state.a;
            if negative.is_none() {
                return Some(search.minimum(&state, &free, square_sum));
            }
        }
        free[negative?] = false;
        a = if free[EXPONENT] { a.max(0.0) } else { 0.0 };
    }
    None
}

impl<'a> Search<'a> {
    fn new(data: &'a Data<'a>, vectors: [&'a mut [f64]; VECTORS], at: f64) -> Search<'a> {
        let [powers, residual @ ..] = vectors;
        let moments = OfMoments { data, at, powers };
        Search {
            data,
            fixed: wide(OfFixed(data)),
            moments: wide(moments),
            powers,
            residual,
        }
    }

    /// The sums at an exponent; made anew where those that are there lie too far away.
    fn sums(&mut self, a: f64) -> Sums {
        if (a - self.moments.at).abs() * self.data.axis.reach > NEAR {
            self.moments = wide(OfMoments {
                data: self.data,
                at: a,
                powers: self.powers,
            });
        }
        self.moments.sums(a)
    }

    /// The minimum as the normal equations have it.
    fn nearest(&mut self, start: f64, free: &[bool; ALL]) -> Option<State> {
        let mut a = start;
        for _ in 0..MOST_STEPS {
            let sums = self.sums(a);
            let (state, step) = linear(&self.fixed, &sums, a, free)?;
            if step.abs() * self.data.axis.reach < STILL {
                return Some(state);
            }
            a = state.a;
        }
        None
    }

    /// The minimum from the residuals themselves, and the sum of squares there.
    fn polished(&mut self, mut state: State, free: &[bool; ALL]) -> Option<(State, f64)> {
        let least = ROUNDING * self.data.residuals() as f64;
        for _ in 0..MOST_STEPS {
            let sums = self.sums(state.a);
            let (sum, gradient) = self.residual(&state);
            let gradient = pinned(gradient, free);
            let factor = Factor::new(&normal(&self.fixed, &sums, &state, free), ALL, 0.0)?;
            let step = factor.solve(&gradient.map(|g| -g));
            let gain: f64 = (step.iter().zip(&gradient)).map(|(s, g)| -s * g).sum();
            let far = step[EXPONENT].abs() > LONGEST || step[LN_C].abs() > 1.0;
            if far || !sum.is_finite() || !gain.is_finite() {
                return None;
            }
            state = state.moved(&step);
            if gain <= OVER * sum.max(least) {
                return Some((state, (sum - gain).max(0.0)));
            }
        }
        None
    }

    /// The residuals at a state within reach of the moments; the sum of their squares and half its
    /// gradient.
    fn residual(&mut self, state: &State) -> (f64, Each) {
        let [re, im, turned] = &mut self.residual;
        let [sum, one, omega, root, e_re, e_im, ln_re, ln_im] = wide(OfResidual {
            data: self.data,
            state,
            powers: self.powers,
            turn: state.a - self.moments.at,
            re,
            im,
            turned,
        });
        let (e, ln) = (Complex64::new(e_re, e_im), Complex64::new(ln_re, ln_im));
        (sum, along(state, [one, omega, root], e, ln))
    }

    /// The minimum with all that is known there.
    fn minimum(&mut self, state: &State, free: &[bool; ALL], square_sum: f64) -> Minimum {
        let sums = self.sums(state.a);
        let mut normal = normal(&self.fixed, &sums, state, &[true; ALL]);
        let mut turned = project(&self.fixed, &sums, state, |z| Complex64::I * z);
        // From the capacitance at ωm to that at 1 kHz: d ln C = d ln C1 − ln(ωm/ω1) da.
        let middle = self.data.axis.middle;
        turned[EXPONENT] -= middle * turned[LN_C];
        normal[EXPONENT][EXPONENT] +=
            middle * (middle * normal[LN_C][LN_C] - 2.0 * normal[EXPONENT][LN_C]);
        normal[EXPONENT][LN_C] -= middle * normal[LN_C][LN_C];
        normal[EXPONENT][L] -= middle * normal[LN_C][L];
        normal[EXPONENT][R0] -= middle * normal[LN_C][R0];
        normal[SKIN][EXPONENT] -= middle * normal[SKIN][LN_C];
        let ln_c = (state.a - 1.0) * middle - (TAU * CAPACITANCE_AT * state.kappa).ln();
        let mut minimum = Minimum {
            circuit: Circuit::Dispersive,
            parameters: [0.0; MOST],
            free: (0..ALL).filter(|k| free[*k]).collect(),
            square_sum,
            normal: [[0.0; MOST]; MOST],
            converged: true,
            course: self.course(),
            turned: [0.0; MOST],
        };
        minimum.parameters[..ALL].copy_from_slice(&[state.r0, state.l, ln_c, state.a, state.skin]);
        for (i, a) in minimum.free.iter().enumerate() {
            minimum.turned[i] = turned[*a];
            for (j, b) in minimum.free[..=i].iter().enumerate() {
                minimum.normal[i][j] = normal[*a][*b];
            }
        }
        minimum
    }

    fn course(&self) -> Course {
        let [re, im, _] = &self.residual;
        Course::of(&re[..self.data.len()], &im[..self.data.len()])
    }
}

/// The points' vectors in lanes, all of one length.
#[derive(Clone, Copy)]
struct Chunks<'a> {
    weight: &'a [[f64; LANES]],
    omega: &'a [[f64; LANES]],
    root: &'a [[f64; LANES]],
    ln: &'a [[f64; LANES]],
    re: &'a [[f64; LANES]],
    im: &'a [[f64; LANES]],
}

impl<'a> Chunks<'a> {
    #[inline(always)]
    fn of(data: &'a Data) -> Chunks<'a> {
        let weight = chunks(data.columns.weight());
        let n = weight.len();
        Chunks {
            weight,
            omega: &chunks(&data.axis.omega)[..n],
            root: &chunks(&data.axis.root)[..n],
            ln: &chunks(&data.axis.ln)[..n],
            re: &chunks(data.columns.re())[..n],
            im: &chunks(data.columns.im())[..n],
        }
    }
}

/// Linear least squares for R0, L, κ, Rs and the exponent's step, the circuit being linear in it
/// near `a`; `None` where the data do not determine them, or not as those of a capacitor.
fn linear(fixed: &Fixed, sums: &Sums, a: f64, free: &[bool; ALL]) -> Option<(State, f64)> {
    let unit = State {
        r0: 0.0,
        l: 0.0,
        kappa: 1.0,
        a,
        skin: 0.0,
    };
    let right = pinned(project(fixed, sums, &unit, |z| z), free);
    let x = Factor::new(&normal(fixed, sums, &unit, free), ALL, 0.0)?.solve(&right);
    // The derivative with respect to ln C1 is −κ v.
    let kappa = -x[LN_C];
    let step = x[EXPONENT] / kappa;
    let found = kappa > 0.0 && kappa.is_finite() && step.abs() <= LONGEST;
    found.then_some((
        State {
            r0: x[R0],
            l: x[L],
            kappa,
            a: a + step,
            skin: x[SKIN],
        },
        step,
    ))
}

/// Nothing for what is not free.
fn pinned(all: Each, free: &[bool; ALL]) -> Each {
    from_fn(|k| if free[k] { all[k] } else { 0.0 })
}

/// `JᵀJ`, lower triangle; what is not free has a row of its own with 1 on the diagonal.
fn normal(fixed: &Fixed, sums: &Sums, state: &State, free: &[bool; ALL]) -> Normal {
    let (c, s) = state.angle();
    let (k, h) = (state.kappa, FRAC_PI_2);
    let [one, one_ln] = sums.one;
    let [omega, omega_ln] = sums.omega;
    let [root, root_ln] = sums.root;
    let [e_e, e_ln, ln_ln] = sums.square;
    let mut all = [[0.0; ALL]; ALL];
    all[R0][R0] = fixed.one_one;
    all[L][L] = fixed.omega_omega;
    all[LN_C][R0] = -k * c * one;
    all[LN_C][L] = -k * s * omega;
    all[LN_C][LN_C] = k * k * e_e;
    all[EXPONENT][R0] = k * (c * one_ln - h * s * one);
    all[EXPONENT][L] = k * (s * omega_ln + h * c * omega);
    all[EXPONENT][LN_C] = -k * k * e_ln;
    all[EXPONENT][EXPONENT] = k * k * (ln_ln + h * h * e_e);
    all[SKIN][R0] = fixed.root_one;
    all[SKIN][L] = fixed.root_omega;
    all[SKIN][LN_C] = -k * (c + s) * root;
    all[SKIN][EXPONENT] = k * ((c + s) * root_ln + h * (c - s) * root);
    all[SKIN][SKIN] = 2.0 * fixed.root_root;
    for i in (0..ALL).filter(|i| !free[*i]) {
        all[i] = [0.0; ALL];
        all.iter_mut().for_each(|row| row[i] = 0.0);
        all[i][i] = 1.0;
    }
    all
}

/// `Jᵀ` of a linear function of the weighted data.
fn project(fixed: &Fixed, sums: &Sums, state: &State, of: impl Fn(Complex64) -> Complex64) -> Each {
    let root = of(fixed.root_z);
    let series = [of(fixed.one_z).re, of(fixed.omega_z).im, root.re + root.im];
    along(state, series, of(sums.z[0]), of(sums.z[1]))
}

/// Products with the derivatives, from sums: of R0, L and Rs as they are, with `e` and with `e ln`
/// for the constant-phase element.
fn along(state: &State, series: [f64; 3], e: Complex64, ln: Complex64) -> Each {
    let (c, s) = state.angle();
    let k = state.kappa;
    let [r0, l, skin] = series;
    let of = |z: Complex64| c * z.re + s * z.im;
    let across = c * e.im - s * e.re;
    [r0, l, -k * of(e), k * (of(ln) + FRAC_PI_2 * across), skin]
}

/// Makes [`Fixed`].
struct OfFixed<'a>(&'a Data<'a>);

impl Kernel for OfFixed<'_> {
    type Output = Fixed;

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) -> Fixed {
        let Chunks {
            weight,
            omega,
            root,
            re,
            im,
            ..
        } = Chunks::of(self.0);
        let none = Lanes::all(simd, 0.0);
        // As many sums at a time as there are registers for.
        let (mut one_one, mut omega_omega, mut root_one, mut root_omega, mut root_root) =
            (none, none, none, none, none);
        for i in 0..weight.len() {
            let u = Lanes::of(simd, &weight[i]);
            let omega = Lanes::of(simd, &omega[i]);
            let root = Lanes::of(simd, &root[i]);
            let w = u.times(u);
            let w_root = w.times(root);
            one_one = one_one.plus(w);
            omega_omega = omega_omega.plus(w.times(omega).times(omega));
            root_one = root_one.plus(w_root);
            root_omega = root_omega.plus(w_root.times(omega));
            root_root = root_root.plus(w_root.times(root));
        }
        let [mut with_re, mut with_im] = [[none; 3]; 2];
        for i in 0..weight.len() {
            let u = Lanes::of(simd, &weight[i]);
            let w = u.times(u);
            let w_re = w.times(Lanes::of(simd, &re[i]));
            let w_im = w.times(Lanes::of(simd, &im[i]));
            let omega = Lanes::of(simd, &omega[i]);
            let root = Lanes::of(simd, &root[i]);
            with_re[0] = with_re[0].plus(w_re);
            with_im[0] = with_im[0].plus(w_im);
            with_re[1] = with_re[1].plus(w_re.times(omega));
            with_im[1] = with_im[1].plus(w_im.times(omega));
            with_re[2] = with_re[2].plus(w_re.times(root));
            with_im[2] = with_im[2].plus(w_im.times(root));
        }
        Fixed {
            one_one: one_one.sum(),
            omega_omega: omega_omega.sum(),
            root_one: root_one.sum(),
            root_omega: root_omega.sum(),
            root_root: root_root.sum(),
            one_z: Complex64::new(with_re[0].sum(), with_im[0].sum()),
            omega_z: Complex64::new(with_re[1].sum(), with_im[1].sum()),
            root_z: Complex64::new(with_re[2].sum(), with_im[2].sum()),
        }
    }
}

/// Makes [`Moments`] at an exponent, and writes the weighted powers.
struct OfMoments<'a> {
    data: &'a Data<'a>,
    at: f64,
    powers: &'a mut [f64],
}

impl Kernel for OfMoments<'_> {
    type Output = Moments;

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) -> Moments {
        let (axis, columns) = (self.data.axis, &self.data.columns);
        for ((e, u), ln) in self.powers.iter_mut().zip(columns.weight()).zip(&axis.ln) {
            *e = u * exp((self.at - 1.0) * (ln - axis.middle));
        }
        let Chunks {
            weight,
            omega,
            root,
            ln,
            re,
            im,
        } = Chunks::of(self.data);
        let e = &chunks(self.powers)[..weight.len()];
        let x = (ln, axis.middle);
        Moments {
            at: self.at,
            one: orders(simd, [weight, e], x),
            omega: orders(simd, [weight, e, omega], x),
            root: orders(simd, [weight, e, root], x),
            re: orders(simd, [weight, e, re], x),
            im: orders(simd, [weight, e, im], x),
            square: orders(simd, [e, e], x),
        }
    }
}

/// Sums over the points of a product of vectors times the powers of `x`, the difference of a vector
/// and a number.
#[inline(always)]
fn orders<S: Simd, const N: usize, const FACTORS: usize>(
    simd: S,
    factors: [&[[f64; LANES]]; FACTORS],
    x: (&[[f64; LANES]], f64),
) -> [f64; N] {
    let (ln, middle) = (x.0, Lanes::all(simd, x.1));
    let mut lanes = [Lanes::all(simd, 0.0); N];
    for i in 0..ln.len() {
        let x = Lanes::of(simd, &ln[i]).minus(middle);
        let mut term = Lanes::of(simd, &factors[0][i]);
        for factor in &factors[1..] {
            term = term.times(Lanes::of(simd, &factor[i]));
        }
        lanes[0] = lanes[0].plus(term);
        for lanes in &mut lanes[1..] {
            term = term.times(x);
            *lanes = lanes.plus(term);
        }
    }
    let mut sums = [0.0; N];
    for n in 0..N {
        sums[n] = lanes[n].sum();
    }
    sums
}

impl Moments {
    /// At an exponent nearby.
    fn sums(&self, a: f64) -> Sums {
        let d = a - self.at;
        let both = |of: &[f64]| [series(of, d), series(&of[1..], d)];
        let ([re, re_ln], [im, im_ln]) = (both(&self.re), both(&self.im));
        Sums {
            one: both(&self.one),
            omega: both(&self.omega),
            root: both(&self.root),
            z: [Complex64::new(re, im), Complex64::new(re_ln, im_ln)],
            square: from_fn(|k| series(&self.square[k..], 2.0 * d)),
        }
    }
}

/// `Σ mₖ dᵏ/k!`
fn series(moments: &[f64], d: f64) -> f64 {
    (moments.iter().enumerate().rev()).fold(0.0, |sum, (k, m)| m + sum * d / (k + 1) as f64)
}

/// Makes the weighted residuals' real and imaginary parts, and the sums over the points of their
/// squares and of their products with the weighted 1, ω and root, with the powers, and with these
/// times ln(ω/ωm).
struct OfResidual<'a> {
    data: &'a Data<'a>,
    state: &'a State,
    powers: &'a [f64],
    /// How far the state's exponent is from that of the powers.
    turn: f64,
    re: &'a mut [f64],
    im: &'a mut [f64],
    /// Receives the powers at the state's exponent.
    turned: &'a mut [f64],
}

impl Kernel for OfResidual<'_> {
    type Output = [f64; 8];

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) -> [f64; 8] {
        // Exact to rounding where |x| is below `NEAR`.
        let [.., first, a, b, c, d, e, f] = SERIES;
        let (all, state) = (Chunks::of(self.data), self.state);
        let Chunks {
            weight,
            omega,
            root,
            ln,
            ..
        } = all;
        let powers = &chunks(self.powers)[..weight.len()];
        let re = &mut chunks_mut(self.re)[..weight.len()];
        let im = &mut chunks_mut(self.im)[..weight.len()];
        let turned = &mut chunks_mut(self.turned)[..weight.len()];
        let (middle, turn) = (self.data.axis.middle, Lanes::all(simd, self.turn));
        let middle = Lanes::all(simd, middle);
        let (r0, l) = (Lanes::all(simd, state.r0), Lanes::all(simd, state.l));
        let skin = Lanes::all(simd, state.skin);
        let (cos, sin) = state.angle();
        let cos = Lanes::all(simd, state.kappa * cos);
        let sin = Lanes::all(simd, state.kappa * sin);
        for i in 0..weight.len() {
            let y = Lanes::of(simd, &ln[i]).minus(middle).times(turn);
            let mut grown = Lanes::all(simd, first);
            for c in [a, b, c, d, e, f] {
                grown = grown.times(y).plus(Lanes::all(simd, c));
            }
            let power = Lanes::of(simd, &powers[i]);
            power
                .plus(power.times(y.times(grown)))
                .store(&mut turned[i]);
        }
        let none = Lanes::all(simd, 0.0);
        let (mut square, mut with_one, mut with_omega, mut with_root) = (none, none, none, none);
        for i in 0..weight.len() {
            let u = Lanes::of(simd, &weight[i]);
            let e = Lanes::of(simd, &turned[i]);
            let omega = Lanes::of(simd, &omega[i]);
            let root = Lanes::of(simd, &root[i]);
            let rise = skin.times(root);
            let series = r0.plus(rise).minus(Lanes::of(simd, &all.re[i]));
            let of_re = u.times(series).plus(cos.times(e));
            let series = l.times(omega).plus(rise).minus(Lanes::of(simd, &all.im[i]));
            let of_im = u.times(series).plus(sin.times(e));
            of_re.store(&mut re[i]);
            of_im.store(&mut im[i]);
            square = square.plus(of_re.times(of_re).plus(of_im.times(of_im)));
            with_one = with_one.plus(u.times(of_re));
            with_omega = with_omega.plus(u.times(omega).times(of_im));
            with_root = with_root.plus(u.times(root).times(of_re.plus(of_im)));
        }
        let (mut e_re, mut e_im, mut ln_re, mut ln_im) = (none, none, none, none);
        for i in 0..weight.len() {
            let x = Lanes::of(simd, &ln[i]).minus(middle);
            let e = Lanes::of(simd, &turned[i]);
            let with_re = e.times(Lanes::of(simd, &re[i]));
            let with_im = e.times(Lanes::of(simd, &im[i]));
            e_re = e_re.plus(with_re);
            e_im = e_im.plus(with_im);
            ln_re = ln_re.plus(with_re.times(x));
            ln_im = ln_im.plus(with_im.times(x));
        }
        [
            square.sum(),
            with_one.sum(),
            with_omega.sum(),
            with_root.sum(),
            e_re.sum(),
            e_im.sum(),
            ln_re.sum(),
            ln_im.sum(),
        ]
    }
}

#[cfg(test)]
mod tests {
    use super::super::data::{Columns, Room};
    use super::*;
    use crate::readings::grid::grid;

    /// A capacitor with dispersion and skin effect, 0.1 % of something else at every point.
    fn sweep() -> (Vec<f64>, Vec<Complex64>) {
        let frequency: Vec<f64> = (0..203).map(|i| 1e3 * 1.055f64.powi(i)).collect();
        let p = [2e-3, 0.5e-9, (4.6e-6f64).ln(), 0.017, 3e-4];
        let mut impedance = Circuit::Dispersive.impedance(&p, &frequency);
        for (i, z) in impedance.iter_mut().enumerate() {
            let i = i as f64;
            *z *= Complex64::new(1.0 + 1e-3 * (37.0 * i).sin(), 1e-3 * (53.0 * i).cos());
        }
        (frequency, impedance)
    }

    #[test]
    fn sums_nearby_are_those_made_there() {
        let (frequency, impedance) = sweep();
        let grid = grid(&frequency, 0..frequency.len());
        let sums = |at: f64, wanted: f64| {
            let mut room = Room::default();
            let (room, vectors) = room.take(frequency.len());
            let data = Data::new(&grid, Columns::new(&impedance, room));
            let search = Search::new(&data, vectors, at);
            assert!((at - wanted).abs() * data.axis.reach < NEAR);
            let sums = search.moments.sums(wanted);
            let z = sums.z.map(|z| [z.re, z.im]);
            let [one, omega, root] = [sums.one, sums.omega, sums.root];
            [&one[..], &omega, &root, &z[0], &z[1], &sums.square].concat()
        };
        for (nearby, there) in sums(0.02, 0.024).iter().zip(sums(0.024, 0.024)) {
            assert!((nearby / there - 1.0).abs() < 1e-7, "{nearby} {there}");
        }
    }

    #[test]
    fn the_minimum_is_that_of_levenberg_and_marquardt_from_any_start() {
        let (frequency, impedance) = sweep();
        let grid = grid(&frequency, 0..frequency.len());
        for start in [1e-4, 0.017, 0.05, 0.1] {
            let mut room = Room::default();
            let (room, vectors) = room.take(frequency.len());
            let data = Data::new(&grid, Columns::new(&impedance, room));
            let ours = minimise(&data, vectors, start).expect("a minimum");
            let mut from = ours.parameters;
            (from[0], from[1], from[2], from[4]) = (1e-3, 1e-9, (3e-6f64).ln(), 1e-4);
            let theirs = data.minimise(Circuit::Dispersive, &from, &[0, 1, 2, 3, 4]);
            assert!(theirs.converged);
            assert!((ours.square_sum / theirs.square_sum - 1.0).abs() < 1e-9);
            assert_eq!(ours.free, theirs.free);
            for k in 0..ALL {
                // A standard deviation is the root of s²/JᵀJ, or more.
                let sigma = (ours.square_sum / 400.0 / ours.normal[k][k]).sqrt();
                let (a, b) = (ours.parameters[k], theirs.parameters[k]);
                assert!((a - b).abs() < 1e-3 * sigma, "{k}: {a} {b} {sigma}");
                for j in 0..=k {
                    let scale = (ours.normal[k][k] * ours.normal[j][j]).sqrt();
                    let difference = ours.normal[k][j] - theirs.normal[k][j];
                    assert!(difference.abs() < 1e-6 * scale, "{k} {j}");
                }
                let difference = ours.turned[k] - theirs.turned[k];
                let scale = (ours.normal[k][k] * data.len() as f64).sqrt();
                assert!(difference.abs() < 1e-6 * scale, "{k}");
            }
        }
    }
}
