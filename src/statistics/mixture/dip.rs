//! Hartigan's dip test of unimodality.

use crate::statistics::Undefined;
use crate::statistics::random::Random;
use crate::statistics::summary::sorted;

/// The outcome of the dip test.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Dip {
    /// The largest difference between the empirical distribution and the nearest unimodal one; 1/2n to 1/4.
    pub statistic: f64,
    /// Share of uniform samples of that size with a dip at least as large; at least 1/(samples + 1).
    pub p_value: f64,
}

/// Tests a sample for having a single peak.
///
/// Hartigan & Hartigan (1985), The dip test of unimodality. The uniform population is the least
/// favourable with one peak; its law is simulated here at the size in hand, from that many samples
/// of that seed, so that p counts itself among them and is never 0. For other single-peaked
/// populations the p-value is too large: the test errs towards one population. Readings rounded to
/// a coarse step raise the dip.
///
/// # Errors
/// [`Undefined::TooFewValues`] below 4, [`Undefined::NotFinite`].
pub fn dip_test(values: &[f64], samples: u32, seed: u64) -> Result<Dip, Undefined> {
    let statistic = dip_statistic(values)?;
    let mut random = Random::seeded(seed);
    let mut uniform = vec![0.0; values.len()];
    let mut as_large = 0_u32;
    for _ in 0..samples {
        uniform.fill_with(|| random.uniform());
        uniform.sort_by(f64::total_cmp);
        // A sum may come out one rounding smaller than its equal.
        if of_sorted(&uniform) >= statistic * (1.0 - 1e-12) {
            as_large += 1;
        }
    }
    Ok(Dip {
        statistic,
        p_value: (f64::from(as_large) + 1.0) / (f64::from(samples) + 1.0),
    })
}

/// The dip of a sample.
///
/// # Errors
/// [`Undefined::TooFewValues`] below 4, [`Undefined::NotFinite`].
pub fn dip_statistic(values: &[f64]) -> Result<f64, Undefined> {
    if values.len() < 4 {
        return Err(Undefined::TooFewValues {
            needed: 4,
            found: values.len() as u64,
        });
    }
    Ok(of_sorted(&sorted(values)?))
}

/// The dip of ascending values, by the modal interval of Hartigan & Hartigan (1985), section 3.
///
/// The nearest unimodal distribution is convex up to the modal interval, straight in it and concave
/// beyond. The interval begins as the whole sample and is narrowed to where the greatest convex
/// minorant and the least concave majorant lie farthest apart; left and right of it, the dip is at
/// least the distance of the step function from the minorant and the majorant.
fn of_sorted(values: &[f64]) -> f64 {
    let n = values.len();
    let mut dip: f64 = 1.0;
    let (mut low, mut high) = (0, n - 1);
    while high > low {
        let minorant = hull(values, low, high, Side::Below);
        let majorant = hull(values, low, high, Side::Above);
        let gap = widest_gap(values, &minorant, &majorant);
        if gap.width <= dip {
            break;
        }
        let left = deviation(values, &minorant, (low, gap.low), Side::Below);
        let right = deviation(values, &majorant, (gap.high, high), Side::Above);
        dip = dip.max(left).max(right);
        if (gap.low, gap.high) == (low, high) {
            break;
        }
        (low, high) = (gap.low, gap.high);
    }
    dip / (2.0 * n as f64)
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Side {
    Below,
    Above,
}

/// Indices of the knots of the convex minorant (below) or concave majorant (above) of the points
/// (value, index), from low to high.
fn hull(values: &[f64], low: usize, high: usize, side: Side) -> Vec<usize> {
    let mut knots: Vec<usize> = Vec::new();
    for next in low..=high {
        while let [.., a, b] = knots[..] {
            let turn = cross(values, a, b, next);
            let keeps = match side {
                Side::Below => turn > 0.0,
                Side::Above => turn < 0.0,
            };
            if keeps {
                break;
            }
            knots.pop();
        }
        knots.push(next);
    }
    knots
}

/// Positive where the way a, b, c turns upwards.
fn cross(values: &[f64], a: usize, b: usize, c: usize) -> f64 {
    let x = |i: usize| values.get(i).copied().unwrap_or(f64::NAN);
    (x(b) - x(a)) * (c - b) as f64 - (x(c) - x(b)) * (b - a) as f64
}

/// Where majorant and minorant lie farthest apart: the knots of the minorant and of the majorant
/// around it, and how far, in steps.
struct Gap {
    width: f64,
    low: usize,
    high: usize,
}

/// The majorant runs through the upper ends of the steps (index + 1), the minorant through the
/// lower (index): one step more than between indices.
fn widest_gap(values: &[f64], minorant: &[usize], majorant: &[usize]) -> Gap {
    let whole = |knots: &[usize]| (knots.first().copied(), knots.last().copied());
    let (first, last) = match whole(minorant) {
        (Some(first), Some(last)) => (first, last),
        _ => (0, 0),
    };
    let mut widest = Gap {
        width: 0.0,
        low: first,
        high: last,
    };
    for (i, &knot) in minorant.iter().enumerate() {
        let Some((before, after)) = around(majorant, knot) else {
            continue;
        };
        let width = line(values, before, after, knot) - knot as f64 + 1.0;
        if width > widest.width && i + 1 < minorant.len() {
            widest = Gap {
                width,
                low: knot,
                high: after,
            };
        }
    }
    for (i, &knot) in majorant.iter().enumerate() {
        let Some((before, after)) = around(minorant, knot) else {
            continue;
        };
        let width = knot as f64 + 1.0 - line(values, before, after, knot);
        if width > widest.width && i > 0 {
            widest = Gap {
                width,
                low: before,
                high: knot,
            };
        }
    }
    widest
}

/// The neighbouring knots with before ≤ index ≤ after.
fn around(knots: &[usize], index: usize) -> Option<(usize, usize)> {
    let place = knots.partition_point(|knot| *knot < index);
    let after = *knots.get(place)?;
    if after == index {
        return Some((index, index));
    }
    Some((*knots.get(place.checked_sub(1)?)?, after))
}

/// Height, in indices, of the line between two points at the value of a third.
fn line(values: &[f64], a: usize, b: usize, at: usize) -> f64 {
    let x = |i: usize| values.get(i).copied().unwrap_or(f64::NAN);
    let run = x(b) - x(a);
    if run <= 0.0 {
        return at as f64;
    }
    a as f64 + (x(at) - x(a)) / run * (b - a) as f64
}

/// The largest distance, in steps, of the step function from a hull, over the stretches of the hull
/// within the range; at least 1.
fn deviation(values: &[f64], hull: &[usize], range: (usize, usize), side: Side) -> f64 {
    let mut largest: f64 = 1.0;
    for stretch in hull.windows(2) {
        let [a, b] = *stretch else { continue };
        if a < range.0 || b > range.1 || b - a < 2 {
            continue;
        }
        for index in a..=b {
            let height = line(values, a, b, index);
            let distance = match side {
                Side::Below => index as f64 + 1.0 - height,
                Side::Above => height - (index as f64 - 1.0),
            };
            largest = largest.max(distance);
        }
    }
    largest
}
