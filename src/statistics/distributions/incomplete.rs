//! Regularised incomplete gamma and beta functions, both tails.
//!
//! The prefactors are evaluated by deviances instead of differences of log gammas: Loader (2000),
//! Fast and accurate computation of binomial probabilities.

use std::f64::consts::PI;

/// Continued fractions and series here converge in some square roots of their largest argument; more
/// than this many terms would mean an argument beyond any sample or lot.
const TERMS_MAX: u32 = 2_000_000;

/// Lower and upper tail; they add up to 1.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Tails {
    pub lower: f64,
    pub upper: f64,
}

impl Tails {
    pub(super) const NAN: Self = Self {
        lower: f64::NAN,
        upper: f64::NAN,
    };

    pub(super) fn of_lower(lower: f64) -> Self {
        let lower = lower.clamp(0.0, 1.0);
        Self {
            lower,
            upper: 1.0 - lower,
        }
    }

    pub(super) fn of_upper(upper: f64) -> Self {
        Self::of_lower(upper).swapped()
    }

    pub(super) fn swapped(self) -> Self {
        Self {
            lower: self.upper,
            upper: self.lower,
        }
    }
}

/// The remainder of Stirling's formula, ln Γ(x + 1) − (x + ½) ln x + x − ½ ln 2π, for x > 0.
///
/// Series Abramowitz & Stegun 6.1.41 from 10 on; below, its recurrence in x.
pub(super) fn stirling_remainder(x: f64) -> f64 {
    let mut x = x;
    let mut shifted = 0.0;
    while x < 10.0 {
        shifted += (x + 0.5) * (1.0 / x).ln_1p() - 1.0;
        x += 1.0;
    }
    let w = 1.0 / (x * x);
    let series = 1.0 / 12.0
        - w * (1.0 / 360.0
            - w * (1.0 / 1260.0
                - w * (1.0 / 1680.0
                    - w * (1.0 / 1188.0 - w * (691.0 / 360_360.0 - w * (1.0 / 156.0))))));
    shifted + series / x
}

/// x ln(x/m) + m − x for x ≥ 0, m > 0, without cancellation where x is near m.
pub(super) fn deviance(x: f64, m: f64) -> f64 {
    if x == 0.0 {
        return m;
    }
    let difference = x - m;
    if difference.abs() >= 0.1 * (x + m) {
        return x * (x / m).ln() - difference;
    }
    // With v = (x − m)/(x + m): ln(x/m) = 2 (v + v³/3 + v⁵/5 + …).
    let v = difference / (x + m);
    let v2 = v * v;
    let mut sum = difference * v;
    let mut power = 2.0 * x * v;
    let mut j = 1.0;
    loop {
        power *= v2;
        j += 2.0;
        let next = sum + power / j;
        if next == sum || j > 1000.0 {
            return next;
        }
        sum = next;
    }
}

/// e^−m m^x / Γ(x + 1) for real x ≥ 0, m > 0.
pub(super) fn poisson_density(x: f64, m: f64) -> f64 {
    if x == 0.0 {
        return (-m).exp();
    }
    (-stirling_remainder(x) - deviance(x, m)).exp() / (2.0 * PI * x).sqrt()
}

/// Γ(x + y + 1) / (Γ(x + 1) Γ(y + 1)) p^x q^y for real x, y ≥ 0 and q = 1 − p given as such.
pub(super) fn binomial_density(x: f64, y: f64, p: f64, q: f64) -> f64 {
    let n = x + y;
    if x == 0.0 {
        return power_of(q, p, n);
    }
    if y == 0.0 {
        return power_of(p, q, n);
    }
    let exponent = stirling_remainder(n)
        - stirling_remainder(x)
        - stirling_remainder(y)
        - deviance(x, n * p)
        - deviance(y, n * q);
    exponent.exp() * (n / (2.0 * PI * x * y)).sqrt()
}

/// p^n where q = 1 − p is the more accurate of the two if it is small.
fn power_of(p: f64, q: f64, n: f64) -> f64 {
    if q < 0.5 {
        (n * (-q).ln_1p()).exp()
    } else {
        (n * p.ln()).exp()
    }
}

/// Tails of the gamma distribution of the shape at x: P(a, x) and Q(a, x).
///
/// Series and continued fraction Abramowitz & Stegun 6.5.29 and 6.5.31.
pub(super) fn gamma_tails(shape: f64, x: f64) -> Tails {
    if shape.is_nan() || x.is_nan() || shape <= 0.0 || shape.is_infinite() {
        return Tails::NAN;
    }
    if x <= 0.0 {
        return Tails::of_lower(0.0);
    }
    if x.is_infinite() {
        return Tails::of_upper(0.0);
    }
    let density = poisson_density(shape, x);
    if x < shape + 1.0 {
        Tails::of_lower(density * gamma_series(shape, x))
    } else {
        Tails::of_upper(density * shape * gamma_fraction(shape, x))
    }
}

fn gamma_series(shape: f64, x: f64) -> f64 {
    let (mut sum, mut term, mut a) = (1.0, 1.0, shape);
    for _ in 0..TERMS_MAX {
        a += 1.0;
        term *= x / a;
        sum += term;
        if term < sum * 0.25 * f64::EPSILON {
            return sum;
        }
    }
    f64::NAN
}

fn gamma_fraction(shape: f64, x: f64) -> f64 {
    let mut b = x + 1.0 - shape;
    let mut fraction = Lentz::new(b);
    for i in 1..TERMS_MAX {
        let i = f64::from(i);
        b += 2.0;
        if fraction.step(-i * (i - shape), b) {
            return 1.0 / fraction.value;
        }
    }
    f64::NAN
}

/// Tails of the beta distribution of shapes a, b at x: I_x(a, b) and I_y(b, a), with y = 1 − x given as such.
///
/// Continued fraction Abramowitz & Stegun 26.5.8.
pub(super) fn beta_tails(a: f64, b: f64, x: f64, y: f64) -> Tails {
    let shapes_good = a > 0.0 && b > 0.0 && a.is_finite() && b.is_finite();
    if !shapes_good || x.is_nan() || y.is_nan() {
        return Tails::NAN;
    }
    if x <= 0.0 {
        return Tails::of_lower(0.0);
    }
    if y <= 0.0 {
        return Tails::of_upper(0.0);
    }
    // x^a y^b / B(a, b)
    let density = binomial_density(a, b, x, y) * (a / (a + b)) * b;
    if x < (a + 1.0) / (a + b + 2.0) {
        Tails::of_lower(density * beta_fraction(a, b, x) / a)
    } else {
        Tails::of_upper(density * beta_fraction(b, a, y) / b)
    }
}

fn beta_fraction(a: f64, b: f64, x: f64) -> f64 {
    let mut fraction = Lentz::new(1.0);
    fraction.step(-(a + b) * x / (a + 1.0), 1.0);
    for m in 1..TERMS_MAX {
        let m = f64::from(m);
        let am = a + 2.0 * m;
        fraction.step(m * (b - m) * x / ((am - 1.0) * am), 1.0);
        if fraction.step(-(a + m) * (a + b + m) * x / (am * (am + 1.0)), 1.0) {
            return 1.0 / fraction.value;
        }
    }
    f64::NAN
}

/// A continued fraction b0 + a1/(b1 + a2/(b2 + …)), evaluated forwards: Lentz (1976) as modified by
/// Thompson & Barnett (1986).
struct Lentz {
    value: f64,
    c: f64,
    d: f64,
}

impl Lentz {
    fn new(b0: f64) -> Self {
        let value = away_from_zero(b0);
        Self {
            value,
            c: value,
            d: 0.0,
        }
    }

    /// Takes in one more level; true when it changed nothing.
    fn step(&mut self, a: f64, b: f64) -> bool {
        self.d = 1.0 / away_from_zero(b + a * self.d);
        self.c = away_from_zero(b + a / self.c);
        let factor = self.c * self.d;
        self.value *= factor;
        (factor - 1.0).abs() <= 2.0 * f64::EPSILON
    }
}

fn away_from_zero(x: f64) -> f64 {
    if x.abs() < 1e-300 { 1e-300 } else { x }
}
