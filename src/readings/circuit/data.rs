//! The points that are fitted, one vector for each of what is needed of them.

use super::model::Point;
use crate::readings::grid::{Axis, Grid};
use crate::statistics::lanes::{LANES, dot, wide};
use num_complex::Complex64;
use std::array::from_fn;

/// Fewest points of thin data.
const THIN_LEAST: usize = 32;

/// The impedances of a sweep and their sizes, each filled up with zeros to whole lanes.
pub(super) struct Columns {
    /// Number of points.
    points: usize,
    /// Number of points with the filling.
    length: usize,
    /// The columns one after the other.
    all: Vec<f64>,
}

impl Columns {
    pub(super) fn new(impedance: &[Complex64]) -> Columns {
        let points = impedance.len();
        let length = points.next_multiple_of(LANES);
        let mut all = vec![0.0; 5 * length];
        let (re, rest) = all.split_at_mut(length);
        let (im, rest) = rest.split_at_mut(length);
        let (weight, rest) = rest.split_at_mut(length);
        let (square, size) = rest.split_at_mut(length);
        for ((re, im), z) in re.iter_mut().zip(&mut *im).zip(impedance) {
            (*re, *im) = (z.re, z.im);
        }
        let (re, im) = (&re[..points], &im[..points]);
        wide(#[inline(always)] || {
            let sizes = size.iter_mut().zip(weight).zip(square);
            for (((size, weight), square), (re, im)) in sizes.zip(re.iter().zip(im)) {
                *square = re * re + im * im;
                *size = square.sqrt();
                *weight = 1.0 / *size;
            }
        });
        Columns {
            points,
            length,
            all,
        }
    }

    fn column(&self, k: usize) -> &[f64] {
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

/// The points to be fitted.
pub(super) struct Data<'a> {
    pub(super) axis: &'a Axis,
    pub(super) columns: Columns,
    /// Of every eighth point.
    thin_axis: &'a Axis,
}

impl<'a> Data<'a> {
    /// Impedances at the frequencies of `grid`.
    pub(super) fn new(grid: &'a Grid, columns: Columns) -> Data<'a> {
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

    /// The points with their impedance and weight.
    pub(super) fn points(&self) -> impl Iterator<Item = (Point, Complex64, f64)> {
        let columns = &self.columns;
        let impedance = columns.re().iter().zip(columns.im());
        (Point::of(self.axis).zip(impedance).zip(columns.weight()))
            .map(|((at, (re, im)), w)| (at, Complex64::new(*re, *im), *w))
            .take(self.len())
    }

    /// Every eighth point, where there are enough: a search that begins at its minimum is over in a
    /// few steps.
    pub(super) fn thin(&self) -> Option<Data<'a>> {
        let impedance: Vec<Complex64> = self.points().map(|(_, z, _)| z).step_by(Grid::STEP).collect();
        (self.len() >= Grid::STEP * THIN_LEAST).then(|| Data {
            axis: self.thin_axis,
            columns: Columns::new(&impedance),
            thin_axis: self.thin_axis,
        })
    }
}

/// The largest of `re² + im²`, in lanes.
#[inline(always)]
fn largest_square(re: &[f64], im: &[f64]) -> f64 {
    let larger = |a: f64, b: f64| if b > a { b } else { a };
    let (whole_re, rest_re) = re.as_chunks::<LANES>();
    let (whole_im, rest_im) = im.as_chunks::<LANES>();
    let mut lanes = [0.0; LANES];
    for (re, im) in whole_re.iter().zip(whole_im) {
        lanes = from_fn(|i| larger(lanes[i], re[i] * re[i] + im[i] * im[i]));
    }
    let rest = rest_re.iter().zip(rest_im).map(|(re, im)| re * re + im * im);
    lanes.into_iter().chain(rest).fold(0.0, larger)
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
        let next = |v: &'_ [f64]| v.len().min(1);
        let (re_next, im_next) = (&re[next(re)..], &im[next(im)..]);
        let (square, together, largest) = wide(#[inline(always)] || {
            let largest = largest_square(re, im);
            let square = dot(re, re) + dot(im, im);
            let together = dot(&re[..re_next.len()], re_next) + dot(&im[..im_next.len()], im_next);
            (square, together, largest)
        });
        let at = (re.iter().zip(im)).position(|(re, im)| re * re + im * im == largest);
        Course {
            largest: largest.sqrt(),
            largest_at: at.unwrap_or(0),
            autocorrelation: if square > 0.0 { together / square } else { 0.0 },
        }
    }
}
