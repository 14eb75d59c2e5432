//! Levenberg-Marquardt for complex residuals `(Z(f_i) − Z_i)/|Z_i|` (D. W. Marquardt, J. SIAM 11
//! (1963) 431), on scaled normal equations: few parameters, well scaled, many points.

use super::data::{Course, Data, Room};
use super::model::{Circuit, MOST, NONE, Points, Prepared, Wide};
use crate::statistics::lanes::{Kernel, LANES, Lanes, Simd, chunks, chunks_mut, sum, wide};

/// A square matrix of at most `MOST` rows.
pub(super) type Square = [[f64; MOST]; MOST];

/// Where the search ended.
#[derive(Debug, Clone)]
pub(super) struct Minimum {
    pub(super) circuit: Circuit,
    pub(super) parameters: [f64; MOST],
    /// Which parameters were searched; the others stayed as they were.
    pub(super) free: Vec<usize>,
    /// Sum of squared residuals, real and imaginary parts apart.
    pub(super) square_sum: f64,
    /// `JᵀJ` of the free parameters.
    pub(super) normal: Square,
    pub(super) converged: bool,
    /// Of the weighted residuals.
    pub(super) course: Course,
    /// `Jᵀ` of `jZ` in place of the residuals: what a common phase error does.
    pub(super) turned: [f64; MOST],
}

/// Evaluations after which a search is given up: a circuit that fits needs a dozen.
const MOST_EVALUATIONS: usize = 60;

impl Data<'_> {
    /// Sums over the points at the parameters `p`, in one pass; the residuals are left in `residual`.
    fn accumulate(
        &self,
        circuit: Circuit,
        p: &[f64; MOST],
        free: &[usize],
        residual: &mut [Vec<f64>; 2],
    ) -> Normal {
        let [re, im] = residual;
        wide(Accumulate {
            data: self,
            circuit: circuit.prepare(p),
            free,
            re,
            im,
        })
    }

    /// Searches the minimum over the parameters of `free`, from `start`.
    ///
    /// Circuits with one capacitance have one minimum, and it is looked for among few points first;
    /// ladders have more than one, and are searched from `start`.
    pub(super) fn minimise(
        &self,
        circuit: Circuit,
        start: &[f64; MOST],
        free: &[usize],
    ) -> Minimum {
        let ladder = matches!(circuit, Circuit::Ladder(_));
        let mut room = Room::default();
        let thin = (!ladder).then(|| self.thin(&mut room)).flatten();
        let near = thin
            .map(|thin| thin.search(circuit, start, free))
            .filter(|near| near.converged);
        match near {
            Some(near) => self.search(circuit, &near.parameters, free),
            None => self.search(circuit, start, free),
        }
    }

    fn search(&self, circuit: Circuit, start: &[f64; MOST], free: &[usize]) -> Minimum {
        let n = free.len();
        let mut p = *start;
        let length = self.columns.weight().len();
        let mut residual = [vec![0.0; length], vec![0.0; length]];
        let mut here = self.accumulate(circuit, &p, free, &mut residual);
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
            let mut moved = p;
            for (i, k) in free.iter().enumerate() {
                moved[*k] += step[i];
            }
            let there = self.accumulate(circuit, &moved, free, &mut residual);
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
        // The residuals may be those of a step that was not taken.
        let here = self.accumulate(circuit, &p, free, &mut residual);
        let [re, im] = &residual;
        Minimum {
            circuit,
            course: Course::of(&re[..self.len()], &im[..self.len()]),
            turned: here.turned,
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

/// Sum of squares, its half gradient and `JᵀJ`; and `Jᵀ` of the weighted data, turned by a right
/// angle.
struct Normal {
    sum: f64,
    gradient: [f64; MOST],
    /// Lower triangle.
    matrix: Square,
    turned: [f64; MOST],
}

/// Makes [`Normal`], and writes the weighted residuals' real and imaginary parts.
struct Accumulate<'a> {
    data: &'a Data<'a>,
    circuit: Prepared,
    free: &'a [usize],
    re: &'a mut [f64],
    im: &'a mut [f64],
}

impl Kernel for Accumulate<'_> {
    type Output = Normal;

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) -> Normal {
        let columns = &self.data.columns;
        let weight = chunks(columns.weight());
        let (re, im) = (
            &chunks(columns.re())[..weight.len()],
            &chunks(columns.im())[..weight.len()],
        );
        let to_re = &mut chunks_mut(self.re)[..weight.len()];
        let to_im = &mut chunks_mut(self.im)[..weight.len()];
        let n = self.free.len();
        let mut square = Lanes::all(simd, 0.0);
        // More sums than there are registers: they are kept as numbers.
        let [mut gradient, mut turned] = [[[0.0; LANES]; MOST]; 2];
        let mut matrix = [[[0.0; LANES]; MOST]; MOST];
        let (mut derivatives, mut weighted) = (NONE, NONE);
        for (i, at) in Points::of(self.data.axis).enumerate().take(weight.len()) {
            let w = Lanes::of(simd, &weight[i]);
            let measured = Wide::new(Lanes::of(simd, &re[i]), Lanes::of(simd, &im[i]));
            let model = self.circuit.evaluate(simd, at, &mut derivatives);
            let residual = model.minus(measured).scaled(w);
            residual.re.store(&mut to_re[i]);
            residual.im.store(&mut to_im[i]);
            square = square.plus(residual.along(residual));
            // jZ
            let minus = Lanes::all(simd, 0.0).minus(measured.im);
            let across = Wide::new(minus, measured.re).scaled(w);
            for (weighted, k) in weighted.iter_mut().zip(self.free) {
                Wide::of(simd, &derivatives[*k]).scaled(w).store(weighted);
            }
            for i in 0..n {
                let one = Wide::of(simd, &weighted[i]);
                add(simd, one.along(residual), &mut gradient[i]);
                add(simd, one.along(across), &mut turned[i]);
                for (sum, other) in matrix[i][..=i].iter_mut().zip(&weighted) {
                    add(simd, one.along(Wide::of(simd, other)), sum);
                }
            }
        }
        Normal {
            sum: square.sum(),
            gradient: gradient.map(sum),
            matrix: matrix.map(|row| row.map(sum)),
            turned: turned.map(sum),
        }
    }
}

#[inline(always)]
fn add<S: Simd>(simd: S, more: Lanes<S>, to: &mut [f64; LANES]) {
    Lanes::of(simd, to).plus(more).store(to);
}

impl Normal {
    /// The damped step, or `None` where the matrix is not positive definite.
    fn step(&self, n: usize, damping: f64) -> Option<[f64; MOST]> {
        let minus = self.gradient.map(|g| -g);
        solve(&self.matrix, n, damping, &minus)
    }
}

/// Solves `(A + damping·diag A) x = b`; `A` is given by its lower triangle.
pub(super) fn solve<const N: usize>(
    a: &[[f64; N]; N],
    n: usize,
    damping: f64,
    b: &[f64; N],
) -> Option<[f64; N]> {
    Some(Factor::new(a, n, damping)?.solve(b))
}

/// Inverse of `A`, or `None` where the data do not determine every parameter.
pub(super) fn invert<const N: usize>(a: &[[f64; N]; N], n: usize) -> Option<[[f64; N]; N]> {
    Some(Factor::new(a, n, 0.0)?.inverse())
}

/// Cholesky factor of a matrix of `n` rows, in correlation scaling.
pub(super) struct Factor<const N: usize> {
    n: usize,
    /// The factor's lower triangle, on its diagonal the reciprocals.
    lower: [[f64; N]; N],
    scale: [f64; N],
}

impl<const N: usize> Factor<N> {
    /// Of `A + damping·diag A`, `A` given by its lower triangle; `None` where it is not positive
    /// definite.
    #[inline]
    pub(super) fn new(a: &[[f64; N]; N], n: usize, damping: f64) -> Option<Factor<N>> {
        let mut scale = [0.0; N];
        let mut finite = true;
        for i in 0..n {
            scale[i] = 1.0 / a[i][i].sqrt();
            finite &= scale[i].is_finite();
        }
        if !finite {
            return None;
        }
        let mut lower = [[0.0; N]; N];
        for j in 0..n {
            let known: f64 = (0..j).map(|k| lower[j][k] * lower[j][k]).sum();
            let rest = 1.0 + damping - known;
            // Below rounding a parameter is not told from the others.
            if rest.is_nan() || rest <= 1e-13 {
                return None;
            }
            let reciprocal = 1.0 / rest.sqrt();
            lower[j][j] = reciprocal;
            for i in j + 1..n {
                let known: f64 = (0..j).map(|k| lower[i][k] * lower[j][k]).sum();
                lower[i][j] = (a[i][j] * scale[i] * scale[j] - known) * reciprocal;
            }
        }
        Some(Factor { n, lower, scale })
    }

    #[inline]
    pub(super) fn solve(&self, b: &[f64; N]) -> [f64; N] {
        let (n, lower, scale) = (self.n, &self.lower, &self.scale);
        let mut x = [0.0; N];
        for i in 0..n {
            let known: f64 = (0..i).map(|j| lower[i][j] * x[j]).sum();
            x[i] = (b[i] * scale[i] - known) * lower[i][i];
        }
        for i in (0..n).rev() {
            let known: f64 = (i + 1..n).map(|j| lower[j][i] * x[j]).sum();
            x[i] = (x[i] - known) * lower[i][i];
        }
        for i in 0..n {
            x[i] *= scale[i];
        }
        x
    }

    pub(super) fn inverse(&self) -> [[f64; N]; N] {
        let mut inverse = [[0.0; N]; N];
        for k in 0..self.n {
            let mut unit = [0.0; N];
            unit[k] = 1.0;
            let column = self.solve(&unit);
            for i in 0..self.n {
                inverse[i][k] = column[i];
            }
        }
        inverse
    }
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
