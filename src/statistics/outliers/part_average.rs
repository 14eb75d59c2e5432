//! Robust part-average limits.

use crate::statistics::Undefined;
use crate::statistics::summary::{quartiles, sorted};

/// Limits lie this many robust sigmas from the median.
const REACH: f64 = 6.0;

/// Interquartile range of a normal distribution in sigmas, to the digits of the definition (exactly 1.34898).
const QUARTILES_APART: f64 = 1.35;

/// Part-average limits of a lot: parts beyond them are unlike the others, whatever the limits of
/// the specification.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct PartAverage {
    pub median: f64,
    /// (Q3 − Q1)/1.35.
    pub robust_sigma: f64,
    pub lower: f64,
    pub upper: f64,
}

/// Median ± 6 robust sigmas: the dynamic limits of part average testing, AEC-Q001 Rev D (2011), from memory.
///
/// The formula leaves the quantile open; here it is interpolated linearly between the values (type
/// 7 of Hyndman & Fan 1996).
///
/// # Errors
/// [`Undefined::TooFewValues`] below 4, [`Undefined::ZeroSpread`] where the quartiles are equal,
/// [`Undefined::NotFinite`].
pub fn part_average_limits(values: &[f64]) -> Result<PartAverage, Undefined> {
    if values.len() < 4 {
        return Err(Undefined::TooFewValues {
            needed: 4,
            found: values.len() as u64,
        });
    }
    let (first, median, third) = quartiles(&sorted(values)?);
    let robust_sigma = (third - first) / QUARTILES_APART;
    if robust_sigma == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    Ok(PartAverage {
        median,
        robust_sigma,
        lower: median - REACH * robust_sigma,
        upper: median + REACH * robust_sigma,
    })
}
