//! Smallest equivalent series resistance of the sweep, or of a band.
//!
//! Not the smallest point: the noise of R is a share of |Z|, so that the smallest point of a noisy
//! sweep is the luckiest one, far from resonance. Points whose noise would hide R are left out; a
//! local fit finds the minimum's neighbourhood, and a second fit over ±0.25 decade its value.

use super::at_frequency::{inside, outside};
use super::local_fit::{LocalFit, POLYNOMIAL};
use super::{Budget, Characteristic, Place, Reading};
use crate::diagnostic::Note;
use crate::sweep::Sweep;
use std::f64::consts::LN_10;

/// Half-width of the coarse search's fits: 0.15 decade.
const SEARCH: f64 = 0.15 * LN_10;
/// Half-width of the final fit: 0.25 decade.
const WINDOW: f64 = 0.25 * LN_10;
/// A point counts where its noise is below this share of the local R.
const GATE: f64 = 0.3;

/// Smallest Re Z in Ω; its frequency goes with it.
pub(super) fn read(sweep: &Sweep, place: Place, budget: &Budget) -> Reading {
    let (from, to) = match place {
        Place::Between(from, to) => (from, to),
        _ => (
            sweep.frequency[0],
            sweep.frequency[sweep.frequency.len() - 1],
        ),
    };
    for end in [from, to] {
        if !inside(sweep, end) {
            return outside(sweep, end);
        }
    }
    let start = sweep
        .frequency
        .partition_point(|f| *f < from * (1.0 - 1e-5));
    let end = sweep.frequency.partition_point(|f| *f <= to * (1.0 + 1e-5));
    if end - start < 3 {
        return Reading::missing(
            "too_few_points",
            "fewer than three points in the band: no minimum can be told",
        );
    }
    let noise = relative_noise(sweep, start, end);
    let Some(coarse) = coarse_minimum(sweep, start, end, noise) else {
        return Reading::missing(
            "esr_hidden_by_noise",
            "the noise of the sweep hides the resistance everywhere: average more, or use a jig made for this impedance",
        );
    };
    refine(sweep, start, end, coarse, budget)
}

/// Random noise of R as a share of |Z|, from second differences in neighbouring points (median of
/// absolute values, so that a resonance or a single jump does not count as noise).
fn relative_noise(sweep: &Sweep, start: usize, end: usize) -> f64 {
    let mut differences: Vec<f64> = (start + 1..end.saturating_sub(1))
        .map(|i| {
            let [a, b, c] = [i - 1, i, i + 1].map(|k| sweep.impedance[k].re);
            let [fa, fb, fc] = [i - 1, i, i + 1].map(|k| sweep.frequency[k].ln());
            let share = (fb - fa) / (fc - fa);
            let size = sweep.impedance[i].norm().max(f64::MIN_POSITIVE);
            let scale = (1.0 + share * share + (1.0 - share) * (1.0 - share)).sqrt();
            (b - (a + share * (c - a))).abs() / (size * scale)
        })
        .collect();
    if differences.is_empty() {
        return 0.0;
    }
    differences.sort_by(f64::total_cmp);
    // 1.4826: median absolute value to standard deviation for normal noise.
    1.4826 * differences[differences.len() / 2]
}

/// Index of the point with the smallest smoothed R among the points whose noise does not hide it.
fn coarse_minimum(sweep: &Sweep, start: usize, end: usize, noise: f64) -> Option<usize> {
    let mut best: Option<(usize, f64)> = None;
    for i in start..end {
        let centre = sweep.frequency[i].ln();
        let (low, high) = window(sweep, start, end, centre, SEARCH);
        let Some(fit) = fit_resistance(sweep, low, high, centre) else {
            continue;
        };
        let r = fit.value(0.0);
        let reach = noise * sweep.impedance[i].norm() / ((high - low) as f64).sqrt();
        if r > 0.0 && reach < GATE * r && best.is_none_or(|(_, least)| r < least) {
            best = Some((i, r));
        }
    }
    best.map(|(i, _)| i)
}

fn window(sweep: &Sweep, start: usize, end: usize, centre: f64, half: f64) -> (usize, usize) {
    let middle = sweep.frequency.partition_point(|f| f.ln() < centre);
    let low = sweep
        .frequency
        .partition_point(|f| f.ln() < centre - half)
        .min(middle.saturating_sub(2))
        .max(start);
    let high = sweep
        .frequency
        .partition_point(|f| f.ln() <= centre + half)
        .max((middle + 3).min(end))
        .min(end);
    (low, high)
}

fn fit_resistance(sweep: &Sweep, low: usize, high: usize, centre: f64) -> Option<LocalFit> {
    let (mut t, mut r, mut w) = (Vec::new(), Vec::new(), Vec::new());
    for i in low..high {
        t.push(sweep.frequency[i].ln() - centre);
        r.push(sweep.impedance[i].re);
        w.push(1.0 / sweep.impedance[i].norm().max(f64::MIN_POSITIVE));
    }
    LocalFit::new(&POLYNOMIAL, 3.min(t.len()), &t, &r, &w)
}

fn refine(sweep: &Sweep, start: usize, end: usize, coarse: usize, budget: &Budget) -> Reading {
    let centre = sweep.frequency[coarse].ln();
    let (low, high) = window(sweep, start, end, centre, WINDOW);
    let Some(fit) = fit_resistance(sweep, low, high, centre) else {
        return Reading::missing(
            "too_few_points",
            "too few points around the minimum to read it",
        );
    };
    // The vertex: the least of 200 steps over the inner part of the window, then a golden-section
    // search between its neighbours. Outside the coarse neighbourhood a polynomial proves nothing.
    let reach = (SEARCH).min(WINDOW);
    let first = (sweep.frequency[low].ln() - centre).max(-reach);
    let last = (sweep.frequency[high - 1].ln() - centre).min(reach);
    let step = (last - first) / 200.0;
    let least = (0..=200)
        .min_by(|i, j| {
            fit.value(first + f64::from(*i) * step)
                .total_cmp(&fit.value(first + f64::from(*j) * step))
        })
        .unwrap_or(0);
    let mut a = (first + (f64::from(least) - 1.0) * step).max(first);
    let mut b = (first + (f64::from(least) + 1.0) * step).min(last);
    let golden = 0.618_033_988_749_895;
    for _ in 0..40 {
        let (c, d) = (b - golden * (b - a), a + golden * (b - a));
        if fit.value(c) < fit.value(d) {
            b = d
        } else {
            a = c
        }
    }
    let t = 0.5 * (a + b);
    let value = fit.value(t);
    if !value.is_finite() || value <= 0.0 {
        return Reading::missing(
            "esr_hidden_by_noise",
            "the resistance at its minimum is not above the noise of the sweep",
        );
    }
    let frequency = (centre + t).exp();
    let x = reactance(sweep, frequency);
    let mut reading = Reading::known(
        value,
        budget.combine(Characteristic::EsrMinimum, value, x, fit.sigma(t)),
    );
    reading.frequency = Some(frequency);
    if least == 0 && low == start || least == 200 && high == end {
        reading.warnings.push(Note::new(
            "minimum_at_edge",
            "the resistance still falls at the end of the range: the true minimum may lie beyond it",
        ));
    }
    reading
}

/// X in Ω at a frequency, linear between points: it serves the uncertainty alone.
fn reactance(sweep: &Sweep, frequency: f64) -> f64 {
    let i = sweep
        .frequency
        .partition_point(|f| *f < frequency)
        .clamp(1, sweep.frequency.len() - 1);
    let (f0, f1) = (sweep.frequency[i - 1], sweep.frequency[i]);
    let share = (frequency - f0) / (f1 - f0);
    sweep.impedance[i - 1].im + share * (sweep.impedance[i].im - sweep.impedance[i - 1].im)
}
