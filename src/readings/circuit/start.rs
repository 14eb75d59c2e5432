//! Starting values from the sweep's own asymptotes: capacitance and its slope at the low end,
//! inductance at the high end, resistance where it is smallest compared with |Z|.

use super::model::{CAPACITANCE_AT, Circuit, MOST, SKIN_AT};
use num_complex::Complex64;
use std::f64::consts::{FRAC_PI_2, TAU};

/// Rough figures of a sweep's low end.
#[derive(Debug, Clone, Copy)]
pub(super) struct Rough {
    /// F, at the low end.
    capacitance: f64,
    /// rad, loss angle at the low end.
    loss: f64,
}

/// Rough figures of the rest of it.
#[derive(Debug, Clone, Copy)]
struct Rest {
    /// H
    inductance: f64,
    /// Ω, around the smallest |Z|.
    resistance: f64,
    /// Ω above `resistance` at the high end, and the frequency there.
    rise: f64,
    last: f64,
    first: f64,
    /// Frequency of the smallest |Z|.
    valley: f64,
}

/// Most points at an end.
const MOST_POINTS: usize = 8;

/// How many points of `n` are an end.
fn few(n: usize) -> usize {
    (n / 20).clamp(1, MOST_POINTS)
}

/// `None` where the low end is not capacitive.
pub(super) fn rough(frequency: &[f64], impedance: &[Complex64]) -> Option<Rough> {
    let points = || frequency.iter().zip(impedance).take(few(frequency.len()));
    let capacitance = middle(points().map(|(f, z)| -1.0 / (TAU * f * z.im)));
    let loss = middle(points().map(|(_, z)| -z.re / z.im)).atan();
    (capacitance > 0.0 && capacitance.is_finite() && loss.is_finite())
        .then_some(Rough { capacitance, loss })
}

/// `sizes` are |Z|.
fn rest(frequency: &[f64], impedance: &[Complex64], sizes: &[f64], low: f64) -> Rest {
    let n = frequency.len();
    let few = few(n);
    let mut valley = 0;
    for (i, size) in sizes.iter().enumerate() {
        if *size < sizes[valley] {
            valley = i;
        }
    }
    let around = valley.saturating_sub(few)..(valley + few + 1).min(n);
    let resistance = middle(impedance[around].iter().map(|z| z.re));
    let size = sizes[valley];
    let resistance = if resistance > 0.05 * size {
        resistance
    } else {
        0.5 * size
    };
    let (first, last) = (frequency[0], frequency[n - 1]);
    // Above the valley X/ω + 1/(ω²C) is the inductance; without such points the valley's C gives
    // nothing more than a bound.
    let inductance = middle((n - few..n).map(|i| {
        let w = TAU * frequency[i];
        impedance[i].im / w + 1.0 / (w * w * low)
    }));
    let w = TAU * frequency[valley];
    let inductance = if inductance > 0.0 {
        inductance
    } else {
        1.0 / (w * w * low)
    };
    let high = middle(impedance[n - few..].iter().map(|z| z.re));
    Rest {
        inductance,
        resistance,
        rise: (high - resistance).max(0.1 * resistance),
        last,
        first,
        valley: frequency[valley],
    }
}

impl Rough {
    /// The dispersion exponent.
    pub(super) fn exponent(&self) -> f64 {
        (self.loss / FRAC_PI_2).clamp(1e-4, 0.2)
    }

    /// Parameters of a circuit to start from; `sizes` are |Z|.
    pub(super) fn parameters(
        &self,
        circuit: Circuit,
        frequency: &[f64],
        impedance: &[Complex64],
        sizes: &[f64],
    ) -> [f64; MOST] {
        let rest = rest(frequency, impedance, sizes, self.capacitance);
        let eddy = [(2.0 * rest.rise).ln(), (0.2 * rest.inductance).ln()];
        let a = self.exponent();
        let at_1khz = self.capacitance * (CAPACITANCE_AT / rest.first).powf(-a);
        let mut all = [0.0; MOST];
        (all[0], all[1]) = (0.8 * rest.resistance, 0.8 * rest.inductance);
        match circuit {
            Circuit::Dispersive => {
                let skin = rest.rise / (rest.last / SKIN_AT).sqrt();
                all[1] = 0.9 * rest.inductance;
                (all[2], all[3], all[4]) = (at_1khz.ln(), a, skin);
            }
            Circuit::DispersiveEddy => {
                (all[2], all[3]) = (at_1khz.ln(), a);
                (all[4], all[5]) = (eddy[0], eddy[1]);
            }
            Circuit::Ladder(stages) => {
                (all[2], all[3]) = (eddy[0], eddy[1]);
                let c = self.capacitance / stages as f64;
                // Corners spread evenly between the low end and the valley, the fastest first.
                let span = (rest.valley / rest.first).max(10.0);
                for k in 0..stages {
                    all[4 + 2 * k] = c.ln();
                    if k + 1 < stages {
                        let corner =
                            rest.first * span.powf(1.0 - (k + 1) as f64 / (stages + 1) as f64);
                        all[5 + 2 * k] = (1.0 / (TAU * corner * c)).ln();
                    }
                }
            }
        }
        all
    }
}

/// The middle one of as many values as two ends and a point have, at most.
fn middle(all: impl Iterator<Item = f64>) -> f64 {
    let mut values = [0.0; 2 * MOST_POINTS + 1];
    let mut count = 0;
    for (place, value) in values.iter_mut().zip(all) {
        (*place, count) = (value, count + 1);
    }
    let values = &mut values[..count];
    let half = values.len() / 2;
    if values.is_empty() {
        return f64::NAN;
    }
    *values.select_nth_unstable_by(half, f64::total_cmp).1
}
