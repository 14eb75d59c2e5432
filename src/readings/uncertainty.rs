//! Standard uncertainty of readings from what the station states and what the sweep itself shows.
//!
//! First-order propagation (JCGM 100:2008 clause 5.1.2) of relative magnitude and phase of Z, the
//! reference resistor's tolerance (rectangular, clause 4.3.7), the scatter about the fit, the
//! station's repeatability of the characteristic, and the part's temperature where it is told how
//! the characteristic changes with it. No correlation between them is assumed. One set
//! of terms serves both the reading's uncertainty and the budget as a table.

use super::Characteristic;
use super::reading::Estimate;
use crate::station::{Repeatability, Station};

/// The line that is there only where station and limit file state what it needs.
pub(super) const TEMPERATURE: &str = "temperature of the part";

/// A station's uncertainty, ready to be propagated.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Budget {
    /// Relative standard uncertainty of |Z| from the instrument; `None` where not stated.
    magnitude: Option<f64>,
    /// Standard uncertainty of the phase of Z in rad; `None` where not stated.
    phase: Option<f64>,
    /// Relative standard uncertainty of the reference resistance; 0 without one.
    reference: f64,
    repeatability: Vec<(String, Repeatability)>,
    /// Standard uncertainty of the part's temperature in K; `None` where not stated.
    temperature: Option<f64>,
    /// Relative change of a characteristic per kelvin.
    coefficients: Vec<(Characteristic, f64)>,
}

/// One line of an uncertainty budget.
#[derive(Debug, Clone, PartialEq)]
pub struct Component {
    /// What is uncertain.
    pub name: &'static str,
    /// Its standard uncertainty, in `unit`.
    pub standard_uncertainty: f64,
    /// `1` (relative), `rad`, `K`, or the unit of the reading.
    pub unit: &'static str,
    /// Change of the reading per unit of the input.
    pub sensitivity: f64,
    /// What it contributes to the reading's standard uncertainty, in the unit of the reading.
    pub contribution: f64,
    /// How the input is distributed: `normal` or `rectangular`.
    pub distribution: &'static str,
}

impl Component {
    fn new(
        name: &'static str,
        standard_uncertainty: f64,
        unit: &'static str,
        sensitivity: f64,
    ) -> Component {
        Component {
            name,
            standard_uncertainty,
            unit,
            sensitivity,
            contribution: (sensitivity * standard_uncertainty).abs(),
            distribution: "normal",
        }
    }
}

/// The standard uncertainty that a budget's components make: the root of the sum of their squares.
pub fn combined(components: &[Component]) -> f64 {
    components
        .iter()
        .map(|c| c.contribution * c.contribution)
        .sum::<f64>()
        .sqrt()
}

impl Budget {
    /// The budget of a station. `magnitude` and `phase` of its file are standard uncertainties of
    /// the measured impedance; `tolerance` of the reference is a half-width.
    pub fn of(station: &Station) -> Budget {
        let stated = &station.uncertainty;
        Budget {
            magnitude: stated.magnitude,
            phase: stated.phase,
            reference: station.reference.map_or(0.0, |r| r.tolerance / 3f64.sqrt()),
            repeatability: stated.repeatability.clone(),
            temperature: stated.temperature,
            coefficients: Vec::new(),
        }
    }

    /// The budget for parts that change with temperature so much: relative changes per kelvin by
    /// characteristic. They count where the station states the uncertainty of the temperature.
    pub fn with_temperature_coefficients(self, coefficients: &[(Characteristic, f64)]) -> Budget {
        Budget {
            coefficients: coefficients.to_vec(),
            ..self
        }
    }

    /// Every term of an estimate; `None` where the station leaves unstated what the value depends
    /// on: an ESR without a stated phase has no known uncertainty, however good the magnitude.
    pub(super) fn components(
        &self,
        characteristic: Characteristic,
        estimate: &Estimate,
    ) -> Option<[Component; 6]> {
        let of_magnitude = estimate.per_log_magnitude;
        let magnitude = match self.magnitude {
            Some(u) => u,
            None if of_magnitude == 0.0 && self.phase.is_some() => 0.0,
            None => return None,
        };
        let phase = match self.phase {
            Some(u) => u,
            None if !characteristic.is_phase() => 0.0,
            None => return None,
        };
        let repeatability = self
            .repeatability
            .iter()
            .find(|(name, _)| name == characteristic.name())
            .map_or(0.0, |(_, stated)| match stated {
                Repeatability::Relative(ratio) => ratio * estimate.value.abs(),
                Repeatability::Absolute(absolute) => *absolute,
            });
        let coefficient = self
            .coefficients
            .iter()
            .find(|(of, _)| *of == characteristic)
            .map_or(0.0, |(_, share)| share * estimate.value);
        let unit = characteristic.unit();
        let reference = Component {
            distribution: "rectangular",
            ..Component::new("reference resistance", self.reference, "1", of_magnitude)
        };
        let components = [
            Component::new("magnitude of the instrument", magnitude, "1", of_magnitude),
            Component::new("phase of the instrument", phase, "rad", estimate.per_radian),
            reference,
            Component::new("scatter about the fit", estimate.scatter, unit, 1.0),
            Component::new("repeatability", repeatability, unit, 1.0),
            Component::new(
                TEMPERATURE,
                self.temperature.unwrap_or(0.0),
                "K",
                coefficient,
            ),
        ];
        combined(&components).is_finite().then_some(components)
    }
}
