//! Means, covariances and Mahalanobis distances of small dimension.

/// A pivot of a Cholesky factor below this, in units in which the bulk of every variable has unit
/// spread, is taken for zero.
const PIVOT_MIN: f64 = 1e-12;

/// Mean of some of the points, and the Cholesky factor of their covariance.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Scatter {
    mean: Vec<f64>,
    /// Lower triangle, row after row.
    factor: Vec<f64>,
}

impl Scatter {
    /// Of the points of those indices, with divisor count − 1; `None` where it is singular.
    pub(super) fn of(points: &[Vec<f64>], indices: &[usize]) -> Option<Self> {
        let p = points.first()?.len();
        let count = indices.len() as f64;
        let chosen = || indices.iter().filter_map(|i| points.get(*i));
        let mut mean = vec![0.0; p];
        for point in chosen() {
            for (m, x) in mean.iter_mut().zip(point) {
                *m += x / count;
            }
        }
        let mut covariance = vec![0.0; p * (p + 1) / 2];
        for point in chosen() {
            let deviation: Vec<f64> = point.iter().zip(&mean).map(|(x, m)| x - m).collect();
            let products = (0..p).flat_map(|i| (0..=i).map(move |j| (i, j)));
            for (cell, (i, j)) in covariance.iter_mut().zip(products) {
                let product = deviation.get(i).zip(deviation.get(j));
                *cell += product.map_or(0.0, |(a, b)| a * b) / (count - 1.0);
            }
        }
        Self::from_moments(mean, &covariance)
    }

    /// Of a mean and the lower triangle of a covariance, row after row; `None` where it is singular.
    pub(super) fn from_moments(mean: Vec<f64>, covariance: &[f64]) -> Option<Self> {
        Some(Self {
            factor: cholesky(covariance, mean.len())?,
            mean,
        })
    }

    /// A row of the Cholesky factor up to its pivot, and the mean of its variable.
    pub(super) fn row(&self, i: usize) -> Option<(&[f64], f64)> {
        let row = self.factor.get(cell(i, 0)..=cell(i, i))?;
        Some((row, *self.mean.get(i)?))
    }

    /// ln of the determinant of the covariance.
    pub(super) fn ln_determinant(&self) -> f64 {
        (0..self.mean.len())
            .map(|i| 2.0 * self.factor.get(cell(i, i)).map_or(f64::NAN, |l| l.ln()))
            .sum()
    }

    /// The mean.
    pub(super) fn mean(&self) -> &[f64] {
        &self.mean
    }

    /// The covariance, row after row: the factor times its transpose.
    pub(super) fn covariance(&self) -> Vec<Vec<f64>> {
        let p = self.mean.len();
        let row = |i: usize| self.factor.get(cell(i, 0)..=cell(i, i)).unwrap_or_default();
        let product = |i: usize, j: usize| row(i).iter().zip(row(j)).map(|(a, b)| a * b).sum();
        (0..p)
            .map(|i| (0..p).map(|j| product(i, j)).collect())
            .collect()
    }

    /// Squared Mahalanobis distance of a point.
    pub(super) fn squared_distance(&self, point: &[f64]) -> f64 {
        let mut solved: Vec<f64> = Vec::with_capacity(self.mean.len());
        for (i, (x, m)) in point.iter().zip(&self.mean).enumerate() {
            let row = self.factor.get(cell(i, 0)..=cell(i, i)).unwrap_or_default();
            let known: f64 = row.iter().zip(&solved).map(|(l, y)| l * y).sum();
            let pivot = row.last().copied().unwrap_or(f64::NAN);
            solved.push((x - m - known) / pivot);
        }
        solved.iter().map(|y| y * y).sum()
    }
}

/// Place of row i, column j ≤ i in the lower triangle.
fn cell(i: usize, j: usize) -> usize {
    i * (i + 1) / 2 + j
}

fn cholesky(covariance: &[f64], p: usize) -> Option<Vec<f64>> {
    let mut factor: Vec<f64> = Vec::with_capacity(covariance.len());
    for i in 0..p {
        for j in 0..=i {
            let row = |k: usize| factor.get(cell(k, 0)..cell(k, 0) + j).unwrap_or_default();
            let known: f64 = if i == j {
                row(i).iter().map(|l| l * l).sum()
            } else {
                row(i).iter().zip(row(j)).map(|(a, b)| a * b).sum()
            };
            let rest = covariance.get(cell(i, j))? - known;
            if i == j {
                if rest.is_nan() || rest <= PIVOT_MIN {
                    return None;
                }
                factor.push(rest.sqrt());
            } else {
                let pivot = *factor.get(cell(j, j))?;
                factor.push(rest / pivot);
            }
        }
    }
    Some(factor)
}
