//! Standard uncertainty of readings from what the station states and what the sweep itself shows.
//!
//! First-order propagation (JCGM 100:2008 clause 5.1.2) of relative magnitude and phase of Z, the
//! reference resistor's tolerance (rectangular, clause 4.3.7), the scatter about the local fit,
//! and the station's repeatability of the characteristic. No correlation between them is assumed.

use super::Characteristic;
use crate::station::{Repeatability, Station};

/// A station's uncertainty, ready to be propagated.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Budget {
    /// Relative standard uncertainty of |Z| (instrument and reference); `None` where not stated.
    magnitude: Option<f64>,
    /// Standard uncertainty of the phase of Z in rad; 0 where only the magnitude is stated.
    phase: f64,
    repeatability: Vec<(String, Repeatability)>,
}

impl Budget {
    /// The budget of a station. `magnitude` and `phase` of its file are standard uncertainties of
    /// the measured impedance; `tolerance` of the reference is a half-width.
    pub fn of(station: &Station) -> Budget {
        let stated = &station.uncertainty;
        let reference = station.reference.map_or(0.0, |r| r.tolerance / 3f64.sqrt());
        let magnitude = match (stated.magnitude, stated.phase) {
            (None, None) => None,
            (magnitude, _) => Some(magnitude.unwrap_or(0.0).hypot(reference)),
        };
        Budget {
            magnitude,
            phase: stated.phase.unwrap_or(0.0),
            repeatability: stated.repeatability.clone(),
        }
    }

    /// Of a value whose relative sensitivity to |Z| is 1 and whose absolute sensitivity to the
    /// phase is `per_radian`; `scatter` is the standard uncertainty from the local fit.
    pub(super) fn combine(
        &self,
        characteristic: Characteristic,
        value: f64,
        per_radian: f64,
        scatter: f64,
    ) -> Option<f64> {
        let instrument = self.magnitude? * value;
        self.rest(characteristic, value, instrument, per_radian, scatter)
    }

    /// The same for a value that does not depend on |Z| (a frequency, a ratio of R to X).
    pub(super) fn combine_phase_only(
        &self,
        characteristic: Characteristic,
        value: f64,
        per_radian: f64,
        scatter: f64,
    ) -> Option<f64> {
        self.magnitude?;
        self.rest(characteristic, value, 0.0, per_radian, scatter)
    }

    fn rest(
        &self,
        characteristic: Characteristic,
        value: f64,
        instrument: f64,
        per_radian: f64,
        scatter: f64,
    ) -> Option<f64> {
        let repeatability = self
            .repeatability
            .iter()
            .find(|(name, _)| name == characteristic.name())
            .map_or(0.0, |(_, stated)| match stated {
                Repeatability::Relative(ratio) => ratio * value,
                Repeatability::Absolute(absolute) => *absolute,
            });
        let terms = [instrument, per_radian * self.phase, scatter, repeatability];
        let sum: f64 = terms.iter().map(|term| term * term).sum();
        sum.is_finite().then(|| sum.sqrt())
    }
}
