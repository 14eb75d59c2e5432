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
use crate::statistics::lanes::{Kernel, Simd, wide};
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::cell::RefCell;
use std::f64::consts::LN_10;
use std::ops::Range;
use std::rc::Rc;

/// Half-width of the running mean: 0.15 decade.
const SEARCH: f64 = 0.15 * LN_10;
/// A running mean counts where its scatter is below this share of it.
const GATE: f64 = 0.3;
/// How far from a fit's centre its minimum is believed: 0.2 decade. Farther off the fit is moved.
const REACH: f64 = 0.2 * LN_10;
/// Steps in which the range of a fit is looked through.
const STEPS: u32 = 40;
/// How often a minimum is come closer to.
const CLOSER: usize = 30;
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

/// Where the fitted R is smallest between two frequencies: the least of some steps in ln f, then the
/// root of its slope between that one's neighbours.
fn minimum(fit: &LocalFit, low: f64, high: f64) -> f64 {
    let factor = (high / low).powf(1.0 / f64::from(STEPS));
    let mut least = (low, f64::INFINITY);
    let mut f = low;
    for r in fit.resistances(low, factor).take(STEPS as usize + 1) {
        if r < least.1 {
            least = (f, r);
        }
        f *= factor;
    }
    let (mut a, mut b) = ((least.0 / factor).max(low), (least.0 * factor).min(high));
    let slope = |f: f64| fit.slope(f).re;
    let (mut at_a, mut at_b) = (slope(a), slope(b));
    // Without a change of sign the least lies at an end of the range.
    if !(at_a < 0.0 && at_b > 0.0) {
        return if at_a < 0.0 { b } else { a };
    }
    // Secants in ln f that keep the bracket; an end that stays twice counts half (Illinois).
    let mut fell = None;
    for _ in 0..CLOSER {
        let next = b * (a / b).powf(at_b / (at_b - at_a));
        let at = slope(next);
        let falls = at < 0.0;
        let again = if fell == Some(falls) { 0.5 } else { 1.0 };
        fell = Some(falls);
        if falls {
            (a, at_a, at_b) = (next, at, again * at_b);
        } else {
            (b, at_b, at_a) = (next, at, again * at_a);
        }
        if b / a < 1.0 + 1e-9 || at == 0.0 {
            break;
        }
    }
    0.5 * (a + b)
}

/// Index of the point whose running mean of R, plus its scatter, is smallest among those that the
/// noise does not hide. Weights are 1/|Z|²; sums are kept so that the whole search is linear.
fn coarse_minimum(sweep: &Sweep, start: usize, end: usize) -> Option<usize> {
    let sums = sums(&sweep.impedance[start..end]);
    let windows = windows(&sweep.frequency[start..end]);
    let (mut best, mut least) = (None, f64::INFINITY);
    // From the end that most minima are nearer to: fewer are the least so far.
    for (at, window) in windows.iter().rev() {
        let (first, last) = (&sums[window.start], &sums[window.end]);
        let (weight, weighted) = (last.weight - first.weight, last.weighted - first.weighted);
        // What is above the least is not it: nearly all are told by this alone.
        if weighted <= 0.0 || weighted > least * weight {
            continue;
        }
        let mean = weighted / weight;
        let noise = (last.noise - first.noise).max(0.0);
        let variance = noise / (weight * window.len() as f64);
        if variance < GATE * GATE * mean * mean && mean + variance.sqrt() <= least {
            (best, least) = (Some(start + at), mean + variance.sqrt());
        }
    }
    best
}

/// A point, and those within [`SEARCH`] of it.
type Window = (usize, Range<usize>);

thread_local! {
    static WINDOWS: RefCell<(Vec<f64>, Rc<[Window]>)> = RefCell::default();
}

/// The windows in which the minimum is looked for: at least three points each, and each an eighth of
/// one on from the one before. They depend on the frequencies alone, so that sweeps alike share them.
fn windows(points: &[f64]) -> Rc<[Window]> {
    WINDOWS.with_borrow_mut(|(known, windows)| {
        if known != points {
            let (mut low, mut high, mut next) = (0, 0, 0);
            let reach = SEARCH.exp();
            let mut all = Vec::new();
            for (i, f) in points.iter().enumerate() {
                while points[low] * reach < *f {
                    low += 1;
                }
                while high < points.len() && points[high] <= f * reach {
                    high += 1;
                }
                // At least three points, so that there is a scatter.
                let window = low.min(i.saturating_sub(1))..high.max((i + 2).min(points.len()));
                if i >= next || i + 1 == points.len() {
                    next = i + (window.len() / 8).max(1);
                    all.push((i, window));
                }
            }
            *windows = all.into();
            points.clone_into(known);
        }
        Rc::clone(windows)
    })
}

/// Running sums of weights, of weighted R, and of the squared noise of R as a share of |Z|.
#[derive(Debug, Clone, Copy, Default)]
struct Sums {
    weight: f64,
    weighted: f64,
    noise: f64,
}

/// Sums of none, of the first point, of the first two, and so on.
fn sums(z: &[Complex64]) -> Vec<Sums> {
    let mut shares = vec![Sums::default(); z.len()];
    wide(Shares { z, to: &mut shares });
    let mut sum = Sums::default();
    let mut all = vec![sum; z.len() + 1];
    for (to, share) in all.iter_mut().skip(1).zip(&shares) {
        sum.weight += share.weight;
        sum.weighted += share.weighted;
        sum.noise += share.noise;
        *to = sum;
    }
    all
}

/// What each point has in the sums.
struct Shares<'a> {
    z: &'a [Complex64],
    to: &'a mut [Sums],
}

impl Kernel for Shares<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self, _: S) {
        for (to, z) in self.to.iter_mut().zip(self.z) {
            to.weight = 1.0 / (z.re * z.re + z.im * z.im).max(f64::MIN_POSITIVE);
            to.weighted = to.weight * z.re;
        }
        // The ends have no second difference; its variance is 6 times that of a point.
        for (to, z) in self.to.iter_mut().skip(1).zip(self.z.windows(3)) {
            let d = z[0].re - 2.0 * z[1].re + z[2].re;
            to.noise = d * d * to.weight * (1.0 / 6.0);
        }
    }
}
