//! The binomial and beta distributions.

use super::incomplete::{Tails, beta_tails};
use super::quantile::{Tail, positive};

/// P(B ≤ x) for the beta distribution of shapes a, b > 0: the regularised incomplete beta function I_x(a, b).
pub fn beta_cdf(x: f64, a: f64, b: f64) -> f64 {
    beta_tails(a, b, x, 1.0 - x).lower
}

/// P(B > x) for the beta distribution of shapes a, b > 0.
pub fn beta_sf(x: f64, a: f64, b: f64) -> f64 {
    beta_tails(a, b, x, 1.0 - x).upper
}

/// x with P(B ≤ x) = p.
pub fn beta_quantile(p: f64, a: f64, b: f64) -> f64 {
    of_odds(positive(|w| tails_of_odds(w, a, b), p, Tail::Lower))
}

/// x with P(B > x) = p.
pub fn beta_upper_quantile(p: f64, a: f64, b: f64) -> f64 {
    of_odds(positive(|w| tails_of_odds(w, a, b), p, Tail::Upper))
}

/// P(X ≤ k) for the number of successes in n trials of probability p.
pub fn binomial_cdf(k: u64, n: u64, p: f64) -> f64 {
    binomial_tails(k, n, p).lower
}

/// P(X > k) for the number of successes in n trials of probability p.
pub fn binomial_sf(k: u64, n: u64, p: f64) -> f64 {
    binomial_tails(k, n, p).upper
}

/// Abramowitz & Stegun 26.5.24.
fn binomial_tails(k: u64, n: u64, p: f64) -> Tails {
    if !(0.0..=1.0).contains(&p) {
        return Tails::NAN;
    }
    if k >= n {
        return Tails::of_upper(0.0);
    }
    beta_tails(k as f64 + 1.0, (n - k) as f64, p, 1.0 - p).swapped()
}

/// The beta distribution in odds w = x/(1 − x), which keeps the digits of 1 − x.
fn tails_of_odds(w: f64, a: f64, b: f64) -> Tails {
    beta_tails(a, b, w / (1.0 + w), 1.0 / (1.0 + w))
}

fn of_odds(w: f64) -> f64 {
    if w.is_infinite() { 1.0 } else { w / (1.0 + w) }
}
