//! Numerical integration.

use std::f64::consts::PI;

/// Points of the rule.
const POINTS: usize = 20;

/// Gauss-Legendre rule of 20 points, exact for polynomials up to degree 39 (Abramowitz & Stegun 25.4.29).
pub(crate) struct GaussLegendre {
    /// Nodes on (0, 1) with their weights; the rule is symmetric.
    nodes: [(f64, f64); POINTS / 2],
}

impl GaussLegendre {
    pub(crate) fn new() -> Self {
        let mut nodes = [(0.0, 0.0); POINTS / 2];
        for (i, node) in nodes.iter_mut().enumerate() {
            let mut x = (PI * (i as f64 + 0.75) / (POINTS as f64 + 0.5)).cos();
            let mut slope = 1.0;
            for _ in 0..8 {
                let value;
                (value, slope) = legendre(x);
                x -= value / slope;
            }
            *node = (x, 2.0 / ((1.0 - x * x) * slope * slope));
        }
        Self { nodes }
    }

    /// Integral of f over [a, b].
    pub(crate) fn integrate(&self, a: f64, b: f64, mut f: impl FnMut(f64) -> f64) -> f64 {
        let mut sum = 0.0;
        self.visit(a, b, |x, weight| sum += weight * f(x));
        sum
    }

    /// Visits the nodes on [a, b] with their weights.
    pub(crate) fn visit(&self, a: f64, b: f64, mut at: impl FnMut(f64, f64)) {
        let (centre, half) = (0.5 * (a + b), 0.5 * (b - a));
        for (x, weight) in self.nodes {
            at(centre - half * x, half * weight);
            at(centre + half * x, half * weight);
        }
    }
}

/// The Legendre polynomial of the rule's degree and its derivative.
fn legendre(x: f64) -> (f64, f64) {
    let (mut before, mut value) = (1.0, x);
    for k in 2..=POINTS {
        let k = k as f64;
        (before, value) = (
            value,
            ((2.0 * k - 1.0) * x * value - (k - 1.0) * before) / k,
        );
    }
    let slope = POINTS as f64 * (x * value - before) / (x * x - 1.0);
    (value, slope)
}

#[cfg(test)]
mod tests {
    use super::GaussLegendre;

    #[test]
    fn integrates_an_exponential_to_double_precision() {
        let found = GaussLegendre::new().integrate(-1.0, 2.0, f64::exp);
        let exact = 2.0_f64.exp() - (-1.0_f64).exp();
        assert!((found - exact).abs() < 1e-14);
    }
}
