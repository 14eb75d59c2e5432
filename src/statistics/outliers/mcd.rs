//! The minimum covariance determinant: the h points of which the covariance has the smallest determinant.

use super::concentration::Concentration;
use super::scatter::Scatter;
use crate::statistics::Undefined;
use crate::statistics::random::Random;
use crate::statistics::summary::median;

/// Random starts, and how many of them are followed to their end; Rousseeuw & Van Driessen (1999)
/// use the same numbers.
const STARTS: usize = 500;
const FOLLOWED: usize = 10;

/// Concentration steps of every start.
const FIRST_STEPS: usize = 2;

/// Each step lowers the determinant or ends; more than this many would mean a cycle of equals.
const STEPS_MAX: usize = 200;

/// The subset found and its scatter, in the units of the points given.
#[derive(Debug, Clone)]
pub struct MinimumCovariance {
    /// Indices of the h points, ascending.
    pub subset: Vec<usize>,
    /// ln det of their covariance (divisor h − 1).
    pub ln_determinant: f64,
    /// Squared Mahalanobis distances of all points from the subset's mean by its covariance, uncorrected.
    pub squared_distances: Vec<f64>,
    /// Mean of the subset.
    pub centre: Vec<f64>,
    /// Covariance of the subset (divisor h − 1), uncorrected, row after row.
    pub covariance: Vec<Vec<f64>>,
}

/// Finds h of the points with the smallest covariance determinant: FAST-MCD of Rousseeuw & Van
/// Driessen (1999), from random starts of that seed.
///
/// The result is a local optimum, for the sizes of a sample nearly always the global one.
///
/// # Errors
/// [`Undefined::TooFewValues`] for h below p + 1, [`Undefined::OutOfRange`] for points of unequal
/// dimension, none, or h above their number; [`Undefined::NotFinite`]; [`Undefined::Collinear`]
/// where variables depend linearly on one another.
pub fn minimum_covariance_determinant(
    points: &[Vec<f64>],
    h: usize,
    seed: u64,
) -> Result<MinimumCovariance, Undefined> {
    check(points, h)?;
    let Standardised {
        points: scaled,
        units,
    } = standardised(points)?;
    let ln_scales: f64 = units.iter().map(|unit| unit.size.ln()).sum();
    let mut random = Random::seeded(seed);
    let mut concentration = Concentration::of(&scaled, h);
    let mut starts: Vec<(f64, Scatter)> = (0..STARTS)
        .filter_map(|_| {
            let start = random_scatter(&scaled, &mut random)?;
            let scatter = concentration.follow(start, FIRST_STEPS)?;
            Some((scatter.ln_determinant(), scatter))
        })
        .collect();
    starts.sort_by(|a, b| a.0.total_cmp(&b.0));
    starts.dedup_by(|a, b| a.1 == b.1);
    let (_, best) = starts
        .into_iter()
        .take(FOLLOWED)
        .filter_map(|(_, start)| {
            let scatter = concentration.follow(start, STEPS_MAX)?;
            Some((scatter.ln_determinant(), scatter))
        })
        .min_by(|a, b| a.0.total_cmp(&b.0))
        .ok_or(Undefined::Collinear)?;
    let subset = concentration.nearest(&best);
    let scatter = Scatter::of(&scaled, &subset).ok_or(Undefined::Collinear)?;
    Ok(MinimumCovariance {
        subset,
        ln_determinant: scatter.ln_determinant() + 2.0 * ln_scales,
        squared_distances: scaled.iter().map(|x| scatter.squared_distance(x)).collect(),
        centre: units
            .iter()
            .zip(scatter.mean())
            .map(|(unit, m)| unit.origin + unit.size * m)
            .collect(),
        covariance: units
            .iter()
            .zip(scatter.covariance())
            .map(|(a, row)| {
                let each = units.iter().zip(row);
                each.map(|(b, v)| a.size * b.size * v).collect()
            })
            .collect(),
    })
}

fn check(points: &[Vec<f64>], h: usize) -> Result<(), Undefined> {
    let p = points.first().map_or(0, Vec::len);
    if p == 0 || points.iter().any(|x| x.len() != p) {
        return Err(Undefined::OutOfRange {
            argument: "points",
            expected: "points of one dimension, at least one",
        });
    }
    if points.iter().flatten().any(|x| !x.is_finite()) {
        return Err(Undefined::NotFinite);
    }
    if h < p + 1 {
        return Err(Undefined::TooFewValues {
            needed: (p + 1) as u64,
            found: h as u64,
        });
    }
    if h > points.len() {
        return Err(Undefined::OutOfRange {
            argument: "subset",
            expected: "at most the number of points",
        });
    }
    Ok(())
}

/// A variable's own measure.
struct Unit {
    /// Its median.
    origin: f64,
    /// Its MAD.
    size: f64,
}

struct Standardised {
    points: Vec<Vec<f64>>,
    units: Vec<Unit>,
}

/// Each variable from its median in units of its MAD.
///
/// The determinant's minimum does not depend on units; the arithmetic does.
fn standardised(points: &[Vec<f64>]) -> Result<Standardised, Undefined> {
    let mut scaled = vec![Vec::new(); points.len()];
    let mut units = Vec::new();
    let p = points.first().map_or(0, Vec::len);
    for j in 0..p {
        let column: Vec<f64> = points.iter().filter_map(|x| x.get(j)).copied().collect();
        let centre = median(&column)?;
        let deviations: Vec<f64> = column.iter().map(|x| (x - centre).abs()).collect();
        let mad = median(&deviations)?;
        // Half of the values equal: some h points lie in a plane.
        if mad == 0.0 {
            return Err(Undefined::Collinear);
        }
        units.push(Unit {
            origin: centre,
            size: mad,
        });
        for (row, x) in scaled.iter_mut().zip(&column) {
            row.push((x - centre) / mad);
        }
    }
    Ok(Standardised {
        points: scaled,
        units,
    })
}

/// Scatter of p + 1 random points, with further ones where those lie in a plane.
fn random_scatter(points: &[Vec<f64>], random: &mut Random) -> Option<Scatter> {
    let n = points.len();
    let p = points.first()?.len();
    let mut order: Vec<usize> = (0..n).collect();
    for drawn in 0..n {
        let other = drawn + random.below(n - drawn);
        order.swap(drawn, other);
        if drawn >= p
            && let Some(scatter) = Scatter::of(points, order.get(..=drawn)?)
        {
            return Some(scatter);
        }
    }
    None
}
