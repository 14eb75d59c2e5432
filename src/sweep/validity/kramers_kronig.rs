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
//! On dense lists the terms are fitted to sums over groups of a few neighbouring points, which leave several
//! groups for each unknown: what the terms can show they show in the sums as well. The columns depend only on the
//! frequency list and on the envelope's coarse form, so their orthogonal basis is made once for all parts of a lot.

use super::neighbours::Neighbours;
use super::noise::Noise;
use super::order::median;
use super::{Evidence, FLOOR};
use crate::diagnostic::Note;
use crate::statistics::lanes::{
    Kernel, LANES, Lanes, Simd, chunks, dot, filled, four_products, wide,
};
use crate::sweep::Sweep;
use crate::sweep::faults::hertz;
use num_complex::Complex64;
use std::array::from_fn;
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

/// Points of one group where there are enough of them, otherwise one; a block holds whole groups.
const GROUP: usize = 5;

/// A group reaches over no more than this in ln f, so that it is small beside what a term changes in.
const WIDEST: f64 = 0.25;

/// So many groups for each unknown, or each point is taken by itself.
const GROUPS_PER_TERM: usize = 3;

/// Columns that are worked on at once.
const TOGETHER: usize = 4;

/// A block's mean residual of so many times its own noise is not noise.
const SIGNIFICANT: f64 = 6.0;

/// What the fixed terms leave of a sound part (relative); clean reference parts stay below 0.3 %.
const MODEL: f64 = 8e-3;

/// The loss of the envelope is at most a factor of 100, in half nepers.
const LOSS: i32 = 9;

/// Bases kept by each thread.
const KEPT: usize = 8;

/// What a basis depends on.
#[derive(Debug, Clone)]
struct Key {
    /// Those of the sweep's frequency list.
    list: Rc<Neighbours>,
    /// The stretch of it.
    from: usize,
    to: usize,
    /// Resonance of the envelope, in half nepers.
    resonance: i32,
    /// Resistance over the reactance at that resonance, in half nepers.
    loss: i32,
}

impl Key {
    fn frequency(&self) -> &[f64] {
        self.list
            .frequency()
            .get(self.from..self.to)
            .unwrap_or_default()
    }

    fn is(&self, other: &Key) -> bool {
        let coarse = |key: &Key| (key.from, key.to, key.resonance, key.loss);
        coarse(self) == coarse(other)
            && (Rc::ptr_eq(&self.list, &other.list) || self.frequency() == other.frequency())
    }
}

struct Basis {
    key: Key,
    /// Points of one group.
    group: usize,
    /// One over the envelope at each point.
    weight: Vec<f64>,
    /// Orthonormal columns for the sums over groups, real parts before imaginary ones, in whole lanes; behind the
    /// last of them columns of zeros to a multiple of `TOGETHER`.
    columns: Vec<Vec<f64>>,
    /// Means over the blocks of points, real parts before imaginary ones, in whole lanes: for each lane of blocks
    /// those of all columns.
    means: Vec<Vec<[f64; LANES]>>,
    /// One over the points of each block, laid out like the means.
    share: Vec<[f64; LANES]>,
}

thread_local! {
    static BASES: RefCell<Vec<Rc<Basis>>> = const { RefCell::new(Vec::new()) };
}

/// Checks a sweep with one resonance at most.
pub(super) fn check(sweep: &Sweep, evidence: &Evidence, noise: &Noise) -> Option<Note> {
    let (from, to) = quiet(sweep, noise)?;
    let frequency = sweep.frequency.get(from..to)?;
    let re = noise.re().get(from..to)?;
    let im = noise.im().get(from..to)?;
    let square = noise.square().get(from..to)?;
    let (resonance, loss) = wide(Envelope { frequency, re, im })?;
    let list = Rc::clone(noise.neighbours());
    let basis = basis(Key {
        list,
        from,
        to,
        resonance,
        loss,
    })?;
    let systematic = evidence.systematic();
    let residual = wide(Residual {
        basis: &basis,
        re,
        im,
        square,
        systematic,
    })?;
    let variance = noise.variance().get(from..to)?;
    let noises = block_noises(variance, &basis.weight);
    // The typical weighted impedance is what residuals are relative to.
    let scale = median(squared_sizes(square, &basis.weight)).sqrt();
    let means = complex(residual.as_flattened(), noises.len());
    let (at, found) = worst_block(&means, &noises, square.len(), systematic, scale)?;
    let f = hertz(frequency.get(at).copied().unwrap_or(f64::NAN));
    Some(Note::new(
        "kramers_kronig",
        format!(
            "around {f} the sweep is {:.1} % off what any unchanging part can show: the contact or the part drifted during the sweep, or the calibration is off; reseat the part and measure again",
            found * 100.0
        ),
    ))
}

/// The residual of a sweep by blocks, where one of them may stand out.
struct Residual<'a> {
    basis: &'a Basis,
    re: &'a [f64],
    im: &'a [f64],
    square: &'a [f64],
    systematic: f64,
}

impl Kernel for Residual<'_> {
    type Output = Option<Vec<[f64; LANES]>>;

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) -> Self::Output {
        let residual = self.basis.residual(simd, self.re, self.im);
        let least = largest_square(&residual) / (self.systematic + MODEL).powi(2);
        is_typical_below(least, self.square, &self.basis.weight).then_some(residual)
    }
}

/// The largest squared magnitude of values whose real parts stand before the imaginary ones, each half in whole lanes.
#[inline(always)]
fn largest_square(values: &[[f64; LANES]]) -> f64 {
    let (re, im) = values.split_at(values.len() / 2);
    let mut largest = [0.0; LANES];
    for (re, im) in re.iter().zip(im) {
        largest = from_fn(|i| {
            let square = re[i] * re[i] + im[i] * im[i];
            if square > largest[i] {
                square
            } else {
                largest[i]
            }
        });
    }
    largest.into_iter().fold(0.0, f64::max)
}

/// Whether the median of the squared weighted magnitudes is below a value: where it is not, no block stands out,
/// whatever the noise.
#[inline(always)]
fn is_typical_below(value: f64, square: &[f64], weight: &[f64]) -> bool {
    let mut below = 0u64;
    for (s, w) in square.iter().zip(weight) {
        below += u64::from(s * (w * w) < value);
    }
    below > square.len() as u64 / 2
}

/// The stretch of the sweep with little noise, begun and ended on multiples of eight points so that
/// sweeps alike share a basis.
fn quiet(sweep: &Sweep, noise: &Noise) -> Option<(usize, usize)> {
    let n = sweep.frequency.len();
    if !noise.is_noisy_anywhere() {
        return long_enough(sweep, 0, n);
    }
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
    long_enough(sweep, from, to)
}

/// A stretch of the sweep, where it has points enough.
fn long_enough(sweep: &Sweep, from: usize, to: usize) -> Option<(usize, usize)> {
    let decades = (sweep.frequency.get(to.checked_sub(1)?)? / sweep.frequency.get(from)?).log10();
    let terms = ((decades + 1.0) * PER_DECADE) as usize + 4;
    (decades > 1.0 && to - from >= POINTS_PER_TERM * terms).then_some((from, to))
}

/// Coarse form of the impedance: resonance and loss in half nepers.
struct Envelope<'a> {
    frequency: &'a [f64],
    re: &'a [f64],
    im: &'a [f64],
}

impl Kernel for Envelope<'_> {
    type Output = Option<(i32, i32)>;

    #[inline(always)]
    fn run<S: Simd>(self, _: S) -> Self::Output {
        let Envelope { frequency, re, im } = self;
        let crossing = im.iter().rposition(|x| *x < 0.0);
        let resonance = *frequency.get(crossing?)?;
        let reactance = im.first()?.abs() * frequency.first()? / resonance;
        // The class of the resistance that a tenth of the points stay below, by counting.
        let tenth = re.len() as u64 / 10;
        let (mut least, mut most) = (-LOSS, LOSS);
        while least < most {
            let middle = (least + most).div_euclid(2);
            let limit = reactance * (0.5 * (f64::from(middle) + 0.5)).exp();
            let mut below = 0u64;
            for r in re {
                below += u64::from(r.abs() < limit);
            }
            if below > tenth {
                most = middle;
            } else {
                least = middle + 1;
            }
        }
        Some(((2.0 * resonance.max(1e-6).ln()).round() as i32, most))
    }
}

fn basis(key: Key) -> Option<Rc<Basis>> {
    BASES.with(|bases| {
        let mut bases = bases.try_borrow_mut().ok()?;
        if let Some(basis) = bases.iter().find(|b| b.key.is(&key)) {
            return Some(Rc::clone(basis));
        }
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
        let frequency = key.frequency();
        let f0 = (f64::from(key.resonance) / 2.0).exp();
        let loss = (f64::from(key.loss) / 2.0).exp();
        // 1 over the envelope, in units of the reactance at resonance.
        let weight: Vec<f64> = frequency
            .iter()
            .map(|f| 1.0 / (f0 / f).max(f / f0).max(loss))
            .collect();
        let (low, high) = (TAU * frequency.first()?, TAU * frequency.last()? * BEYOND);
        let count = ((high / low).log10() * PER_DECADE).ceil() as usize + 1;
        let step = (high / low).ln() / (count.max(2) - 1) as f64;
        let tau = (0..count).map(|k| 1.0 / (low * (step * k as f64).exp()));
        let narrow = frequency.chunks(GROUP).all(|points| {
            let ends = points.first().zip(points.last());
            ends.is_some_and(|(first, last)| (last / first).ln() <= WIDEST)
        });
        let enough = frequency.len() >= GROUPS_PER_TERM * GROUP * (count + 3);
        let group = if enough && narrow { GROUP } else { 1 };
        // The noise of a sum goes with the root of its points.
        let roots: Vec<f64> = frequency
            .chunks(group)
            .map(|points| (points.len() as f64).sqrt())
            .collect();
        let j = Complex64::i();
        let column = |term: &dyn Fn(f64) -> Complex64| -> Vec<f64> {
            let groups = frequency.chunks(group).zip(weight.chunks(group));
            let sums = groups.zip(&roots).map(|((frequency, weight), root)| {
                let points = frequency.iter().zip(weight);
                points.map(|(f, w)| term(TAU * f) * w).sum::<Complex64>() / root
            });
            laid_out(&sums.collect::<Vec<_>>())
        };
        let mut raw = vec![
            column(&|w| (j * w).finv()),
            column(&|w| j * w),
            column(&|_| 1.0.into()),
        ];
        raw.extend(tau.map(|tau| column(&|w| (1.0 + j * (w * tau)).finv())));
        let mut columns = orthonormal(raw);
        let length = columns.first()?.len();
        columns.resize(columns.len().next_multiple_of(TOGETHER), vec![0.0; length]);
        let points = frequency.chunks(BLOCK).map(|block| block.len() as f64);
        let points: Vec<f64> = points.collect();
        let in_block = BLOCK / group;
        let means = columns.iter().map(|column| {
            let sums = complex(column, roots.len());
            let sums: Vec<Complex64> = sums.iter().zip(&roots).map(|(v, root)| v * root).collect();
            let blocks = sums.chunks(in_block).zip(&points);
            let means = blocks.map(|(sums, points)| sums.iter().sum::<Complex64>() / points);
            laid_out(&means.collect::<Vec<_>>())
        });
        let means: Vec<Vec<f64>> = means.collect();
        let share: Vec<Complex64> = points
            .iter()
            .map(|m| Complex64::new(1.0 / m, 1.0 / m))
            .collect();
        let share = chunks(&laid_out(&share)).to_vec();
        let means = (0..share.len())
            .map(|at| {
                means
                    .iter()
                    .filter_map(|m| chunks(m).get(at).copied())
                    .collect()
            })
            .collect();
        // From the sums as they are to those of even noise.
        for column in &mut columns {
            for half in column.chunks_mut(length / 2) {
                half.iter_mut().zip(&roots).for_each(|(v, root)| *v /= root);
            }
        }
        Some(Basis {
            key,
            group,
            weight,
            columns,
            means,
            share,
        })
    }

    /// Block means of what no combination of the terms explains, weighted, real parts before imaginary ones. Only the
    /// means are looked at, so that the columns' shares are taken out of the means and not of every point.
    #[inline(always)]
    fn residual<S: Simd>(&self, simd: S, re: &[f64], im: &[f64]) -> Vec<[f64; LANES]> {
        let length = self.columns.first().map_or(0, Vec::len);
        let mut sums = vec![0.0; length];
        let (re_sums, im_sums) = sums.split_at_mut(length / 2);
        group_sums(self.group, re, &self.weight, re_sums);
        group_sums(self.group, im, &self.weight, im_sums);
        let mut rest = vec![[0.0; LANES]; self.share.len()];
        let (re_rest, im_rest) = rest.split_at_mut(self.share.len() / 2);
        block_sums(BLOCK / self.group, re_sums, re_rest.as_flattened_mut());
        block_sums(BLOCK / self.group, im_sums, im_rest.as_flattened_mut());
        let mut shares = Vec::with_capacity(self.columns.len());
        for columns in self.columns.as_chunks::<TOGETHER>().0 {
            let columns = columns.each_ref().map(Vec::as_slice);
            shares.extend(four_products(simd, columns, &sums));
        }
        for ((rest, share), means) in rest.iter_mut().zip(&self.share).zip(&self.means) {
            let mut left = Lanes::of(simd, rest).times(Lanes::of(simd, share));
            for (share, mean) in shares.iter().zip(means) {
                left = left.minus(Lanes::of(simd, mean).times(Lanes::all(simd, *share)));
            }
            left.store(rest);
        }
        rest
    }
}

/// Real parts before imaginary ones, each filled up to whole lanes.
fn laid_out(values: &[Complex64]) -> Vec<f64> {
    let mut all = filled(values.iter().map(|v| v.re));
    all.extend(filled(values.iter().map(|v| v.im)));
    all
}

/// The first values of what is laid out so.
fn complex(laid_out: &[f64], count: usize) -> Vec<Complex64> {
    let (re, im) = laid_out.split_at(laid_out.len() / 2);
    let all = re.iter().zip(im).take(count);
    all.map(|(re, im)| Complex64::new(*re, *im)).collect()
}

/// Sums over groups of points of weighted values.
#[inline(always)]
fn group_sums(group: usize, values: &[f64], weight: &[f64], sums: &mut [f64]) {
    match group {
        GROUP => sums_of::<GROUP>(values, weight, sums),
        _ => sums_of::<1>(values, weight, sums),
    }
}

#[inline(always)]
fn sums_of<const N: usize>(values: &[f64], weight: &[f64], sums: &mut [f64]) {
    let (groups, rest) = values.as_chunks::<N>();
    let (weights, weights_rest) = weight.as_chunks::<N>();
    let mut sums = sums.iter_mut();
    for ((values, weights), sum) in groups.iter().zip(weights).zip(&mut sums) {
        let terms: [f64; N] = from_fn(|i| values[i] * weights[i]);
        *sum = terms.iter().sum();
    }
    if let Some(sum) = sums.next() {
        *sum = rest.iter().zip(weights_rest).map(|(v, w)| v * w).sum();
    }
}

/// Sums over blocks of so many groups.
#[inline(always)]
fn block_sums(groups: usize, sums: &[f64], blocks: &mut [f64]) {
    for (block, sums) in blocks.iter_mut().zip(sums.chunks(groups)) {
        *block = sums.iter().sum();
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

/// Squares of the weighted magnitudes.
fn squared_sizes<'a>(square: &'a [f64], weight: &'a [f64]) -> impl Iterator<Item = f64> {
    square.iter().zip(weight).map(|(s, w)| s * (w * w))
}

/// The largest weighted noise in each block of points, from the variances in Ω².
fn block_noises(variance: &[f64], weight: &[f64]) -> Vec<f64> {
    let blocks = variance.chunks(BLOCK).zip(weight.chunks(BLOCK));
    blocks
        .map(|(variance, weight)| {
            let all = variance.iter().zip(weight).map(|(v, w)| v * (w * w));
            all.fold(0.0, f64::max).sqrt()
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
