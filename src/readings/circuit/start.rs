//! Starting values from the sweep's own asymptotes: capacitance and its slope at the low end,
//! inductance at the high end, resistance where it is smallest compared with |Z|.

use super::model::{CAPACITANCE_AT, Circuit, SKIN_AT};
use num_complex::Complex64;
use std::f64::consts::{FRAC_PI_2, TAU};

/// Rough figures of a sweep.
#[derive(Debug, Clone, Copy)]
pub(super) struct Rough {
    /// F, at the low end.
    capacitance: f64,
    /// rad, loss angle at the low end.
    loss: f64,
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

/// `None` where the low end is not capacitive.
///
/// `sizes` are |Z|.
pub(super) fn rough(frequency: &[f64], impedance: &[Complex64], sizes: &[f64]) -> Option<Rough> {
    let n = frequency.len();
    let few = (n / 20).clamp(1, 8);
    let low = middle(
        &mut (0..few)
            .map(|i| -1.0 / (TAU * frequency[i] * impedance[i].im))
            .collect::<Vec<_>>(),
    );
    let loss = middle(
        &mut (0..few)
            .map(|i| (-impedance[i].re / impedance[i].im).atan())
            .collect::<Vec<_>>(),
    );
    let mut valley = 0;
    for (i, size) in sizes.iter().enumerate() {
        if *size < sizes[valley] {
            valley = i;
        }
    }
    let around = valley.saturating_sub(few)..(valley + few + 1).min(n);
    let resistance = middle(&mut impedance[around].iter().map(|z| z.re).collect::<Vec<_>>());
    let size = sizes[valley];
    let resistance = if resistance > 0.05 * size {
        resistance
    } else {
        0.5 * size
    };
    let (first, last) = (frequency[0], frequency[n - 1]);
    // Above the valley X/ω + 1/(ω²C) is the inductance; without such points the valley's C gives
    // nothing more than a bound.
    let inductance = middle(
        &mut (n - few..n)
            .map(|i| {
                let w = TAU * frequency[i];
                impedance[i].im / w + 1.0 / (w * w * low)
            })
            .collect::<Vec<_>>(),
    );
    let w = TAU * frequency[valley];
    let inductance = if inductance > 0.0 {
        inductance
    } else {
        1.0 / (w * w * low)
    };
    let high = middle(
        &mut impedance[n - few..]
            .iter()
            .map(|z| z.re)
            .collect::<Vec<_>>(),
    );
    (low > 0.0 && low.is_finite() && loss.is_finite()).then_some(Rough {
        capacitance: low,
        loss,
        inductance,
        resistance,
        rise: (high - resistance).max(0.1 * resistance),
        last,
        first,
        valley: frequency[valley],
    })
}

impl Rough {
    /// Parameters of a circuit to start from.
    pub(super) fn parameters(&self, circuit: Circuit) -> Vec<f64> {
        let eddy = [(2.0 * self.rise).ln(), (0.2 * self.inductance).ln()];
        let a = (self.loss / FRAC_PI_2).clamp(1e-4, 0.2);
        let at_1khz = self.capacitance * (CAPACITANCE_AT / self.first).powf(-a);
        match circuit {
            Circuit::Dispersive => {
                let skin = self.rise / (self.last / SKIN_AT).sqrt();
                vec![
                    0.8 * self.resistance,
                    0.9 * self.inductance,
                    at_1khz.ln(),
                    a,
                    skin,
                ]
            }
            Circuit::DispersiveEddy => vec![
                0.8 * self.resistance,
                0.8 * self.inductance,
                at_1khz.ln(),
                a,
                eddy[0],
                eddy[1],
            ],
            Circuit::Ladder(stages) => {
                let mut all = vec![
                    0.8 * self.resistance,
                    0.8 * self.inductance,
                    eddy[0],
                    eddy[1],
                ];
                let c = self.capacitance / stages as f64;
                // Corners spread evenly between the low end and the valley, the fastest first.
                let span = (self.valley / self.first).max(10.0);
                for k in 0..stages {
                    all.push(c.ln());
                    if k + 1 < stages {
                        let corner =
                            self.first * span.powf(1.0 - (k + 1) as f64 / (stages + 1) as f64);
                        all.push((1.0 / (TAU * corner * c)).ln());
                    }
                }
                all
            }
        }
    }
}

/// The middle one of some values.
fn middle(values: &mut [f64]) -> f64 {
    let half = values.len() / 2;
    if values.is_empty() {
        return f64::NAN;
    }
    *values.select_nth_unstable_by(half, f64::total_cmp).1
}
