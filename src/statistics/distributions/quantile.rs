//! Quantiles by inversion of a tail.

use super::incomplete::Tails;
use crate::statistics::root::bracketed;

/// Which tail a probability is of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Tail {
    Lower,
    Upper,
}

/// ln of the smallest and largest arguments that are searched.
const LN_RANGE: (f64, f64) = (-744.0, 709.0);

/// The x > 0 at which the tail has probability p, for a distribution on the positive axis.
///
/// Solved in ln x and ln p, in which tails are nearly straight; the smaller of the two tails is matched, so
/// that neither a small nor a large p loses digits.
pub(super) fn positive(tails: impl Fn(f64) -> Tails, p: f64, tail: Tail) -> f64 {
    if !(0.0..=1.0).contains(&p) {
        return f64::NAN;
    }
    let (lower, upper) = match tail {
        Tail::Lower => (p, 1.0 - p),
        Tail::Upper => (1.0 - p, p),
    };
    if lower == 0.0 {
        return 0.0;
    }
    if upper == 0.0 {
        return f64::INFINITY;
    }
    let excess = |u: f64| {
        let at = tails(u.exp());
        if lower <= upper {
            at.lower.ln() - lower.ln()
        } else {
            upper.ln() - at.upper.ln()
        }
    };
    bracketed(excess, LN_RANGE.0, LN_RANGE.1).map_or(f64::NAN, f64::exp)
}
