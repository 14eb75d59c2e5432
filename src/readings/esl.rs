//! Equivalent series inductance above self-resonance.
//!
//! `L = (dX/dω + X/ω)/2`, which removes the reactance of a constant capacitance exactly, from a
//! local fit over 3 to 10 times the self-resonant frequency, at the band's geometric mean; from
//! the self-resonance to the sweep's end where the sweep ends sooner. Skin effect lowers L with
//! frequency, so that the frequency is part of the result.

use super::Reading;
use super::local_fit::{LocalFit, grown};
use super::reading::{Estimate, Outcome};
use crate::diagnostic::Note;
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::f64::consts::TAU;

/// Fewest points that show an inductance and their scatter.
const FEWEST: usize = 5;

/// ESL in H, with its frequency.
///
/// `resonance` is the sweep's self-resonance.
pub(super) fn read(sweep: &Sweep, resonance: &Outcome) -> Outcome {
    let Ok(crossing) = resonance else {
        return Err(Reading::missing(
            "srf_outside_sweep",
            "no self-resonance inside the sweep: the inductance cannot be told from the capacitance",
        ));
    };
    let resonance = crossing.value;
    let points = &sweep.frequency;
    let last = points[points.len() - 1];
    if last < 1.5 * resonance {
        return Err(Reading::missing(
            "sweep_ends_too_low",
            format!(
                "the sweep must reach at least 1.5 times the self-resonance ({}) to show the inductance",
                crate::quantity::engineering(resonance, "Hz", 4)
            ),
        ));
    }
    let from = if last >= 6.0 * resonance {
        3.0 * resonance
    } else {
        resonance
    };
    let to = last.min(10.0 * resonance);
    let centre = (from * to).sqrt();
    let slack = 1.0 + 1e-9;
    let range =
        points.partition_point(|f| f * slack < from)..points.partition_point(|f| *f <= to * slack);
    let range = grown(points, range, centre, FEWEST);
    let Some(fit) = LocalFit::new(sweep, range) else {
        return Err(Reading::missing(
            "too_few_points",
            "too few points above self-resonance to determine the inductance",
        ));
    };
    let at = |f: f64| (fit.slope(f) + fit.impedance(f)) * (0.5 / (TAU * f));
    let inductance = at(centre).im;
    let gradient = Complex64::new(0.0, 0.5 / (TAU * centre));
    let scatter = fit.sigma_with_slope(centre, gradient, gradient);
    // A rotation by φ turns X by R φ and dX/d ln f by R' φ; it also moves the SRF, and with it the
    // frequency at which the falling inductance is read.
    let moved = if to < last { 1.0 } else { 0.5 } * crossing.per_radian / resonance;
    let falls = (at(centre * 1.01).im - at(centre / 1.01).im) / (2.0 * 1.01f64.ln());
    let per_radian = at(centre).re + falls * moved;
    let mut estimate = Estimate::new(inductance, 1.0, per_radian, scatter).at(centre);
    if from < 3.0 * resonance {
        estimate.warnings.push(Note::new(
            "esl_near_resonance",
            "the sweep ends close above self-resonance: the inductance is less certain",
        ));
    }
    Ok(estimate)
}
