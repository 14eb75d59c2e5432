//! Smallest equivalent series resistance of the sweep, or of a band.
//!
//! Not the smallest point: the noise of R is a share of |Z|, so that the smallest point of a noisy
//! sweep is the luckiest one, far from resonance. A running mean, judged by its own scatter, finds
//! the minimum's neighbourhood; the minimum of a local fit there is the value.

use super::at_frequency::{inside, local, outside};
use super::local_fit::LocalFit;
use super::reading::{Estimate, Outcome};
use super::{Place, Reading};
use crate::diagnostic::Note;
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::f64::consts::LN_10;

/// Half-width of the running mean: 0.15 decade.
const SEARCH: f64 = 0.15 * LN_10;
/// A running mean counts where its scatter is below this share of it.
const GATE: f64 = 0.3;
/// How far from a fit's centre its minimum is believed: 0.2 decade. Farther off the fit is moved.
const REACH: f64 = 0.2 * LN_10;
/// Share of the golden section, (3 − √5)/2.
const GOLDEN: f64 = 0.381_966_011_250_105;
/// How often the fit may be moved.
const MOVES: usize = 8;

/// Smallest Re Z in Ω; its frequency goes with it.
pub(super) fn read(sweep: &Sweep, place: Place) -> Outcome {
    let points = &sweep.frequency;
    let (from, to) = match (place, points.first(), points.last()) {
        (Place::Between(from, to), _, _) => (from, to),
        (_, Some(first), Some(last)) => (*first, *last),
        _ => return Err(too_few("the sweep is empty")),
    };
    for end in [from, to] {
        if !inside(sweep, end) {
            return Err(outside(sweep, end));
        }
    }
    let start = points.partition_point(|f| *f < from * (1.0 - 1e-5));
    let end = points.partition_point(|f| *f <= to * (1.0 + 1e-5));
    if end < start + 3 {
        return Err(too_few(
            "fewer than three points in the band: no minimum can be told",
        ));
    }
    let Some(coarse) = coarse_minimum(sweep, start, end) else {
        return Err(hidden());
    };
    let (mut centre, mut found) = (points[coarse], None);
    for _ in 0..MOVES {
        let Some(fit) = local(sweep, centre) else {
            return Err(too_few("too few points around the minimum to read it"));
        };
        let (low, high) = (
            from.max(centre * (-REACH).exp()),
            to.min(centre * REACH.exp()),
        );
        let at = minimum(&fit, low, high);
        let settled = (at > low * 1.001 || low <= from) && (at < high * 0.999 || high >= to);
        found = Some((fit, at));
        if settled {
            break;
        }
        centre = at;
    }
    match found {
        Some((fit, at)) => Ok(estimate(&fit, at, from, to)),
        None => Err(hidden()),
    }
}

fn too_few(text: &str) -> Reading {
    Reading::missing("too_few_points", text)
}

fn hidden() -> Reading {
    Reading::missing(
        "esr_hidden_by_noise",
        "the noise of the sweep hides the resistance everywhere: average more, or use a jig made for this impedance",
    )
}

fn estimate(fit: &LocalFit, at: f64, from: f64, to: f64) -> Estimate {
    let z = fit.impedance(at);
    let mut estimate = Estimate::new(z.re, 1.0, -z.im, fit.sigma(at, Complex64::ONE)).at(at);
    if at <= from * 1.001 || at >= to * 0.999 {
        estimate.warnings.push(Note::new(
            "minimum_at_edge",
            "the resistance still falls at the end of the range: the true minimum may lie beyond it",
        ));
    }
    estimate
}

/// Where the fitted R is smallest between two frequencies: the least of 40 steps in ln f, then golden
/// sections between its neighbours.
fn minimum(fit: &LocalFit, low: f64, high: f64) -> f64 {
    let [first, last] = [low, high].map(|f| (f / fit.centre()).ln());
    let resistance = |x: f64| fit.resistance(x);
    let step = (last - first) / 40.0;
    let mut least = (first, f64::INFINITY);
    for i in 0..=40 {
        let x = first + step * f64::from(i);
        let r = resistance(x);
        if r < least.1 {
            least = (x, r);
        }
    }
    let (mut a, mut b) = ((least.0 - step).max(first), (least.0 + step).min(last));
    // Each step keeps one of its two inner points for the next.
    let third = GOLDEN * (b - a);
    let (mut c, mut d) = (a + third, b - third);
    let (mut at_c, mut at_d) = (resistance(c), resistance(d));
    for _ in 0..30 {
        if at_c < at_d {
            (b, d, at_d) = (d, c, at_c);
            c = a + GOLDEN * (b - a);
            at_c = resistance(c);
        } else {
            (a, c, at_c) = (c, d, at_d);
            d = b - GOLDEN * (b - a);
            at_d = resistance(d);
        }
    }
    (fit.centre() * (0.5 * (a + b)).exp()).clamp(low, high)
}

/// Index of the point whose running mean of R, plus its scatter, is smallest among those that the
/// noise does not hide. Weights are 1/|Z|²; sums are kept so that the whole search is linear.
fn coarse_minimum(sweep: &Sweep, start: usize, end: usize) -> Option<usize> {
    let sums = Sums::new(sweep, start, end);
    let points = &sweep.frequency[start..end];
    let (mut low, mut high) = (0, 0);
    let (mut best, mut least) = (None, f64::INFINITY);
    let reach = SEARCH.exp();
    for (i, f) in points.iter().enumerate() {
        while points[low] * reach < *f {
            low += 1;
        }
        while high < points.len() && points[high] <= f * reach {
            high += 1;
        }
        // At least three points, so that there is a scatter.
        let window = low.min(i.saturating_sub(1))..high.max((i + 2).min(points.len()));
        let [weight, weighted, noise] = sums.of(&window);
        // What is not below the least is not it: nearly all are told by this alone.
        if weighted <= 0.0 || weighted >= least * weight {
            continue;
        }
        let mean = weighted / weight;
        let variance = noise / (weight * window.len() as f64);
        if variance < GATE * GATE * mean * mean && mean + variance.sqrt() < least {
            (best, least) = (Some(start + i), mean + variance.sqrt());
        }
    }
    best
}

/// Running sums of weights, of weighted R, and of the squared noise of R as a share of |Z|.
struct Sums(Vec<[f64; 3]>);

impl Sums {
    fn new(sweep: &Sweep, start: usize, end: usize) -> Sums {
        let z = &sweep.impedance[start..end];
        // Sums of 1/|Z|² over many decades of |Z| lose digits; relative to the largest they keep 10.
        let mut sums = [0.0; 3];
        let mut all = Vec::with_capacity(z.len() + 1);
        all.push(sums);
        for i in 0..z.len() {
            let w = 1.0 / z[i].norm_sqr().max(f64::MIN_POSITIVE);
            sums[0] += w;
            sums[1] += w * z[i].re;
            // Second differences: variance 6 times that of a point.
            if i > 0 && i + 1 < z.len() {
                let d = z[i - 1].re - 2.0 * z[i].re + z[i + 1].re;
                sums[2] += d * d * w / 6.0;
            }
            all.push(sums);
        }
        Sums(all)
    }

    /// Over points of the range: weight, weighted R, noise.
    fn of(&self, range: &std::ops::Range<usize>) -> [f64; 3] {
        let (first, last) = (&self.0[range.start], &self.0[range.end]);
        let [weight, weighted, noise] = std::array::from_fn(|k| last[k] - first[k]);
        [weight, weighted, noise.max(0.0)]
    }
}
