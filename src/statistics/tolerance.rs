//! Statistical tolerance intervals: an interval that holds a stated share of the population (the
//! content) with a stated confidence. Normal populations with mean and standard deviation
//! estimated: x̄ ± k s. ISO 16269-6:2014.

use super::Undefined;
use super::distributions::{
    chi_squared_sf, noncentral_t_quantile, normal_cdf, normal_sf, normal_upper_quantile,
};
use super::quadrature::GaussLegendre;
use super::root::bracketed;
use std::f64::consts::PI;

/// Beyond this many standard errors of the mean there is nothing left to integrate.
const MEAN_REACH: f64 = 9.0;

/// Panels of the integral over the mean.
const PANELS: usize = 6;

/// Factor k of a one-sided interval, x̄ − k s or x̄ + k s, for n values: exact, by the noncentral t
/// distribution.
///
/// ISO 16269-6:2014 Annex; NIST/SEMATECH e-Handbook 7.2.6.3. `content` and `confidence` are ratios.
///
/// # Errors
/// [`Undefined::TooFewValues`] below 2, [`Undefined::OutOfRange`] for a ratio not in (0, 1).
pub fn one_sided_factor(n: u64, content: f64, confidence: f64) -> Result<f64, Undefined> {
    check(n, content, confidence)?;
    let root_n = (n as f64).sqrt();
    let delta = normal_upper_quantile(1.0 - content) * root_n;
    let t = noncentral_t_quantile(confidence, (n - 1) as f64, delta);
    finite(t / root_n)
}

/// Factor k of a two-sided interval, x̄ ± k s, for n values: exact.
///
/// k solves √(2n/π) ∫₀^∞ P(χ²_ν ≥ ν r(x)²/k²) e^(−nx²/2) dx = confidence, where r(x) is the
/// half-width that holds the content about a centre that is x off: Odeh & Owen (1980); ISO
/// 16269-6:2014.
///
/// # Errors
/// As [`one_sided_factor`].
pub fn two_sided_factor(n: u64, content: f64, confidence: f64) -> Result<f64, Undefined> {
    check(n, content, confidence)?;
    let weighted = weighted_half_widths((n as f64).sqrt(), content)?;
    factor(n, &weighted, confidence)
}

/// Several of them, each of a content and a confidence, for the same n: what a content takes is done
/// once where the pairs of it follow one another.
///
/// # Errors
/// As [`one_sided_factor`].
pub fn two_sided_factors(n: u64, pairs: &[(f64, f64)]) -> Result<Vec<f64>, Undefined> {
    let mut last: Option<(f64, Vec<(f64, f64)>)> = None;
    pairs
        .iter()
        .map(|&(content, confidence)| {
            check(n, content, confidence)?;
            if last.as_ref().is_none_or(|(known, _)| *known != content) {
                last = Some((content, weighted_half_widths((n as f64).sqrt(), content)?));
            }
            let weighted = last.as_ref().map_or(&[][..], |(_, weighted)| weighted);
            factor(n, weighted, confidence)
        })
        .collect()
}

fn factor(n: u64, weighted: &[(f64, f64)], confidence: f64) -> Result<f64, Undefined> {
    let nu = (n - 1) as f64;
    let held = |k: f64| -> f64 {
        let tail = |r: f64| chi_squared_sf(nu * (r / k) * (r / k), nu);
        weighted.iter().map(|(r, w)| w * tail(*r)).sum()
    };
    let excess = |ln_k: f64| held(ln_k.exp()) - confidence;
    let k = bracketed(excess, -12.0, 40.0).ok_or(Undefined::NoSolution)?;
    finite(k.exp())
}

/// How many values an interval between the smallest and the largest of them needs, whatever their
/// distribution: the smallest n with 1 − n c^(n−1) + (n − 1) cⁿ ≥ confidence (Wilks 1941);
/// one-sided the smallest with 1 − cⁿ ≥ confidence.
///
/// # Errors
/// [`Undefined::OutOfRange`] for a ratio not in (0, 1), [`Undefined::NoSolution`] where it would be
/// over 2^40.
pub fn distribution_free_size(
    content: f64,
    confidence: f64,
    two_sided: bool,
) -> Result<u64, Undefined> {
    check(2, content, confidence)?;
    let missed = |n: u64| {
        let n = n as f64;
        let power = |m: f64| (m * content.ln()).exp();
        if two_sided {
            n * power(n - 1.0) - (n - 1.0) * power(n)
        } else {
            power(n)
        }
    };
    let (mut too_few, mut enough) = (1, 2_u64);
    while missed(enough) > 1.0 - confidence {
        if enough > 1 << 40 {
            return Err(Undefined::NoSolution);
        }
        too_few = enough;
        enough *= 2;
    }
    while enough - too_few > 1 {
        let middle = too_few + (enough - too_few) / 2;
        if missed(middle) > 1.0 - confidence {
            too_few = middle;
        } else {
            enough = middle;
        }
    }
    Ok(enough)
}

/// Half-widths r at the nodes of the integral over the error of the mean, with their weights.
fn weighted_half_widths(root_n: f64, content: f64) -> Result<Vec<(f64, f64)>, Undefined> {
    let rule = GaussLegendre::new();
    let mut found = Vec::new();
    let mut failed = false;
    for panel in 0..PANELS {
        let width = MEAN_REACH / PANELS as f64;
        let (a, b) = (width * panel as f64, width * (panel + 1) as f64);
        rule.visit(a, b, |z, weight| match half_width(z / root_n, content) {
            Some(r) => found.push((r, weight * (2.0 / PI).sqrt() * (-0.5 * z * z).exp())),
            None => failed = true,
        });
    }
    if failed {
        return Err(Undefined::NoSolution);
    }
    Ok(found)
}

/// r with Φ(x + r) − Φ(x − r) = content.
fn half_width(x: f64, content: f64) -> Option<f64> {
    let outside = 1.0 - content;
    let excess = |r: f64| outside - (normal_sf(x + r) + normal_cdf(x - r));
    let z = normal_upper_quantile(0.5 * outside);
    bracketed(excess, 0.0, x + z + 1.0)
}

fn check(n: u64, content: f64, confidence: f64) -> Result<(), Undefined> {
    if n < 2 {
        return Err(Undefined::TooFewValues {
            needed: 2,
            found: n,
        });
    }
    for (argument, ratio) in [("content", content), ("confidence", confidence)] {
        if !(ratio > 0.0 && ratio < 1.0) {
            return Err(Undefined::OutOfRange {
                argument,
                expected: "a ratio above 0 and below 1",
            });
        }
    }
    Ok(())
}

fn finite(k: f64) -> Result<f64, Undefined> {
    if k.is_finite() {
        Ok(k)
    } else {
        Err(Undefined::NoSolution)
    }
}
