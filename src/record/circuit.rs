//! The equivalent circuit of the lot's median part.

use super::{PartSweep, PartVerdict};
use crate::diagnostic::Note;
use crate::limits::Limits;
use crate::readings::circuit;
use crate::record::PartRecord;
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};

/// Points of the drawn curve.
const POINTS: usize = 81;

/// The equivalent circuit fitted to one part.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct CircuitSection {
    /// The conforming part in the middle of the lot by its first characteristic.
    pub part: String,
    /// In words.
    pub model: String,
    /// Elements by name.
    pub parameters: IndexMap<String, ParameterSection>,
    /// Root mean square of what the circuit leaves, relative to |Z|.
    pub residual: f64,
    /// The same for the sweep's own noise.
    pub noise: f64,
    /// Whether the circuit describes the part; otherwise `notes` say why not.
    pub described: bool,
    pub notes: Vec<Note>,
    /// Hz, |Z| in Ω, R in Ω of the circuit; empty where it does not describe the part.
    pub curve: Vec<[f64; 3]>,
}

/// One element.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ParameterSection {
    pub value: f64,
    pub standard_uncertainty: Option<f64>,
    pub unit: String,
}

/// The circuit of the median part; `None` where no part conforms, or none can be fitted.
pub(super) fn of_median_part(
    limits: &Limits,
    parts: &[PartRecord],
    sweeps: &[PartSweep],
) -> Option<CircuitSection> {
    let key = &limits.bounds.first()?.key;
    let mut values: Vec<(f64, &str)> = parts
        .iter()
        .filter(|p| p.verdict == PartVerdict::Conforming)
        .filter_map(|p| Some((p.readings.get(key)?.value?, p.part.as_str())))
        .collect();
    values.sort_by(|a, b| a.0.total_cmp(&b.0));
    let (_, part) = *values.get(values.len() / 2)?;
    let sweep = &sweeps.iter().find(|s| s.part == part)?.sweep;
    let fit = circuit::fit(sweep).ok()?;
    let (first, last) = (*sweep.frequency.first()?, *sweep.frequency.last()?);
    let step = (last / first).powf(1.0 / (POINTS - 1) as f64);
    let frequency: Vec<f64> = (0..POINTS).map(|i| first * step.powi(i as i32)).collect();
    let curve = if fit.described {
        let impedance = fit.impedance(&frequency);
        frequency
            .iter()
            .zip(impedance)
            .map(|(f, z)| [*f, z.norm(), z.re])
            .collect()
    } else {
        Vec::new()
    };
    let parameter = |p: &circuit::Parameter| {
        let section = ParameterSection {
            value: p.value,
            standard_uncertainty: p.standard_uncertainty,
            unit: p.unit.to_owned(),
        };
        (p.name.to_owned(), section)
    };
    Some(CircuitSection {
        part: part.to_owned(),
        model: fit.circuit.title().to_owned(),
        parameters: fit.parameters.iter().map(parameter).collect(),
        residual: fit.residual.rms,
        noise: fit.residual.noise,
        described: fit.described,
        notes: fit.notes.clone(),
        curve,
    })
}
