//! Probability of conformity of a value, and the risks of a decision rule.
//!
//! JCGM 106:2012: conformance probability, clause 7; acceptance limits, clause 8; global consumer's
//! and producer's risk, clause 9.5. Values are normally distributed about what was measured, and
//! true values about the process mean.

use crate::limits::{DecisionRule, DecisionRuleKind, Window};
use crate::statistics::distributions::{normal_cdf, normal_sf};

/// Probability that the true value lies in the window, given a measured value and its standard
/// uncertainty (JCGM 106:2012, 7.3 and 7.4 equation (11), no prior knowledge).
///
/// With no uncertainty (0) it is 1 inside the closed window and 0 outside. `None` for values that
/// are not finite or an uncertainty below 0.
pub fn conformance_probability(value: f64, u: f64, window: Window) -> Option<f64> {
    if !value.is_finite() || !u.is_finite() || u < 0.0 {
        return None;
    }
    if u == 0.0 {
        return Some(f64::from(u8::from(window.contains(value))));
    }
    Some(inside(value, u, window))
}

/// P(lower ≤ X ≤ upper) for X normal about `centre`; the tail that is small is the one computed.
fn inside(centre: f64, sigma: f64, window: Window) -> f64 {
    let below = window
        .lower
        .map_or(0.0, |l| normal_cdf((l - centre) / sigma));
    let above = window
        .upper
        .map_or(0.0, |u| normal_sf((u - centre) / sigma));
    match (window.lower, window.upper) {
        (Some(l), Some(u)) if centre < l => {
            normal_sf((l - centre) / sigma) - normal_sf((u - centre) / sigma)
        }
        (Some(l), Some(u)) if centre > u => {
            normal_cdf((u - centre) / sigma) - normal_cdf((l - centre) / sigma)
        }
        (Some(l), None) => normal_sf((l - centre) / sigma),
        (None, Some(u)) => normal_cdf((u - centre) / sigma),
        _ => 1.0 - below - above,
    }
}

/// The acceptance interval of a decision rule: the tolerance interval less the guard band `w = k u`
/// under guarded acceptance (8.3.2), widened by it under guarded rejection (8.3.3).
///
/// `None` where the guard bands leave no acceptance zone.
pub fn acceptance_window(window: Window, u: f64, rule: &DecisionRule) -> Option<Window> {
    let guard = rule.coverage_factor * u;
    let inwards = match rule.kind {
        DecisionRuleKind::SimpleAcceptance => 0.0,
        DecisionRuleKind::GuardedAcceptance => guard,
        DecisionRuleKind::GuardedRejection => -guard,
    };
    let accepted = Window {
        lower: window.lower.map(|l| l + inwards),
        upper: window.upper.map(|u| u - inwards),
    };
    match (accepted.lower, accepted.upper) {
        (Some(l), Some(u)) if l > u => None,
        _ => Some(accepted),
    }
}

/// Risks of a decision rule for parts of a process, before any of them is measured.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Risks {
    /// Probability that a part does not conform and is accepted (9.5.2, equation (19)).
    pub consumer: f64,
    /// Probability that a part conforms and is rejected (9.5.2, equation (20)).
    pub producer: f64,
}

/// Global risks for a normal process of `mean` and standard deviation `sd`, measured with standard
/// uncertainty `u`, limits `tolerance`, accepted in `acceptance` (9.5.2; A.4, equations A.15 to
/// A.17).
///
/// `None` unless `sd` and `u` are finite and above 0.
pub fn global_risks(
    (mean, sd): (f64, f64),
    u: f64,
    tolerance: Window,
    acceptance: Window,
) -> Option<Risks> {
    if !(mean.is_finite() && sd.is_finite() && sd > 0.0 && u.is_finite() && u > 0.0) {
        return None;
    }
    let mut edges = vec![mean - 9.0 * sd, mean, mean + 9.0 * sd];
    for limit in [tolerance.lower, tolerance.upper].into_iter().flatten() {
        edges.push(limit);
    }
    for limit in [acceptance.lower, acceptance.upper].into_iter().flatten() {
        // The probability of acceptance turns over within some u of an acceptance limit.
        edges.extend([-9.0, -3.0, 0.0, 3.0, 9.0].map(|k| limit + k * u));
    }
    let (first, last) = (edges[0], edges[2]);
    edges.iter_mut().for_each(|e| *e = e.clamp(first, last));
    edges.sort_by(f64::total_cmp);
    let density = |x: f64| {
        let z = (x - mean) / sd;
        (-0.5 * z * z).exp() / (sd * std::f64::consts::TAU.sqrt())
    };
    let mut risks = Risks {
        consumer: 0.0,
        producer: 0.0,
    };
    for pair in edges.windows(2) {
        let (a, b) = (pair[0], pair[1]);
        if b <= a {
            continue;
        }
        if tolerance.contains(0.5 * (a + b)) {
            risks.producer += simpson(a, b, |x| (1.0 - inside(x, u, acceptance)) * density(x));
        } else {
            risks.consumer += simpson(a, b, |x| inside(x, u, acceptance) * density(x));
        }
    }
    Some(risks)
}

/// Simpson's rule in 200 steps.
fn simpson(a: f64, b: f64, f: impl Fn(f64) -> f64) -> f64 {
    let steps = 200;
    let h = (b - a) / f64::from(steps);
    let sum: f64 = (1..steps)
        .map(|i| f(a + f64::from(i) * h) * if i % 2 == 0 { 2.0 } else { 4.0 })
        .sum();
    (f(a) + sum + f(b)) * h / 3.0
}
