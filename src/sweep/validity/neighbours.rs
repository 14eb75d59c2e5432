//! What a point's neighbours say about it: the cubic through the two on either side.
//!
//! The weights depend on the frequency list alone, so they are made once for all parts of a lot.

use crate::statistics::lanes::{Kernel, Simd, wide};
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::cell::RefCell;
use std::rc::Rc;

/// Neighbours farther apart than this in ln f say nothing about a point between them.
const WIDEST: f64 = 0.6;

/// Lists kept by each thread; sweeps of one station share theirs.
const KEPT: usize = 4;

/// The cubics of one frequency list in ln f, one for each point but the two at either end: list
/// entry `k` is of point `k + 2`.
#[derive(Debug)]
pub(super) struct Neighbours {
    frequency: Vec<f64>,
    /// Lagrange weights of the points before and after, in ascending order.
    weights: [Vec<f64>; 4],
    /// Share of a point's own variance in that of its difference to the cubic; NaN where the
    /// neighbours are too far apart.
    share: Vec<f64>,
    /// Sixth part of the fourth power of the mean step.
    curvature: Vec<f64>,
}

thread_local! {
    static LISTS: RefCell<Vec<Rc<Neighbours>>> = const { RefCell::new(Vec::new()) };
}

impl Neighbours {
    /// Those of a frequency list, made where the thread does not have them yet.
    pub fn of(frequency: &[f64]) -> Rc<Neighbours> {
        let kept = LISTS.with(|lists| {
            let lists = lists.try_borrow().ok()?;
            lists
                .iter()
                .find(|l| same(&l.frequency, frequency))
                .cloned()
        });
        kept.unwrap_or_else(|| {
            let made = Rc::new(Neighbours::new(frequency));
            LISTS.with(|lists| {
                if let Ok(mut lists) = lists.try_borrow_mut() {
                    if lists.len() >= KEPT {
                        lists.remove(0);
                    }
                    lists.push(Rc::clone(&made));
                }
            });
            made
        })
    }

    /// The list that they are of, in Hz.
    pub fn frequency(&self) -> &[f64] {
        &self.frequency
    }

    fn new(frequency: &[f64]) -> Neighbours {
        let position: Vec<f64> = frequency.iter().map(|f| f.ln()).collect();
        let points = position.len().saturating_sub(4);
        let mut made = Neighbours {
            frequency: frequency.to_vec(),
            weights: std::array::from_fn(|_| Vec::with_capacity(points)),
            share: Vec::with_capacity(points),
            curvature: Vec::with_capacity(points),
        };
        for window in position.windows(5) {
            let &[x0, x1, x2, x3, x4] = window else {
                continue;
            };
            let widest = (x1 - x0).max(x2 - x1).max(x3 - x2).max(x4 - x3);
            let step = (x4 - x0) / 4.0;
            let w = weights([x0 - x2, x1 - x2, x3 - x2, x4 - x2]);
            for (list, w) in made.weights.iter_mut().zip(w) {
                list.push(w);
            }
            made.share.push(if widest > WIDEST {
                f64::NAN
            } else {
                1.0 / gain_squared(&w)
            });
            made.curvature.push((step * step) * (step * step) / 6.0);
        }
        made
    }

    /// Squares of the deviations of all points from their cubics over the larger of both squared
    /// magnitudes, scaled to the noise of one point, into `all`; NaN where there is no cubic.
    #[inline(always)]
    pub fn squared_deviations(&self, re: &[f64], im: &[f64], square: &[f64], all: &mut [f64]) {
        all.fill(f64::NAN);
        let n = self.share.len();
        let [re, im] = [re, im].map(|values| around(values, n));
        let [a, b, c, d] = self.weights.each_ref().map(|w| w.get(..n));
        let (Some(re), Some(im), Some(square), Some(all)) =
            (re, im, square.get(2..n + 2), all.get_mut(2..n + 2))
        else {
            return;
        };
        let (Some(a), Some(b), Some(c), Some(d)) = (a, b, c, d) else {
            return;
        };
        let share = self.share.as_slice();
        for i in 0..n {
            let w = [a[i], b[i], c[i], d[i]];
            let (er, ei) = (cubic(&re, i, w), cubic(&im, i, w));
            let (dr, di) = (re[2][i] - er, im[2][i] - ei);
            let (e, s) = (er * er + ei * ei, square[i]);
            let larger = if e > s { e } else { s };
            all[i] = (dr * dr + di * di) * share[i] / larger;
        }
    }

    /// Complex deviation of one point, scaled as its square is, and what interpolation alone can
    /// make of it; `None` where there is no cubic.
    pub fn deviation(&self, sweep: &Sweep, point: usize) -> Option<(Complex64, f64)> {
        let at = point.checked_sub(2)?;
        self.share.get(at).filter(|share| share.is_finite())?;
        let &[z0, z1, z2, z3, z4] = sweep.impedance.get(at..at + 5)? else {
            return None;
        };
        let [a, b, c, d] = &self.weights;
        let w = [*a.get(at)?, *b.get(at)?, *c.get(at)?, *d.get(at)?];
        let expected = z0 * w[0] + z1 * w[1] + z3 * w[2] + z4 * w[3];
        let size = z2.norm_sqr().max(expected.norm_sqr()).sqrt();
        let largest = z0.norm_sqr().max(z4.norm_sqr()).sqrt().max(size);
        Some((
            (z2 - expected) / (size * gain_squared(&w).sqrt()),
            self.curvature.get(at)? * largest / size,
        ))
    }
}

/// Whether two lists are the same: most that are not differ at once, and the others are compared to their end.
fn same(a: &[f64], b: &[f64]) -> bool {
    a.len() == b.len() && a.first() == b.first() && wide(Same(a, b))
}

struct Same<'a>(&'a [f64], &'a [f64]);

impl Kernel for Same<'_> {
    type Output = bool;

    #[inline(always)]
    fn run<S: Simd>(self, _: S) -> bool {
        let mut other = 0u64;
        for (a, b) in self.0.iter().zip(self.1) {
            other += u64::from(a != b);
        }
        other == 0
    }
}

/// The two values before, the value itself and the two behind it, of `n` points from the third on.
#[inline(always)]
fn around(values: &[f64], n: usize) -> Option<[&[f64]; 5]> {
    (values.len() >= n + 4 && n > 0).then(|| std::array::from_fn(|k| &values[k..k + n]))
}

/// Value of a point's cubic from the values around and their weights.
#[inline(always)]
fn cubic(around: &[&[f64]; 5], i: usize, w: [f64; 4]) -> f64 {
    let [before, last, _, next, behind] = around;
    before[i] * w[0] + last[i] * w[1] + next[i] * w[2] + behind[i] * w[3]
}

/// Variance of a point's difference to its cubic over its own, where all points have the same.
fn gain_squared(weights: &[f64; 4]) -> f64 {
    1.0 + weights.iter().map(|w| w * w).sum::<f64>()
}

/// Weights of four points for the value of their cubic at 0 (Lagrange).
fn weights(x: [f64; 4]) -> [f64; 4] {
    let [a, b, c, d] = x;
    [
        b * c * d / ((b - a) * (c - a) * (d - a)),
        a * c * d / ((a - b) * (c - b) * (d - b)),
        a * b * d / ((a - c) * (b - c) * (d - c)),
        a * b * c / ((a - d) * (b - d) * (c - d)),
    ]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn weights_reproduce_a_cubic() {
        let x = [-2.1, -0.9, 1.2, 2.0];
        let cubic = |x: f64| 1.0 + x * (2.0 + x * (3.0 + x * 4.0));
        let sum: f64 = weights(x).iter().zip(x).map(|(w, x)| w * cubic(x)).sum();
        assert!((sum - 1.0).abs() < 1e-12);
    }

    #[test]
    fn squares_are_those_of_the_complex_deviations() {
        // Two points are too far apart for a cubic between them.
        let frequency = [
            1e3, 1.1e3, 1.3e3, 1.4e3, 1.7e3, 2e3, 5e3, 6e3, 7e3, 8e3, 9e3,
        ];
        let z =
            |f: &f64| Complex64::new(0.1 + 1e-5 * f, -4e3 / f * (1.0 + 0.01 * (f / 70.0).sin()));
        let sweep = Sweep {
            frequency: frequency.to_vec(),
            impedance: frequency.iter().map(z).collect(),
            level: None,
        };
        let neighbours = Neighbours::of(&sweep.frequency);
        let re: Vec<f64> = sweep.impedance.iter().map(|z| z.re).collect();
        let im: Vec<f64> = sweep.impedance.iter().map(|z| z.im).collect();
        let square: Vec<f64> = sweep.impedance.iter().map(|z| z.norm_sqr()).collect();
        let mut squares = vec![0.0; frequency.len()];
        neighbours.squared_deviations(&re, &im, &square, &mut squares);
        let mut known = 0;
        for (point, found) in squares.iter().enumerate() {
            match neighbours.deviation(&sweep, point) {
                Some((deviation, _)) => {
                    known += 1;
                    let expected = deviation.norm_sqr();
                    assert!((found - expected).abs() <= 1e-12 * expected, "{point}");
                }
                None => assert!(found.is_nan(), "{point}"),
            }
        }
        assert_eq!(known, 3);
    }

    #[test]
    fn only_so_many_lists_are_kept_and_all_come_out_the_same() {
        let list = |k: usize| (1..40).map(|i| (i * (k + 7)) as f64).collect::<Vec<f64>>();
        for round in 0..2 {
            for k in 0..3 * KEPT {
                let found = Neighbours::of(&list(k));
                let fresh = Neighbours::new(&list(k));
                assert_eq!(found.frequency, fresh.frequency, "{round} {k}");
                assert_eq!(found.weights, fresh.weights, "{round} {k}");
            }
        }
        assert!(LISTS.with(|lists| lists.borrow().len()) <= KEPT);
    }
}
