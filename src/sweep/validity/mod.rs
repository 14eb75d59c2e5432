//! Validity before judgement: whether a sweep is that of a capacitor, measured without a fault.

use super::Sweep;
use crate::diagnostic::Note;
use crate::station::Station;
use num_complex::Complex64;

/// What is known besides the sweep.
#[derive(Debug, Clone, Default)]
#[allow(dead_code)]
pub struct Evidence {
    channels: Option<(Vec<Complex64>, Vec<Complex64>)>,
    open: Option<Vec<Complex64>>,
    reference: Option<crate::station::Reference>,
    phase: Option<f64>,
}

/// Faults leave the part unmeasured; warnings do not.
#[derive(Debug, Clone, PartialEq, Default)]
#[allow(missing_docs)]
pub struct Findings {
    pub faults: Vec<Note>,
    pub warnings: Vec<Note>,
}

impl Evidence {
    pub(super) fn new(
        station: &Station,
        channels: Option<(Vec<Complex64>, Vec<Complex64>)>,
        open: Option<Vec<Complex64>>,
    ) -> Self {
        Evidence {
            channels,
            open,
            reference: station.reference,
            phase: station.uncertainty.phase,
        }
    }

    pub(super) fn before_compensation(&self, _sweep: &Sweep) -> Vec<Note> {
        Vec::new()
    }
}

/// Checks a sweep.
pub fn check(_sweep: &Sweep, _evidence: &Evidence) -> Findings {
    Findings::default()
}
