//! Equivalent series inductance: `X/ω = L − 1/(ω² C)` fitted above self-resonance.
//!
//! The band is 3 to 10 times the self-resonant frequency, or from it to the sweep's end where the
//! sweep ends sooner; the constant term is L, with the capacitance's share removed exactly.
//! Skin effect lowers L with frequency, so that the band is part of the result.

use super::local_fit::{Basis, LocalFit};
use super::{Budget, Characteristic, Reading, srf};
use crate::diagnostic::Note;
use crate::sweep::Sweep;
use std::f64::consts::TAU;

const INDUCTANCE: [Basis; 2] = [|_| 1.0, |t| (-2.0 * t).exp()];
/// Fewest points that determine two terms and show their scatter.
const FEWEST: usize = 5;
/// ln f so far above the band that the second term has gone and the constant is left.
const FAR: f64 = 40.0;

/// ESL in H, with the band's geometric mean as its frequency.
pub(super) fn read(sweep: &Sweep, budget: &Budget) -> Reading {
    let Some(resonance) = srf::read(sweep, budget).known_value() else {
        return Reading::missing(
            "srf_outside_sweep",
            "no self-resonance inside the sweep: the inductance cannot be told from the capacitance",
        );
    };
    let last = sweep.frequency[sweep.frequency.len() - 1];
    if last < 1.5 * resonance {
        return Reading::missing(
            "sweep_ends_too_low",
            format!(
                "the sweep must reach at least 1.5 times the self-resonance ({}) to show the inductance",
                crate::quantity::engineering(resonance, "Hz", 4)
            ),
        );
    }
    let from = if last >= 6.0 * resonance {
        3.0 * resonance
    } else {
        resonance
    };
    let to = last.min(10.0 * resonance);
    let centre = (from * to).sqrt();
    let (mut t, mut y, mut w) = (Vec::new(), Vec::new(), Vec::new());
    for (f, z) in sweep.frequency.iter().zip(&sweep.impedance) {
        if *f >= from && *f <= to * (1.0 + 1e-9) {
            t.push((f / centre).ln());
            y.push(z.im / (TAU * f));
            w.push(TAU * f / z.norm().max(f64::MIN_POSITIVE));
        }
    }
    if t.len() < FEWEST {
        return Reading::missing(
            "too_few_points",
            "too few points above self-resonance to fit the inductance",
        );
    }
    let Some(fit) = LocalFit::new(&INDUCTANCE, 2, &t, &y, &w) else {
        return Reading::missing(
            "too_few_points",
            "the points above self-resonance do not determine the inductance",
        );
    };
    // The second term decays above resonance, so the constant is the curve's limit at high f.
    let inductance = fit.value(FAR);
    let mut reading = Reading::known(
        inductance,
        budget.combine(Characteristic::Esl, inductance, 0.0, fit.sigma(FAR)),
    );
    reading.frequency = Some(centre);
    if from < 3.0 * resonance {
        reading.warnings.push(Note::new(
            "esl_near_resonance",
            "the sweep ends close above self-resonance: the inductance is less certain",
        ));
    }
    reading
}
