//! Modified z-scores.

use crate::statistics::Undefined;
use crate::statistics::summary::{median, sum};
use std::f64::consts::FRAC_PI_2;

/// A value whose modified z-score exceeds this in magnitude is taken for an outlier: Iglewicz &
/// Hoaglin (1993).
pub const MODIFIED_Z_LIMIT: f64 = 3.5;

/// The third quartile of the standard normal distribution to the digits that define the score.
const SCALE: f64 = 0.6745;

/// 0.6745 (x − median)/MAD for every value.
///
/// Iglewicz & Hoaglin (1993), How to detect and handle outliers; NIST/SEMATECH e-Handbook 1.3.5.17.
/// Where more than half of the values are equal the MAD is 0; the mean absolute deviation from the
/// median times √(π/2) = 1.2533 stands in.
///
/// # Errors
/// [`Undefined::TooFewValues`] below 3, [`Undefined::ZeroSpread`] where all are equal,
/// [`Undefined::NotFinite`].
pub fn modified_z_scores(values: &[f64]) -> Result<Vec<f64>, Undefined> {
    if values.len() < 3 {
        return Err(Undefined::TooFewValues {
            needed: 3,
            found: values.len() as u64,
        });
    }
    let centre = median(values)?;
    let deviations: Vec<f64> = values.iter().map(|x| (x - centre).abs()).collect();
    let mad = median(&deviations)?;
    let scale = if mad > 0.0 {
        mad / SCALE
    } else {
        sum(deviations.iter().copied()) / deviations.len() as f64 * FRAC_PI_2.sqrt()
    };
    if scale == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    Ok(values.iter().map(|x| (x - centre) / scale).collect())
}
