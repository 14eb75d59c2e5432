//! Location and spread of a sample.

use super::Undefined;
use super::distributions::chi_mean_ratio;
use super::root::bracketed;
use std::f64::consts::{FRAC_2_SQRT_PI, PI};

/// d2 for ranges of two, 2/√π: the mean range of two values from a normal distribution in units of its sigma.
pub const D2_OF_TWO: f64 = FRAC_2_SQRT_PI;

/// Location and spread of a sample.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct Summary {
    pub n: u64,
    pub mean: f64,
    /// Divisor n − 1; needs two values.
    pub standard_deviation: Result<f64, Undefined>,
    pub minimum: f64,
    pub maximum: f64,
    /// Of an even number of values the mean of the middle two.
    pub median: f64,
}

impl Summary {
    /// Summarises a sample.
    ///
    /// Deviations are taken from a value of the sample first, so that constant leading digits do not cost any
    /// (NIST StRD univariate data sets), and sums are compensated (Neumaier 1974).
    ///
    /// # Errors
    /// [`Undefined::TooFewValues`] for no value, [`Undefined::NotFinite`] where a value or the
    /// spread is not finite.
    pub fn of(values: &[f64]) -> Result<Self, Undefined> {
        let sorted = sorted(values)?;
        let (Some(&minimum), Some(&maximum)) = (sorted.first(), sorted.last()) else {
            return Err(Undefined::TooFewValues {
                needed: 1,
                found: 0,
            });
        };
        let n = values.len() as f64;
        let median = median_of_sorted(&sorted);
        let origin = minimum + 0.5 * (maximum - minimum);
        let offset = sum(values.iter().map(|x| x - origin)) / n;
        let mean = origin + offset;
        let squares = sum(values.iter().map(|x| (x - origin - offset).powi(2)));
        // What rounding left of the offset: the corrected two-pass formula of Chan, Golub & LeVeque (1983).
        let rest = sum(values.iter().map(|x| x - origin - offset));
        let variance = (squares - rest * rest / n) / (n - 1.0);
        if !(mean.is_finite() && squares.is_finite()) {
            return Err(Undefined::NotFinite);
        }
        let standard_deviation = match (minimum == maximum, values.len()) {
            (_, 1) => Err(Undefined::TooFewValues {
                needed: 2,
                found: 1,
            }),
            (true, _) => Ok(0.0),
            (false, _) => Ok(variance.max(0.0).sqrt()),
        };
        Ok(Self {
            n: values.len() as u64,
            mean,
            standard_deviation,
            minimum,
            maximum,
            median,
        })
    }
}

/// Within-lot sigma of values in measuring order: the mean moving range of two over d2.
///
/// ISO 7870-2 (individuals and moving range); NIST/SEMATECH e-Handbook 6.3.2.2.
///
/// # Errors
/// [`Undefined::TooFewValues`] below two values, [`Undefined::NotFinite`].
pub fn moving_range_sigma(values: &[f64]) -> Result<f64, Undefined> {
    if values.len() < 2 {
        return Err(Undefined::TooFewValues {
            needed: 2,
            found: values.len() as u64,
        });
    }
    let ranges = values.windows(2).map(|pair| match pair {
        [before, after] => (after - before).abs(),
        _ => 0.0,
    });
    let sigma = sum(ranges) / (values.len() - 1) as f64 / D2_OF_TWO;
    if sigma.is_finite() {
        Ok(sigma)
    } else {
        Err(Undefined::NotFinite)
    }
}

/// Degrees of freedom of [`moving_range_sigma`] of n values: those of the chi distribution with the
/// same coefficient of variation; about 0.6 (n − 1), because neighbouring ranges share a value.
///
/// The variance of the mean moving range follows from E|XY| of a bivariate normal pair of
/// correlation −½ (Nabeya 1951); it tends to 0.826 σ²/(n − 1), as in Cryer & Ryan (1990), The
/// estimation of sigma for an X chart.
///
/// # Errors
/// [`Undefined::TooFewValues`] below two values.
pub fn moving_range_degrees_of_freedom(n: u64) -> Result<f64, Undefined> {
    if n < 2 {
        return Err(Undefined::TooFewValues {
            needed: 2,
            found: n,
        });
    }
    // In units of sigma: a range has the mean 2/√π and the variance 2 − 4/π.
    let mean_square = 4.0 / PI;
    let variance = 2.0 - mean_square;
    let covariance = mean_square * (0.75_f64.sqrt() + PI / 12.0) - mean_square;
    let ranges = (n - 1) as f64;
    let variation =
        (variance + 2.0 * covariance * (ranges - 1.0) / ranges) / (ranges * mean_square);
    let excess = |ln_nu: f64| chi_mean_ratio(ln_nu.exp()).powi(-2) - 1.0 - variation;
    bracketed(excess, -2.0, 46.0)
        .map(f64::exp)
        .ok_or(Undefined::NoSolution)
}

/// Median; of an even number of values the mean of the middle two.
pub(super) fn median(values: &[f64]) -> Result<f64, Undefined> {
    let sorted = sorted(values)?;
    if sorted.is_empty() {
        return Err(Undefined::TooFewValues {
            needed: 1,
            found: 0,
        });
    }
    Ok(median_of_sorted(&sorted))
}

/// First quartile, median and third quartile, interpolated linearly between the values (type 7 of
/// Hyndman & Fan 1996).
///
/// # Errors
/// [`Undefined::TooFewValues`] for no value, [`Undefined::NotFinite`].
pub fn quartiles_of(values: &[f64]) -> Result<[f64; 3], Undefined> {
    if values.is_empty() {
        return Err(Undefined::TooFewValues {
            needed: 1,
            found: 0,
        });
    }
    let (first, median, third) = quartiles(&sorted(values)?);
    Ok([first, median, third])
}

/// First quartile, median and third quartile of ascending values, interpolated linearly (type 7 of
/// Hyndman & Fan 1996); NaN of none.
pub(super) fn quartiles(sorted: &[f64]) -> (f64, f64, f64) {
    let at = |share: f64| {
        let place = share * sorted.len().saturating_sub(1) as f64;
        let value = |i: usize| sorted.get(i).copied().unwrap_or(f64::NAN);
        let (below, above) = (value(place.floor() as usize), value(place.ceil() as usize));
        below + place.fract() * (above - below)
    };
    (at(0.25), at(0.5), at(0.75))
}

/// The values in ascending order.
pub(super) fn sorted(values: &[f64]) -> Result<Vec<f64>, Undefined> {
    if values.iter().any(|x| !x.is_finite()) {
        return Err(Undefined::NotFinite);
    }
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    Ok(sorted)
}

fn median_of_sorted(sorted: &[f64]) -> f64 {
    let middle = sorted.len() / 2;
    let above = sorted.get(middle).copied().unwrap_or(f64::NAN);
    if sorted.len() % 2 == 1 {
        return above;
    }
    let below = middle.checked_sub(1).and_then(|i| sorted.get(i).copied());
    let below = below.unwrap_or(f64::NAN);
    below + 0.5 * (above - below)
}

/// Sum with the rounding errors carried along: Neumaier (1974).
pub(super) fn sum(values: impl Iterator<Item = f64>) -> f64 {
    let (mut total, mut lost) = (0.0_f64, 0.0_f64);
    for value in values {
        let next = total + value;
        lost += if total.abs() >= value.abs() {
            (total - next) + value
        } else {
            (value - next) + total
        };
        total = next;
    }
    total + lost
}
