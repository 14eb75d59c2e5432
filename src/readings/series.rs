//! The series circuit that self-resonance and capacitance stand for: where jig and reference leave
//! their mark on a whole lot.
//!
//! `L = 1/((2π f₀)² C)` depends on the part's geometry and on the jig, not on the capacitance. A
//! factor on |Z| (a reference impedance that is not what the station file says) makes C smaller by
//! it, R and L larger by it, and leaves f₀ and C R as they are.

use super::reading::Outcome;
use super::{Reader, Request};
use serde::{Deserialize, Serialize};
use std::f64::consts::TAU;

/// Capacitance, self-resonance and resistance there of one part; all finite and above zero.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct SeriesCircuit {
    /// F, as measured, at the frequency asked for.
    pub capacitance: f64,
    /// Self-resonant frequency in Hz.
    pub srf: f64,
    /// Re Z in Ω at the self-resonance, where an error of phase does not change it.
    pub resistance: f64,
}

impl SeriesCircuit {
    /// `1/((2π f₀)² C)` in H.
    pub fn inductance(&self) -> f64 {
        ((TAU * self.srf).powi(2) * self.capacitance).recip()
    }
}

/// A self-resonance, or why there is none, with Re Z in Ω where it is.
#[derive(Debug, Clone)]
pub(super) struct Resonance {
    pub(super) outcome: Outcome,
    pub(super) resistance: Option<f64>,
}

impl Reader<'_> {
    /// The series circuit of the sweep with the capacitance of `capacitance`; `None` where the
    /// sweep holds no capacitance there, no self-resonance, or noise hides its resistance.
    pub fn series(&self, capacitance: &Request) -> Option<SeriesCircuit> {
        let resonance = self.resonance();
        let srf = resonance.outcome.as_ref().ok()?.value;
        let circuit = SeriesCircuit {
            capacitance: self.estimate(capacitance).0.ok()?.value,
            srf,
            resistance: resonance.resistance?,
        };
        [circuit.capacitance, circuit.srf, circuit.resistance]
            .iter()
            .all(|v| v.is_finite() && *v > 0.0)
            .then_some(circuit)
    }
}
