//! ESR or |Z| over a band: the lowest and the highest value between two frequencies.
//!
//! Between the ends the points of the sweep themselves carry the values, smoothed by local fits so
//! that the extreme is the part's and not the noise's; a point that stands off its fit by more than
//! five times the scatter is no noise and counts as it was measured. A band that reaches beyond the
//! sweep is refused: what was not measured cannot conform.

use super::at_frequency::{inside, local, outside};
use super::local_fit::{LocalFit, WIDTH};
use super::reading::{Estimate, Outcome};
use super::{Characteristic, Reading};
use crate::sweep::Sweep;
use num_complex::Complex64;

/// A point farther off its fit than this many standard deviations is no noise.
const APART: f64 = 5.0;

#[derive(Debug, Clone, Copy)]
struct Candidate {
    frequency: f64,
    value: f64,
    /// Sensitivity to the phase, Ω/rad.
    per_radian: f64,
    scatter: Scatter,
}

/// Where the scatter comes from: it is worked out for the two extremes alone.
#[derive(Debug, Clone, Copy)]
enum Scatter {
    /// Of a point that counts as it was measured.
    OfPoint(f64),
    /// Of a fit, by its number, along a direction of Z.
    OfFit(usize, Complex64),
}

/// The lowest and the highest value of `characteristic` (ESR or impedance) from `from` to `to` Hz.
pub(super) fn read(
    sweep: &Sweep,
    characteristic: Characteristic,
    from: f64,
    to: f64,
) -> (Outcome, Outcome) {
    let neither = |reading: Reading| (Err(reading.clone()), Err(reading));
    for end in [from, to] {
        if !inside(sweep, end) {
            return neither(outside(sweep, end));
        }
    }
    let (found, fits) = candidates(sweep, characteristic, from, to).unwrap_or_default();
    let lowest = found.iter().min_by(|a, b| a.value.total_cmp(&b.value));
    let highest = found.iter().max_by(|a, b| a.value.total_cmp(&b.value));
    let estimate = |c: &Candidate| {
        let scatter = match c.scatter {
            Scatter::OfPoint(scatter) => scatter,
            Scatter::OfFit(fit, direction) => fits
                .get(fit)
                .map_or(f64::INFINITY, |fit| fit.sigma(c.frequency, direction)),
        };
        Ok(Estimate::new(c.value, 1.0, c.per_radian, scatter).at(c.frequency))
    };
    match (lowest, highest) {
        (Some(lowest), Some(highest)) => (estimate(lowest), estimate(highest)),
        _ => neither(Reading::missing(
            "too_few_points",
            "too few points in and around the band to read a value there",
        )),
    }
}

/// Candidates with the fits that they come from.
type Candidates = (Vec<Candidate>, Vec<LocalFit>);

/// Values at the band's ends and at the points between them; each fit serves the points within a
/// quarter of its width around its centre.
fn candidates(
    sweep: &Sweep,
    characteristic: Characteristic,
    from: f64,
    to: f64,
) -> Option<Candidates> {
    let points = &sweep.frequency;
    let start = points.partition_point(|f| *f <= from);
    let end = points.partition_point(|f| *f < to);
    let mut found = Vec::with_capacity(end.saturating_sub(start) + 2);
    let reach = (WIDTH / 4.0).exp();
    let mut fits: Vec<LocalFit> = Vec::new();
    let mut until = f64::NEG_INFINITY;
    let between = (start..end).map(|i| (points[i], Some(sweep.impedance[i])));
    for (f, z) in std::iter::once((from, None))
        .chain(between)
        .chain([(to, None)])
    {
        if f > until {
            let centre = (f * reach).min(to.max(f));
            fits.push(local(sweep, centre)?);
            until = centre * reach;
        }
        found.push(candidate(&fits, characteristic, f, z)?);
    }
    Some((found, fits))
}

fn candidate(
    fits: &[LocalFit],
    characteristic: Characteristic,
    f: f64,
    measured: Option<Complex64>,
) -> Option<Candidate> {
    let fit = fits.last()?;
    let of = |z: Complex64| match characteristic {
        Characteristic::Impedance => (z.norm(), 0.0, z / z.norm()),
        _ => (z.re, -z.im, Complex64::ONE),
    };
    let (value, per_radian, direction) = of(fit.impedance(f));
    if let Some(z) = measured {
        let scatter = fit.point_scatter(z, direction);
        let (raw, per_radian, _) = of(z);
        if (raw - value).abs() > APART * scatter && (raw - value).abs() > 1e-6 * z.norm() {
            return Some(Candidate {
                frequency: f,
                value: raw,
                per_radian,
                scatter: Scatter::OfPoint(scatter),
            });
        }
    }
    Some(Candidate {
        frequency: f,
        value,
        per_radian,
        scatter: Scatter::OfFit(fits.len() - 1, direction),
    })
}
