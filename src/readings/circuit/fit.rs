//! Which circuit, how well it describes the part, and what its parameters are.

use super::marquardt::{Data, Minimum, Square, invert, solve};
use super::model::{CAPACITANCE_AT, Circuit, MOST, Point};
use super::start::{Rough, rough};
use crate::diagnostic::Note;
use crate::quantity::engineering;
use crate::readings::grid::grid;
use crate::readings::local_fit::{noise, sound};
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::f64::consts::TAU;

/// Fewest points, and fewest decades, from which a circuit is told.
const FEWEST_POINTS: usize = 20;
const FEWEST_DECADES: f64 = 2.0;
/// A circuit describes a part whose impedance it meets within this, root mean square of real and
/// imaginary part, noise apart; a real part is no circuit of five elements.
const MISFIT: f64 = 0.01;
/// Residuals up to so many times the sweep's own noise are noise.
const NOISE: f64 = 1.5;
/// Below this a better circuit is not looked for.
const GOOD_ENOUGH: f64 = 0.005;
/// Beyond this a part of one capacitance is not looked for, but a ladder.
const HOPELESS: f64 = 0.02;

/// One element of a fitted circuit.
#[derive(Debug, Clone, PartialEq)]
pub struct Parameter {
    /// `r_0`, `l`, `c_1`, `dispersion`, `r_skin_1mhz`, `r_eddy`, `l_eddy`, `r_1`, …
    pub name: String,
    /// SI unit; `1` for the dispersion exponent.
    pub unit: &'static str,
    #[allow(missing_docs)]
    pub value: f64,
    /// From the residuals' scatter, widened where neighbouring residuals go together; `None` where
    /// the element is not visible in the sweep and stands at 0.
    pub standard_uncertainty: Option<f64>,
}

/// What the circuit leaves, relative to |Z|.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Residual {
    /// Root mean square of real and imaginary parts.
    pub rms: f64,
    /// Largest |Z − Z(f)|/|Z|.
    pub largest: f64,
    /// Hz, where that is.
    pub largest_at: f64,
    /// The same root mean square for the sweep's own noise, from differences of neighbours.
    pub noise: f64,
    /// Correlation of neighbouring residuals: near 0 for noise, near 1 for a course that the
    /// circuit does not have.
    pub autocorrelation: f64,
}

/// The equivalent circuit of a part.
#[derive(Debug, Clone, PartialEq)]
pub struct CircuitFit {
    #[allow(missing_docs)]
    pub circuit: Circuit,
    /// Elements, in the circuit's order.
    pub parameters: Vec<Parameter>,
    /// Covariance of `parameters` by the residuals' scatter, `s² (JᵀJ)⁻¹` with
    /// `s² = Σr²/(2n − p)`; 0 for elements that are not visible.
    pub covariance: Vec<Vec<f64>>,
    #[allow(missing_docs)]
    pub residual: Residual,
    /// Whether the circuit describes the part; otherwise `notes` say why not, and no reading is
    /// taken from it.
    pub described: bool,
    #[allow(missing_docs)]
    pub notes: Vec<Note>,
    /// As the circuit has them, logarithms where it has logarithms.
    internal: Vec<f64>,
    /// Change of each internal parameter with a common phase error, per radian.
    per_radian: Vec<f64>,
    /// Covariance of the internal parameters, widened for correlated residuals.
    widened: Vec<Vec<f64>>,
}

/// Fits an equivalent circuit to a sweep.
///
/// # Errors
/// The reason why no circuit can be fitted: too few points or decades, or no capacitive course.
pub fn fit(sweep: &Sweep) -> Result<CircuitFit, Note> {
    let (frequency, impedance) = (&sweep.frequency, &sweep.impedance);
    let span = match (frequency.first(), frequency.last()) {
        (Some(first), Some(last)) => (last / first).log10(),
        _ => 0.0,
    };
    if frequency.len() < FEWEST_POINTS || span < FEWEST_DECADES {
        return Err(Note::new(
            "circuit_too_few_points",
            format!(
                "an equivalent circuit needs {FEWEST_POINTS} points over {FEWEST_DECADES} decades: the sweep has {} over {span:.1}",
                frequency.len()
            ),
        ));
    }
    let square: Vec<f64> = impedance.iter().map(Complex64::norm_sqr).collect();
    if !sound(&square) {
        return Err(Note::new(
            "circuit_not_finite",
            "the sweep holds an impedance that is zero",
        ));
    }
    let size: Vec<f64> = square.iter().map(|s| s.sqrt()).collect();
    let Some(rough) = rough(frequency, impedance, &size) else {
        return Err(Note::new(
            "circuit_not_capacitive",
            "the sweep does not start capacitive: there is no capacitor to be fitted",
        ));
    };
    let grid = grid(frequency, 0..frequency.len());
    let data = Data::new(&grid, impedance, &size);
    let noise = relative_noise(impedance, &square, &size);
    let best = best(&data, &rough, noise);
    Ok(assemble(sweep, &data, &best, noise))
}

/// Root mean square of the relative noise of real and imaginary part.
fn relative_noise(impedance: &[Complex64], square: &[f64], size: &[f64]) -> f64 {
    let [magnitude, phase] = noise(impedance, square, size).unwrap_or([0.0, 0.0]);
    (0.5 * (magnitude * magnitude + phase * phase)).sqrt()
}

fn rms(data: &Data, minimum: &Minimum) -> f64 {
    (minimum.square_sum / data.residuals() as f64).sqrt()
}

/// Tries circuits from small to large until one leaves no more than noise.
fn best(data: &Data, rough: &Rough, noise: f64) -> Minimum {
    let mut best = physical(
        data,
        Circuit::Dispersive,
        &rough.parameters(Circuit::Dispersive),
    );
    let enough = |m: &Minimum, limit: f64| rms(data, m) <= limit.max(NOISE * noise);
    let larger = [
        (Circuit::DispersiveEddy, GOOD_ENOUGH),
        (Circuit::Ladder(2), MISFIT),
        (Circuit::Ladder(3), GOOD_ENOUGH),
        (Circuit::Ladder(4), GOOD_ENOUGH),
    ];
    for (circuit, limit) in larger {
        // More stages help where fewer did; they are no way out of a part that is no ladder.
        let goes_on = match circuit {
            Circuit::DispersiveEddy => rms(data, &best) < HOPELESS,
            Circuit::Ladder(stages) if stages > 2 => best.circuit == Circuit::Ladder(stages - 1),
            _ => true,
        };
        // An element that came out negative says that the circuit is not the right one, unless what
        // is left is noise all the same.
        let whole = best.free.len() == best.circuit.parameters();
        if !goes_on {
            continue;
        }
        if enough(&best, limit) && (whole || circuit != Circuit::DispersiveEddy || is_noise(&best))
        {
            continue;
        }
        let found = physical(data, circuit, &rough.parameters(circuit));
        if information(data, &found) < information(data, &best) && determined(data, &found) {
            best = found;
        }
    }
    best
}

/// Whether neighbouring residuals go no more together than those of noise do: their correlation has
/// a standard deviation of 1/√(2n) then.
fn is_noise(m: &Minimum) -> bool {
    autocorrelation(&m.residual) < 2.0 / (2.0 * m.residual.len() as f64).sqrt()
}

/// Correlation of neighbouring residuals; 0 where there are none.
fn autocorrelation(all: &[Complex64]) -> f64 {
    let square: f64 = all.iter().map(|r| r.norm_sqr()).sum();
    let together: f64 = all
        .windows(2)
        .map(|r| r[0].re * r[1].re + r[0].im * r[1].im)
        .sum();
    if square > 0.0 { together / square } else { 0.0 }
}

/// Whether the sweep tells every element: an element known to no better than a factor of e is one
/// too many.
fn determined(data: &Data, m: &Minimum) -> bool {
    let variance = m.square_sum / (data.residuals() - m.free.len()) as f64;
    m.converged
        && invert(&m.normal, m.free.len()).is_some_and(|inverse| {
            m.free
                .iter()
                .enumerate()
                .all(|(i, k)| !m.circuit.is_logarithm(*k) || inverse[i][i] * variance < 1.0)
        })
}

/// Akaike's criterion for `2n` residuals of unknown variance.
fn information(data: &Data, m: &Minimum) -> f64 {
    let n = data.residuals() as f64;
    n * m.square_sum.max(f64::MIN_POSITIVE).ln() + 2.0 * m.free.len() as f64
}

/// A minimum whose resistances, inductance and dispersion are not negative: an element that would
/// be is not visible in the sweep, and is left out.
fn physical(data: &Data, circuit: Circuit, start: &[f64]) -> Minimum {
    let mut free: Vec<usize> = (0..circuit.parameters()).collect();
    let mut minimum = data.minimise(circuit, start, &free);
    let dispersive = matches!(circuit, Circuit::Dispersive | Circuit::DispersiveEddy);
    let not_negative: &[usize] = match circuit {
        Circuit::Dispersive => &[4, 3, 0, 1],
        Circuit::DispersiveEddy => &[3, 0, 1],
        Circuit::Ladder(_) => &[0, 1],
    };
    for _ in 0..not_negative.len() {
        let negative = not_negative.iter().find(|k| minimum.parameters[**k] < 0.0);
        let Some(k) = negative else { break };
        free.retain(|f| f != k);
        let mut from = start.to_vec();
        if dispersive && minimum.converged {
            from.clone_from(&minimum.parameters);
        }
        for k in not_negative {
            from[*k] = if free.contains(k) {
                from[*k].max(0.0)
            } else {
                0.0
            };
        }
        minimum = data.minimise(circuit, &from, &free);
    }
    minimum
}

fn residual(sweep: &Sweep, data: &Data, m: &Minimum, noise: f64) -> Residual {
    let (mut square, mut largest_at) = (0.0, sweep.frequency[0]);
    for (r, f) in m.residual.iter().zip(&sweep.frequency) {
        if r.norm_sqr() > square {
            (square, largest_at) = (r.norm_sqr(), *f);
        }
    }
    Residual {
        rms: rms(data, m),
        largest: square.sqrt(),
        largest_at,
        noise,
        autocorrelation: autocorrelation(&m.residual),
    }
}

fn assemble(sweep: &Sweep, data: &Data, m: &Minimum, noise: f64) -> CircuitFit {
    let residual = residual(sweep, data, m, noise);
    let names = m.circuit.names();
    let p = names.len();
    let degrees = (data.residuals() - m.free.len()) as f64;
    let variance = m.square_sum / degrees;
    let inverse = invert(&m.normal, m.free.len());
    let full = |of: &dyn Fn(usize, usize) -> f64| -> Vec<Vec<f64>> {
        let mut matrix = vec![vec![0.0; p]; p];
        for (i, a) in m.free.iter().enumerate() {
            for (j, b) in m.free.iter().enumerate() {
                matrix[*a][*b] = of(i, j);
            }
        }
        matrix
    };
    let inverse_full = inverse.map(|v: Square| full(&|i, j| v[i][j]));
    // A first-order correlated residual carries (1 − ρ)/(1 + ρ) of the information.
    let rho = residual.autocorrelation.clamp(0.0, 0.99);
    let widening = (1.0 + rho) / (1.0 - rho);
    let scaled = |matrix: &[Vec<f64>], s: f64| -> Vec<Vec<f64>> {
        matrix
            .iter()
            .map(|row| row.iter().map(|v| v * s).collect())
            .collect()
    };
    let zero = vec![vec![0.0; p]; p];
    let internal_covariance = scaled(inverse_full.as_ref().unwrap_or(&zero), variance);
    let widened = scaled(&internal_covariance, widening);
    // The quantity itself where the circuit has its logarithm: d(e^x) = e^x dx.
    let factor: Vec<f64> = names
        .iter()
        .zip(&m.parameters)
        .map(|((_, _, logarithm), v)| if *logarithm { v.exp() } else { 1.0 })
        .collect();
    let parameters = names
        .into_iter()
        .enumerate()
        .map(|(k, (name, unit, logarithm))| Parameter {
            name,
            unit,
            value: if logarithm {
                m.parameters[k].exp()
            } else {
                m.parameters[k]
            },
            standard_uncertainty: (inverse_full.is_some() && m.free.contains(&k))
                .then(|| widened[k][k].sqrt() * factor[k]),
        })
        .collect();
    let covariance = (0..p)
        .map(|i| {
            (0..p)
                .map(|j| internal_covariance[i][j] * factor[i] * factor[j])
                .collect()
        })
        .collect();
    let mut per_radian = vec![0.0; p];
    if let Some(change) = solve(&m.normal, m.free.len(), 0.0, &m.turned) {
        for (i, k) in m.free.iter().enumerate() {
            per_radian[*k] = change[i];
        }
    }
    let notes = notes(m, &residual, inverse_full.is_some());
    CircuitFit {
        circuit: m.circuit,
        parameters,
        covariance,
        residual,
        described: notes.is_empty(),
        notes,
        internal: m.parameters.clone(),
        per_radian,
        widened,
    }
}

/// Why a circuit does not describe the part; nothing where it does.
fn notes(m: &Minimum, residual: &Residual, determined: bool) -> Vec<Note> {
    let mut notes = Vec::new();
    if !m.converged || !determined {
        notes.push(Note::new(
            "circuit_not_identifiable",
            "the sweep does not determine the elements of the equivalent circuit",
        ));
    }
    let beyond_noise = (residual.rms.powi(2) - residual.noise.powi(2))
        .max(0.0)
        .sqrt();
    let noise = residual.rms <= NOISE * residual.noise;
    if (beyond_noise > MISFIT && !noise) || residual.rms.is_nan() {
        notes.push(Note::new(
            "circuit_misfit",
            format!(
                "the equivalent circuit does not describe the part: it misses the impedance by {:.1} % (at most {:.1} %, at {}), where the sweep's noise is {:.2} %",
                100.0 * residual.rms,
                100.0 * residual.largest,
                engineering(residual.largest_at, "Hz", 3),
                100.0 * residual.noise,
            ),
        ));
    }
    notes
}

impl CircuitFit {
    /// Z in Ω of the circuit at each frequency in Hz, for curves.
    pub fn impedance(&self, frequency: &[f64]) -> Vec<Complex64> {
        let circuit = self.circuit.prepare(&self.internal);
        let mut scratch = [Complex64::ZERO; MOST];
        frequency
            .iter()
            .map(|f| circuit.evaluate(Point::new(*f), &mut scratch))
            .collect()
    }

    /// An element by its name.
    pub fn parameter(&self, name: &str) -> Option<&Parameter> {
        self.parameters.iter().find(|p| p.name == name)
    }

    /// A quantity of the circuit: its value, its change per radian of a common phase error, and its
    /// standard uncertainty from scatter.
    pub(in crate::readings) fn quantity(
        &self,
        of: impl Fn(Circuit, &[f64]) -> f64,
    ) -> (f64, f64, f64) {
        let value = of(self.circuit, &self.internal);
        let gradient: Vec<f64> = (0..self.internal.len())
            .map(|k| {
                let spread = self.widened[k][k].sqrt();
                // A tenth of the parameter's own uncertainty is small enough to be linear.
                let h = if spread > 0.0 {
                    0.1 * spread
                } else {
                    return 0.0;
                };
                let mut moved = self.internal.clone();
                moved[k] += h;
                let up = of(self.circuit, &moved);
                moved[k] -= 2.0 * h;
                (up - of(self.circuit, &moved)) / (2.0 * h)
            })
            .collect();
        let per_radian = gradient
            .iter()
            .zip(&self.per_radian)
            .map(|(g, s)| g * s)
            .sum();
        let variance: f64 = gradient
            .iter()
            .zip(&self.widened)
            .map(|(a, row)| a * row.iter().zip(&gradient).map(|(v, b)| v * b).sum::<f64>())
            .sum();
        (value, per_radian, variance.max(0.0).sqrt())
    }
}

/// Series capacitance in F of the circuit's capacitive branch at 1 kHz.
pub(in crate::readings) fn capacitance_at_1khz(circuit: Circuit, internal: &[f64]) -> f64 {
    -1.0 / (TAU * CAPACITANCE_AT * circuit.capacitive_branch(internal, CAPACITANCE_AT).im)
}
