//! A mixture of two normal populations by expectation and maximisation.

use crate::statistics::Undefined;
use crate::statistics::distributions::normal_cdf;
use crate::statistics::summary::{Summary, sorted, sum};
use std::f64::consts::PI;

/// Smallest sample for a mixture.
pub const MIXTURE_SIZE_MIN: u64 = 10;

/// A component must hold at least this many values, or it describes a few outliers and not a population.
const COMPONENT_SIZE_MIN: f64 = 3.0;

/// Smallest standard deviation of a component in those of the whole sample: the likelihood grows
/// without bound where one shrinks onto equal values.
const SPREAD_FLOOR: f64 = 0.01;

/// Shares of the sorted sample at which the starts divide it.
const CUTS: usize = 19;

/// Iterations after which the starts are compared, and how many of them are then followed to their end.
const FIRST_ITERATIONS: usize = 25;
const FOLLOWED: usize = 4;

const ITERATIONS_MAX: usize = 2000;

/// Iteration ends where the log likelihood, by the ratio of its last two gains (Aitken), has no
/// more than this to gain. Near the end of a mixture that fits nothing the gains shrink by less
/// than a thousandth each; plain EM would go on for ever.
const GAIN_LEFT: f64 = 1e-6;

/// Whether the two components share a standard deviation.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum Spread {
    Equal,
    Unequal,
}

/// One population of a mixture.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct Component {
    /// Share of the mixture.
    pub weight: f64,
    pub mean: f64,
    /// Maximum-likelihood value (divisor n).
    pub standard_deviation: f64,
}

/// A fitted mixture of two normal populations.
#[derive(Debug, Clone, PartialEq)]
pub struct Mixture {
    /// The two populations, that of the lower mean first.
    pub components: [Component; 2],
    #[allow(missing_docs)]
    pub log_likelihood: f64,
    /// Bayesian information criterion, −2 ln L + p ln n with p = 4 (equal spread) or 5: the
    /// smaller, the better.
    pub bic: f64,
    /// For every value of the sample, the probability that it is of the second population.
    pub second: Vec<f64>,
}

impl Mixture {
    /// Distance of the means in units of the root mean square of the two standard deviations: above
    /// 2 the populations are apart (Ashman, Bird & Zepf 1994).
    pub fn separation(&self) -> f64 {
        let [a, b] = self.components;
        let square = 0.5 * (a.standard_deviation.powi(2) + b.standard_deviation.powi(2));
        (b.mean - a.mean) / square.sqrt()
    }

    /// Share of the values expected to be put into the wrong one of the two populations by the
    /// nearer-probability rule, for equal weights and spreads.
    pub fn overlap(&self) -> f64 {
        normal_cdf(-0.5 * self.separation())
    }
}

/// The criterion of a single normal population, −2 ln L + 2 ln n, to compare a mixture's with.
/// Schwarz (1978).
///
/// # Errors
/// [`Undefined::TooFewValues`] below 2, [`Undefined::ZeroSpread`], [`Undefined::NotFinite`].
pub fn one_normal_bic(values: &[f64]) -> Result<f64, Undefined> {
    let deviation = maximum_likelihood_deviation(values)?;
    let n = values.len() as f64;
    let log_likelihood = -0.5 * n * ((2.0 * PI).ln() + 2.0 * deviation.ln() + 1.0);
    Ok(-2.0 * log_likelihood + 2.0 * n.ln())
}

/// Fits a mixture of two normal populations: EM of Dempster, Laird & Rubin (1977) from 19 divisions
/// of the sorted sample, of which the best four are followed and the best end taken. An end with a
/// component of fewer than three values, or of less than a hundredth of the sample's standard
/// deviation, does not count.
///
/// # Errors
/// [`Undefined::TooFewValues`] below [`MIXTURE_SIZE_MIN`], [`Undefined::ZeroSpread`],
/// [`Undefined::NotFinite`], [`Undefined::NoSolution`] where no end counts.
pub fn two_normals(values: &[f64], spread: Spread) -> Result<Mixture, Undefined> {
    if (values.len() as u64) < MIXTURE_SIZE_MIN {
        return Err(Undefined::TooFewValues {
            needed: MIXTURE_SIZE_MIN,
            found: values.len() as u64,
        });
    }
    let whole = maximum_likelihood_deviation(values)?;
    let centre = Summary::of(values)?.mean;
    // In units of the sample, so that nothing depends on the unit of the values.
    let scaled: Vec<f64> = values.iter().map(|x| (x - centre) / whole).collect();
    let ascending = sorted(&scaled)?;
    let mut ends: Vec<End> = (1..=CUTS)
        .filter_map(|cut| {
            let place = ascending.len() * cut / (CUTS + 1);
            climb(
                &scaled,
                spread,
                start(&ascending, place, spread)?,
                FIRST_ITERATIONS,
            )
        })
        .collect();
    ends.sort_by(|a, b| b.log_likelihood.total_cmp(&a.log_likelihood));
    let best = ends
        .into_iter()
        .filter(|end| end.counts(scaled.len()))
        .take(FOLLOWED)
        .filter_map(|end| climb(&scaled, spread, end.components, ITERATIONS_MAX))
        .filter(|end| end.counts(scaled.len()))
        .max_by(|a, b| a.log_likelihood.total_cmp(&b.log_likelihood));
    let best = best.ok_or(Undefined::NoSolution)?;
    Ok(best.in_units(centre, whole, &scaled, spread))
}

fn maximum_likelihood_deviation(values: &[f64]) -> Result<f64, Undefined> {
    let deviation = Summary::of(values)?.standard_deviation?;
    if deviation == 0.0 {
        return Err(Undefined::ZeroSpread);
    }
    let n = values.len() as f64;
    Ok(deviation * ((n - 1.0) / n).sqrt())
}

/// The two parts of the sorted sample as populations.
fn start(ascending: &[f64], place: usize, spread: Spread) -> Option<[Component; 2]> {
    let (below, above) = ascending.split_at_checked(place)?;
    let part = |values: &[f64]| {
        let n = values.len() as f64;
        let mean = sum(values.iter().copied()) / n;
        let variance = sum(values.iter().map(|x| (x - mean).powi(2))) / n;
        (!values.is_empty()).then_some(Component {
            weight: n / ascending.len() as f64,
            mean,
            standard_deviation: variance.sqrt().max(SPREAD_FLOOR),
        })
    };
    Some(shared([part(below)?, part(above)?], spread))
}

/// With equal spread, the pooled standard deviation for both.
fn shared(components: [Component; 2], spread: Spread) -> [Component; 2] {
    if spread == Spread::Unequal {
        return components;
    }
    let pooled: f64 = components
        .iter()
        .map(|c| c.weight * c.standard_deviation.powi(2))
        .sum();
    components.map(|c| Component {
        standard_deviation: pooled.sqrt().max(SPREAD_FLOOR),
        ..c
    })
}

struct End {
    components: [Component; 2],
    log_likelihood: f64,
}

impl End {
    fn counts(&self, n: usize) -> bool {
        self.components.iter().all(|c| {
            c.weight * n as f64 >= COMPONENT_SIZE_MIN && c.standard_deviation > SPREAD_FLOOR
        })
    }

    fn in_units(&self, centre: f64, whole: f64, scaled: &[f64], spread: Spread) -> Mixture {
        let n = scaled.len() as f64;
        let mut components = self.components;
        components.sort_by(|a, b| a.mean.total_cmp(&b.mean));
        let second = scaled.iter().map(|x| weigh(&components, *x).1).collect();
        let parameters = match spread {
            Spread::Equal => 4.0,
            Spread::Unequal => 5.0,
        };
        let log_likelihood = self.log_likelihood - n * whole.ln();
        Mixture {
            components: components.map(|c| Component {
                weight: c.weight,
                mean: centre + whole * c.mean,
                standard_deviation: whole * c.standard_deviation,
            }),
            log_likelihood,
            bic: -2.0 * log_likelihood + parameters * n.ln(),
            second,
        }
    }
}

/// Follows a start to its end, or for that many iterations; `None` where a component dies out.
fn climb(values: &[f64], spread: Spread, start: [Component; 2], iterations: usize) -> Option<End> {
    let mut components = start;
    let (mut before, mut gain_before) = (f64::NEG_INFINITY, f64::INFINITY);
    for _ in 0..iterations {
        let weighed: Vec<(f64, f64)> = values.iter().map(|x| weigh(&components, *x)).collect();
        let log_likelihood = sum(weighed.iter().map(|(ln_density, _)| *ln_density));
        if !log_likelihood.is_finite() {
            return None;
        }
        let gain = log_likelihood - before;
        before = log_likelihood;
        if gain_left(gain, gain_before) < GAIN_LEFT {
            break;
        }
        gain_before = gain;
        components = maximise(values, &weighed, spread)?;
    }
    Some(End {
        components,
        log_likelihood: before,
    })
}

/// What is left to gain if the gains go on shrinking by the ratio of the last two; no end in sight
/// while they do not shrink.
fn gain_left(gain: f64, gain_before: f64) -> f64 {
    if gain <= f64::EPSILON {
        return 0.0;
    }
    let ratio = gain / gain_before;
    if ratio < 1.0 && gain_before.is_finite() {
        gain * ratio / (1.0 - ratio)
    } else {
        f64::INFINITY
    }
}

/// ln of the mixture's density at a value, and the probability that the value is of the second component.
fn weigh(components: &[Component; 2], x: f64) -> (f64, f64) {
    let ln = |c: &Component| {
        let z = (x - c.mean) / c.standard_deviation;
        c.weight.ln() - c.standard_deviation.ln() - 0.5 * (2.0 * PI).ln() - 0.5 * z * z
    };
    let [a, b] = [ln(&components[0]), ln(&components[1])];
    let largest = a.max(b);
    let total = largest + ((a - largest).exp() + (b - largest).exp()).ln();
    (total, (b - total).exp())
}

fn maximise(values: &[f64], weighed: &[(f64, f64)], spread: Spread) -> Option<[Component; 2]> {
    let part = |second: bool| {
        let share = |w: &(f64, f64)| if second { w.1 } else { 1.0 - w.1 };
        let weight = sum(weighed.iter().map(share));
        let pairs = || values.iter().zip(weighed);
        let mean = sum(pairs().map(|(x, w)| share(w) * x)) / weight;
        let variance = sum(pairs().map(|(x, w)| share(w) * (x - mean).powi(2))) / weight;
        let component = Component {
            weight: weight / values.len() as f64,
            mean,
            standard_deviation: variance.sqrt().max(SPREAD_FLOOR),
        };
        (weight > 0.0 && mean.is_finite()).then_some(component)
    };
    Some(shared([part(false)?, part(true)?], spread))
}
