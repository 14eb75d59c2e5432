//! Concentration steps (Rousseeuw & Van Driessen 1999), on points laid out by variable so that the
//! distances of all points are had in one go.

use super::scatter::Scatter;
use crate::statistics::lanes::dot;

/// The points, and room for what a step computes.
pub(super) struct Concentration {
    /// One a variable.
    columns: Vec<Vec<f64>>,
    h: usize,
    /// 1 for the h points nearest by the last scatter, 0 for the others.
    inside: Vec<f64>,
    distances: Vec<f64>,
    /// As `columns`: of the distances what each variable adds; of a scatter what lies inside.
    worked: Vec<Vec<f64>>,
    keys: Vec<u64>,
}

impl Concentration {
    /// All points have the dimension of the first; h is at most their number.
    pub(super) fn of(points: &[Vec<f64>], h: usize) -> Self {
        let p = points.first().map_or(0, Vec::len);
        let column = |j: usize| points.iter().filter_map(|x| x.get(j).copied()).collect();
        Self {
            columns: (0..p).map(column).collect(),
            h,
            inside: vec![0.0; points.len()],
            distances: vec![0.0; points.len()],
            worked: vec![vec![0.0; points.len()]; p],
            keys: Vec::with_capacity(points.len()),
        }
    }

    /// So many steps, or fewer where the h points stay the same: the h points nearest by the
    /// scatter, their scatter, and again. `None` where one is singular.
    pub(super) fn follow(&mut self, start: Scatter, steps: usize) -> Option<Scatter> {
        let mut scatter = start;
        for _ in 0..steps {
            self.choose(&scatter);
            let next = self.scatter()?;
            // The same points have the same scatter, to the last bit.
            if next == scatter {
                break;
            }
            scatter = next;
        }
        Some(scatter)
    }

    /// Indices of the h points nearest by the scatter, ascending; of equals the first.
    pub(super) fn nearest(&mut self, scatter: &Scatter) -> Vec<usize> {
        self.choose(scatter);
        let chosen = self.inside.iter().enumerate().filter(|(_, w)| **w > 0.0);
        chosen.map(|(i, _)| i).collect()
    }

    fn choose(&mut self, scatter: &Scatter) {
        self.distances.fill(0.0);
        for (i, column) in self.columns.iter().enumerate() {
            let (before, rest) = self.worked.split_at_mut(i);
            let (Some(solved), Some((row, mean))) = (rest.first_mut(), scatter.row(i)) else {
                continue;
            };
            for (y, x) in solved.iter_mut().zip(column) {
                *y = x - mean;
            }
            for (other, l) in before.iter().zip(row) {
                for (y, known) in solved.iter_mut().zip(other) {
                    *y -= l * known;
                }
            }
            let pivot = row.last().map_or(f64::NAN, |l| 1.0 / l);
            for (y, d) in solved.iter_mut().zip(&mut self.distances) {
                *y *= pivot;
                *d += *y * *y;
            }
        }
        // What is not below zero has the order of its bits.
        self.keys.clear();
        self.keys.extend(self.distances.iter().map(|d| d.to_bits()));
        let last = self.h.saturating_sub(1);
        if last >= self.keys.len() {
            self.inside.fill(1.0);
            return;
        }
        let farthest = *self.keys.select_nth_unstable(last).1;
        let nearer = self.distances.iter().filter(|d| d.to_bits() < farthest);
        let mut equals = self.h - nearer.count();
        for (w, d) in self.inside.iter_mut().zip(&self.distances) {
            let key = d.to_bits();
            let taken = key < farthest || (key == farthest && equals > 0);
            equals -= usize::from(taken && key == farthest);
            *w = if taken { 1.0 } else { 0.0 };
        }
    }

    /// Scatter of the points inside.
    fn scatter(&mut self) -> Option<Scatter> {
        let count = self.h as f64;
        let mut means = Vec::with_capacity(self.columns.len());
        for (inner, column) in self.worked.iter_mut().zip(&self.columns) {
            let mean = dot(&self.inside, column) / count;
            for ((d, x), w) in inner.iter_mut().zip(column).zip(&self.inside) {
                *d = w * (x - mean);
            }
            means.push(mean);
        }
        let mut covariance = Vec::with_capacity(means.len() * (means.len() + 1) / 2);
        for (i, a) in self.worked.iter().enumerate() {
            let products = self.worked.iter().take(i + 1).map(|b| dot(a, b));
            covariance.extend(products.map(|sum| sum / (count - 1.0)));
        }
        Scatter::from_moments(means, &covariance)
    }
}
