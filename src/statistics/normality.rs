//! Test for normality.

use super::Undefined;
use super::distributions::normal_ln_cdf;
use super::summary::{Summary, sorted, sum};

/// The smallest sample for which the p-value holds.
pub const ANDERSON_DARLING_SIZE_MIN: u64 = 8;

/// Beyond this A* the approximation of the p-value turns upwards; there it stays at its value here,
/// below 1e-30.
const ADJUSTED_MAX: f64 = 13.0;

/// The Anderson-Darling test of a sample for normality, mean and standard deviation estimated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AndersonDarling {
    /// A².
    pub statistic: f64,
    /// A* = A² (1 + 0.75/n + 2.25/n²).
    pub adjusted: f64,
    /// The probability of an A* at least as large from a normal population.
    pub p_value: f64,
}

/// Tests a sample for normality.
///
/// D'Agostino & Stephens (1986), Goodness-of-fit techniques, Table 4.9; NIST/SEMATECH e-Handbook
/// 1.3.5.14. Readings rounded to a coarse step, with many ties, give small p-values from normal
/// populations too.
///
/// # Errors
/// [`Undefined::TooFewValues`] below [`ANDERSON_DARLING_SIZE_MIN`], [`Undefined::ZeroSpread`],
/// [`Undefined::NotFinite`].
pub fn anderson_darling(values: &[f64]) -> Result<AndersonDarling, Undefined> {
    let n = values.len();
    if (n as u64) < ANDERSON_DARLING_SIZE_MIN {
        return Err(Undefined::TooFewValues {
            needed: ANDERSON_DARLING_SIZE_MIN,
            found: n as u64,
        });
    }
    let summary = Summary::of(values)?;
    let s = summary.standard_deviation?;
    if s == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    let standard: Vec<f64> = sorted(values)?
        .iter()
        .map(|x| (x - summary.mean) / s)
        .collect();
    let terms = standard.iter().zip(standard.iter().rev()).enumerate();
    let total = sum(terms.map(|(i, (low, high))| {
        (2 * i + 1) as f64 * (normal_ln_cdf(*low) + normal_ln_cdf(-*high))
    }));
    let n = n as f64;
    let statistic = -n - total / n;
    let adjusted = statistic * (1.0 + 0.75 / n + 2.25 / (n * n));
    Ok(AndersonDarling {
        statistic,
        adjusted,
        p_value: p_value(adjusted),
    })
}

/// p-value of an A*, in four pieces that leave steps of about 0.001 at their joints.
fn p_value(adjusted: f64) -> f64 {
    let a = adjusted.clamp(0.0, ADJUSTED_MAX);
    if a < 0.2 {
        1.0 - (-13.436 + 101.14 * a - 223.73 * a * a).exp()
    } else if a < 0.34 {
        1.0 - (-8.318 + 42.796 * a - 59.938 * a * a).exp()
    } else if a < 0.6 {
        (0.9177 - 4.279 * a - 1.38 * a * a).exp()
    } else {
        (1.2937 - 5.709 * a + 0.0186 * a * a).exp()
    }
}
