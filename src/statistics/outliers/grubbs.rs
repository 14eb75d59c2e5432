//! Grubbs' test for a single outlier.

use crate::statistics::Undefined;
use crate::statistics::distributions::student_t_upper_quantile;
use crate::statistics::summary::Summary;

/// On which side an outlier is looked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Side {
    Either,
    Upper,
    Lower,
}

/// The outcome of Grubbs' test.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Grubbs {
    /// Index in the sample of the most extreme value on that side.
    pub index: usize,
    /// G, its distance from the mean in standard deviations.
    pub statistic: f64,
    #[allow(missing_docs)]
    pub critical: f64,
    /// G above its critical value.
    pub outlier: bool,
}

/// Tests whether the most extreme value is an outlier, at significance level alpha.
///
/// Grubbs (1969); NIST/SEMATECH e-Handbook 1.3.5.17.1. The other values are to be near normal. For
/// more than one suspect use [`generalized_esd`](super::generalized_esd): two outliers hide one
/// another from this test.
///
/// # Errors
/// [`Undefined::TooFewValues`] below 3, [`Undefined::OutOfRange`] for alpha not in (0, 1),
/// [`Undefined::ZeroSpread`], [`Undefined::NotFinite`].
pub fn grubbs(values: &[f64], side: Side, alpha: f64) -> Result<Grubbs, Undefined> {
    if values.len() < 3 {
        return Err(Undefined::TooFewValues {
            needed: 3,
            found: values.len() as u64,
        });
    }
    if !(alpha > 0.0 && alpha < 1.0) {
        return Err(Undefined::OutOfRange {
            argument: "significance level",
            expected: "a ratio above 0 and below 1",
        });
    }
    let summary = Summary::of(values)?;
    let s = summary.standard_deviation?;
    if s == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    let deviation = |x: f64| match side {
        Side::Either => (x - summary.mean).abs(),
        Side::Upper => x - summary.mean,
        Side::Lower => summary.mean - x,
    };
    let (index, farthest) = first_largest(values.iter().map(|&x| deviation(x)));
    let n = values.len() as f64;
    let tail = match side {
        Side::Either => alpha / (2.0 * n),
        Side::Upper | Side::Lower => alpha / n,
    };
    let statistic = farthest / s;
    let critical = critical_value(values.len(), tail);
    Ok(Grubbs {
        index,
        statistic,
        critical,
        outlier: statistic > critical,
    })
}

/// Index and size of the largest number, the first of equals.
pub(super) fn first_largest(numbers: impl Iterator<Item = f64>) -> (usize, f64) {
    numbers
        .enumerate()
        .fold((0, f64::NEG_INFINITY), |held, (index, number)| {
            if number > held.1 {
                (index, number)
            } else {
                held
            }
        })
}

/// (n − 1)/√n · √(t²/(n − 2 + t²)), with t the quantile of that upper tail for n − 2 degrees of freedom.
pub(super) fn critical_value(n: usize, tail: f64) -> f64 {
    let n = n as f64;
    let t = student_t_upper_quantile(tail, n - 2.0);
    let t2 = t * t;
    (n - 1.0) / n.sqrt() * (t2 / (n - 2.0 + t2)).sqrt()
}
