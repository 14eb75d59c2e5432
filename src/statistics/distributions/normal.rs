//! The standard normal distribution.

use libm::{erf, erfc};
use statrs::function::erf::erfc_inv;
use std::f64::consts::{FRAC_1_SQRT_2, PI, SQRT_2};

/// Below this the lower tail is too near the smallest double for its logarithm to be taken of it.
const LN_TAIL_FROM: f64 = -30.0;

/// P(Z ≤ z).
pub fn normal_cdf(z: f64) -> f64 {
    // Abramowitz & Stegun 26.2.29
    0.5 * erfc(-z * FRAC_1_SQRT_2)
}

/// P(Z > z).
pub fn normal_sf(z: f64) -> f64 {
    normal_cdf(-z)
}

/// ln P(Z ≤ z), finite down to where z² overflows.
///
/// In the far tail the asymptotic series of Mills' ratio, Abramowitz & Stegun 26.2.12.
pub fn normal_ln_cdf(z: f64) -> f64 {
    if z > 0.0 {
        return (-normal_sf(z)).ln_1p();
    }
    if z > LN_TAIL_FROM {
        return normal_cdf(z).ln();
    }
    let w = 1.0 / (z * z);
    let series = -w * (1.0 - w * (3.0 - w * (15.0 - w * (105.0 - 945.0 * w))));
    -0.5 * z * z - (-z).ln() - 0.5 * (2.0 * PI).ln() + series.ln_1p()
}

/// z with P(Z ≤ z) = p; ∓∞ at 0 and 1.
pub fn normal_quantile(p: f64) -> f64 {
    -normal_upper_quantile(p)
}

/// z with P(Z > z) = p; ±∞ at 0 and 1. For p near 0 more accurate than the lower quantile of 1 − p.
pub fn normal_upper_quantile(p: f64) -> f64 {
    if !(0.0..=1.0).contains(&p) {
        return f64::NAN;
    }
    let tail = p.min(1.0 - p);
    if tail == 0.0 {
        return if p == 0.0 {
            f64::INFINITY
        } else {
            f64::NEG_INFINITY
        };
    }
    let magnitude = polished(SQRT_2 * erfc_inv(2.0 * tail), tail);
    if p > 0.5 { -magnitude } else { magnitude }
}

/// One Newton step towards the z ≥ 0 whose upper tail has that probability.
fn polished(z: f64, tail: f64) -> f64 {
    let x = z * FRAC_1_SQRT_2;
    // Half the difference of the tails, from whichever of the two is the smaller.
    let excess = if tail > 0.25 {
        (0.5 - tail) - 0.5 * erf(x)
    } else {
        0.5 * erfc(x) - tail
    };
    let density = (-0.5 * z * z).exp() / (2.0 * PI).sqrt();
    let better = z + excess / density;
    if better.is_finite() { better } else { z }
}
