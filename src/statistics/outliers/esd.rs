//! The generalized extreme studentized deviate test.

use super::grubbs::{critical_value, first_largest};
use crate::statistics::Undefined;
use crate::statistics::summary::Summary;

/// The smallest sample for which the test keeps its significance level: Rosner (1983) finds the approximation
/// reasonable from 15 and accurate from 25 values.
pub const ESD_SIZE_MIN: u64 = 15;

/// One step of the test: the most extreme of the values that are left.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct EsdStep {
    /// Index in the sample.
    pub index: usize,
    #[allow(missing_docs)]
    pub value: f64,
    /// R, the largest |x − x̄|/s.
    pub statistic: f64,
    /// λ, its critical value.
    pub critical: f64,
}

/// The outcome of the test.
#[derive(Debug, Clone, PartialEq)]
pub struct Esd {
    /// Every step taken. It ends early where the values left are all equal.
    pub steps: Vec<EsdStep>,
    /// Indices in the sample of the outliers, most extreme first.
    pub outliers: Vec<usize>,
}

/// Tests for up to `outliers_max` outliers on either side at significance level alpha (two-sided).
///
/// The number of outliers is the largest i with R_i > λ_i, even where an earlier R_j ≤ λ_j: two outliers that
/// mask one another are both found. Rosner (1983), Percentage points for a generalized ESD many-outlier
/// procedure; NIST/SEMATECH e-Handbook 1.3.5.17.3. The values without the outliers are to be near normal.
///
/// # Errors
/// [`Undefined::TooFewValues`] below [`ESD_SIZE_MIN`], [`Undefined::OutOfRange`] for alpha not in (0, 1) or
/// `outliers_max` above half the sample, [`Undefined::ZeroSpread`], [`Undefined::NotFinite`].
pub fn generalized_esd(values: &[f64], outliers_max: usize, alpha: f64) -> Result<Esd, Undefined> {
    check(values, outliers_max, alpha)?;
    if Summary::of(values)?.standard_deviation? == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    let mut left: Vec<(usize, f64)> = values.iter().copied().enumerate().collect();
    let mut steps = Vec::with_capacity(outliers_max);
    for _ in 0..outliers_max {
        let Some((position, step)) = most_extreme(&left, alpha)? else {
            break;
        };
        steps.push(step);
        left.remove(position);
    }
    let count = steps
        .iter()
        .rposition(|step| step.statistic > step.critical)
        .map_or(0, |last| last + 1);
    let outliers = steps.iter().take(count).map(|step| step.index).collect();
    Ok(Esd { steps, outliers })
}

fn check(values: &[f64], outliers_max: usize, alpha: f64) -> Result<(), Undefined> {
    if (values.len() as u64) < ESD_SIZE_MIN {
        return Err(Undefined::TooFewValues {
            needed: ESD_SIZE_MIN,
            found: values.len() as u64,
        });
    }
    if !(alpha > 0.0 && alpha < 1.0) {
        return Err(Undefined::OutOfRange {
            argument: "significance level",
            expected: "a ratio above 0 and below 1",
        });
    }
    if outliers_max > values.len() / 2 {
        return Err(Undefined::OutOfRange {
            argument: "largest number of outliers",
            expected: "at most half the sample",
        });
    }
    Ok(())
}

/// The position in `left` of the value farthest from the mean, the first of equals, with its step;
/// `None` where all are equal.
fn most_extreme(left: &[(usize, f64)], alpha: f64) -> Result<Option<(usize, EsdStep)>, Undefined> {
    let values: Vec<f64> = left.iter().map(|&(_, x)| x).collect();
    let summary = Summary::of(&values)?;
    let s = summary.standard_deviation?;
    if s == 0.0 {
        return Ok(None);
    }
    let (position, distance) = first_largest(values.iter().map(|x| (x - summary.mean).abs()));
    // The test is two-sided: alpha over twice the number of values left, as for Grubbs.
    let critical = critical_value(left.len(), alpha / (2.0 * left.len() as f64));
    Ok(left.get(position).map(|&(index, value)| {
        let step = EsdStep {
            index,
            value,
            statistic: distance / s,
            critical,
        };
        (position, step)
    }))
}
