//! The points that are fitted, one vector for each of what is needed of them.

use crate::readings::grid::{Axis, Grid};
use crate::readings::sizes::sizes;
use crate::statistics::lanes::{Kernel, LANES, Simd, dot, sum, wide};
use num_complex::Complex64;
use std::cell::Cell;

/// Fewest points of thin data.
const THIN_LEAST: usize = 32;

/// Vectors of numbers that are kept for the next sweep; what they hold is nothing until it is written.
#[derive(Default)]
pub(super) struct Room(Vec<f64>);

/// More than so many numbers are not kept.
const MOST_KEPT: usize = 1 << 17;

thread_local! {
    static ROOM: Cell<Vec<f64>> = const { Cell::new(Vec::new()) };
}

impl Room {
    /// For the columns of so many points, and `N` vectors as long as a column.
    pub(super) fn take<const N: usize>(&mut self, points: usize) -> (&mut [f64], [&mut [f64]; N]) {
        let length = points.next_multiple_of(LANES);
        let all = &mut self.0;
        *all = ROOM.take();
        if all.len() < (COLUMNS + N) * length {
            all.resize((COLUMNS + N) * length, 0.0);
        }
        let (columns, mut rest) = all.split_at_mut(COLUMNS * length);
        let vectors = [(); N].map(|()| {
            let (vector, after) = std::mem::take(&mut rest).split_at_mut(length);
            rest = after;
            vector
        });
        (columns, vectors)
    }
}

impl Drop for Room {
    fn drop(&mut self) {
        if self.0.len() <= MOST_KEPT {
            ROOM.set(std::mem::take(&mut self.0));
        }
    }
}

/// Number of columns.
const COLUMNS: usize = 5;

/// The impedances of a sweep and their sizes, each filled up with zeros to whole lanes.
pub(super) struct Columns<'a> {
    /// Number of points.
    points: usize,
    /// Number of points with the filling.
    length: usize,
    /// The columns one after the other.
    all: &'a [f64],
    /// Whether no impedance is zero and all are numbers.
    pub(super) sound: bool,
}

impl<'a> Columns<'a> {
    /// In `room` for so many points.
    pub(super) fn new(impedance: &[Complex64], room: &'a mut [f64]) -> Columns<'a> {
        let points = impedance.len();
        let length = room.len() / COLUMNS;
        let (re, rest) = room.split_at_mut(length);
        let (im, rest) = rest.split_at_mut(length);
        let (weight, rest) = rest.split_at_mut(length);
        let (square, size) = rest.split_at_mut(length);
        for column in [&mut *re, im, weight] {
            column[points..].fill(0.0);
        }
        let sound = wide(Sizes {
            impedance,
            re: &mut re[..points],
            im: &mut im[..points],
            square: &mut square[..points],
            size: &mut size[..points],
            weight: &mut weight[..points],
        });
        Columns {
            points,
            length,
            all: room,
            sound,
        }
    }

    fn column(&self, k: usize) -> &'a [f64] {
        &self.all[k * self.length..][..self.length]
    }

    /// Re Z in Ω.
    pub(super) fn re(&self) -> &[f64] {
        self.column(0)
    }

    /// Im Z in Ω.
    pub(super) fn im(&self) -> &[f64] {
        self.column(1)
    }

    /// 1/|Z|
    pub(super) fn weight(&self) -> &[f64] {
        self.column(2)
    }

    /// |Z|², without the filling.
    pub(super) fn square(&self) -> &[f64] {
        &self.column(3)[..self.points]
    }

    /// |Z|, without the filling.
    pub(super) fn size(&self) -> &[f64] {
        &self.column(4)[..self.points]
    }
}

/// Writes real and imaginary parts, |Z|², |Z| and 1/|Z|; whether no |Z|² is zero and all are numbers.
struct Sizes<'a> {
    impedance: &'a [Complex64],
    re: &'a mut [f64],
    im: &'a mut [f64],
    square: &'a mut [f64],
    size: &'a mut [f64],
    weight: &'a mut [f64],
}

impl Kernel for Sizes<'_> {
    type Output = bool;

    #[inline(always)]
    fn run<S: Simd>(self, _: S) -> bool {
        let sound = sizes(self.impedance, self.re, self.im, self.square, self.size);
        for (weight, size) in self.weight.iter_mut().zip(&*self.size) {
            *weight = 1.0 / size;
        }
        sound
    }
}

/// The points to be fitted.
pub(super) struct Data<'a> {
    pub(super) axis: &'a Axis,
    pub(super) columns: Columns<'a>,
    /// Of every eighth point.
    thin_axis: &'a Axis,
}

impl<'a> Data<'a> {
    /// Impedances at the frequencies of `grid`.
    pub(super) fn new(grid: &'a Grid, columns: Columns<'a>) -> Data<'a> {
        Data {
            axis: &grid.all,
            columns,
            thin_axis: &grid.thin,
        }
    }

    /// Number of points.
    pub(super) fn len(&self) -> usize {
        self.columns.points
    }

    /// Number of real residuals.
    pub(super) fn residuals(&self) -> usize {
        2 * self.len()
    }

    /// Every eighth point, where there are enough: a search that begins at its minimum is over in a
    /// few steps.
    pub(super) fn thin<'b>(&self, room: &'b mut Room) -> Option<Data<'b>>
    where
        'a: 'b,
    {
        if self.len() < Grid::STEP * THIN_LEAST {
            return None;
        }
        let all = self.columns.re().iter().zip(self.columns.im());
        let every = all.take(self.len()).step_by(Grid::STEP);
        let impedance: Vec<Complex64> = every.map(|(re, im)| Complex64::new(*re, *im)).collect();
        let (room, []) = room.take(impedance.len());
        Some(Data {
            axis: self.thin_axis,
            columns: Columns::new(&impedance, room),
            thin_axis: self.thin_axis,
        })
    }
}

/// What is kept of the weighted residuals.
#[derive(Debug, Clone, Copy)]
pub(super) struct Course {
    /// The largest one's absolute value, and which it is.
    pub(super) largest: f64,
    pub(super) largest_at: usize,
    /// Correlation of neighbours; 0 where nothing is left.
    pub(super) autocorrelation: f64,
}

impl Course {
    /// Of the residuals' real and imaginary parts.
    pub(super) fn of(re: &[f64], im: &[f64]) -> Course {
        let (square, together, largest) = wide(Together { re, im });
        let at = (re.iter().zip(im)).position(|(re, im)| re * re + im * im == largest);
        Course {
            largest: largest.sqrt(),
            largest_at: at.unwrap_or(0),
            autocorrelation: if square > 0.0 { together / square } else { 0.0 },
        }
    }
}

/// Sums of the squares of residuals and of their products with their neighbours, and the largest
/// square.
struct Together<'a> {
    re: &'a [f64],
    im: &'a [f64],
}

impl Kernel for Together<'_> {
    type Output = (f64, f64, f64);

    #[inline(always)]
    fn run<S: Simd>(self, _: S) -> (f64, f64, f64) {
        let (re, im) = (self.re, self.im);
        let (re_whole, re_rest) = re.as_chunks::<LANES>();
        let (im_whole, im_rest) = im.as_chunks::<LANES>();
        let [mut largest, mut squares] = [[0.0; LANES]; 2];
        for (re, im) in re_whole.iter().zip(im_whole) {
            for k in 0..LANES {
                let square = re[k] * re[k] + im[k] * im[k];
                squares[k] += square;
                largest[k] = larger(largest[k], square);
            }
        }
        let (mut square, mut together) = (sum(squares), 0.0);
        for (k, (re, im)) in re_rest.iter().zip(im_rest).enumerate() {
            let one = re * re + im * im;
            square += one;
            largest[k] = larger(largest[k], one);
        }
        if let ([_, re_next @ ..], [_, im_next @ ..]) = (re, im) {
            together = dot(&re[..re_next.len()], re_next) + dot(&im[..im_next.len()], im_next);
        }
        (square, together, largest.into_iter().fold(0.0, larger))
    }
}

#[inline(always)]
fn larger(a: f64, b: f64) -> f64 {
    if b > a { b } else { a }
}
