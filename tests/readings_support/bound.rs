//! The Cramér-Rao bound of a reading: the least standard deviation that an unbiased estimator can
//! have from a noisy sweep of a reference part, its topology known and its elements free.
//!
//! For normal noise of ln|Z| and phase the information is `JᵀJ`, `J` the derivatives of
//! (ln|Z|/σ_m, θ/σ_φ) with respect to the logarithms of the elements; the bound of a quantity with
//! gradient g is `√(gᵀ (JᵀJ)⁺ g)` (C. R. Rao 1945). The singular value decomposition is one-sided
//! Jacobi.

use super::{Network, Sweep};
use num_complex::Complex64;

impl Network {
    fn elements(&self, found: &mut Vec<f64>) {
        match self {
            Network::R(v) | Network::L(v) | Network::C(v) => found.push(*v),
            Network::Series(all) | Network::Parallel(all) => {
                all.iter().for_each(|n| n.elements(found));
            }
        }
    }

    /// The same topology with other values, in the order of `elements`.
    fn with(&self, values: &mut impl Iterator<Item = f64>) -> Network {
        match self {
            Network::R(_) => Network::R(values.next().unwrap()),
            Network::L(_) => Network::L(values.next().unwrap()),
            Network::C(_) => Network::C(values.next().unwrap()),
            Network::Series(all) => Network::Series(all.iter().map(|n| n.with(values)).collect()),
            Network::Parallel(all) => {
                Network::Parallel(all.iter().map(|n| n.with(values)).collect())
            }
        }
    }
}

/// Derivatives of `of(network)` with respect to the logarithm of each element, by central
/// differences: `derivatives[element][quantity]`.
fn derivatives(network: &Network, of: impl Fn(&Network) -> Vec<f64>) -> Vec<Vec<f64>> {
    let mut elements = Vec::new();
    network.elements(&mut elements);
    let h = 1e-5f64;
    (0..elements.len())
        .map(|k| {
            let moved = |step: f64| {
                let mut values = elements.clone();
                values[k] *= step.exp();
                of(&network.with(&mut values.into_iter()))
            };
            let (up, down) = (moved(h), moved(-h));
            up.iter()
                .zip(down)
                .map(|(u, d)| (u - d) / (2.0 * h))
                .collect()
        })
        .collect()
}

/// Bounds of quantities whose values are `of(network)`, each in its own unit.
pub fn cramer_rao(
    network: &Network,
    sweep: &Sweep,
    (magnitude, phase): (f64, f64),
    of: impl Fn(&Network) -> Vec<f64>,
) -> Vec<f64> {
    let observed = |n: &Network| {
        let ln: Vec<Complex64> = sweep
            .frequency
            .iter()
            .map(|f| (-Complex64::I * n.impedance(*f)).ln())
            .collect();
        // Times −j, so that the phase of a capacitor or inductor does not wrap.
        ln.iter()
            .map(|l| l.re / magnitude)
            .chain(ln.iter().map(|l| l.im / phase))
            .collect()
    };
    let mut columns = derivatives(network, observed);
    let gradients = derivatives(network, of);
    let rotations = jacobi(&mut columns);
    let lengths: Vec<f64> = columns
        .iter()
        .map(|c| c.iter().map(|v| v * v).sum::<f64>().sqrt())
        .collect();
    let largest = lengths.iter().copied().fold(0.0, f64::max);
    (0..gradients[0].len())
        .map(|q| {
            let squares = lengths.iter().zip(&rotations).map(|(s, v)| {
                let share: f64 = v.iter().zip(&gradients).map(|(v, g)| v * g[q]).sum();
                // What central differences cannot resolve is no information.
                if *s > 1e-9 * largest {
                    (share / s).powi(2)
                } else {
                    0.0
                }
            });
            squares.sum::<f64>().sqrt()
        })
        .collect()
}

/// Orthogonalises columns in place; returns the accumulated rotation, column by column.
fn jacobi(columns: &mut [Vec<f64>]) -> Vec<Vec<f64>> {
    let n = columns.len();
    let mut rotations: Vec<Vec<f64>> = (0..n)
        .map(|i| (0..n).map(|j| f64::from(u8::from(i == j))).collect())
        .collect();
    let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(x, y)| x * y).sum::<f64>();
    for _ in 0..60 {
        let mut turned = false;
        for i in 0..n {
            for j in i + 1..n {
                let (a, b) = (dot(&columns[i], &columns[i]), dot(&columns[j], &columns[j]));
                let c = dot(&columns[i], &columns[j]);
                if c.abs() <= 1e-14 * (a * b).sqrt() {
                    continue;
                }
                turned = true;
                let zeta = (b - a) / (2.0 * c);
                let t = zeta.signum() / (zeta.abs() + (1.0 + zeta * zeta).sqrt());
                let cos = 1.0 / (1.0 + t * t).sqrt();
                for pair in [&mut *columns, &mut rotations] {
                    let (left, right) = pair.split_at_mut(j);
                    for (x, y) in left[i].iter_mut().zip(&mut right[0]) {
                        (*x, *y) = (cos * (*x - t * *y), cos * (t * *x + *y));
                    }
                }
            }
        }
        if !turned {
            break;
        }
    }
    rotations
}
