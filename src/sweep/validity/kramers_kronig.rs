//! Linear Kramers-Kronig consistency: whether a sweep can be that of a linear, stable part that did
//! not change while it was measured.
//!
//! Boukamp, J. Electrochem. Soc. 142 (1995) 1885; Schönleber, Klotz and Ivers-Tiffée, Electrochim.
//! Acta 131 (2014) 20. Fitted is `R + jωL + 1/(jωC) + Σ R_k/(1 + jωτ_k)` with fixed time constants,
//! three a decade: a linear problem. The published rule for their number is for batteries and stops
//! much too early for capacitors, whose skin effect and ladders need negative `R_k`; the series
//! terms L and C are indispensable. Residuals are taken relative to the envelope of the impedance
//! (the larger of capacitive, inductive and resistive part, without the dip at resonance), and their
//! means over blocks of points are held against the sweep's own noise.
//!
//! The columns depend only on the frequency list and on the envelope's coarse form, so their
//! orthogonal basis is made once for all parts of a lot.

use super::noise::Noise;
use super::order::median;
use super::{Evidence, FLOOR};
use crate::diagnostic::Note;
use crate::statistics::lanes::dot;
use crate::sweep::Sweep;
use crate::sweep::faults::hertz;
use num_complex::Complex64;
use std::cell::RefCell;
use std::f64::consts::TAU;
use std::rc::Rc;

/// Time constants in a decade.
const PER_DECADE: f64 = 3.0;

/// The time constants reach so far beyond the sweep: jigs and references have theirs there.
const BEYOND: f64 = 10.0;

/// Fewer points than this for each unknown, or less than a decade, show nothing.
const POINTS_PER_TERM: usize = 2;

/// Points of one block.
const BLOCK: usize = 10;

/// A block's mean residual of so many times its own noise is not noise.
const SIGNIFICANT: f64 = 6.0;

/// What the fixed terms leave of a sound part (relative); clean reference parts stay below 0.3 %.
const MODEL: f64 = 8e-3;

/// The loss of the envelope is at most a factor of 100, in half nepers.
const LOSS: i32 = 9;

/// Bases kept by each thread.
const KEPT: usize = 8;

/// What a basis depends on.
#[derive(Debug, Clone, PartialEq)]
struct Key {
    frequency: Vec<f64>,
    /// Resonance of the envelope, in half nepers.
    resonance: i32,
    /// Resistance over the reactance at that resonance, in half nepers.
    loss: i32,
}

struct Basis {
    key: Key,
    /// Orthonormal columns times the weight, so that they go with the impedance as it is.
    columns: Vec<Column>,
    /// Means of each orthonormal column over the blocks of points.
    means: Vec<Vec<Complex64>>,
    weight: Vec<f64>,
}

/// Real and imaginary parts of all points.
struct Column {
    re: Vec<f64>,
    im: Vec<f64>,
}

thread_local! {
    static BASES: RefCell<Vec<Rc<Basis>>> = const { RefCell::new(Vec::new()) };
}

/// Checks a sweep with one resonance at most.
pub(super) fn check(sweep: &Sweep, evidence: &Evidence, noise: &Noise) -> Option<Note> {
    let (from, to) = quiet(sweep, noise)?;
    let frequency = sweep.frequency.get(from..to)?;
    let re = noise.re.get(from..to)?;
    let im = noise.im.get(from..to)?;
    let (resonance, loss) = envelope(frequency, re, im)?;
    let basis = basis(frequency, resonance, loss)?;
    let residual = block_residuals(&basis, re, im);
    let square = noise.square.get(from..to)?;
    let noises = block_noises(noise.variance.get(from..to)?, square, &basis.weight);
    // The typical weighted impedance is what residuals are relative to.
    let scale = median(squared_sizes(square, &basis.weight)).sqrt();
    let points = square.len();
    let (at, found) = worst_block(&residual, &noises, points, evidence.systematic(), scale)?;
    let f = hertz(frequency.get(at).copied().unwrap_or(f64::NAN));
    Some(Note::new(
        "kramers_kronig",
        format!(
            "around {f} the sweep is {:.1} % off what any unchanging part can show: the contact or the part drifted during the sweep, or the calibration is off; reseat the part and measure again",
            found * 100.0
        ),
    ))
}

/// The stretch of the sweep with little noise, begun and ended on multiples of eight points so that
/// sweeps alike share a basis.
fn quiet(sweep: &Sweep, noise: &Noise) -> Option<(usize, usize)> {
    let n = sweep.frequency.len();
    let from = (0..n)
        .rev()
        .find(|&i| noise.exceeds(i, FLOOR))
        .map_or(0, |i| (i + 1).next_multiple_of(8));
    // Noise at the upper end alone (a series-through jig) ends the stretch instead.
    let (from, to) = if from > n / 2 {
        (
            0,
            (0..n)
                .find(|&i| noise.exceeds(i, FLOOR))
                .map_or(n, |i| i / 8 * 8),
        )
    } else {
        (from, n)
    };
    let decades = (sweep.frequency.get(to.checked_sub(1)?)? / sweep.frequency.get(from)?).log10();
    let terms = ((decades + 1.0) * PER_DECADE) as usize + 4;
    (decades > 1.0 && to - from >= POINTS_PER_TERM * terms).then_some((from, to))
}

/// Coarse form of the impedance: resonance and loss in half nepers.
fn envelope(frequency: &[f64], re: &[f64], im: &[f64]) -> Option<(i32, i32)> {
    let crossing = im
        .iter()
        .rposition(|x| *x < 0.0)
        .and_then(|i| frequency.get(i));
    let resonance = *crossing?;
    let reactance = im.first()?.abs() * frequency.first()? / resonance;
    // The class of the resistance that a tenth of the points stay below, by counting.
    let tenth = re.len() / 10;
    let within = |class: i32| {
        let limit = reactance * (0.5 * (f64::from(class) + 0.5)).exp();
        re.iter().filter(|r| r.abs() < limit).count() > tenth
    };
    let (mut least, mut most) = (-LOSS, LOSS);
    while least < most {
        let middle = (least + most).div_euclid(2);
        if within(middle) {
            most = middle;
        } else {
            least = middle + 1;
        }
    }
    Some(((2.0 * resonance.max(1e-6).ln()).round() as i32, most))
}

fn basis(frequency: &[f64], resonance: i32, loss: i32) -> Option<Rc<Basis>> {
    BASES.with(|bases| {
        let mut bases = bases.try_borrow_mut().ok()?;
        let known = |b: &Rc<Basis>| {
            b.key.resonance == resonance && b.key.loss == loss && b.key.frequency == frequency
        };
        if let Some(basis) = bases.iter().find(|b| known(b)) {
            return Some(Rc::clone(basis));
        }
        let key = Key {
            frequency: frequency.to_vec(),
            resonance,
            loss,
        };
        let basis = Rc::new(Basis::new(key)?);
        if bases.len() >= KEPT {
            bases.remove(0);
        }
        bases.push(Rc::clone(&basis));
        Some(basis)
    })
}

impl Basis {
    fn new(key: Key) -> Option<Basis> {
        let f0 = (f64::from(key.resonance) / 2.0).exp();
        let loss = (f64::from(key.loss) / 2.0).exp();
        // 1 over the envelope, in units of the reactance at resonance.
        let weight: Vec<f64> = key
            .frequency
            .iter()
            .map(|f| 1.0 / (f0 / f).max(f / f0).max(loss))
            .collect();
        let (low, high) = (
            TAU * key.frequency.first()?,
            TAU * key.frequency.last()? * BEYOND,
        );
        let count = ((high / low).log10() * PER_DECADE).ceil() as usize + 1;
        let step = (high / low).ln() / (count.max(2) - 1) as f64;
        let tau = (0..count).map(|k| 1.0 / (low * (step * k as f64).exp()));
        let j = Complex64::i();
        let column = |term: &dyn Fn(f64) -> Complex64| -> Vec<f64> {
            let values: Vec<Complex64> = key
                .frequency
                .iter()
                .zip(&weight)
                .map(|(f, w)| term(TAU * f) * w)
                .collect();
            values
                .iter()
                .map(|v| v.re)
                .chain(values.iter().map(|v| v.im))
                .collect()
        };
        let mut raw = vec![
            column(&|w| (j * w).finv()),
            column(&|w| j * w),
            column(&|_| 1.0.into()),
        ];
        raw.extend(tau.map(|tau| column(&|w| (1.0 + j * (w * tau)).finv())));
        let columns = orthonormal(raw);
        let halves = || columns.iter().map(|c| c.split_at(c.len() / 2));
        let even = vec![1.0; weight.len()];
        let means = halves()
            .map(|(re, im)| block_means(re, im, &even))
            .collect();
        let weighted =
            |half: &[f64]| -> Vec<f64> { half.iter().zip(&weight).map(|(v, w)| v * w).collect() };
        let columns = halves()
            .map(|(re, im)| Column {
                re: weighted(re),
                im: weighted(im),
            })
            .collect();
        Some(Basis {
            key,
            columns,
            means,
            weight,
        })
    }
}

/// Gram-Schmidt, twice over for the digits; columns that add nothing are left out.
fn orthonormal(raw: Vec<Vec<f64>>) -> Vec<Vec<f64>> {
    let mut columns: Vec<Vec<f64>> = Vec::with_capacity(raw.len());
    for mut column in raw {
        let before = dot(&column, &column).sqrt();
        for _ in 0..2 {
            for known in &columns {
                let share = dot(known, &column);
                subtract(&mut column, known, share);
            }
        }
        let norm = dot(&column, &column).sqrt();
        if norm > 1e-11 * before {
            column.iter_mut().for_each(|v| *v /= norm);
            columns.push(column);
        }
    }
    columns
}

fn subtract(from: &mut [f64], what: &[f64], share: f64) {
    for (value, w) in from.iter_mut().zip(what) {
        *value -= share * w;
    }
}

/// Means over blocks of points of weighted values.
fn block_means(re: &[f64], im: &[f64], weight: &[f64]) -> Vec<Complex64> {
    let mean = |block: &[f64], weight: &[f64]| {
        let terms = block.iter().zip(weight).map(|(v, w)| v * w);
        terms.sum::<f64>() / block.len() as f64
    };
    re.chunks(BLOCK)
        .zip(im.chunks(BLOCK))
        .zip(weight.chunks(BLOCK))
        .map(|((re, im), w)| Complex64::new(mean(re, w), mean(im, w)))
        .collect()
}

/// Block means of what no combination of the terms explains, weighted. Only the means are looked at, so
/// that the columns' shares are taken out of the means and not of every point.
fn block_residuals(basis: &Basis, re: &[f64], im: &[f64]) -> Vec<Complex64> {
    let mut rest = block_means(re, im, &basis.weight);
    for (column, means) in basis.columns.iter().zip(&basis.means) {
        let share = dot(&column.re, re) + dot(&column.im, im);
        for (value, mean) in rest.iter_mut().zip(means) {
            *value -= mean * share;
        }
    }
    rest
}

/// Squares of the weighted magnitudes.
fn squared_sizes<'a>(square: &'a [f64], weight: &'a [f64]) -> impl Iterator<Item = f64> {
    square.iter().zip(weight).map(|(s, w)| s * (w * w))
}

/// The largest weighted noise in each block of points.
fn block_noises(variance: &[f64], square: &[f64], weight: &[f64]) -> Vec<f64> {
    variance
        .chunks(BLOCK)
        .zip(square.chunks(BLOCK).zip(weight.chunks(BLOCK)))
        .map(|(variance, (square, weight))| {
            let sizes = squared_sizes(square, weight);
            let all = variance.iter().zip(sizes).map(|(v, s)| v * s);
            all.fold(0.0, |most, v| if v > most { v } else { most })
                .sqrt()
        })
        .collect()
}

/// The block of points whose mean residual stands out most, as centre index and relative size.
/// `noises` is the largest of each block, `points` the number of points in all blocks.
fn worst_block(
    means: &[Complex64],
    noises: &[f64],
    points: usize,
    systematic: f64,
    scale: f64,
) -> Option<(usize, f64)> {
    let mut worst: Option<(usize, f64, f64)> = None;
    for (at, mean) in means.iter().enumerate() {
        let start = at * BLOCK;
        let length = BLOCK.min(points.saturating_sub(start));
        let (m, mean) = (length as f64, mean.norm_sqr().sqrt() / scale);
        // The fit lets noise of the neighbouring points through as well.
        let around = noises.iter().skip(at.saturating_sub(1));
        let around = around.take(if at == 0 { 2 } else { 3 });
        let around = around.copied().fold(0.0, f64::max) / scale;
        let allowed = SIGNIFICANT * around / m.sqrt() + systematic + MODEL;
        let excess = mean / allowed;
        if worst.is_none_or(|(_, _, most)| excess > most) {
            worst = Some((start + length / 2, mean, excess));
        }
    }
    worst
        .filter(|(_, _, excess)| *excess > 1.0)
        .map(|(at, mean, _)| (at, mean))
}
