//! Self-resonant frequency: the first frequency, from low to high, where the reactance goes from
//! capacitive to inductive. Not the minimum of |Z|, which lies elsewhere where the resistance
//! changes with frequency (by 29 % for the reference electrolytic of tests/reference).
//!
//! Sign changes closer than 0.1 decade are one crossing if the signs beyond them differ. The
//! crossing is then the root of the reactance of a local fit over ±0.4 decade.

use super::local_fit::{LocalFit, WIDTH, grown};
use super::reading::Estimate;
use super::series::Resonance;
use super::{Reading, Value};
use crate::diagnostic::Note;
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::f64::consts::LN_10;

/// Sign changes closer than this (0.1 decade) belong to one crossing.
const CLUSTER: f64 = 0.1 * LN_10;

/// A crossing of the reactance: ln f of its first and last sign change, and whether it rises.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Crossing {
    first: f64,
    last: f64,
    rises: bool,
}

fn crossings(sweep: &Sweep) -> Vec<Crossing> {
    // (ln f at the change, sign before, sign after)
    let mut changes: Vec<(f64, bool, bool)> = Vec::new();
    let (f, z) = (&sweep.frequency, &sweep.impedance);
    for (i, pair) in (1..).zip(z.windows(2)) {
        // Neighbours of one sign: nearly all.
        if pair[0].im * pair[1].im > 0.0 || pair[1].im == 0.0 {
            continue;
        }
        let (x, before) = (pair[1].im, (0..i).rev().find(|k| z[*k].im != 0.0));
        if let Some(k) = before
            && (z[k].im < 0.0) != (x < 0.0)
        {
            let x0 = z[k].im;
            let share = x0 / (x0 - x);
            changes.push((
                f[k].ln() + share * (f[i].ln() - f[k].ln()),
                x0 > 0.0,
                x > 0.0,
            ));
        }
    }
    let mut found: Vec<Crossing> = Vec::new();
    let mut i = 0;
    while i < changes.len() {
        let mut j = i;
        while j + 1 < changes.len() && changes[j + 1].0 - changes[j].0 < CLUSTER {
            j += 1;
        }
        let (before, after) = (changes[i].1, changes[j].2);
        if before != after {
            found.push(Crossing {
                first: changes[i].0,
                last: changes[j].0,
                rises: after,
            });
        }
        i = j + 1;
    }
    found
}

/// The self-resonant frequency in Hz.
///
/// A sweep that is capacitive up to its end gives `Value::Above` its last frequency; one that is
/// inductive from its start `Value::Below` its first.
pub(super) fn read(sweep: &Sweep) -> Resonance {
    let none = |reading| Resonance {
        outcome: Err(reading),
        resistance: None,
    };
    let n = sweep.frequency.len();
    let found = crossings(sweep);
    let Some(at) = found.iter().position(|c| c.rises) else {
        return none(without_crossing(sweep, &found));
    };
    let crossing = found[at];
    let centre = 0.5 * (crossing.first + crossing.last);
    let lower = if at > 0 {
        0.5 * (found[at - 1].last + crossing.first)
    } else {
        f64::NEG_INFINITY
    };
    let upper = found
        .get(at + 1)
        .map_or(f64::INFINITY, |next| 0.5 * (crossing.last + next.first));
    let half = (WIDTH / 2.0).max(crossing.last - centre + 0.05);
    let Some(resonance) = refine(
        sweep,
        centre.exp(),
        (centre - half).max(lower).exp(),
        (centre + half).min(upper).exp(),
    ) else {
        return none(Reading::missing(
            "srf_not_resolved",
            "the reactance changes sign, but its course there gives no definite crossing; measure again",
        ));
    };
    let value = resonance.frequency;
    // A rotation by φ changes X by R φ, and with it the crossing by −R φ / (dX/d ln f).
    let per_radian = -value * resonance.resistance / resonance.slope;
    let mut estimate = Estimate::new(value, 0.0, per_radian, value * resonance.sigma).at(value);
    let middle = centre.exp();
    let position = sweep.frequency.partition_point(|f| *f < middle);
    if position < 3 || position + 3 > n {
        estimate.warnings.push(Note::new(
            "srf_at_sweep_edge",
            "the self-resonance lies within three points of the sweep's end",
        ));
    }
    if found.iter().filter(|c| c.rises).count() > 1 {
        estimate.warnings.push(Note::new(
            "multiple_resonances",
            "the reactance crosses zero more than once: the first crossing is given; look for a second part left in the jig",
        ));
    }
    Resonance {
        outcome: Ok(estimate),
        resistance: Some(resonance.resistance),
    }
}

fn without_crossing(sweep: &Sweep, found: &[Crossing]) -> Reading {
    let n = sweep.frequency.len();
    let capacitive = sweep.impedance.iter().filter(|z| z.im < 0.0).count();
    let hz = |f: f64| crate::quantity::engineering(f, "Hz", 4);
    let bound = |value: Value, text: String| Reading {
        value,
        standard_uncertainty: None,
        frequency: None,
        warnings: vec![Note::new("srf_outside_sweep", text)],
    };
    if found.is_empty() && capacitive == n {
        let last = sweep.frequency[n - 1];
        return bound(
            Value::Above(last),
            format!(
                "no self-resonance up to the sweep's end: it lies above {}",
                hz(last)
            ),
        );
    }
    if found.is_empty() && capacitive == 0 {
        let first = sweep.frequency[0];
        return bound(
            Value::Below(first),
            format!(
                "inductive from the sweep's start: the self-resonance lies below {}",
                hz(first)
            ),
        );
    }
    Reading::missing(
        "srf_not_resolved",
        "the reactance changes sign without a definite crossing from capacitive to inductive",
    )
}

/// The self-resonance had from a local fit.
struct Root {
    /// Hz
    frequency: f64,
    /// Standard uncertainty of ln f from the fit.
    sigma: f64,
    /// dX/d ln f in Ω.
    slope: f64,
    /// Ω
    resistance: f64,
}

/// The root of the fitted reactance between two frequencies.
fn refine(sweep: &Sweep, centre: f64, low: f64, high: f64) -> Option<Root> {
    let points = &sweep.frequency;
    let range = points.partition_point(|f| *f < low)..points.partition_point(|f| *f <= high);
    let range = grown(points, range, centre, 5);
    let (mut a, mut b) = (points[range.start], points[range.end - 1]);
    let fit = LocalFit::new(sweep, range)?;
    let reactance = |f: f64| fit.impedance(f).im;
    // The window's ends must lie on either side; bisection then cannot fail.
    if !(reactance(a) < 0.0 && reactance(b) > 0.0) {
        return None;
    }
    let mut root = centre;
    for _ in 0..60 {
        let x = reactance(root);
        if x < 0.0 {
            a = root
        } else {
            b = root
        }
        // Newton's step in ln f where it stays inside the bracket, else its middle.
        let next = root * (-x / fit.slope(root).im).exp();
        let next = if next > a && next < b {
            next
        } else {
            (a * b).sqrt()
        };
        let done = (next / root - 1.0).abs() < 1e-14;
        root = next;
        if done {
            break;
        }
    }
    let slope = fit.slope(root).im;
    (slope.is_finite() && slope > 0.0).then(|| Root {
        frequency: root,
        sigma: fit.sigma(root, Complex64::I) / slope,
        slope,
        resistance: fit.impedance(root).re,
    })
}
