//! The chi-squared, gamma and Poisson distributions.

use super::incomplete::{gamma_tails, stirling_remainder};
use super::quantile::{Tail, positive};

/// P(χ² ≤ x) with ν > 0 degrees of freedom, which need not be whole.
pub fn chi_squared_cdf(x: f64, nu: f64) -> f64 {
    gamma_tails(0.5 * nu, 0.5 * x).lower
}

/// P(χ² > x) with ν > 0 degrees of freedom.
pub fn chi_squared_sf(x: f64, nu: f64) -> f64 {
    gamma_tails(0.5 * nu, 0.5 * x).upper
}

/// x with P(χ² ≤ x) = p.
pub fn chi_squared_quantile(p: f64, nu: f64) -> f64 {
    2.0 * positive(|x| gamma_tails(0.5 * nu, x), p, Tail::Lower)
}

/// x with P(χ² > x) = p.
pub fn chi_squared_upper_quantile(p: f64, nu: f64) -> f64 {
    2.0 * positive(|x| gamma_tails(0.5 * nu, x), p, Tail::Upper)
}

/// x with P(G ≤ x) = p for the gamma distribution of that shape and scale 1.
pub fn gamma_quantile(p: f64, shape: f64) -> f64 {
    positive(|x| gamma_tails(shape, x), p, Tail::Lower)
}

/// P(X ≤ k) for a Poisson count of the mean m ≥ 0.
pub fn poisson_cdf(k: u64, mean: f64) -> f64 {
    if mean == 0.0 {
        return 1.0;
    }
    if mean < 0.0 {
        return f64::NAN;
    }
    gamma_tails(k as f64 + 1.0, mean).upper
}

/// E χ / √ν with ν > 0 degrees of freedom, √(2/ν) Γ((ν + 1)/2) / Γ(ν/2): the constant c4 of a
/// sample of ν + 1.
pub fn chi_mean_ratio(nu: f64) -> f64 {
    // With x = ν/2, Γ(x + ½)/Γ(x)/√x by Stirling's formula for Γ(x + 3/2) and Γ(x + 1).
    let x = 0.5 * nu;
    let y = x + 0.5;
    let exponent = x * (0.5 / x).ln_1p() - 0.5 + stirling_remainder(y) - stirling_remainder(x);
    exponent.exp()
}
