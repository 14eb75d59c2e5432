//! Capacitance, dissipation factor, ESR and |Z| at one frequency inside the sweep.
//!
//! `C_s = −1/(ωX)`, `C_p = C_s/(1+D²)`, `D = R/|X|` (definitions of the series and parallel
//! equivalents, IEC 60384-1). R and X are had from a local fit over 0.8 decade, not from the
//! nearest point; a frequency outside the sweep is refused, never extrapolated.

use super::local_fit::{LocalFit, stretch};
use super::{Budget, Characteristic, Equivalent, Reading};
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
    LocalFit::new(sweep, stretch(sweep, frequency), frequency)
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

/// The reading of a characteristic at a frequency.
pub(super) fn read(
    sweep: &Sweep,
    characteristic: Characteristic,
    frequency: f64,
    equivalent: Equivalent,
    budget: &Budget,
) -> Reading {
    if !inside(sweep, frequency) {
        return outside(sweep, frequency);
    }
    let Some(fit) = local(sweep, frequency) else {
        return Reading::missing(
            "too_few_points",
            "too few points around this frequency to read a value between them",
        );
    };
    let z = fit.impedance(frequency);
    if characteristic == Characteristic::Impedance {
        let scatter = fit.sigma(frequency, z / z.norm());
        return Reading::known(
            z.norm(),
            budget.combine(characteristic, z.norm(), 0.0, scatter),
        );
    }
    if characteristic == Characteristic::Esr {
        let scatter = fit.sigma(frequency, Complex64::ONE);
        return Reading::known(z.re, budget.combine(characteristic, z.re, z.im, scatter));
    }
    if z.im >= 0.0 {
        let at = crate::quantity::engineering(frequency, "Hz", 4);
        return Reading::missing(
            "not_capacitive",
            format!(
                "the reactance at {at} is inductive: the part has no {} there",
                characteristic.title()
            ),
        );
    }
    let d = z.re / -z.im;
    // The derivatives of D = −R/X with respect to R and X.
    let of_d = Complex64::new(-1.0 / z.im, z.re / (z.im * z.im));
    if characteristic == Characteristic::DissipationFactor {
        // Phase errs as an angle: d(tan δ) = (1 + tan² δ) dδ.
        return Reading::known(
            d,
            budget.combine_phase_only(characteristic, d, 1.0 + d * d, fit.sigma(frequency, of_d)),
        );
    }
    let series = -1.0 / (TAU * frequency * z.im);
    let of_series = Complex64::new(0.0, -series / z.im);
    // dC_s/dφ = C_s D for a rotation of Z by φ; C_p = C_s/(1+D²) turns the sign.
    let (capacitance, gradient, per_radian) = match equivalent {
        Equivalent::Series => (series, of_series, series * d),
        Equivalent::Parallel => {
            let share = 1.0 / (1.0 + d * d);
            let gradient = of_series * share - of_d * (2.0 * d * series * share * share);
            (series * share, gradient, series * d * share)
        }
    };
    Reading::known(
        capacitance,
        budget.combine(
            characteristic,
            capacitance,
            per_radian,
            fit.sigma(frequency, gradient),
        ),
    )
}
