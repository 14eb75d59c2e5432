//! The weighted least-squares problem while it is being solved, term after term.

use super::basis::{Basis, MOST, NOTHING};
use crate::statistics::lanes::{LANES, Lanes, Simd, chunks, chunks_mut, products};
use num_complex::Complex64;

/// Columns of the basis, each point's divided by its Z and by the noise there, made orthonormal. Rows:
/// ln|Z| of each point, then the phases, since `dZ/Z = d ln|Z| + j dθ`.
pub(super) struct Design<'a> {
    basis: &'a Basis,
    points: usize,
    /// Real and negative imaginary part of 1/Z over the noise of ln|Z|, then of the phase; times the
    /// size that the basis is relative to.
    inverse: [Vec<f64>; 4],
    /// Orthonormal columns, one after the other.
    columns: Vec<f64>,
    residual: Vec<f64>,
    /// Sum of squares of the residual.
    pub(super) rest: f64,
    /// The basis's columns by the orthonormal ones: packed upper triangle, column after column.
    pub(super) triangle: Vec<f64>,
    /// Of the weighted data on the orthonormal columns.
    pub(super) projections: Vec<f64>,
}

impl<'a> Design<'a> {
    /// `square` is |Z|² of the points; `noise` that of ln|Z| and of the phase.
    #[inline(always)]
    pub(super) fn new(
        basis: &'a Basis,
        impedance: &[Complex64],
        square: &[f64],
        noise: [f64; 2],
    ) -> Design<'a> {
        let n = impedance.len();
        let weight = noise.map(|sigma| 1.0 / sigma);
        let half = basis.filled;
        let mut inverse = [(); 4].map(|()| vec![0.0; half]);
        let [a, b, c, d] = &mut inverse;
        let [a, b, c, d] = [&mut a[..n], &mut b[..n], &mut c[..n], &mut d[..n]];
        let (size, square) = (&basis.size[..n], &square[..n]);
        for i in 0..n {
            let over = size[i] / square[i];
            let (re, im) = (impedance[i].re * over, impedance[i].im * over);
            (a[i], b[i]) = (re * weight[0], im * weight[0]);
            (c[i], d[i]) = (re * weight[1], im * weight[1]);
        }
        let mut residual = vec![0.0; 2 * half];
        residual[..n].fill(weight[0]);
        Design {
            basis,
            points: n,
            inverse,
            columns: Vec::with_capacity(2 * half * MOST),
            rest: n as f64 * weight[0] * weight[0],
            residual,
            triangle: Vec::with_capacity(MOST * (MOST + 1) / 2),
            projections: Vec::with_capacity(MOST),
        }
    }

    /// Rows of the problem.
    pub(super) fn rows(&self) -> usize {
        2 * self.points
    }

    /// Orthogonalises one more column of the basis, appends its column of the triangle and takes its
    /// share out of the residual. `None` where there is no further one, or where the points do not
    /// tell it from those before.
    #[inline(always)]
    pub(super) fn add<S: Simd>(&mut self, simd: S) -> Option<()> {
        let k = self.projections.len();
        if k >= self.basis.terms() {
            return None;
        }
        let rows = self.residual.len();
        let start = self.columns.len();
        self.weigh(simd, k);
        let (earlier, new) = self.columns.split_at_mut(start);
        let entries = self.triangle.len();
        // Four columns at a time: they are at right angles to each other, and the next four see what
        // these have left.
        let mut left = &*earlier;
        while left.len() > 4 * rows {
            let (block, rest) = left.split_at(4 * rows);
            let of = |i: usize| &block[i * rows..(i + 1) * rows];
            let (shares, _) = take(simd, new, [of(0), of(1), of(2), of(3)], &self.residual);
            self.triangle.extend_from_slice(&shares);
            left = rest;
        }
        let of = |i: usize| &left[i * rows..(i + 1) * rows];
        let [square, projection] = match left.len() / rows {
            0 => take(simd, new, [], &self.residual).1,
            1 => {
                let (shares, products) = take(simd, new, [of(0)], &self.residual);
                self.triangle.extend_from_slice(&shares);
                products
            }
            2 => {
                let (shares, products) = take(simd, new, [of(0), of(1)], &self.residual);
                self.triangle.extend_from_slice(&shares);
                products
            }
            3 => {
                let (shares, products) = take(simd, new, [of(0), of(1), of(2)], &self.residual);
                self.triangle.extend_from_slice(&shares);
                products
            }
            _ => {
                let (shares, products) =
                    take(simd, new, [of(0), of(1), of(2), of(3)], &self.residual);
                self.triangle.extend_from_slice(&shares);
                products
            }
        };
        // What was taken and what is left are at right angles.
        let taken: f64 = self.triangle[entries..]
            .iter()
            .map(|share| share * share)
            .sum();
        if square.is_nan() || square <= (square + taken) * NOTHING {
            self.triangle.truncate(entries);
            return None;
        }
        let norm = square.sqrt();
        self.triangle.push(norm);
        let projection = projection / norm;
        self.projections.push(projection);
        self.rest = explain(simd, &mut self.residual, projection, new, 1.0 / norm);
        Some(())
    }

    /// Appends a column of the basis as the points weigh it.
    #[inline(always)]
    fn weigh<S: Simd>(&mut self, simd: S, k: usize) {
        let start = self.columns.len();
        self.columns.resize(start + self.residual.len(), 0.0);
        let (of_size, of_phase) = self.columns[start..].split_at_mut(self.basis.filled);
        let (re, im) = self.basis.column(k);
        let [a, b, c, d] = &self.inverse;
        combine(simd, of_size, [a, re], [b, im], 1.0);
        combine(simd, of_phase, [c, im], [d, re], -1.0);
    }
}

/// `a b + sign c d`, element by element.
#[inline(always)]
fn combine<S: Simd>(
    simd: S,
    target: &mut [f64],
    [a, b]: [&[f64]; 2],
    [c, d]: [&[f64]; 2],
    sign: f64,
) {
    let sign = Lanes::all(simd, sign);
    let target = chunks_mut(target);
    let n = target.len();
    let (a, b, c, d) = (
        &chunks(a)[..n],
        &chunks(b)[..n],
        &chunks(c)[..n],
        &chunks(d)[..n],
    );
    for i in 0..n {
        let first = Lanes::of(simd, &a[i]).times(Lanes::of(simd, &b[i]));
        let second = Lanes::of(simd, &c[i]).times(Lanes::of(simd, &d[i]));
        first.plus(second.times(sign)).store(&mut target[i]);
    }
}

/// Takes the shares of some orthonormal columns out of a vector; gives them, and the products of what
/// is left with itself and with `other`.
#[inline(always)]
fn take<S: Simd, const N: usize>(
    simd: S,
    of: &mut [f64],
    columns: [&[f64]; N],
    other: &[f64],
) -> ([f64; N], [f64; 2]) {
    let shares = products(simd, columns, of);
    let of = chunks_mut(of);
    let other = &chunks(other)[..of.len()];
    let mut rows: [&[[f64; LANES]]; N] = [&[]; N];
    let mut factors = [Lanes::all(simd, 0.0); N];
    for n in 0..N {
        rows[n] = &chunks(columns[n])[..of.len()];
        factors[n] = Lanes::all(simd, shares[n]);
    }
    let (mut square, mut product) = (Lanes::all(simd, 0.0), Lanes::all(simd, 0.0));
    for i in 0..of.len() {
        let mut left = Lanes::of(simd, &of[i]);
        for n in 0..N {
            left = left.minus(factors[n].times(Lanes::of(simd, &rows[n][i])));
        }
        left.store(&mut of[i]);
        square = square.plus(left.times(left));
        product = product.plus(left.times(Lanes::of(simd, &other[i])));
    }
    (shares, [square.sum(), product.sum()])
}

/// Scales `column` by `factor` and takes `share` of that out of `of`; the sum of squares of what is
/// left.
#[inline(always)]
fn explain<S: Simd>(simd: S, of: &mut [f64], share: f64, column: &mut [f64], factor: f64) -> f64 {
    let (share, factor) = (Lanes::all(simd, share), Lanes::all(simd, factor));
    let mut squares = Lanes::all(simd, 0.0);
    let (of, column) = (chunks_mut(of), chunks_mut(column));
    let n = of.len().min(column.len());
    for i in 0..n {
        let scaled = Lanes::of(simd, &column[i]).times(factor);
        scaled.store(&mut column[i]);
        let left = Lanes::of(simd, &of[i]).minus(share.times(scaled));
        left.store(&mut of[i]);
        squares = squares.plus(left.times(left));
    }
    squares.sum()
}
