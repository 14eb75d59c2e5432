//! Fisher's F distribution.

use super::incomplete::{Tails, beta_tails};
use super::quantile::{Tail, positive};

/// P(F > x) with ν₁ and ν₂ degrees of freedom (Abramowitz & Stegun 26.6.2).
pub fn f_sf(x: f64, nu1: f64, nu2: f64) -> f64 {
    if x <= 0.0 {
        return 1.0;
    }
    tails(x, nu1, nu2).upper
}

/// x with P(F > x) = p.
pub fn f_upper_quantile(p: f64, nu1: f64, nu2: f64) -> f64 {
    positive(|x| tails(x, nu1, nu2), p, Tail::Upper)
}

fn tails(x: f64, nu1: f64, nu2: f64) -> Tails {
    let w = x * (nu1 / nu2);
    if w.is_infinite() {
        return Tails::of_upper(0.0);
    }
    beta_tails(0.5 * nu1, 0.5 * nu2, w / (1.0 + w), 1.0 / (1.0 + w))
}
