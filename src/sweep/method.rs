//! Measurement methods: what the instrument delivers to the impedance of the part.
//!
//! Formulas are those of the divider and of the loaded two-port (Pozar, Microwave Engineering,
//! 4th edition, chapter 4): with port impedances `Za`, `Zb`
//!
//! - shunt: `Z = Z21 = 2 √(Za Zb) S21 / ((1-S11)(1-S22) - S12 S21)`, free of series arms at the ports;
//! - series: `Z = -1/Y21 = √(Za Zb) ((1+S11)(1+S22) - S12 S21) / (2 S21)`, free of shunt arms;
//! - reflection: `Z = Z0 (1+S11)/(1-S11)`.

use super::network::{Network, Parameter};
use super::raw::{Measured, RawSweep};
use crate::diagnostic::Note;
use crate::station::{Method, Reference, Station};
use num_complex::Complex64;
use std::f64::consts::{SQRT_2, TAU};

/// Impedance and level by the station's method.
pub(super) struct Measurement {
    /// Ω
    pub impedance: Vec<Complex64>,
    /// V rms across the part.
    pub level: Option<Vec<f64>>,
}

impl Reference {
    /// `R + jωL` in ohm.
    pub(super) fn impedance(&self, frequency: f64) -> Complex64 {
        Complex64::new(self.resistance, TAU * frequency * self.inductance)
    }
}

/// Applies the station's method.
///
/// # Errors
/// A file that does not hold what the method needs, and points that give no finite impedance.
pub(super) fn apply(raw: &RawSweep, station: &Station) -> Result<Measurement, Note> {
    let measurement = match (station.method, &raw.measured) {
        (Method::Direct, Measured::Impedance(z)) => plain(z.clone()),
        (Method::Direct | Method::Reflection, Measured::Network(network)) if network.ports == 1 => {
            plain(one_port(network))
        }
        (Method::Reflection, Measured::Network(network)) if only_s11(network) => {
            plain(one_port(&first_port(network)))
        }
        (Method::SeriesReference, Measured::Channels { a, b, peak }) => {
            let reference = reference(station)?;
            let z = raw
                .frequency
                .iter()
                .zip(a.iter().zip(b))
                .map(|(&f, (&a, &b))| reference.impedance(f) * b / (a - b));
            let scale = if *peak { 1.0 / SQRT_2 } else { 1.0 };
            Measurement {
                impedance: z.collect(),
                level: Some(b.iter().map(|b| scale * b.norm()).collect()),
            }
        }
        (Method::SeriesReference, Measured::Ratio(ratio)) => {
            let reference = reference(station)?;
            let z = raw
                .frequency
                .iter()
                .zip(ratio)
                .map(|(&f, &h)| reference.impedance(f) * h / (1.0 - h));
            plain(z.collect())
        }
        (Method::ShuntThrough, Measured::Network(network)) if network.ports == 2 => {
            plain(through(network, Place::Shunt)?)
        }
        (Method::SeriesThrough, Measured::Network(network)) if network.ports == 2 => {
            plain(through(network, Place::Series)?)
        }
        (method, measured) => return Err(mismatch(method, measured)),
    };
    match measurement.impedance.iter().position(|z| !z.is_finite()) {
        None => Ok(measurement),
        Some(at) => {
            let line = raw.lines.get(at).copied().unwrap_or(0);
            Err(Note::new(
                "impedance_not_finite",
                format!(
                    "line {line}: the values give no finite impedance (two equal channels, or a zero): measure the part again"
                ),
            ))
        }
    }
}

fn plain(impedance: Vec<Complex64>) -> Measurement {
    Measurement {
        impedance,
        level: None,
    }
}

fn reference(station: &Station) -> Result<Reference, Note> {
    station.reference.ok_or_else(|| {
        Note::new("reference_missing", "the station file states no reference impedance, which the method series_reference needs")
    })
}

fn mismatch(method: Method, measured: &Measured) -> Note {
    let (name, needs) = match method {
        Method::Direct => ("direct", "impedance columns or a one-port Touchstone file"),
        Method::SeriesReference => (
            "series_reference",
            "a table of two voltage channels or of their ratio",
        ),
        Method::ShuntThrough => ("shunt_through", "a two-port Touchstone file"),
        Method::SeriesThrough => ("series_through", "a two-port Touchstone file"),
        Method::Reflection => ("reflection", "a one-port Touchstone file"),
    };
    Note::new(
        "method_mismatch",
        format!(
            "the file holds {}, but the station measures by {name}, which needs {needs}: check the station and what was exported",
            measured.words()
        ),
    )
}

/// Impedance of a one-port; not finite where the reflection is that of an ideal open.
fn one_port(network: &Network) -> Vec<Complex64> {
    let reference = network.reference.first().copied().unwrap_or(f64::NAN);
    network
        .values
        .iter()
        .map(|&value| match network.parameter {
            Parameter::Impedance => value,
            Parameter::Admittance => value.finv(),
            Parameter::Scattering => reference * (1.0 + value) / (1.0 - value),
        })
        .collect()
}

/// Some instruments write a reflection as a two-port whose other parameters are zero.
fn only_s11(network: &Network) -> bool {
    network.ports == 2
        && network.parameter == Parameter::Scattering
        && network
            .values
            .chunks(4)
            .all(|s| s.iter().skip(1).all(|v| v.norm() == 0.0))
}

fn first_port(network: &Network) -> Network {
    Network {
        ports: 1,
        values: network.values.iter().step_by(4).copied().collect(),
        ..network.clone()
    }
}

/// How the part stands between the ports.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Place {
    Shunt,
    Series,
}

/// S-parameters of one point.
struct TwoPort {
    s11: Complex64,
    s12: Complex64,
    s21: Complex64,
    s22: Complex64,
}

fn through(network: &Network, place: Place) -> Result<Vec<Complex64>, Note> {
    let scattering = network.scattering().ok_or_else(|| {
        Note::new(
            "singular_parameters",
            "the network parameters cannot be converted to S-parameters: export S-parameters",
        )
    })?;
    let points: Vec<TwoPort> = scattering
        .chunks(4)
        .filter_map(|s| match *s {
            [s11, s12, s21, s22] => Some(TwoPort { s11, s12, s21, s22 }),
            _ => None,
        })
        .collect();
    let (za, zb) = match network.reference.as_slice() {
        [a, b] => (*a, *b),
        _ => (f64::NAN, f64::NAN),
    };
    let forward_only = points
        .iter()
        .all(|p| p.s12.norm() == 0.0 && p.s22.norm() == 0.0);
    if forward_only && za == zb {
        plausible(&points, place, false)?;
        return Ok(points.iter().map(|p| simple(p.s21, za, place)).collect());
    }
    reciprocal(&points)?;
    if za == zb {
        plausible(&points, place, true)?;
    }
    let mean = (za * zb).sqrt();
    Ok(points.iter().map(|p| exact(p, mean, place)).collect())
}

/// From S21 alone, for equal port impedances.
fn simple(s21: Complex64, z0: f64, place: Place) -> Complex64 {
    match place {
        Place::Shunt => z0 / 2.0 * s21 / (1.0 - s21),
        Place::Series => 2.0 * z0 * (1.0 - s21) / s21,
    }
}

/// From all four parameters; the two directions are averaged, as the part is reciprocal.
fn exact(p: &TwoPort, mean: f64, place: Place) -> Complex64 {
    let through = 0.5 * (p.s21 + p.s12);
    let both = p.s12 * p.s21;
    match place {
        Place::Shunt => 2.0 * mean * through / ((1.0 - p.s11) * (1.0 - p.s22) - both),
        Place::Series => mean * ((1.0 + p.s11) * (1.0 + p.s22) - both) / (2.0 * through),
    }
}

/// The two directions must agree: a capacitor is reciprocal.
fn reciprocal(points: &[TwoPort]) -> Result<(), Note> {
    let differ =
        |p: &&TwoPort| (p.s21 - p.s12).norm() > 0.1 * p.s21.norm().max(p.s12.norm()) + 1e-3;
    let count = points.iter().filter(differ).count();
    if count * 10 > points.len() {
        return Err(Note::new(
            "not_reciprocal",
            format!(
                "S21 and S12 differ at {count} of {} points, which no capacitor does: check the calibration and the order of the columns",
                points.len()
            ),
        ));
    }
    Ok(())
}

/// A part in shunt has S21 - S11 = 1, a part in series S21 + S11 = 1 (equal port impedances).
/// A file that is far from its own identity was measured otherwise than the station says.
fn plausible(points: &[TwoPort], place: Place, has_reverse: bool) -> Result<(), Note> {
    if !has_reverse && points.iter().all(|p| p.s11.norm() == 0.0) {
        // Transmission only: there is nothing to compare with.
        return Ok(());
    }
    let sign = if place == Place::Shunt { 1.0 } else { -1.0 };
    let mut residual: Vec<f64> = points
        .iter()
        .map(|p| (p.s21 - sign * p.s11 - 1.0).norm())
        .collect();
    let middle = residual.len() / 2;
    if residual.is_empty() {
        return Ok(());
    }
    let (_, median, _) = residual.select_nth_unstable_by(middle, f64::total_cmp);
    if *median <= 0.3 {
        return Ok(());
    }
    let (is, other) = match place {
        Place::Shunt => ("in shunt (shunt_through)", "series_through"),
        Place::Series => ("in series (series_through)", "shunt_through"),
    };
    Err(Note::new(
        "method_mismatch",
        format!(
            "S11 and S21 do not belong to a part {is}: check whether the jig is a {other} one, and the calibration"
        ),
    ))
}
