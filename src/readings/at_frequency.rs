//! Capacitance, dissipation factor, ESR and |Z| at one frequency inside the sweep.
//!
//! `C_s = −1/(ωX)`, `C_p = C_s/(1+D²)`, `D = R/|X|` (definitions of the series and parallel
//! equivalents, IEC 60384-1). R and X are had from a local fit over 0.8 decade, not from the
//! nearest point; a frequency outside the sweep is refused, never extrapolated.

use super::local_fit::{LocalFit, stretch};
use super::reading::{Estimate, Outcome};
use super::{Characteristic, Equivalent, Reading};
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::f64::consts::TAU;

/// A test frequency this close to the sweep's end counts as inside: grids are printed rounded.
const EDGE: f64 = 1e-5;

/// Whether a frequency lies inside the sweep.
pub(super) fn inside(sweep: &Sweep, frequency: f64) -> bool {
    let (Some(first), Some(last)) = (sweep.frequency.first(), sweep.frequency.last()) else {
        return false;
    };
    frequency >= first * (1.0 - EDGE) && frequency <= last * (1.0 + EDGE)
}

/// The local fit around a frequency inside the sweep.
pub(super) fn local(sweep: &Sweep, frequency: f64) -> Option<LocalFit> {
    LocalFit::new(sweep, stretch(sweep, frequency))
}

/// A missing reading for a frequency outside the sweep.
pub(super) fn outside(sweep: &Sweep, frequency: f64) -> Reading {
    let hz = |f: f64| crate::quantity::engineering(f, "Hz", 4);
    let covers = match (sweep.frequency.first(), sweep.frequency.last()) {
        (Some(first), Some(last)) => format!("which covers {} to {}", hz(*first), hz(*last)),
        _ => "which is empty".to_owned(),
    };
    Reading::missing(
        "frequency_outside_sweep",
        format!(
            "{} lies outside the sweep, {covers}; nothing is extrapolated",
            hz(frequency)
        ),
    )
}

/// The estimate of a characteristic at a frequency, from the local fit there.
pub(super) fn read(
    sweep: &Sweep,
    fit: Option<&LocalFit>,
    characteristic: Characteristic,
    frequency: f64,
    equivalent: Equivalent,
) -> Outcome {
    if !inside(sweep, frequency) {
        return Err(outside(sweep, frequency));
    }
    let Some(fit) = fit else {
        return Err(Reading::missing(
            "too_few_points",
            "too few points around this frequency to read a value between them",
        ));
    };
    let z = fit.impedance(frequency);
    match characteristic {
        Characteristic::Impedance => {
            let scatter = fit.sigma(frequency, z / z.norm());
            Ok(Estimate::new(z.norm(), 1.0, 0.0, scatter))
        }
        // dR/dφ = −X for a rotation of Z by φ.
        Characteristic::Esr => Ok(Estimate::new(
            z.re,
            1.0,
            -z.im,
            fit.sigma(frequency, Complex64::ONE),
        )),
        _ if z.im >= 0.0 => Err(inductive(characteristic, frequency)),
        Characteristic::DissipationFactor => Ok(loss(fit, frequency, z)),
        _ => Ok(capacitance(fit, frequency, z, equivalent)),
    }
}

fn inductive(characteristic: Characteristic, frequency: f64) -> Reading {
    Reading::missing(
        "not_capacitive",
        format!(
            "the reactance at {} is inductive: the part has no {} there",
            crate::quantity::engineering(frequency, "Hz", 4),
            characteristic.title()
        ),
    )
}

/// The derivatives of `D = −R/X` with respect to R and X.
fn gradient_of_loss(z: Complex64) -> Complex64 {
    Complex64::new(-1.0 / z.im, z.re / (z.im * z.im))
}

fn loss(fit: &LocalFit, frequency: f64, z: Complex64) -> Estimate {
    let d = -z.re / z.im;
    // Phase errs as an angle: d(tan δ) = (1 + tan² δ) dδ.
    Estimate::new(
        d,
        0.0,
        1.0 + d * d,
        fit.sigma(frequency, gradient_of_loss(z)),
    )
}

fn capacitance(fit: &LocalFit, frequency: f64, z: Complex64, equivalent: Equivalent) -> Estimate {
    let d = -z.re / z.im;
    let series = -1.0 / (TAU * frequency * z.im);
    let of_series = Complex64::new(0.0, -series / z.im);
    // A rotation of Z by φ changes X by R φ: dC_s/dφ = C_s D, and dC_p/dφ = −C_p D.
    let (value, gradient, per_radian) = match equivalent {
        Equivalent::Series => (series, of_series, series * d),
        Equivalent::Parallel => {
            let share = 1.0 / (1.0 + d * d);
            let of_loss = gradient_of_loss(z) * (2.0 * d * series * share * share);
            (
                series * share,
                of_series * share - of_loss,
                -series * share * d,
            )
        }
    };
    Estimate::new(value, -1.0, per_radian, fit.sigma(frequency, gradient))
}
