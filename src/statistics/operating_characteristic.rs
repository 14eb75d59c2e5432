//! Operating characteristic of a single sampling plan: the probability that a lot is accepted.
//!
//! Three laws: binomial (a lot from a process of that quality, type B, percent nonconforming), Poisson
//! (nonconformities per item), hypergeometric (one lot of known size, type A). ISO 2859-1:1999
//! Table 10 uses the first two. MIL-STD-105E Table X prints the Poisson for samples over 80 (from memory).

use super::Undefined;
use super::distributions::{
    beta_upper_quantile, binomial_cdf, gamma_quantile, hypergeometric_cdf, poisson_cdf,
};

/// How near, relatively, a risk or a count must be to a boundary to be on it: decimals such as 0.1
/// have no exact binary form, and a boundary met exactly in decimals must not be missed by a
/// rounding.
const ROUNDING: f64 = 1e-10;

/// P(at most Ac nonconforming in n) at the share nonconforming p of the process (a ratio): binomial.
pub fn acceptance_probability(n: u64, ac: u64, p: f64) -> f64 {
    binomial_cdf(ac, n, p)
}

/// P(at most Ac nonconformities in n items) at that many nonconformities per item: Poisson.
pub fn acceptance_probability_poisson(n: u64, ac: u64, per_item: f64) -> f64 {
    poisson_cdf(ac, n as f64 * per_item)
}

/// P(at most Ac nonconforming in n) for a lot that holds that many nonconforming items: hypergeometric.
/// NaN where the sample or the count exceeds the lot.
pub fn acceptance_probability_of_lot(lot: u64, nonconforming: u64, n: u64, ac: u64) -> f64 {
    hypergeometric_cdf(ac, lot, nonconforming, n)
}

/// The share nonconforming (a ratio) at which a lot is accepted with probability pa: binomial.
///
/// At Ac ≥ n every lot is accepted: NaN.
pub fn quality_at(n: u64, ac: u64, pa: f64) -> f64 {
    if ac >= n {
        return f64::NAN;
    }
    beta_upper_quantile(pa, ac as f64 + 1.0, (n - ac) as f64)
}

/// The nonconformities per item at which a lot is accepted with probability pa: Poisson. NaN for n = 0.
pub fn quality_at_poisson(n: u64, ac: u64, pa: f64) -> f64 {
    if n == 0 {
        return f64::NAN;
    }
    gamma_quantile(1.0 - pa, ac as f64 + 1.0) / n as f64
}

/// The number of nonconforming items in a lot at a quality limit: the limit times the lot, rounded
/// up, at least 1.
///
/// `quality_limit` is a ratio, above 0 and at most 1. A product that is whole but for a rounding is
/// that whole number.
pub fn nonconforming_at_limit(lot: u64, quality_limit: f64) -> u64 {
    let product = lot as f64 * quality_limit;
    let nearest = product.round();
    let count = if (product - nearest).abs() <= ROUNDING * nearest {
        nearest
    } else {
        product.ceil()
    };
    (count as u64).clamp(1, lot.max(1))
}

/// The smallest sample for acceptance at zero nonconforming: a lot at the quality limit is accepted
/// with at most the consumer's risk, by the exact hypergeometric law.
///
/// `quality_limit` and `consumers_risk` are ratios. The smallest n with C(N − D, n)/C(N, n) ≤ β for
/// D = ⌈N · limit⌉: the definition of limiting quality by type A probability, ISO 2859-2 (from memory).
///
/// # Errors
/// [`Undefined::LotTooSmall`] for an empty lot, [`Undefined::OutOfRange`] for a limit or risk not in (0, 1).
pub fn zero_acceptance_sample(
    lot: u64,
    quality_limit: f64,
    consumers_risk: f64,
) -> Result<u64, Undefined> {
    if lot == 0 {
        return Err(Undefined::LotTooSmall {
            smallest: 1,
            found: 0,
        });
    }
    within_unit("quality limit", quality_limit)?;
    within_unit("consumer's risk", consumers_risk)?;
    let nonconforming = nonconforming_at_limit(lot, quality_limit);
    let good_enough = |n: u64| {
        acceptance_probability_of_lot(lot, nonconforming, n, 0) <= consumers_risk * (1.0 + ROUNDING)
    };
    // The probability falls with n and is 0 once only nonconforming items could be left out.
    let (mut too_few, mut enough) = (0, lot - nonconforming + 1);
    while enough - too_few > 1 {
        let middle = too_few + (enough - too_few) / 2;
        if good_enough(middle) {
            enough = middle;
        } else {
            too_few = middle;
        }
    }
    Ok(enough)
}

fn within_unit(argument: &'static str, value: f64) -> Result<(), Undefined> {
    if value > 0.0 && value < 1.0 {
        return Ok(());
    }
    Err(Undefined::OutOfRange {
        argument,
        expected: "a ratio above 0 and below 1",
    })
}
