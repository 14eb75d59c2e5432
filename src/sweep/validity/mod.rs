//! Validity before judgement: whether a sweep is that of a capacitor, measured without a fault.
//!
//! Every test knows the sweep's own noise. What a passive linear network could be is beyond these
//! tests: a wrong part, a gain error, a part that stands askew show only against limits.

mod channels;
mod completeness;
mod jumps;
mod kind;
mod kramers_kronig;
mod neighbours;
mod noise;
mod nominal;
mod order;

pub use completeness::complete;
pub use nominal::expect_capacitance;

use super::Sweep;
use super::faults::hertz;
use crate::diagnostic::Note;
use crate::station::{Reference, Station};
use channels::Channels;
use noise::Noise;
use num_complex::Complex64;

/// What is known of a measurement besides the impedance.
#[derive(Debug, Clone, Default)]
pub struct Evidence {
    channels: Option<Channels>,
    /// Reading of the open jig on the same frequency list, and of the part before compensation.
    open: Option<(Vec<Complex64>, Vec<Complex64>)>,
    reference: Option<Reference>,
    phase: Option<f64>,
    magnitude: Option<f64>,
}

/// Faults leave the part unmeasured; warnings do not.
#[derive(Debug, Clone, PartialEq, Default)]
#[allow(missing_docs)]
pub struct Findings {
    pub faults: Vec<Note>,
    pub warnings: Vec<Note>,
}

/// Taken for the standard uncertainty of the phase where the station states none, in rad.
const PHASE_NOT_STATED: f64 = 1.7e-3;

/// Points with more relative noise than this say nothing.
const UNUSABLE: f64 = 0.3;

impl Evidence {
    /// What the station states; add channels and the open reading where there are any.
    pub fn of(station: &Station) -> Self {
        Evidence {
            channels: None,
            open: None,
            reference: station.reference,
            phase: station.uncertainty.phase,
            magnitude: station.uncertainty.magnitude,
        }
    }

    /// With the two channels in V on the sweep's frequency list.
    pub(super) fn with_channels(mut self, a: Vec<Complex64>, b: Vec<Complex64>) -> Self {
        self.channels = Some(Channels { a, b });
        self
    }

    /// With the reading of the open jig and the uncompensated reading of the part.
    pub(super) fn with_open(mut self, open: Vec<Complex64>, read: Vec<Complex64>) -> Self {
        self.open = Some((open, read));
        self
    }

    /// How far the phase may be off without being a fault, in rad.
    fn phase_tolerance(&self) -> f64 {
        3.0 * self.phase.unwrap_or(PHASE_NOT_STATED)
    }

    /// Relative error that the station owns up to, three standard uncertainties.
    fn systematic(&self) -> f64 {
        3.0 * self
            .magnitude
            .unwrap_or(0.0)
            .hypot(self.phase.unwrap_or(0.0))
    }
}

/// Checks a sweep; with a fault it must not be judged.
///
/// The first fault is the most likely cause, in words an operator can act on.
pub fn check(sweep: &Sweep, evidence: &Evidence) -> Findings {
    let noise = noise::estimate(sweep);
    let mut findings = Findings::default();
    if let Some(fault) = kind::no_part(sweep, evidence, &noise) {
        findings.faults.push(fault);
        return findings;
    }
    let passive = kind::passive(sweep, evidence, &noise);
    let capacitive = kind::capacitive(sweep, &noise);
    let resonances = match capacitive {
        None => kind::one_resonance(sweep, &noise),
        Some(_) => None,
    };
    // Sharp resonances of a second part look like jumps on a coarse list.
    let jump = match resonances {
        None => jumps::find(sweep, &noise),
        Some(_) => None,
    };
    let suspect = jump.is_some() || passive.is_some() || capacitive.is_some();
    if suspect && let Some(channels) = &evidence.channels {
        findings
            .faults
            .extend(channels.cause(sweep, evidence.reference));
    }
    let jump = jump.map(|jump| jump.into_note());
    findings.faults.extend(
        [jump, resonances, capacitive, passive]
            .into_iter()
            .flatten(),
    );
    if findings.faults.is_empty() {
        findings.faults.extend(noise_floor(sweep, &noise));
    }
    if findings.faults.is_empty() {
        findings
            .faults
            .extend(kramers_kronig::check(sweep, evidence, &noise));
    }
    findings.warnings.extend(noisy_end(sweep, &noise));
    findings
}

/// Whether a sweep jumps, of whatever it is: a standard is no capacitor, and its contact fails likewise.
pub(super) fn unsteady(sweep: &Sweep) -> Option<Note> {
    jumps::find(sweep, &noise::estimate(sweep)).map(|jump| jump.into_note())
}

/// More relative noise than this where |Z| is least makes ESR and resonance worthless.
const FLOOR: f64 = 0.1;

fn noise_floor(sweep: &Sweep, noise: &Noise) -> Option<Note> {
    if !noise.is_noisy_anywhere() {
        return None;
    }
    let smallest = noise.least();
    let least = noise.square().iter().position(|s| *s == smallest)?;
    let found = noise.at(least);
    (found > FLOOR).then(|| {
        Note::new(
            "noise_floor",
            format!(
                "near {}, where the impedance is least, the noise is {:.0} % of it: raise the drive or average more, and measure again",
                hertz(sweep.frequency.get(least).copied().unwrap_or(f64::NAN)),
                found * 100.0
            ),
        )
    })
}

/// Noise at the low end is no fault of the sweep, but its readings there are poor.
fn noisy_end(sweep: &Sweep, noise: &Noise) -> Option<Note> {
    if !noise.is_noisy_anywhere() {
        return None;
    }
    let noisy = (0..sweep.frequency.len())
        .take_while(|&i| noise.exceeds(i, FLOOR))
        .count();
    let frequency = sweep.frequency.get(noisy)?;
    (noisy > 0).then(|| {
        Note::new(
            "noisy_low_end",
            format!(
                "below {} the noise is more than 10 % of the impedance: readings there are poor",
                hertz(*frequency)
            ),
        )
    })
}
