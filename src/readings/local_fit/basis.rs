//! The terms of a stretch as orthonormal columns, in the order in which they are offered.
//!
//! What they span together is the same whatever the frequency that they are relative to, and so is
//! what each first few of them span: columns that are orthonormal for a plain weight do instead of the
//! terms. They depend on the frequencies alone, so that the sweeps of a lot share them, and a sweep's
//! own weights leave them nearly as well apart as they are.

use super::curve::Point;
use crate::statistics::lanes::{LANES, product};
use std::cell::RefCell;
use std::rc::Rc;

/// A term `u^power_u s^power_s`.
#[derive(Debug, Clone, Copy)]
pub(super) struct Term {
    pub(super) power_u: i32,
    pub(super) power_s: i32,
}

const fn term(power_u: i32, power_s: i32) -> Term {
    Term { power_u, power_s }
}

/// For the capacitive branch: capacitance, dispersion, resistance, inductance, then remainders.
const CAPACITIVE: [Term; MOST] = [
    term(0, -1),
    term(1, -1),
    term(0, 0),
    term(0, 1),
    term(2, -1),
    term(1, 0),
    term(1, 1),
    term(3, -1),
    term(2, 0),
    term(2, 1),
    term(4, -1),
    term(3, 0),
    term(3, 1),
];

/// Around and above resonance: inductance, capacitance, resistance, then remainders.
const RESONANT: [Term; MOST] = [
    term(0, 1),
    term(0, -1),
    term(0, 0),
    term(1, -1),
    term(1, 0),
    term(1, 1),
    term(2, -1),
    term(2, 0),
    term(2, 1),
    term(3, -1),
    term(3, 0),
    term(3, 1),
    term(4, -1),
];

/// Most terms, and the highest power of `u` in one.
pub(super) const MOST: usize = 13;
pub(super) const HIGHEST: usize = 4;

/// What part of its course a stretch shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Course {
    /// Reactance of the capacitance alone.
    Capacitive,
    /// Around self-resonance or above it.
    Resonant,
}

impl Course {
    /// Terms in the order in which they are offered.
    pub(super) fn terms(self) -> &'static [Term; MOST] {
        match self {
            Course::Capacitive => &CAPACITIVE,
            Course::Resonant => &RESONANT,
        }
    }

    /// The fewest terms of a model.
    pub(super) fn fewest(self) -> usize {
        match self {
            Course::Capacitive => 2,
            Course::Resonant => 3,
        }
    }

    /// About |Z|, for a frequency relative to the middle of the stretch.
    fn size(self, ratio: f64) -> f64 {
        match self {
            Course::Capacitive => 1.0 / ratio,
            Course::Resonant => ratio.max(1.0 / ratio),
        }
    }
}

/// The orthonormal columns of one stretch.
#[derive(Debug)]
pub(super) struct Basis {
    frequency: Vec<f64>,
    pub(super) course: Course,
    /// Hz: what the terms are relative to.
    pub(super) centre: f64,
    /// Points, filled up to whole lanes.
    pub(super) filled: usize,
    /// About |Z| at each point, which the columns are relative to.
    pub(super) size: Vec<f64>,
    /// Each column's real parts and then its imaginary parts.
    columns: Vec<f64>,
    /// The terms by the columns: packed upper triangle with reciprocals on its diagonal.
    triangle: Vec<f64>,
}

/// Numbers that a thread keeps in bases; sweeps of a lot share some ten bases.
const KEPT: usize = 1 << 20;

thread_local! {
    static BASES: RefCell<Vec<Rc<Basis>>> = const { RefCell::new(Vec::new()) };
}

impl Basis {
    /// The basis for these frequencies (at least two), made where the thread does not have it yet.
    pub(super) fn of(frequency: &[f64], course: Course) -> Rc<Basis> {
        BASES.with_borrow_mut(|bases| {
            let known = |b: &Rc<Basis>| b.course == course && b.frequency == frequency;
            if let Some(basis) = bases.iter().find(|b| known(b)) {
                return Rc::clone(basis);
            }
            let made = Rc::new(Basis::new(frequency, course));
            let mut total = made.columns.len();
            // The oldest go, so that what is kept does not grow without end.
            let keep = bases
                .iter()
                .rev()
                .take_while(|b| {
                    total += b.columns.len();
                    total <= KEPT
                })
                .count();
            bases.drain(..bases.len() - keep);
            bases.push(Rc::clone(&made));
            made
        })
    }

    fn new(frequency: &[f64], course: Course) -> Basis {
        let ends = frequency.first().zip(frequency.last());
        let centre = ends.map_or(1.0, |(first, last)| (first * last).sqrt());
        let points = || frequency.iter().map(|f| f / centre);
        let size: Vec<f64> = points().map(|ratio| course.size(ratio)).collect();
        let at: Vec<Point> = points().map(Point::new).collect();
        let mut basis = Basis {
            frequency: frequency.to_vec(),
            course,
            centre,
            filled: frequency.len().next_multiple_of(LANES),
            columns: Vec::new(),
            triangle: Vec::new(),
            size,
        };
        for term in course.terms() {
            let mut raw = vec![0.0; 2 * basis.filled];
            let (re, im) = raw.split_at_mut(basis.filled);
            for (((re, im), at), size) in re.iter_mut().zip(im).zip(&at).zip(&basis.size) {
                let value = at.value(*term) / size;
                (*re, *im) = (value.re, value.im);
            }
            if !basis.append(raw) {
                break;
            }
        }
        basis
    }

    /// Appends what is left of a term beside the columns before it (modified Gram-Schmidt, twice over
    /// for the digits); false where that is nothing.
    fn append(&mut self, mut new: Vec<f64>) -> bool {
        let start = self.triangle.len();
        let before = product(&new, &new);
        self.triangle.resize(start + self.terms(), 0.0);
        for _ in 0..2 {
            let earlier = self.columns.chunks_exact(2 * self.filled);
            for (column, entry) in earlier.zip(&mut self.triangle[start..]) {
                let share = product(column, &new);
                *entry += share;
                for (new, column) in new.iter_mut().zip(column) {
                    *new -= share * column;
                }
            }
        }
        let square = product(&new, &new);
        if square.is_nan() || square <= before * NOTHING {
            self.triangle.truncate(start);
            return false;
        }
        let norm = square.sqrt();
        self.triangle.push(1.0 / norm);
        self.columns.extend(new.iter().map(|v| v / norm));
        true
    }

    /// How many terms the points can tell from each other.
    pub(super) fn terms(&self) -> usize {
        self.columns.len() / (2 * self.filled).max(1)
    }

    /// Real and imaginary parts of a column.
    pub(super) fn column(&self, k: usize) -> (&[f64], &[f64]) {
        let start = 2 * self.filled * k;
        self.columns[start..start + 2 * self.filled].split_at(self.filled)
    }

    /// The terms by the columns: packed upper triangle, column after column, with reciprocals on its
    /// diagonal.
    pub(super) fn triangle(&self) -> &[f64] {
        &self.triangle
    }
}

/// Share of its square beside the columns before it that a column does not fall below.
pub(super) const NOTHING: f64 = 1e-20;
