//! Process capability indices of a sample against its limits, with confidence bounds.
//!
//! Cp and Cpk use the within-lot sigma (mean moving range over d2, values in measuring order), Pp
//! and Ppk the standard deviation of the whole sample. Definitions: ISO 22514-2 and NIST/SEMATECH
//! e-Handbook 6.1.6. The indices assume a normal distribution.

use super::Undefined;
use super::distributions::{chi_squared_quantile, noncentrality_at, normal_upper_quantile};
use super::summary::{Summary, moving_range_sigma};

/// Capability indices of a sample; each is there or says why it is not.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct Capability {
    /// Mean moving range of two over d2.
    pub sigma_within: Result<f64, Undefined>,
    /// Standard deviation of the sample, divisor n − 1.
    pub sigma_overall: Result<f64, Undefined>,
    pub cp: Result<f64, Undefined>,
    pub cpk: Result<f64, Undefined>,
    pub pp: Result<f64, Undefined>,
    pub ppk: Result<f64, Undefined>,
}

impl Capability {
    /// Indices of values in measuring order against a lower limit, an upper limit or both.
    ///
    /// With one limit Cp and Pp do not exist and Cpk and Ppk are those of that side. With zero
    /// spread none exists.
    pub fn of(values: &[f64], lower: Option<f64>, upper: Option<f64>) -> Self {
        let summary = Summary::of(values);
        let sigma_within = summary.and_then(|_| moving_range_sigma(values));
        let sigma_overall = summary.and_then(|s| s.standard_deviation);
        let mean = summary.map(|s| s.mean);
        let width = |sigma| index_of_width(lower, upper, sigma?);
        let nearer = |sigma| index_of_nearer_limit(lower, upper, mean?, sigma?);
        Self {
            sigma_within,
            sigma_overall,
            cp: width(sigma_within),
            cpk: nearer(sigma_within),
            pp: width(sigma_overall),
            ppk: nearer(sigma_overall),
        }
    }
}

/// (U − L)/6σ.
fn index_of_width(lower: Option<f64>, upper: Option<f64>, sigma: f64) -> Result<f64, Undefined> {
    check_limits(lower, upper)?;
    match (lower, upper) {
        (Some(lower), Some(upper)) => ratio(upper - lower, 6.0 * sigma),
        _ => Err(Undefined::OneSided),
    }
}

/// The smaller of (U − x̄)/3σ and (x̄ − L)/3σ.
fn index_of_nearer_limit(
    lower: Option<f64>,
    upper: Option<f64>,
    mean: f64,
    sigma: f64,
) -> Result<f64, Undefined> {
    check_limits(lower, upper)?;
    let to_lower = lower.map(|l| mean - l);
    let to_upper = upper.map(|u| u - mean);
    let distance = match (to_lower, to_upper) {
        (Some(a), Some(b)) => a.min(b),
        (Some(only), None) | (None, Some(only)) => only,
        (None, None) => return Err(Undefined::NoLimit),
    };
    ratio(distance, 3.0 * sigma)
}

fn check_limits(lower: Option<f64>, upper: Option<f64>) -> Result<(), Undefined> {
    match (lower, upper) {
        (None, None) => Err(Undefined::NoLimit),
        (Some(l), Some(u)) if l < u => Ok(()),
        (Some(_), Some(_)) => Err(Undefined::LimitsReversed),
        _ => Ok(()),
    }
}

fn ratio(distance: f64, spread: f64) -> Result<f64, Undefined> {
    if spread == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    let index = distance / spread;
    if index.is_finite() {
        Ok(index)
    } else {
        Err(Undefined::NotFinite)
    }
}

/// The smallest sample from which an index is worth stating: below, the test for normality has
/// nothing to say of the shape that an index assumes. Up to about 25 values the confidence bound
/// beside it says how little it means (a Cpk of 1.33 does not even show 1.00).
pub const CAPABILITY_SIZE_MIN: u64 = 8;

/// The largest share of the variance that may be the measurement's for an index to say something of
/// the parts: one half. Common practice, no source.
pub const MEASUREMENT_SHARE_MAX: f64 = 0.5;

/// Whether an index from n values of that standard deviation is worth stating, where a single
/// reading has that standard uncertainty of its own (random part, in the same unit).
///
/// # Errors
/// [`Undefined::TooFewValues`] below [`CAPABILITY_SIZE_MIN`], [`Undefined::ZeroSpread`],
/// [`Undefined::NotFinite`], [`Undefined::MeasurementDominates`] above [`MEASUREMENT_SHARE_MAX`].
pub fn worth_stating(n: u64, sigma: f64, repeatability: Option<f64>) -> Result<(), Undefined> {
    if n < CAPABILITY_SIZE_MIN {
        return Err(Undefined::TooFewValues {
            needed: CAPABILITY_SIZE_MIN,
            found: n,
        });
    }
    if sigma == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    let share = (repeatability.unwrap_or(0.0) / sigma).powi(2);
    if !share.is_finite() {
        return Err(Undefined::NotFinite);
    }
    if share > MEASUREMENT_SHARE_MAX {
        return Err(Undefined::MeasurementDominates {
            share: share.min(1.0),
        });
    }
    Ok(())
}

/// Lower confidence bound of Cp or Pp: the index times √(χ²_{ν, 1 − confidence}/ν).
///
/// Exact for a normal sample's own standard deviation (ν = n − 1); with the moving range an
/// approximation by its [degrees of freedom](super::summary::moving_range_degrees_of_freedom).
/// One-sided; NIST e-Handbook 6.1.6.
///
/// # Errors
/// [`Undefined::OutOfRange`] for ν ≤ 0 or a confidence not in (0, 1).
pub fn cp_lower_bound(index: f64, nu: f64, confidence: f64) -> Result<f64, Undefined> {
    check_bound(nu, confidence)?;
    Ok(index * (chi_squared_quantile(1.0 - confidence, nu) / nu).sqrt())
}

/// Lower confidence bound of Cpk or Ppk: index − z √(1/9n + index²/2ν).
///
/// Normal approximation of Bissell (1990), How reliable is your capability index?; NIST e-Handbook
/// 6.1.6. n is the number of values behind the mean, ν the degrees of freedom of the sigma: n − 1
/// for the standard deviation, those of [the moving
/// range](super::summary::moving_range_degrees_of_freedom) for the within-lot sigma. One-sided.
///
/// # Errors
/// [`Undefined::OutOfRange`] for ν ≤ 0 or a confidence not in (0, 1), [`Undefined::TooFewValues`]
/// for n below 2.
pub fn cpk_lower_bound(index: f64, n: u64, nu: f64, confidence: f64) -> Result<f64, Undefined> {
    check_bound(nu, confidence)?;
    if n < 2 {
        return Err(Undefined::TooFewValues {
            needed: 2,
            found: n,
        });
    }
    let z = normal_upper_quantile(1.0 - confidence);
    Ok(index - z * (1.0 / (9.0 * n as f64) + index * index / (2.0 * nu)).sqrt())
}

fn check_bound(nu: f64, confidence: f64) -> Result<(), Undefined> {
    if !(nu > 0.0 && nu.is_finite()) {
        return Err(Undefined::OutOfRange {
            argument: "degrees of freedom",
            expected: "a number above 0",
        });
    }
    if !(confidence > 0.0 && confidence < 1.0) {
        return Err(Undefined::OutOfRange {
            argument: "confidence",
            expected: "a ratio above 0 and below 1",
        });
    }
    Ok(())
}

/// Lower confidence bound of a one-sided index, (U − x̄)/3s or (x̄ − L)/3s with the sample's own
/// standard deviation: exact.
///
/// The C with P(T ≥ 3√n · index) = 1 − confidence for the noncentral t of n − 1 degrees of freedom
/// and noncentrality 3√n C. For Ppk with two limits, taken for the nearer one, it errs on the safe
/// side.
///
/// # Errors
/// [`Undefined::TooFewValues`] for n below 2, [`Undefined::OutOfRange`], [`Undefined::NoSolution`].
pub fn one_sided_lower_bound(index: f64, n: u64, confidence: f64) -> Result<f64, Undefined> {
    if n < 2 {
        return Err(Undefined::TooFewValues {
            needed: 2,
            found: n,
        });
    }
    let nu = (n - 1) as f64;
    check_bound(nu, confidence)?;
    let scale = 3.0 * (n as f64).sqrt();
    let bound = noncentrality_at(scale * index, nu, 1.0 - confidence) / scale;
    if bound.is_finite() {
        Ok(bound)
    } else {
        Err(Undefined::NoSolution)
    }
}
