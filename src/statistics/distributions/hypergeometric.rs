//! The hypergeometric distribution: nonconforming items in a sample drawn without replacement.

use super::incomplete::{Tails, binomial_density};

/// P(X ≤ k): at most k of the `marked` items of a lot are in a sample of n. NaN where `marked` or n
/// exceeds the lot.
pub fn hypergeometric_cdf(k: u64, lot: u64, marked: u64, n: u64) -> f64 {
    tails(k, lot, marked, n).lower
}

/// P(X > k): more than k of the `marked` items of a lot are in a sample of n.
pub fn hypergeometric_sf(k: u64, lot: u64, marked: u64, n: u64) -> f64 {
    tails(k, lot, marked, n).upper
}

fn tails(k: u64, lot: u64, marked: u64, n: u64) -> Tails {
    if marked > lot || n > lot {
        return Tails::NAN;
    }
    let smallest = n.saturating_sub(lot - marked);
    let largest = n.min(marked);
    if k < smallest {
        return Tails::of_lower(0.0);
    }
    if k >= largest {
        return Tails::of_upper(0.0);
    }
    let law = Law { lot, marked, n };
    let mean = n as f64 * (marked as f64 / lot as f64);
    if (k as f64) < mean {
        Tails::of_lower(law.density(k) * law.sum_down(k, smallest))
    } else {
        Tails::of_upper(law.density(k + 1) * law.sum_up(k + 1, largest))
    }
}

#[derive(Clone, Copy)]
struct Law {
    lot: u64,
    marked: u64,
    n: u64,
}

impl Law {
    /// P(X = x), as a product of three binomial densities: Loader (2000).
    fn density(self, x: u64) -> f64 {
        let lot = self.lot as f64;
        let p = self.n as f64 / lot;
        let q = (self.lot - self.n) as f64 / lot;
        let (drawn, left) = (x as f64, (self.marked - x) as f64);
        let others = (self.lot - self.marked) as f64;
        let others_drawn = (self.n - x) as f64;
        binomial_density(drawn, left, p, q)
            * binomial_density(others_drawn, others - others_drawn, p, q)
            / binomial_density(self.n as f64, (self.lot - self.n) as f64, p, q)
    }

    /// P(X = x) / P(X = x − 1).
    fn ratio(self, x: u64) -> f64 {
        let marked_left = (self.marked - x + 1) as f64;
        let drawn_others = (self.n - x + 1) as f64;
        let others_left = (self.lot - self.marked + x - self.n) as f64;
        (marked_left / x as f64) * (drawn_others / others_left)
    }

    /// Σ P(X = i)/P(X = k) for i = k, k − 1, …, smallest.
    fn sum_down(self, k: u64, smallest: u64) -> f64 {
        let (mut sum, mut term, mut x) = (1.0, 1.0, k);
        while x > smallest && term > sum * 0.25 * f64::EPSILON {
            term /= self.ratio(x);
            sum += term;
            x -= 1;
        }
        sum
    }

    /// Σ P(X = i)/P(X = k) for i = k, k + 1, …, largest.
    fn sum_up(self, k: u64, largest: u64) -> f64 {
        let (mut sum, mut term, mut x) = (1.0, 1.0, k);
        while x < largest && term > sum * 0.25 * f64::EPSILON {
            x += 1;
            term *= self.ratio(x);
            sum += term;
        }
        sum
    }
}
