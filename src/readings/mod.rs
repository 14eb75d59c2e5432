//! Sweep to readings: the value of each characteristic with its standard uncertainty.
//!
//! Cannot see limits: extraction cannot lean towards a verdict it cannot import. One file a
//! characteristic (or family of them); `local_fit` is the one estimator all of them use.

mod ageing;
mod at_frequency;
mod band;
mod characteristic;
mod esl;
mod esr_minimum;
mod local_fit;
mod reading;
mod srf;
mod uncertainty;

pub use ageing::{AgeingError, Referral, refer};
pub use characteristic::{Characteristic, Equivalent, Place};
pub use reading::{Extremes, Reading, Request, Value};
pub use uncertainty::{Budget, Component, combined};

use reading::Outcome;

use crate::sweep::Sweep;

/// Reads one characteristic from a sweep.
///
/// A value that the sweep does not hold is `Value::Missing` with a warning that says why; nothing
/// is extrapolated.
pub fn read(sweep: &Sweep, request: &Request, budget: &Budget) -> Extremes {
    let reading = |outcome: Outcome| match outcome {
        Ok(estimate) => estimate.into_reading(request.characteristic, budget),
        Err(reading) => reading,
    };
    match estimate(sweep, request) {
        (lowest, Some(highest)) => Extremes {
            lowest: reading(lowest),
            highest: reading(highest),
        },
        (single, None) => {
            let reading = reading(single);
            Extremes {
                lowest: reading.clone(),
                highest: reading,
            }
        }
    }
}

/// The uncertainty budget of a reading, line by line; of the highest value where a band is read.
///
/// The root of the sum of the contributions' squares ([`combined`]) is the reading's standard
/// uncertainty. Empty where there is no value, or where the station does not state what the value
/// depends on.
pub fn budget_table(sweep: &Sweep, request: &Request, budget: &Budget) -> Vec<Component> {
    let (lowest, highest) = estimate(sweep, request);
    highest
        .unwrap_or(lowest)
        .ok()
        .and_then(|estimate| budget.components(request.characteristic, &estimate))
        .map_or_else(Vec::new, |components| components.to_vec())
}

/// The estimate, or the lowest and the highest one over a band.
fn estimate(sweep: &Sweep, request: &Request) -> (Outcome, Option<Outcome>) {
    match (request.characteristic, request.place) {
        (Characteristic::Esr | Characteristic::Impedance, Place::Between(from, to)) => {
            let (lowest, highest) = band::read(sweep, request.characteristic, from, to);
            (lowest, Some(highest))
        }
        (Characteristic::EsrMinimum, place) => (esr_minimum::read(sweep, place), None),
        (Characteristic::Srf, _) => (srf::read(sweep), None),
        (Characteristic::Esl, _) => (esl::read(sweep), None),
        (characteristic, Place::At(frequency)) => (
            at_frequency::read(sweep, characteristic, frequency, request.equivalent),
            None,
        ),
        (characteristic, _) => (
            Err(Reading::missing(
                "frequency_missing",
                format!(
                    "{} is read at a frequency, and none was asked for",
                    characteristic.name()
                ),
            )),
            None,
        ),
    }
}
