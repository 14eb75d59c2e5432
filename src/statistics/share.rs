//! Confidence bounds of the share nonconforming, from the count in a sample. Exact; one-sided at
//! the stated confidence.

use super::Undefined;
use super::distributions::{
    beta_quantile, beta_upper_quantile, hypergeometric_cdf, hypergeometric_sf,
};

/// Upper bound of the share nonconforming of the process, a ratio: Clopper & Pearson (1934).
///
/// # Errors
/// [`Undefined::TooFewValues`] for an empty sample, [`Undefined::OutOfRange`] for a count above the
/// sample or a confidence not in (0, 1).
pub fn upper_bound(n: u64, nonconforming: u64, confidence: f64) -> Result<f64, Undefined> {
    check(n, nonconforming, confidence)?;
    if nonconforming == n {
        return Ok(1.0);
    }
    let (a, b) = (nonconforming as f64 + 1.0, (n - nonconforming) as f64);
    Ok(beta_upper_quantile(1.0 - confidence, a, b))
}

/// Lower bound of the share nonconforming of the process, a ratio: Clopper & Pearson (1934).
///
/// # Errors
/// As [`upper_bound`].
pub fn lower_bound(n: u64, nonconforming: u64, confidence: f64) -> Result<f64, Undefined> {
    check(n, nonconforming, confidence)?;
    if nonconforming == 0 {
        return Ok(0.0);
    }
    let (a, b) = (nonconforming as f64, (n - nonconforming) as f64 + 1.0);
    Ok(beta_quantile(1.0 - confidence, a, b))
}

/// Upper bound of the number of nonconforming items in a lot, those of the sample included: the
/// largest number with which a sample as good as this, or better, has a probability above 1 −
/// confidence (hypergeometric).
///
/// # Errors
/// As [`upper_bound`]; [`Undefined::OutOfRange`] for a sample above the lot.
pub fn lot_upper_bound(
    lot: u64,
    n: u64,
    nonconforming: u64,
    confidence: f64,
) -> Result<u64, Undefined> {
    check_lot(lot, n, nonconforming, confidence)?;
    let possible =
        |marked: u64| hypergeometric_cdf(nonconforming, lot, marked, n) > 1.0 - confidence;
    // Falls with the number in the lot: possible at `nonconforming`, where the probability is 1.
    let (mut good, mut bad) = (nonconforming, lot - (n - nonconforming) + 1);
    while bad - good > 1 {
        let middle = good + (bad - good) / 2;
        if possible(middle) {
            good = middle;
        } else {
            bad = middle;
        }
    }
    Ok(good)
}

/// Lower bound of the number of nonconforming items in a lot: the smallest number with which a
/// sample as bad as this, or worse, has a probability above 1 − confidence (hypergeometric).
///
/// # Errors
/// As [`lot_upper_bound`].
pub fn lot_lower_bound(
    lot: u64,
    n: u64,
    nonconforming: u64,
    confidence: f64,
) -> Result<u64, Undefined> {
    check_lot(lot, n, nonconforming, confidence)?;
    let Some(below) = nonconforming.checked_sub(1) else {
        return Ok(0);
    };
    let possible = |marked: u64| hypergeometric_sf(below, lot, marked, n) > 1.0 - confidence;
    // Rises with the number in the lot: impossible below the count, certain where only the others
    // of the sample conform.
    let (mut bad, mut good) = (below, lot - (n - nonconforming));
    while good - bad > 1 {
        let middle = bad + (good - bad) / 2;
        if possible(middle) {
            good = middle;
        } else {
            bad = middle;
        }
    }
    Ok(good)
}

fn check(n: u64, nonconforming: u64, confidence: f64) -> Result<(), Undefined> {
    if n == 0 {
        return Err(Undefined::TooFewValues {
            needed: 1,
            found: 0,
        });
    }
    if nonconforming > n {
        return Err(Undefined::OutOfRange {
            argument: "number nonconforming",
            expected: "at most the sample",
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

fn check_lot(lot: u64, n: u64, nonconforming: u64, confidence: f64) -> Result<(), Undefined> {
    check(n, nonconforming, confidence)?;
    if n > lot {
        return Err(Undefined::OutOfRange {
            argument: "sample",
            expected: "at most the lot",
        });
    }
    Ok(())
}
