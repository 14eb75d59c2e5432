//! The noncentral t distribution.
//!
//! T = (Z + δ)/Y with Y = √(χ²_ν/ν): P(T ≤ t) = ∫ Φ(ty − δ) f_Y(y) dy. Both tails are integrated as
//! such: the integrand is positive and, for ν ≥ 1, log-concave, so that it can be followed into any
//! tail without cancellation. (Series in incomplete beta functions, as AS 243, lose their digits in
//! the far tail and for large δ.)

use super::incomplete::stirling_remainder;
use super::normal::normal_ln_cdf;
use crate::statistics::quadrature::GaussLegendre;
use crate::statistics::root::bracketed;
use std::f64::consts::{LN_2, PI};

/// The integral leaves out what lies this far below the peak of the integrand, in powers of e.
const DEPTH: f64 = 42.0;

/// Panels over the whole range and over the step of Φ.
const PANELS: usize = 12;

/// The step of Φ(s) from 0 to 1 for double precision: |s| below this.
const STEP: f64 = 9.0;

/// P(T ≤ t) with ν ≥ 1 degrees of freedom and the noncentrality δ.
pub fn noncentral_t_cdf(t: f64, nu: f64, delta: f64) -> f64 {
    tail(t, nu, delta, 1.0)
}

/// P(T > t) with ν ≥ 1 degrees of freedom and the noncentrality δ.
pub fn noncentral_t_sf(t: f64, nu: f64, delta: f64) -> f64 {
    tail(t, nu, delta, -1.0)
}

/// t with P(T ≤ t) = p, for 0 < p < 1, ν ≥ 1.
pub fn noncentral_t_quantile(p: f64, nu: f64, delta: f64) -> f64 {
    if !(p > 0.0 && p < 1.0) {
        return f64::NAN;
    }
    let excess = |t: f64| {
        if p <= 0.5 {
            noncentral_t_cdf(t, nu, delta).ln() - p.ln()
        } else {
            (1.0 - p).ln() - noncentral_t_sf(t, nu, delta).ln()
        }
    };
    let mut reach = 2.0 * (1.0 + delta * delta / (2.0 * nu)).sqrt();
    for _ in 0..200 {
        let (low, high) = (delta - reach, delta + reach);
        if let Some(t) = bracketed(excess, low, high) {
            return t;
        }
        reach *= 4.0;
    }
    f64::NAN
}

/// δ with P(T > t) = p: the noncentrality that leaves an observed t at that upper tail. For 0 < p < 1, ν ≥ 1.
pub fn noncentrality_at(t: f64, nu: f64, p: f64) -> f64 {
    if !(p > 0.0 && p < 1.0 && t.is_finite()) {
        return f64::NAN;
    }
    let excess = |delta: f64| {
        if p <= 0.5 {
            noncentral_t_sf(t, nu, delta).ln() - p.ln()
        } else {
            (1.0 - p).ln() - noncentral_t_cdf(t, nu, delta).ln()
        }
    };
    let mut reach = 2.0 * (1.0 + t * t / (2.0 * nu)).sqrt();
    for _ in 0..60 {
        if let Some(delta) = bracketed(excess, t - reach, t + reach) {
            return delta;
        }
        reach *= 2.0;
    }
    f64::NAN
}

fn tail(t: f64, nu: f64, delta: f64, sign: f64) -> f64 {
    let good = nu >= 1.0 && nu.is_finite() && delta.is_finite();
    if !good || t.is_nan() {
        return f64::NAN;
    }
    if t.is_infinite() {
        return if (t > 0.0) == (sign > 0.0) { 1.0 } else { 0.0 };
    }
    let integrand = Integrand {
        t,
        nu,
        delta,
        sign,
        constant: LN_2 - stirling_remainder(0.5 * nu) + 0.5 * (nu / (4.0 * PI)).ln(),
    };
    integrand.integral().clamp(0.0, 1.0)
}

struct Integrand {
    t: f64,
    nu: f64,
    delta: f64,
    sign: f64,
    constant: f64,
}

impl Integrand {
    /// ln of the integrand; −∞ at y = 0 for ν > 1.
    fn ln(&self, y: f64) -> f64 {
        let power = if self.nu == 1.0 {
            0.0
        } else {
            (self.nu - 1.0) * y.ln()
        };
        let density = self.constant + power + 0.5 * self.nu * (1.0 - y) * (1.0 + y);
        density + normal_ln_cdf(self.sign * (self.t * y - self.delta))
    }

    fn integral(&self) -> f64 {
        // Where √ν Y exceeds √ν + 40 its density alone is below e^-800.
        let far = 1.0 + 40.0 / self.nu.sqrt();
        let peak_at = self.peak(far);
        let peak = self.ln(peak_at);
        if peak == f64::NEG_INFINITY {
            return 0.0;
        }
        let floor = peak - DEPTH;
        let low = self.edge(peak_at, 0.0, floor);
        let high = self.edge(peak_at, far, floor);
        let mut cuts = Vec::with_capacity(2 * PANELS + 3);
        even_cuts(&mut cuts, low, high);
        cuts.push(peak_at);
        if self.t != 0.0 {
            let (centre, reach) = (self.delta / self.t, STEP / self.t.abs());
            even_cuts(
                &mut cuts,
                (centre - reach).clamp(low, high),
                (centre + reach).clamp(low, high),
            );
        }
        cuts.sort_by(f64::total_cmp);
        let rule = GaussLegendre::new();
        let scaled: f64 = cuts
            .windows(2)
            .map(|panel| match panel {
                [a, b] if b > a => rule.integrate(*a, *b, |y| (self.ln(y) - peak).exp()),
                _ => 0.0,
            })
            .sum();
        scaled * peak.exp()
    }

    /// Where the integrand is largest on [0, far], by golden section on its concave logarithm.
    fn peak(&self, far: f64) -> f64 {
        let ratio = 0.5 * (5.0_f64.sqrt() - 1.0);
        let (mut low, mut high) = (0.0, far);
        let (mut a, mut b) = (high - ratio * (high - low), low + ratio * (high - low));
        let (mut fa, mut fb) = (self.ln(a), self.ln(b));
        for _ in 0..60 {
            if fa >= fb {
                (high, b, fb) = (b, a, fa);
                a = high - ratio * (high - low);
                fa = self.ln(a);
            } else {
                (low, a, fa) = (a, b, fb);
                b = low + ratio * (high - low);
                fb = self.ln(b);
            }
        }
        if fa >= fb { a } else { b }
    }

    /// The point between the peak and an end where the logarithm has fallen to the floor, or the end.
    fn edge(&self, peak_at: f64, end: f64, floor: f64) -> f64 {
        if self.ln(end) >= floor {
            return end;
        }
        let (mut inside, mut outside) = (peak_at, end);
        for _ in 0..40 {
            let middle = 0.5 * (inside + outside);
            if self.ln(middle) >= floor {
                inside = middle;
            } else {
                outside = middle;
            }
        }
        outside
    }
}

fn even_cuts(cuts: &mut Vec<f64>, low: f64, high: f64) {
    let step = (high - low) / PANELS as f64;
    cuts.extend((0..PANELS).map(|i| low + step * i as f64));
    cuts.push(high);
}
