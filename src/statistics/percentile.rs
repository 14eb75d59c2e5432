//! Capability of a characteristic that is not normal: the percentile method of ISO 22514-2.
//!
//! The indices compare the limits with the 0.135 %, 50 % and 99.865 % quantiles of a fitted
//! distribution, which take the places of x̄ − 3s, x̄ and x̄ + 3s; for a normal distribution they
//! are the classical Pp and Ppk. Such quantiles cannot be read off a sample of less than thousands;
//! here the fit is normal after a Box-Cox transformation.

use super::Undefined;
use super::normality::{AndersonDarling, anderson_darling};
use super::summary::{Summary, sum};

/// The exponent is searched within ± this many reciprocals of the standard deviation of ln x, or ±
/// 5 if that is more.
const EXPONENT_REACH: f64 = 2.0;
const EXPONENT_REACH_MIN: f64 = 5.0;

/// Quantiles of a distribution at the normal probabilities of −3σ, 0 and +3σ.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Quantiles {
    /// 0.135 %.
    pub low: f64,
    /// Median.
    pub middle: f64,
    /// 99.865 %.
    pub high: f64,
}

/// Indices by the percentile method.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct PercentileCapability {
    pub pp: Result<f64, Undefined>,
    pub ppk: Result<f64, Undefined>,
}

/// A sample made normal by a power.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BoxCox {
    /// λ of y = (x^λ − 1)/λ, or ln x at 0: the maximum-likelihood value.
    pub exponent: f64,
    /// Of the fitted distribution of x.
    pub quantiles: Quantiles,
    /// Of the transformed sample: whether the fit holds.
    pub normality: AndersonDarling,
}

impl Quantiles {
    /// Pp = (U − L)/(X99.865 − X0.135); Ppk the smaller of (U − X50)/(X99.865 − X50) and (X50 −
    /// L)/(X50 − X0.135).
    pub fn capability(&self, lower: Option<f64>, upper: Option<f64>) -> PercentileCapability {
        if let (Some(l), Some(u)) = (lower, upper)
            && l >= u
        {
            return PercentileCapability {
                pp: Err(Undefined::LimitsReversed),
                ppk: Err(Undefined::LimitsReversed),
            };
        }
        let above = upper.map(|u| ratio(u - self.middle, self.high - self.middle));
        let below = lower.map(|l| ratio(self.middle - l, self.middle - self.low));
        let pp = match (lower, upper) {
            (Some(l), Some(u)) => ratio(u - l, self.high - self.low),
            (None, None) => Err(Undefined::NoLimit),
            _ => Err(Undefined::OneSided),
        };
        let ppk = match (below, above) {
            (Some(Ok(b)), Some(Ok(a))) => Ok(b.min(a)),
            (Some(only), None) | (None, Some(only)) => only,
            (Some(Err(why)), _) | (_, Some(Err(why))) => Err(why),
            (None, None) => Err(Undefined::NoLimit),
        };
        PercentileCapability { pp, ppk }
    }
}

fn ratio(distance: f64, spread: f64) -> Result<f64, Undefined> {
    if spread == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    let index = distance / spread;
    if index.is_finite() && spread > 0.0 {
        Ok(index)
    } else {
        Err(Undefined::NotFinite)
    }
}

/// Fits a power that makes a sample of positive values normal; Box & Cox (1964), NIST/SEMATECH
/// e-Handbook 6.5.2.
///
/// # Errors
/// [`Undefined::OutOfRange`] for a value that is not positive, [`Undefined::TooFewValues`] below 8,
/// [`Undefined::ZeroSpread`], [`Undefined::NoSolution`] where no moderate power is the best, or
/// where a quantile would lie outside the fitted distribution.
pub fn box_cox(values: &[f64]) -> Result<BoxCox, Undefined> {
    if values.iter().any(|x| *x <= 0.0) {
        return Err(Undefined::OutOfRange {
            argument: "value",
            expected: "a number above 0",
        });
    }
    let logs: Vec<f64> = values.iter().map(|x| x.ln()).collect();
    let summary = Summary::of(&logs)?;
    let spread = summary.standard_deviation?;
    if spread == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    // In units of the geometric mean the Jacobian of the likelihood is constant and powers stay moderate.
    let centred: Vec<f64> = logs.iter().map(|l| l - summary.mean).collect();
    let exponent = best_exponent(&centred, (EXPONENT_REACH / spread).max(EXPONENT_REACH_MIN))?;
    let transformed: Vec<f64> = centred.iter().map(|l| power(*l, exponent)).collect();
    let normality = anderson_darling(&transformed)?;
    let fit = Summary::of(&transformed)?;
    let s = fit.standard_deviation?;
    let back = |y: f64| {
        let x = (summary.mean + root(y, exponent)).exp();
        if x.is_finite() && x > 0.0 {
            Ok(x)
        } else {
            Err(Undefined::NoSolution)
        }
    };
    Ok(BoxCox {
        exponent,
        quantiles: Quantiles {
            low: back(fit.mean - 3.0 * s)?,
            middle: back(fit.mean)?,
            high: back(fit.mean + 3.0 * s)?,
        },
        normality,
    })
}

/// (x^λ − 1)/λ for x = e^l.
fn power(l: f64, exponent: f64) -> f64 {
    if exponent == 0.0 {
        l
    } else {
        (exponent * l).exp_m1() / exponent
    }
}

/// ln x for (x^λ − 1)/λ = y; NaN where no x > 0 has it.
fn root(y: f64, exponent: f64) -> f64 {
    if exponent == 0.0 {
        y
    } else {
        (exponent * y).ln_1p() / exponent
    }
}

/// The λ of the smallest variance within ± reach, by golden section on its logarithm.
fn best_exponent(centred: &[f64], reach: f64) -> Result<f64, Undefined> {
    let n = centred.len() as f64;
    let ln_variance = |exponent: f64| {
        let y: Vec<f64> = centred.iter().map(|l| power(*l, exponent)).collect();
        let mean = sum(y.iter().copied()) / n;
        (sum(y.iter().map(|y| (y - mean).powi(2))) / n).ln()
    };
    let ratio = 0.5 * (5.0_f64.sqrt() - 1.0);
    let (mut low, mut high) = (-reach, reach);
    while high - low > 1e-9 * reach {
        let (a, b) = (high - ratio * (high - low), low + ratio * (high - low));
        if ln_variance(a) <= ln_variance(b) {
            high = b;
        } else {
            low = a;
        }
    }
    let best = 0.5 * (low + high);
    if reach - best.abs() < 1e-6 * reach {
        return Err(Undefined::NoSolution);
    }
    Ok(best)
}
