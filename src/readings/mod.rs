//! Sweep to readings: the value of each characteristic with its standard uncertainty.
//!
//! Cannot see limits: extraction cannot lean towards a verdict it cannot import. One file a
//! characteristic (or family of them); `local_fit` is the one estimator all of them use.

mod ageing;
mod at_frequency;
mod band;
mod characteristic;
pub mod circuit;
mod esl;
mod esr_minimum;
mod grid;
mod local_fit;
mod reading;
mod series;
mod sizes;
mod srf;
mod uncertainty;

pub use ageing::{AgeingError, Referral, refer};
pub use characteristic::{Characteristic, Equivalent, Place};
pub use reading::{Extremes, Reading, Request, Value};
pub use series::SeriesCircuit;
pub use uncertainty::{Budget, Component, combined};

use crate::diagnostic::Note;
use crate::sweep::Sweep;
use at_frequency::local;
use circuit::CircuitFit;
use local_fit::LocalFit;
use reading::Outcome;
use series::Resonance;
use std::cell::{OnceCell, RefCell};
use uncertainty::TEMPERATURE;

/// Reads characteristics from one sweep; what several of them share is computed once.
#[derive(Debug, Clone)]
pub struct Reader<'a> {
    sweep: &'a Sweep,
    budget: &'a Budget,
    circuit: OnceCell<Result<CircuitFit, Note>>,
    resonance: OnceCell<Resonance>,
    /// The local fits that were asked for, and their frequencies.
    local: RefCell<Vec<(f64, Option<LocalFit>)>>,
}

impl<'a> Reader<'a> {
    #[allow(missing_docs)]
    pub fn new(sweep: &'a Sweep, budget: &'a Budget) -> Reader<'a> {
        Reader {
            sweep,
            budget,
            circuit: OnceCell::new(),
            resonance: OnceCell::new(),
            local: RefCell::new(Vec::new()),
        }
    }

    /// Reads one characteristic.
    ///
    /// A value that the sweep does not hold is `Value::Missing` with a warning that says why;
    /// nothing is extrapolated.
    pub fn read(&self, request: &Request) -> Extremes {
        let reading = |outcome: Outcome| match outcome {
            Ok(estimate) => estimate.into_reading(request.characteristic, self.budget),
            Err(reading) => reading,
        };
        match self.estimate(request) {
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
    /// uncertainty. Empty where there is no value, or where the station does not state what the
    /// value depends on.
    pub fn budget_table(&self, request: &Request) -> Vec<Component> {
        let (lowest, highest) = self.estimate(request);
        highest
            .unwrap_or(lowest)
            .ok()
            .and_then(|estimate| self.budget.components(request.characteristic, &estimate))
            .map_or_else(Vec::new, |components| {
                let stated = |c: &Component| c.name != TEMPERATURE || c.contribution > 0.0;
                components.into_iter().filter(stated).collect()
            })
    }

    /// The equivalent circuit of the sweep, or why there is none.
    pub fn circuit(&self) -> &Result<CircuitFit, Note> {
        self.circuit.get_or_init(|| circuit::fit(self.sweep))
    }

    fn resonance(&self) -> &Resonance {
        self.resonance.get_or_init(|| srf::read(self.sweep))
    }

    /// The estimate at one frequency; characteristics at the same frequency share their fit.
    fn at(
        &self,
        characteristic: Characteristic,
        frequency: f64,
        equivalent: Equivalent,
    ) -> Outcome {
        let mut known = self.local.borrow_mut();
        let at = known
            .iter()
            .position(|(f, _)| *f == frequency)
            .unwrap_or_else(|| {
                known.push((frequency, local(self.sweep, frequency)));
                known.len() - 1
            });
        at_frequency::read(
            self.sweep,
            known[at].1.as_ref(),
            characteristic,
            frequency,
            equivalent,
        )
    }

    /// The estimate, or the lowest and the highest one over a band.
    fn estimate(&self, request: &Request) -> (Outcome, Option<Outcome>) {
        let sweep = self.sweep;
        let single = match (request.characteristic, request.place) {
            (Characteristic::Esr | Characteristic::Impedance, Place::Between(from, to)) => {
                let (lowest, highest) = band::read(sweep, request.characteristic, from, to);
                return (lowest, Some(highest));
            }
            (Characteristic::EsrMinimum, place) => esr_minimum::read(sweep, place),
            (Characteristic::Srf, _) => self.resonance().outcome.clone(),
            (Characteristic::Esl, _) => esl::read(sweep, &self.resonance().outcome),
            (c @ (Characteristic::FittedCapacitance | Characteristic::FittedResistance), _) => {
                circuit::read(sweep, self.circuit(), c)
            }
            (characteristic, Place::At(frequency)) => {
                self.at(characteristic, frequency, request.equivalent)
            }
            (characteristic, _) => Err(Reading::missing(
                "frequency_missing",
                format!(
                    "{} is read at a frequency, and none was asked for",
                    characteristic.name()
                ),
            )),
        };
        (single, None)
    }
}

/// Reads one characteristic from a sweep; see [`Reader::read`].
pub fn read(sweep: &Sweep, request: &Request, budget: &Budget) -> Extremes {
    Reader::new(sweep, budget).read(request)
}

/// The uncertainty budget of one reading; see [`Reader::budget_table`].
pub fn budget_table(sweep: &Sweep, request: &Request, budget: &Budget) -> Vec<Component> {
    Reader::new(sweep, budget).budget_table(request)
}
