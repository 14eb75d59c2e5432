//! Capacitance, dissipation factor, ESR and |Z| at one frequency inside the sweep.
//!
//! `C_s = −1/(ωX)`, `C_p = C_s/(1+D²)`, `D = R/|X|` (definitions of the series and parallel
//! equivalents, IEC 60384-1). R and X are had from a local fit over 0.8 decade, not from the
//! nearest point; a frequency outside the sweep is refused, never extrapolated.

use super::local_fit::{Basis, LocalFit, POLYNOMIAL, REACTANCE};
use super::{Budget, Characteristic, Equivalent, Reading};
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::f64::consts::TAU;

/// Width of the stretch that carries a reading, as ln of the frequency ratio (0.8 decade).
const WIDTH: f64 = 0.8 * std::f64::consts::LN_10;
/// A test frequency this close to the sweep's end counts as inside: grids are printed rounded.
const EDGE: f64 = 1e-5;

/// R, X and their scatter at one frequency.
#[derive(Debug, Clone, Copy)]
pub(super) struct Local {
    pub(super) r: f64,
    pub(super) x: f64,
    pub(super) sigma_r: f64,
    pub(super) sigma_x: f64,
}

/// The points that carry a reading at `frequency`: `WIDTH` around it, shifted inwards at an end
/// of the sweep, and at least four points where the sweep has them.
fn stretch(sweep: &Sweep, frequency: f64) -> std::ops::Range<usize> {
    let points = &sweep.frequency;
    let (first, last) = (points[0].ln(), points[points.len() - 1].ln());
    let centre = frequency.ln();
    let low = (centre - WIDTH / 2.0).min(last - WIDTH).max(first);
    let high = (low + WIDTH).max(centre + WIDTH / 2.0).min(last);
    let mut start = points.partition_point(|f| f.ln() < low - 1e-9);
    let mut end = points.partition_point(|f| f.ln() <= high + 1e-9);
    while end - start < 4.min(points.len()) {
        // Grow towards the nearer neighbour so that the reading stays between points.
        let below = start.checked_sub(1).map(|i| centre - points[i].ln());
        let above = points.get(end).map(|f| f.ln() - centre);
        match (below, above) {
            (Some(b), Some(a)) if a < b => end += 1,
            (Some(_), _) => start -= 1,
            (None, Some(_)) => end += 1,
            (None, None) => break,
        }
    }
    start..end
}

/// Whether a frequency lies inside the sweep.
pub(super) fn inside(sweep: &Sweep, frequency: f64) -> bool {
    let points = &sweep.frequency;
    frequency >= points[0] * (1.0 - EDGE) && frequency <= points[points.len() - 1] * (1.0 + EDGE)
}

fn curve(
    sweep: &Sweep,
    frequency: f64,
    basis: &'static [Basis],
    y: impl Fn(f64, Complex64) -> f64,
    w: impl Fn(f64, Complex64) -> f64,
) -> Option<(f64, f64)> {
    let range = stretch(sweep, frequency);
    let (mut t, mut ys, mut ws) = (Vec::new(), Vec::new(), Vec::new());
    for i in range {
        let (f, z) = (sweep.frequency[i], sweep.impedance[i]);
        t.push((f / frequency).ln());
        ys.push(y(f, z));
        ws.push(w(f, z));
    }
    let fit = LocalFit::new(basis, 2.min(t.len()), &t, &ys, &ws)?;
    let (value, sigma) = (fit.value(0.0), fit.sigma(0.0));
    (value.is_finite() && sigma.is_finite()).then_some((value, sigma))
}

/// R and X at a frequency inside the sweep.
pub(super) fn local(sweep: &Sweep, frequency: f64) -> Option<Local> {
    let size = |z: Complex64| z.norm().max(f64::MIN_POSITIVE);
    let (r, sigma_r) = curve(
        sweep,
        frequency,
        &POLYNOMIAL,
        |_, z| z.re,
        |_, z| 1.0 / size(z),
    )?;
    let (wx, sigma_wx) = curve(
        sweep,
        frequency,
        &REACTANCE,
        |f, z| f * z.im,
        |f, z| 1.0 / (f * size(z)),
    )?;
    Some(Local {
        r,
        x: wx / frequency,
        sigma_r,
        sigma_x: sigma_wx / frequency,
    })
}

/// |Z| and its scatter at a frequency inside the sweep.
pub(super) fn magnitude(sweep: &Sweep, frequency: f64) -> Option<(f64, f64)> {
    let (ln, sigma) = curve(
        sweep,
        frequency,
        &POLYNOMIAL,
        |_, z| z.norm().max(f64::MIN_POSITIVE).ln(),
        |_, _| 1.0,
    )?;
    Some((ln.exp(), ln.exp() * sigma))
}

/// A missing reading for a frequency outside the sweep.
pub(super) fn outside(sweep: &Sweep, frequency: f64) -> Reading {
    let points = &sweep.frequency;
    Reading::missing(
        "frequency_outside_sweep",
        format!(
            "{} lies outside the sweep, which covers {} to {}; nothing is extrapolated",
            crate::quantity::engineering(frequency, "Hz", 4),
            crate::quantity::engineering(points[0], "Hz", 4),
            crate::quantity::engineering(points[points.len() - 1], "Hz", 4),
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
    let unfit = || {
        Reading::missing(
            "too_few_points",
            "too few points around this frequency to read a value between them",
        )
    };
    if characteristic == Characteristic::Impedance {
        let Some((value, scatter)) = magnitude(sweep, frequency) else {
            return unfit();
        };
        return Reading::known(value, budget.combine(characteristic, value, 0.0, scatter));
    }
    let Some(Local {
        r,
        x,
        sigma_r,
        sigma_x,
    }) = local(sweep, frequency)
    else {
        return unfit();
    };
    if characteristic == Characteristic::Esr {
        return Reading::known(r, budget.combine(characteristic, r, x, sigma_r));
    }
    if x >= 0.0 {
        let at = crate::quantity::engineering(frequency, "Hz", 4);
        return Reading::missing(
            "not_capacitive",
            format!(
                "the reactance at {at} is inductive: the part has no {} there",
                characteristic.title()
            ),
        );
    }
    let d = r / -x;
    if characteristic == Characteristic::DissipationFactor {
        // Phase errs as an angle: d(tan δ) = (1 + tan² δ) dδ.
        let scatter = (sigma_r / x).hypot(d * sigma_x / x);
        return Reading::known(
            d,
            budget.combine_phase_only(characteristic, d, 1.0 + d * d, scatter),
        );
    }
    let series = -1.0 / (TAU * frequency * x);
    let capacitance = match equivalent {
        Equivalent::Series => series,
        Equivalent::Parallel => series / (1.0 + d * d),
    };
    Reading::known(
        capacitance,
        budget.combine(
            characteristic,
            capacitance,
            capacitance * d,
            capacitance * sigma_x / x,
        ),
    )
}
