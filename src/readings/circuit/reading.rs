//! Readings from a fitted circuit: only from one that describes the part.

use super::fit::{CircuitFit, capacitance_at_1khz};
use super::model::CAPACITANCE_AT;
use crate::diagnostic::Note;
use crate::readings::at_frequency::{inside, outside};
use crate::readings::reading::{Estimate, Outcome};
use crate::readings::{Characteristic, Reading};
use crate::sweep::Sweep;

/// The estimate of `c_1khz` or `r_0`.
pub(in crate::readings) fn read(
    sweep: &Sweep,
    fit: &Result<CircuitFit, Note>,
    characteristic: Characteristic,
) -> Outcome {
    let fit = match fit {
        Ok(fit) => fit,
        Err(note) => return Err(Reading::missing(&note.code, note.text.clone())),
    };
    if let Some(note) = fit.notes.first() {
        return Err(Reading::missing(&note.code, note.text.clone()));
    }
    if characteristic == Characteristic::FittedResistance {
        let (value, per_radian, scatter) = fit.quantity(|_, p| p[0]);
        if value <= 0.0 {
            return Err(Reading::missing(
                "resistance_not_visible",
                "the fitted circuit needs no constant series resistance: the sweep does not show it",
            ));
        }
        return Ok(Estimate::new(value, 1.0, per_radian, scatter));
    }
    if !inside(sweep, CAPACITANCE_AT) {
        return Err(outside(sweep, CAPACITANCE_AT));
    }
    let (value, per_radian, scatter) = fit.quantity(capacitance_at_1khz);
    Ok(Estimate::new(value, -1.0, per_radian, scatter))
}
