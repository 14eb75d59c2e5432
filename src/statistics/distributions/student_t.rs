//! Student's t distribution.

use super::chi_squared::chi_mean_ratio;
use super::incomplete::{Tails, beta_tails};
use super::quantile::{Tail, positive};
use std::f64::consts::PI;

/// P(T > t) with ν > 0 degrees of freedom.
pub fn student_t_sf(t: f64, nu: f64) -> f64 {
    if t < 0.0 {
        return 1.0 - upper(-t, nu);
    }
    upper(t, nu)
}

/// P(T ≤ t) with ν > 0 degrees of freedom.
pub fn student_t_cdf(t: f64, nu: f64) -> f64 {
    student_t_sf(-t, nu)
}

/// t with P(T > t) = p.
pub fn student_t_upper_quantile(p: f64, nu: f64) -> f64 {
    if p > 0.5 {
        return -student_t_upper_quantile(1.0 - p, nu);
    }
    if p == 0.0 && nu > 0.0 {
        return f64::INFINITY;
    }
    nu.sqrt() * positive(|ratio| two_sided(ratio, nu), 2.0 * p, Tail::Upper)
}

/// P(T > t) for t ≥ 0.
fn upper(t: f64, nu: f64) -> f64 {
    0.5 * two_sided(t / nu.sqrt(), nu).upper
}

/// Tails of |T|/√ν: with w = t²/ν, w/(1 + w) is beta distributed (Abramowitz & Stegun 26.7.1).
fn two_sided(ratio: f64, nu: f64) -> Tails {
    if ratio > 1e150 {
        // w overflows; only the leading term of the tail is left.
        let leading = chi_mean_ratio(nu) * (2.0 / (PI * nu)).sqrt();
        return Tails::of_upper(leading * (-nu * ratio.ln()).exp());
    }
    let w = ratio * ratio;
    beta_tails(0.5, 0.5 * nu, w / (1.0 + w), 1.0 / (1.0 + w))
}
