//! The weighted least-squares problem while it is being solved, term after term.

use super::basis::{Basis, MOST, NOTHING};
use super::scatter::Points;
use crate::statistics::lanes::{
    Lanes, Plain, Simd, chunks, chunks_mut, four_products, one_product, product,
};

/// Share of a sum of squares below which too little of it is left to be had by subtraction: rounding
/// is 1e-15 of it.
const FEW_DIGITS: f64 = 1e-10;

/// What became of one more column.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Added {
    One,
    /// There is no further one.
    None,
    /// The products do not tell it; the columns themselves may.
    TooFewDigits,
}

/// Room for a problem, to be used again for the next.
#[derive(Debug, Default)]
pub(super) struct Room {
    inverse: [Vec<f64>; 4],
    columns: Vec<f64>,
    data: Vec<f64>,
}

impl Room {
    /// Numbers that there is room for in columns, nearly all of it.
    pub(super) fn len(&self) -> usize {
        self.columns.len()
    }
}

/// Columns of the basis, each point's divided by its Z and by the noise there. Rows: ln|Z| of each
/// point, then the phases, since `dZ/Z = d ln|Z| + j dθ`.
pub(super) struct Design<'a> {
    basis: &'a Basis,
    points: usize,
    /// Real and negative imaginary part of 1/Z over the noise of ln|Z|, then of the phase; times the
    /// size that the basis is relative to.
    inverse: [&'a [f64]; 4],
    /// One after the other; orthonormal where they are added exactly.
    columns: &'a mut [f64],
    /// Where columns are added exactly, what they leave of them.
    data: &'a mut [f64],
    /// Sum of squares of what the columns leave of the data.
    pub(super) rest: f64,
    /// Of the data.
    total: f64,
    /// The basis's columns by the orthonormal ones: packed upper triangle, column after column, with
    /// reciprocals on its diagonal.
    pub(super) triangle: Vec<f64>,
    /// Of the weighted data on the orthonormal columns.
    pub(super) projections: Vec<f64>,
}

impl<'a> Design<'a> {
    /// `noise` is that of ln|Z| and of the phase.
    #[inline(always)]
    pub(super) fn new(
        basis: &'a Basis,
        points: Points<'_>,
        noise: [f64; 2],
        room: &'a mut Room,
    ) -> Design<'a> {
        let n = points.square.len();
        let weight = [1.0 / noise[0], 1.0 / noise[1]];
        let half = basis.filled;
        let Room {
            inverse: [a, b, c, d],
            columns,
            data,
        } = room;
        for target in [&mut *a, &mut *b, &mut *c, &mut *d] {
            target.resize(half, 0.0);
            target[n..].fill(0.0);
        }
        let over = basis.size.iter().zip(points.square);
        let z = points.re.iter().zip(points.im);
        let of_size = a.iter_mut().zip(&mut *b);
        let of_phase = c.iter_mut().zip(&mut *d);
        for (((a, b), (c, d)), ((size, square), (re, im))) in of_size.zip(of_phase).zip(over.zip(z))
        {
            let over = size / square;
            let (re, im) = (re * over, im * over);
            (*a, *b) = (re * weight[0], im * weight[0]);
            (*c, *d) = (re * weight[1], im * weight[1]);
        }
        // What was there is written over before it is read.
        columns.resize(2 * half * MOST, 0.0);
        data.resize(2 * half, 0.0);
        data[..n].fill(weight[0]);
        data[n..].fill(0.0);
        let total = n as f64 * weight[0] * weight[0];
        Design {
            basis,
            points: n,
            inverse: [a, b, c, d],
            columns,
            data,
            rest: total,
            total,
            triangle: Vec::with_capacity(MOST * (MOST + 1) / 2),
            projections: Vec::with_capacity(MOST),
        }
    }

    /// Rows of the problem.
    pub(super) fn rows(&self) -> usize {
        2 * self.points
    }

    /// Adds one more column of the basis by its products with those before it (Cholesky's factor of
    /// the normal equations), which costs half of what [`Design::add_exactly`] does.
    #[inline(always)]
    pub(super) fn add<S: Simd>(&mut self, simd: S) -> Added {
        let k = self.projections.len();
        if k >= self.basis.terms() {
            return Added::None;
        }
        let rows = self.data.len();
        self.weigh(simd, k);
        let (earlier, new) = self.columns[..(k + 1) * rows].split_at(k * rows);
        let entries = self.triangle.len();
        let mut left = earlier;
        while left.len() >= 4 * rows {
            let (block, rest) = left.split_at(4 * rows);
            let of = |i: usize| &block[i * rows..(i + 1) * rows];
            let shares = four_products(simd, [of(0), of(1), of(2), of(3)], new);
            self.triangle.extend_from_slice(&shares);
            left = rest;
        }
        for column in left.chunks_exact(rows) {
            self.triangle.push(one_product(simd, column, new));
        }
        let half = self.basis.filled;
        let before = one_product(simd, new, new);
        let mut projection = one_product(simd, &self.data[..half], &new[..half]);
        let (known, shares) = self.triangle.split_at_mut(entries);
        let mut square = before;
        for j in 0..k {
            let start = j * (j + 1) / 2;
            let mut share = shares[j];
            for i in 0..j {
                share -= known[start + i] * shares[i];
            }
            share *= known[start + j];
            shares[j] = share;
            square -= share * share;
            projection -= share * self.projections[j];
        }
        if square.is_nan() || square <= before * FEW_DIGITS {
            return Added::TooFewDigits;
        }
        let over = 1.0 / square.sqrt();
        projection *= over;
        self.triangle.push(over);
        self.projections.push(projection);
        self.rest -= projection * projection;
        if self.rest > self.total * FEW_DIGITS {
            Added::One
        } else {
            Added::TooFewDigits
        }
    }

    /// Orthogonalises one more column of the basis, appends its column of the triangle and takes its
    /// share out of the residual. [`Added::None`] where there is no further one, or where the points do
    /// not tell it from those before.
    pub(super) fn add_exactly(&mut self) -> Added {
        let k = self.projections.len();
        if k >= self.basis.terms() {
            return Added::None;
        }
        let rows = self.data.len();
        self.weigh(Plain, k);
        let (earlier, new) = self.columns[..(k + 1) * rows].split_at_mut(k * rows);
        let entries = self.triangle.len();
        for column in earlier.chunks_exact(rows) {
            let share = product(column, new);
            self.triangle.push(share);
            take(new, share, column);
        }
        let square = product(new, new);
        // What was taken and what is left are at right angles.
        let taken: f64 = self.triangle[entries..]
            .iter()
            .map(|share| share * share)
            .sum();
        if square.is_nan() || square <= (square + taken) * NOTHING {
            self.triangle.truncate(entries);
            return Added::None;
        }
        let norm = square.sqrt();
        new.iter_mut().for_each(|v| *v /= norm);
        self.triangle.push(1.0 / norm);
        let projection = product(new, self.data);
        self.projections.push(projection);
        take(self.data, projection, new);
        self.rest = product(self.data, self.data);
        Added::One
    }

    /// Writes a column of the basis as the points weigh it.
    #[inline(always)]
    fn weigh<S: Simd>(&mut self, simd: S, k: usize) {
        let rows = self.data.len();
        let column = &mut self.columns[k * rows..(k + 1) * rows];
        let (of_size, of_phase) = column.split_at_mut(self.basis.filled);
        let (re, im) = self.basis.column(k);
        let [a, b, c, d] = self.inverse;
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
    let first = chunks(a).iter().zip(chunks(b));
    let second = chunks(c).iter().zip(chunks(d));
    for (target, ((a, b), (c, d))) in chunks_mut(target).iter_mut().zip(first.zip(second)) {
        let first = Lanes::of(simd, a).times(Lanes::of(simd, b));
        let second = Lanes::of(simd, c).times(Lanes::of(simd, d));
        first.plus(second.times(sign)).store(target);
    }
}

/// Takes the share of a column out of a vector.
fn take(of: &mut [f64], share: f64, column: &[f64]) {
    for (of, column) in of.iter_mut().zip(column) {
        *of -= share * column;
    }
}
