//! Levenberg-Marquardt for complex residuals `(Z(f_i) − Z_i)/|Z_i|` (D. W. Marquardt, J. SIAM 11
//! (1963) 431), on scaled normal equations: few parameters, well scaled, many points.

use super::model::{Circuit, MOST, Point};
use super::projected;
use crate::readings::grid::{Axis, Grid};
use num_complex::Complex64;

/// A square matrix of at most `MOST` rows.
pub(super) type Square = [[f64; MOST]; MOST];

/// The points to be fitted.
pub(super) struct Data<'a> {
    pub(super) axis: &'a Axis,
    pub(super) impedance: Vec<Complex64>,
    /// 1/|Z|
    pub(super) weight: Vec<f64>,
    /// Every eighth point, where there are enough: a search that begins at its minimum is over in a
    /// few steps.
    pub(super) thin: Option<Box<Data<'a>>>,
}

/// Where the search ended.
#[derive(Debug, Clone)]
pub(super) struct Minimum {
    pub(super) circuit: Circuit,
    pub(super) parameters: Vec<f64>,
    /// Which parameters were searched; the others stayed as they were.
    pub(super) free: Vec<usize>,
    /// Sum of squared residuals, real and imaginary parts apart.
    pub(super) square_sum: f64,
    /// `JᵀJ` of the free parameters.
    pub(super) normal: Square,
    pub(super) converged: bool,
    /// The weighted residual at each point.
    pub(super) residual: Vec<Complex64>,
    /// `Jᵀ` of `jZ` in place of the residuals: what a common phase error does.
    pub(super) turned: [f64; MOST],
}

/// Evaluations after which a search is given up: a circuit that fits needs a dozen.
const MOST_EVALUATIONS: usize = 60;

/// Fewest points of thin data.
const THIN_LEAST: usize = 32;

impl<'a> Data<'a> {
    /// `size` is |Z|.
    pub(super) fn new(grid: &'a Grid, impedance: &[Complex64], size: &[f64]) -> Data<'a> {
        let weight: Vec<f64> = size.iter().map(|size| 1.0 / size).collect();
        let thin = (impedance.len() >= Grid::STEP * THIN_LEAST).then(|| {
            Box::new(Data {
                axis: &grid.thin,
                impedance: impedance.iter().copied().step_by(Grid::STEP).collect(),
                weight: weight.iter().copied().step_by(Grid::STEP).collect(),
                thin: None,
            })
        });
        Data {
            axis: &grid.all,
            impedance: impedance.to_vec(),
            weight,
            thin,
        }
    }

    /// Number of real residuals.
    pub(super) fn residuals(&self) -> usize {
        2 * self.impedance.len()
    }

    /// The points with their impedance and weight.
    fn points(&self) -> impl Iterator<Item = (Point, Complex64, f64)> {
        (Point::of(self.axis).zip(&self.impedance).zip(&self.weight))
            .map(|((at, z), w)| (at, *z, *w))
    }

    /// The weighted residual at each point.
    fn residual(&self, circuit: Circuit, p: &[f64]) -> Vec<Complex64> {
        let circuit = circuit.prepare(p);
        let mut scratch = [Complex64::ZERO; MOST];
        self.points()
            .map(|(at, z, w)| (circuit.evaluate(at, &mut scratch) - z) * w)
            .collect()
    }

    /// Sum of squares, its half gradient and `JᵀJ` in one pass.
    fn accumulate(&self, circuit: Circuit, p: &[f64], free: &[usize]) -> Normal {
        let mut normal = Normal {
            sum: 0.0,
            gradient: [0.0; MOST],
            matrix: [[0.0; MOST]; MOST],
        };
        let circuit = circuit.prepare(p);
        let mut derivatives = [Complex64::ZERO; MOST];
        let mut column = [Complex64::ZERO; MOST];
        for (at, z, w) in self.points() {
            let residual = (circuit.evaluate(at, &mut derivatives) - z) * w;
            normal.sum += residual.norm_sqr();
            for (c, k) in column.iter_mut().zip(free) {
                *c = derivatives[*k] * w;
            }
            for i in 0..free.len() {
                let c = column[i];
                normal.gradient[i] += c.re * residual.re + c.im * residual.im;
                for (entry, other) in normal.matrix[i][..=i].iter_mut().zip(&column) {
                    *entry += c.re * other.re + c.im * other.im;
                }
            }
        }
        normal
    }

    /// `Jᵀ` of the weighted data, turned by a right angle.
    fn turned(&self, circuit: Circuit, p: &[f64], free: &[usize]) -> [f64; MOST] {
        let circuit = circuit.prepare(p);
        let mut sums = [0.0; MOST];
        let mut derivatives = [Complex64::ZERO; MOST];
        for (at, z, w) in self.points() {
            circuit.evaluate(at, &mut derivatives);
            let turned = Complex64::I * z * (w * w);
            for (sum, k) in sums.iter_mut().zip(free) {
                let d = derivatives[*k];
                *sum += d.re * turned.re + d.im * turned.im;
            }
        }
        sums
    }

    /// Searches the minimum over the parameters of `free`, from `start`.
    ///
    /// Circuits with one capacitance have one minimum, and it is looked for among few points first;
    /// ladders have more than one, and are searched from `start`.
    pub(super) fn minimise(&self, circuit: Circuit, start: &[f64], free: &[usize]) -> Minimum {
        if circuit == Circuit::Dispersive
            && let Some(minimum) = projected::minimise(self, start, free)
        {
            return minimum;
        }
        let ladder = matches!(circuit, Circuit::Ladder(_));
        let near = self.thin.as_ref().filter(|_| !ladder);
        let near = near
            .map(|thin| thin.search(circuit, start, free))
            .filter(|near| near.converged);
        match near {
            Some(near) => self.search(circuit, &near.parameters, free),
            None => self.search(circuit, start, free),
        }
    }

    fn search(&self, circuit: Circuit, start: &[f64], free: &[usize]) -> Minimum {
        let n = free.len();
        let mut p = start.to_vec();
        let mut here = self.accumulate(circuit, &p, free);
        let (mut damping, mut converged) = (1e-4, false);
        for _ in 0..MOST_EVALUATIONS {
            let Some(mut step) = here.step(n, damping) else {
                damping = 10.0 * f64::max(damping, 1e-6);
                if damping > 1e12 {
                    break;
                }
                continue;
            };
            let expected: f64 = (0..n).map(|i| -step[i] * here.gradient[i]).sum();
            shorten(circuit, free, &mut step);
            // Rounding of the data (ten digits) is reached, or nothing is left to be gained.
            if expected <= 1e-12 * here.sum || here.sum <= 1e-24 * self.residuals() as f64 {
                converged = here.sum.is_finite();
                break;
            }
            let mut moved = p.clone();
            for (i, k) in free.iter().enumerate() {
                moved[*k] += step[i];
            }
            let there = self.accumulate(circuit, &moved, free);
            if there.sum.is_finite() && there.sum < here.sum {
                (p, here) = (moved, there);
                damping = if damping > 1e-9 { damping * 0.1 } else { 0.0 };
            } else {
                damping = 10.0 * f64::max(damping, 1e-6);
                if damping > 1e12 {
                    break;
                }
            }
        }
        Minimum {
            circuit,
            residual: self.residual(circuit, &p),
            turned: self.turned(circuit, &p, free),
            parameters: p,
            free: free.to_vec(),
            square_sum: here.sum,
            normal: here.matrix,
            converged,
        }
    }
}

/// Shortens a step that would change an element by more than a factor of e: far from the minimum
/// the derivatives of a logarithm say nothing about so long a way.
fn shorten(circuit: Circuit, free: &[usize], step: &mut [f64; MOST]) {
    let longest = free
        .iter()
        .zip(step.iter())
        .filter(|(k, _)| circuit.is_logarithm(**k))
        .map(|(_, s)| s.abs())
        .fold(0.0, f64::max);
    if longest > 1.0 {
        step.iter_mut().for_each(|s| *s /= longest);
    }
}

struct Normal {
    sum: f64,
    gradient: [f64; MOST],
    /// Lower triangle.
    matrix: Square,
}

impl Normal {
    /// The damped step, or `None` where the matrix is not positive definite.
    fn step(&self, n: usize, damping: f64) -> Option<[f64; MOST]> {
        let minus = self.gradient.map(|g| -g);
        solve(&self.matrix, n, damping, &minus)
    }
}

/// Solves `(A + damping·diag A) x = b` by Cholesky's method in correlation scaling; `A` is given by
/// its lower triangle.
pub(super) fn solve(a: &Square, n: usize, damping: f64, b: &[f64; MOST]) -> Option<[f64; MOST]> {
    let (factor, scale) = factorise(a, n, damping)?;
    let mut x = [0.0; MOST];
    for i in 0..n {
        let known: f64 = (0..i).map(|j| factor[i][j] * x[j]).sum();
        x[i] = (b[i] * scale[i] - known) / factor[i][i];
    }
    for i in (0..n).rev() {
        let known: f64 = (i + 1..n).map(|j| factor[j][i] * x[j]).sum();
        x[i] = (x[i] - known) / factor[i][i];
    }
    for i in 0..n {
        x[i] *= scale[i];
    }
    Some(x)
}

/// Inverse of `A`, or `None` where the data do not determine every parameter.
pub(super) fn invert(a: &Square, n: usize) -> Option<Square> {
    let mut inverse = [[0.0; MOST]; MOST];
    for k in 0..n {
        let mut unit = [0.0; MOST];
        unit[k] = 1.0;
        let column = solve(a, n, 0.0, &unit)?;
        for i in 0..n {
            inverse[i][k] = column[i];
        }
    }
    Some(inverse)
}

/// Cholesky factor of the scaled matrix, and the scale.
fn factorise(a: &Square, n: usize, damping: f64) -> Option<(Square, [f64; MOST])> {
    let mut scale = [0.0; MOST];
    for i in 0..n {
        scale[i] = 1.0 / a[i][i].sqrt();
        if !scale[i].is_finite() {
            return None;
        }
    }
    let mut factor = [[0.0; MOST]; MOST];
    for i in 0..n {
        for j in 0..=i {
            let known: f64 = (0..j).map(|k| factor[i][k] * factor[j][k]).sum();
            let entry = if i == j {
                1.0 + damping
            } else {
                a[i][j] * scale[i] * scale[j]
            };
            let rest = entry - known;
            if i == j {
                // Below rounding a parameter is not told from the others.
                if rest.is_nan() || rest <= 1e-13 {
                    return None;
                }
                factor[i][i] = rest.sqrt();
            } else {
                factor[i][j] = rest / factor[j][j];
            }
        }
    }
    Some((factor, scale))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_small_system_is_solved_and_inverted() {
        let mut a = [[0.0; MOST]; MOST];
        // Lower triangle of [[4, 2], [2, 3]]·diag scaling 1e6: badly scaled on purpose.
        (a[0][0], a[1][0], a[1][1]) = (4e12, 2e6, 3.0);
        let mut b = [0.0; MOST];
        (b[0], b[1]) = (8e6, 7.0);
        // 4u + 2v = 8, 2u + 3v = 7 with u = x0·1e6: u = 1.25, v = 1.5.
        let x = solve(&a, 2, 0.0, &b).unwrap();
        assert!((x[0] - 1.25e-6).abs() < 1e-18 && (x[1] - 1.5).abs() < 1e-12);
        let inverse = invert(&a, 2).unwrap();
        assert!((inverse[1][1] - 0.5).abs() < 1e-12);
        (a[1][0], a[1][1]) = (4e6, 4.0);
        assert!(
            invert(&a, 2).is_none(),
            "two columns alike are not determined"
        );
    }
}
