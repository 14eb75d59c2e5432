//! ESR or |Z| over a band: the lowest and the highest value between two frequencies.
//!
//! The ends are read as at a frequency; between them the points of the sweep themselves. A band
//! that reaches beyond the sweep is refused: what was not measured cannot conform.

use super::at_frequency::{inside, local, magnitude, outside};
use super::{Budget, Characteristic, Extremes, Reading};
use crate::sweep::Sweep;

/// The extremes of `characteristic` (ESR or impedance) from `from` to `to` in Hz.
pub(super) fn read(
    sweep: &Sweep,
    characteristic: Characteristic,
    from: f64,
    to: f64,
    budget: &Budget,
) -> Extremes {
    let both = |reading: Reading| Extremes {
        lowest: reading.clone(),
        highest: reading,
    };
    for end in [from, to] {
        if !inside(sweep, end) {
            return both(outside(sweep, end));
        }
    }
    let at = |frequency: f64| -> Option<(f64, f64, f64)> {
        if characteristic == Characteristic::Impedance {
            magnitude(sweep, frequency).map(|(value, scatter)| (value, 0.0, scatter))
        } else {
            local(sweep, frequency).map(|l| (l.r, l.x, l.sigma_r))
        }
    };
    let mut candidates: Vec<(f64, f64, f64, f64)> = Vec::new();
    for end in [from, to] {
        let Some((value, per_radian, scatter)) = at(end) else {
            return both(Reading::missing(
                "too_few_points",
                "too few points around the band's end to read a value there",
            ));
        };
        candidates.push((end, value, per_radian, scatter));
    }
    for (f, z) in sweep.frequency.iter().zip(&sweep.impedance) {
        if *f > from && *f < to {
            let (value, per_radian) = if characteristic == Characteristic::Impedance {
                (z.norm(), 0.0)
            } else {
                (z.re, z.im)
            };
            candidates.push((*f, value, per_radian, 0.0));
        }
    }
    let reading = |(frequency, value, per_radian, scatter): (f64, f64, f64, f64)| {
        let mut reading = Reading::known(
            value,
            budget.combine(characteristic, value, per_radian, scatter),
        );
        reading.frequency = Some(frequency);
        reading
    };
    let lowest = candidates
        .iter()
        .copied()
        .min_by(|a, b| a.1.total_cmp(&b.1));
    let highest = candidates
        .iter()
        .copied()
        .max_by(|a, b| a.1.total_cmp(&b.1));
    match (lowest, highest) {
        (Some(lowest), Some(highest)) => Extremes {
            lowest: reading(lowest),
            highest: reading(highest),
        },
        _ => both(Reading::missing(
            "too_few_points",
            "no point of the sweep lies in the band",
        )),
    }
}
