//! Which circuit, how well it describes the part, and what its parameters are.

use super::data::{Columns, Data, Room};
use super::marquardt::{Factor, Minimum, invert};
use super::model::{CAPACITANCE_AT, Circuit, Element, MOST};
use super::projected;
use super::start::{Rough, rough};
use crate::diagnostic::Note;
use crate::quantity::engineering;
use crate::readings::grid::grid;
use crate::readings::local_fit::{Points, noise};
use crate::sweep::Sweep;
use num_complex::Complex64;
use std::f64::consts::TAU;
use std::ops::Index;

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
    pub name: &'static str,
    /// SI unit; `1` for the dispersion exponent.
    pub unit: &'static str,
    #[allow(missing_docs)]
    pub value: f64,
    /// From the residuals' scatter, widened where neighbouring residuals go together; `None` where
    /// the element is not visible in the sweep and stands at 0.
    pub standard_uncertainty: Option<f64>,
}

/// Covariance of a circuit's elements: a symmetric matrix, in SI units, of which `covariance[k]` is
/// the row of element `k`.
#[derive(Debug, Clone, PartialEq)]
pub struct Covariance {
    order: usize,
    rows: Vec<f64>,
}

impl Index<usize> for Covariance {
    type Output = [f64];

    fn index(&self, row: usize) -> &[f64] {
        &self.rows[row * self.order..][..self.order]
    }
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
    pub covariance: Covariance,
    #[allow(missing_docs)]
    pub residual: Residual,
    /// Whether the circuit describes the part; otherwise `notes` say why not, and no reading is
    /// taken from it.
    pub described: bool,
    #[allow(missing_docs)]
    pub notes: Vec<Note>,
    /// As the circuit has them, logarithms where it has logarithms.
    internal: [f64; MOST],
    /// Change of each internal parameter with a common phase error, per radian.
    per_radian: [f64; MOST],
    /// What correlated residuals widen the covariance by.
    widening: f64,
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
    let mut room = Room::default();
    let (room, vectors) = room.take(frequency.len());
    let columns = Columns::new(impedance, room);
    if !columns.sound {
        return Err(Note::new(
            "circuit_not_finite",
            "the sweep holds an impedance that is zero",
        ));
    }
    let Some(rough) = rough(frequency, impedance) else {
        return Err(Note::new(
            "circuit_not_capacitive",
            "the sweep does not start capacitive: there is no capacitor to be fitted",
        ));
    };
    let grid = grid(frequency, 0..frequency.len());
    let n = frequency.len();
    let noise = relative_noise(Points {
        re: &columns.re()[..n],
        im: &columns.im()[..n],
        square: columns.square(),
        size: columns.size(),
    });
    let data = Data::new(&grid, columns);
    let best = best(sweep, &data, vectors, &rough, noise);
    Ok(assemble(sweep, &data, &best, noise))
}

/// Root mean square of the relative noise of real and imaginary part.
fn relative_noise(points: Points) -> f64 {
    let [magnitude, phase] = noise(points).unwrap_or([0.0, 0.0]);
    (0.5 * (magnitude * magnitude + phase * phase)).sqrt()
}

fn rms(data: &Data, minimum: &Minimum) -> f64 {
    (minimum.square_sum / data.residuals() as f64).sqrt()
}

/// Tries circuits from small to large until one leaves no more than noise.
fn best(
    sweep: &Sweep,
    data: &Data,
    vectors: [&mut [f64]; projected::VECTORS],
    rough: &Rough,
    noise: f64,
) -> Minimum {
    let start = |circuit| {
        let sizes = data.columns.size();
        rough.parameters(circuit, &sweep.frequency, &sweep.impedance, sizes)
    };
    let mut best = projected::minimise(data, vectors, rough.exponent()).unwrap_or_else(|| {
        let circuit = Circuit::Dispersive;
        physical(data, circuit, &start(circuit))
    });
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
        if enough(&best, limit)
            && (whole || circuit != Circuit::DispersiveEddy || is_noise(data, &best))
        {
            continue;
        }
        let found = physical(data, circuit, &start(circuit));
        if information(data, &found) < information(data, &best) && determined(data, &found) {
            best = found;
        }
    }
    best
}

/// Whether neighbouring residuals go no more together than those of noise do: their correlation has
/// a standard deviation of 1/√(2n) then, and more than three of them once in a thousand sweeps.
fn is_noise(data: &Data, m: &Minimum) -> bool {
    m.course.autocorrelation < 3.0 / (data.residuals() as f64).sqrt()
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
fn physical(data: &Data, circuit: Circuit, start: &[f64; MOST]) -> Minimum {
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
        let mut from = *start;
        if dispersive && minimum.converged {
            from = minimum.parameters;
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

fn assemble(sweep: &Sweep, data: &Data, m: &Minimum, noise: f64) -> CircuitFit {
    let residual = Residual {
        rms: rms(data, m),
        largest: m.course.largest,
        largest_at: sweep.frequency[m.course.largest_at],
        noise,
        autocorrelation: m.course.autocorrelation,
    };
    let elements = m.circuit.elements();
    let (order, free) = (elements.len(), m.free.len());
    let variance = m.square_sum / (data.residuals() - free) as f64;
    // A first-order correlated residual carries (1 − ρ)/(1 + ρ) of the information.
    let rho = residual.autocorrelation.clamp(0.0, 0.99);
    let widening = (1.0 + rho) / (1.0 - rho);
    // The quantity itself where the circuit has its logarithm: d(e^x) = e^x dx.
    let mut value = m.parameters;
    let mut factor = [1.0; MOST];
    for (k, _) in elements.iter().enumerate().filter(|(_, e)| e.logarithm) {
        value[k] = m.parameters[k].exp();
        factor[k] = value[k];
    }
    let mut covariance = Covariance {
        order,
        rows: vec![0.0; order * order],
    };
    let mut per_radian = [0.0; MOST];
    let normal = Factor::new(&m.normal, free, 0.0);
    if let Some(normal) = &normal {
        let (inverse, change) = (normal.inverse(), normal.solve(&m.turned));
        for (i, a) in m.free.iter().enumerate() {
            per_radian[*a] = change[i];
            for (j, b) in m.free.iter().enumerate() {
                covariance.rows[a * order + b] = inverse[i][j] * variance * factor[*a] * factor[*b];
            }
        }
    }
    let parameter = |(k, element): (usize, &Element)| Parameter {
        name: element.name,
        unit: element.unit,
        value: value[k],
        standard_uncertainty: (normal.is_some() && m.free.contains(&k))
            .then(|| (covariance[k][k] * widening).sqrt()),
    };
    let parameters = elements.iter().enumerate().map(parameter).collect();
    let notes = notes(m, &residual, normal.is_some());
    CircuitFit {
        circuit: m.circuit,
        parameters,
        covariance,
        residual,
        described: notes.is_empty(),
        notes,
        internal: m.parameters,
        per_radian,
        widening,
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
        self.circuit.impedance(&self.internal, frequency)
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
        let elements = self.circuit.elements();
        // From the internal parameters' covariance to that of the elements.
        let scale = |k: usize| {
            let own = elements[k].logarithm.then(|| self.parameters[k].value);
            own.unwrap_or(1.0)
        };
        let widened =
            |i: usize, j: usize| self.covariance[i][j] * self.widening / (scale(i) * scale(j));
        let mut gradient = [0.0; MOST];
        for (k, gradient) in gradient.iter_mut().enumerate().take(elements.len()) {
            // A tenth of the parameter's own uncertainty is small enough to be linear.
            let h = 0.1 * widened(k, k).sqrt();
            if h > 0.0 {
                let mut moved = self.internal;
                moved[k] += h;
                let up = of(self.circuit, &moved);
                moved[k] -= 2.0 * h;
                *gradient = (up - of(self.circuit, &moved)) / (2.0 * h);
            }
        }
        let per_radian = (gradient.iter().zip(&self.per_radian))
            .map(|(g, s)| g * s)
            .sum();
        let mut variance = 0.0;
        for i in (0..elements.len()).filter(|i| gradient[*i] != 0.0) {
            for j in (0..elements.len()).filter(|j| gradient[*j] != 0.0) {
                variance += gradient[i] * gradient[j] * widened(i, j);
            }
        }
        (value, per_radian, variance.max(0.0).sqrt())
    }
}

/// Series capacitance in F of the circuit's capacitive branch at 1 kHz.
pub(in crate::readings) fn capacitance_at_1khz(circuit: Circuit, internal: &[f64]) -> f64 {
    -1.0 / (TAU * CAPACITANCE_AT * circuit.capacitive_branch(internal, CAPACITANCE_AT).im)
}
