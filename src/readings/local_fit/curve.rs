//! A sum of terms as a curve, and the terms at one frequency.

use super::basis::{HIGHEST, Term};
use num_complex::Complex64;
use std::f64::consts::FRAC_PI_2;

/// A fitted curve `Σ c u^a s^b`, written out in the real variable `x = ln(f/centre)`: for b = −1, 0
/// and 1 the real and the imaginary part of `Σ c (x + jπ/2)^a` as polynomials in x.
#[derive(Debug, Clone, Default)]
pub(super) struct Curve {
    re: [[f64; HIGHEST + 1]; 3],
    im: [[f64; HIGHEST + 1]; 3],
}

impl Curve {
    pub(super) fn new(basis: &[Term], coefficients: &[f64]) -> Curve {
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
    pub(super) fn impedance(&self, x: f64) -> Complex64 {
        let y = x.exp();
        let [re, im] = [&self.re, &self.im].map(|p| p.map(|p| polynomial(&p, x)));
        Complex64::new(
            im[0] / y + re[1] - im[2] * y,
            -re[0] / y + im[1] + re[2] * y,
        )
    }

    /// Re Z at `from`, and on in equal steps of x.
    pub(super) fn resistances(&self, from: f64, step: f64) -> impl Iterator<Item = f64> {
        let [over, plain, times] = [&self.im[0], &self.re[1], &self.im[2]];
        let (mut y, factor) = (from.exp(), step.exp());
        (0..).map(move |k| {
            let x = from + step * f64::from(k);
            let re = polynomial(over, x) / y + polynomial(plain, x) - polynomial(times, x) * y;
            y *= factor;
            re
        })
    }

    /// dZ/dx: dy/dx = y.
    pub(super) fn slope(&self, x: f64) -> Complex64 {
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
pub(super) struct Point {
    u: [Complex64; HIGHEST + 1],
    s: Complex64,
}

impl Point {
    pub(super) fn new(ratio: f64) -> Point {
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

    pub(super) fn value(&self, term: Term) -> Complex64 {
        self.u_power(term.power_u) * self.s_power(term.power_s)
    }

    /// d/d ln f of the term.
    pub(super) fn slope(&self, term: Term) -> Complex64 {
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
