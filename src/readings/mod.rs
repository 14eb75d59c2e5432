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
pub use uncertainty::Budget;

use crate::sweep::Sweep;

/// Reads one characteristic from a sweep.
///
/// A value that the sweep does not hold is `Value::Missing` with a warning that says why; nothing
/// is extrapolated.
pub fn read(sweep: &Sweep, request: &Request, budget: &Budget) -> Extremes {
    let single = |reading: Reading| Extremes {
        lowest: reading.clone(),
        highest: reading,
    };
    match (request.characteristic, request.place) {
        (Characteristic::Esr | Characteristic::Impedance, Place::Between(from, to)) => {
            band::read(sweep, request.characteristic, from, to, budget)
        }
        (Characteristic::EsrMinimum, place) => single(esr_minimum::read(sweep, place, budget)),
        (Characteristic::Srf, _) => single(srf::read(sweep, budget)),
        (Characteristic::Esl, _) => single(esl::read(sweep, budget)),
        (characteristic, Place::At(frequency)) => single(at_frequency::read(
            sweep,
            characteristic,
            frequency,
            request.equivalent,
            budget,
        )),
        (characteristic, _) => single(Reading::missing(
            "frequency_missing",
            format!(
                "{} is read at a frequency, and none was asked for",
                characteristic.name()
            ),
        )),
    }
}
