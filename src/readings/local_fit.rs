//! Weighted least squares over a short stretch of a sweep, with the order chosen by the data.
//!
//! The basis functions are offered in order; each is orthogonalised against those before it
//! (modified Gram-Schmidt), so that every nested model is had from one pass and its residual sum
//! of squares is known. The order with the least information criterion is kept: noisy data get a
//! stiff curve with a small variance, clean data a supple one with a small bias. No thresholds on
//! particular parts, no knowledge of what is fitted.

/// A basis function of `t = ln(f/f0)`.
pub(super) type Basis = fn(f64) -> f64;

/// Polynomials in `t`.
pub(super) const POLYNOMIAL: [Basis; 5] =
    [|_| 1.0, |t| t, |t| t * t, |t| t * t * t, |t| t * t * t * t];

/// For `ωX` below and around resonance: `−1/C` with dispersion (constant and `t`), `ω²L`, rest.
pub(super) const REACTANCE: [Basis; 5] = [
    |_| 1.0,
    |t| t,
    |t| (2.0 * t).exp() - 1.0,
    |t| t * t,
    |t| t * t * t,
];

/// For `X` around resonance: `ωL`, `1/(ωC)`, then smooth remainders.
pub(super) const RESONANCE: [Basis; 5] =
    [|t| t.exp(), |t| (-t).exp(), |_| 1.0, |t| t, |t| t * t * t];

/// Information needed for one more parameter: about the 1 % point of the F test in large samples.
const PENALTY: f64 = 7.0;

/// A fitted local curve.
#[derive(Debug, Clone)]
pub(super) struct LocalFit {
    basis: &'static [Basis],
    coefficients: Vec<f64>,
    /// Upper triangular factor of the weighted design matrix, row by row.
    triangle: Vec<Vec<f64>>,
    /// Residual variance of the weighted data.
    variance: f64,
}

impl LocalFit {
    /// Fits `y(t)` with weights `w` (reciprocal standard deviations up to a common factor).
    ///
    /// At least `least` basis functions are used. `None` where there are fewer points than that,
    /// or where the data do not determine them.
    pub(super) fn new(
        basis: &'static [Basis],
        least: usize,
        t: &[f64],
        y: &[f64],
        w: &[f64],
    ) -> Option<LocalFit> {
        let n = t.len();
        let most = basis.len().min(n.saturating_sub(2).max(least)).min(n);
        if n < least || n == 0 {
            return None;
        }
        let target: Vec<f64> = y.iter().zip(w).map(|(y, w)| y * w).collect();
        let total: f64 = target.iter().map(|v| v * v).sum();
        if !total.is_finite() {
            return None;
        }
        // Below this the residual is the rounding of nine-digit files and of f64, not information.
        let floor = total * 1e-20 + f64::MIN_POSITIVE;
        let mut residual = target;
        let mut columns: Vec<Vec<f64>> = Vec::with_capacity(most);
        let mut triangle: Vec<Vec<f64>> = Vec::with_capacity(most);
        let mut projections: Vec<f64> = Vec::with_capacity(most);
        let mut best: Option<(usize, f64, f64)> = None;
        for (order, function) in basis.iter().take(most).enumerate() {
            let mut column: Vec<f64> = t.iter().zip(w).map(|(t, w)| function(*t) * w).collect();
            let before: f64 = column.iter().map(|v| v * v).sum::<f64>().sqrt();
            let mut entries = Vec::with_capacity(order + 1);
            for earlier in &columns {
                let share: f64 = earlier.iter().zip(&column).map(|(a, b)| a * b).sum();
                for (value, e) in column.iter_mut().zip(earlier) {
                    *value -= share * e;
                }
                entries.push(share);
            }
            let norm = column.iter().map(|v| v * v).sum::<f64>().sqrt();
            if norm.is_nan() || norm <= before * 1e-9 || before == 0.0 {
                break;
            }
            column.iter_mut().for_each(|v| *v /= norm);
            entries.push(norm);
            let projection: f64 = column.iter().zip(&residual).map(|(a, b)| a * b).sum();
            for (value, c) in residual.iter_mut().zip(&column) {
                *value -= projection * c;
            }
            columns.push(column);
            triangle.push(entries);
            projections.push(projection);
            let parameters = order + 1;
            if parameters < least {
                continue;
            }
            let rss: f64 = residual.iter().map(|v| v * v).sum::<f64>();
            let freedom = n.saturating_sub(parameters + 1).max(1) as f64;
            let criterion =
                n as f64 * rss.max(floor).ln() + PENALTY * parameters as f64 * (n as f64 / freedom);
            if best.is_none_or(|(_, least_criterion, _)| criterion < least_criterion) {
                best = Some((parameters, criterion, rss));
            }
        }
        let (parameters, _, rss) = best?;
        triangle.truncate(parameters);
        let mut coefficients = vec![0.0; parameters];
        for k in (0..parameters).rev() {
            let known: f64 = (k + 1..parameters)
                .map(|j| triangle[j][k] * coefficients[j])
                .sum();
            coefficients[k] = (projections[k] - known) / triangle[k][k];
        }
        let freedom = n.saturating_sub(parameters);
        let variance = if freedom > 0 {
            rss / freedom as f64
        } else {
            0.0
        };
        Some(LocalFit {
            basis,
            coefficients,
            triangle,
            variance,
        })
    }

    /// The curve at `t`.
    pub(super) fn value(&self, t: f64) -> f64 {
        self.coefficients
            .iter()
            .zip(self.basis)
            .map(|(c, b)| c * b(t))
            .sum()
    }

    /// Standard uncertainty of the curve at `t` from the scatter of the points about it.
    pub(super) fn sigma(&self, t: f64) -> f64 {
        let mut solved: Vec<f64> = Vec::with_capacity(self.coefficients.len());
        for k in 0..self.coefficients.len() {
            let known: f64 = (0..k).map(|j| self.triangle[k][j] * solved[j]).sum();
            solved.push((self.basis[k](t) - known) / self.triangle[k][k]);
        }
        (self.variance * solved.iter().map(|v| v * v).sum::<f64>()).sqrt()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn recovers_a_polynomial_exactly_and_keeps_noise_stiff() {
        let t: Vec<f64> = (-10..=10).map(|i| f64::from(i) * 0.05).collect();
        let y: Vec<f64> = t.iter().map(|t| 3.0 - 2.0 * t + 0.5 * t * t).collect();
        let w = vec![1.0; t.len()];
        let fit = LocalFit::new(&POLYNOMIAL, 1, &t, &y, &w).unwrap();
        assert!((fit.value(0.07) - (3.0 - 0.14 + 0.5 * 0.0049)).abs() < 1e-12);
        // A level with alternating noise stays a level: one parameter, not five.
        let noisy: Vec<f64> = (0..21)
            .map(|i| 1.0 + if i % 2 == 0 { 1e-2 } else { -1e-2 })
            .collect();
        let fit = LocalFit::new(&POLYNOMIAL, 1, &t, &noisy, &w).unwrap();
        assert_eq!(fit.coefficients.len(), 1);
        assert!((fit.sigma(0.0) - 1e-2 / 21f64.sqrt()).abs() < 2e-4);
    }

    #[test]
    fn too_few_points_give_no_fit() {
        assert!(LocalFit::new(&RESONANCE, 2, &[0.0], &[1.0], &[1.0]).is_none());
        assert!(LocalFit::new(&POLYNOMIAL, 1, &[], &[], &[]).is_none());
    }
}
