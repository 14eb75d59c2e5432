//! The circuits, their impedance and its derivatives.

use crate::readings::grid::{Axis, LN_AT, ROOT_AT};
use num_complex::Complex64;
use std::f64::consts::{FRAC_PI_2, TAU};

/// Frequency at which the dispersive capacitance is stated, Hz.
pub(super) const CAPACITANCE_AT: f64 = LN_AT;
/// Frequency at which the skin resistance is stated, Hz.
pub(super) const SKIN_AT: f64 = ROOT_AT;
/// Most parameters of a circuit.
pub(super) const MOST: usize = 11;

/// An equivalent circuit.
///
/// All are a resistance and an inductance in series with what follows. Parameters in order:
///
/// | circuit | parameters |
/// |---|---|
/// | `Dispersive` | R0, L, ln C1, a, Rs |
/// | `DispersiveEddy` | R0, L, ln C1, a, ln Re, ln Le |
/// | `Ladder(n)` | R0, L, ln Re, ln Le, ln C1, ln R1, ln C2, … ln Cn |
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Circuit {
    /// A constant-phase element `(jω/ω1)^−(1−a) / (ω1 C1)` (class 1 and 2 ceramic, film: its loss
    /// angle is aπ/2 at all frequencies) and skin effect `Rs √(f/1 MHz) (1 + j)`.
    Dispersive,
    /// The same element with eddy currents instead of skin effect: Re in parallel with Le.
    DispersiveEddy,
    /// A ladder of resistances and capacitances (polymer and wet electrolytics, whose pores fill
    /// more and more slowly with depth) of so many stages, and eddy currents.
    Ladder(usize),
}

/// What a parameter is.
#[derive(Debug, Clone, Copy)]
pub(super) struct Element {
    pub(super) name: &'static str,
    pub(super) unit: &'static str,
    /// Whether the parameter is the logarithm of the element.
    pub(super) logarithm: bool,
}

const fn linear(name: &'static str, unit: &'static str) -> Element {
    Element {
        name,
        unit,
        logarithm: false,
    }
}

const fn logarithm(name: &'static str, unit: &'static str) -> Element {
    Element {
        name,
        unit,
        logarithm: true,
    }
}

const DISPERSIVE: [Element; 5] = [
    linear("r_0", "Ω"),
    linear("l", "H"),
    logarithm("c_1", "F"),
    linear("dispersion", "1"),
    linear("r_skin_1mhz", "Ω"),
];
const DISPERSIVE_EDDY: [Element; 6] = [
    linear("r_0", "Ω"),
    linear("l", "H"),
    logarithm("c_1", "F"),
    linear("dispersion", "1"),
    logarithm("r_eddy", "Ω"),
    logarithm("l_eddy", "H"),
];
/// Of the longest ladder; shorter ones end with an earlier capacitance.
const LADDER: [Element; MOST] = [
    linear("r_0", "Ω"),
    linear("l", "H"),
    logarithm("r_eddy", "Ω"),
    logarithm("l_eddy", "H"),
    logarithm("c_1", "F"),
    logarithm("r_1", "Ω"),
    logarithm("c_2", "F"),
    logarithm("r_2", "Ω"),
    logarithm("c_3", "F"),
    logarithm("r_3", "Ω"),
    logarithm("c_4", "F"),
];

/// What the circuits need of a frequency.
#[derive(Debug, Clone, Copy)]
pub(super) struct Point {
    omega: f64,
    /// ln(f / 1 kHz)
    ln: f64,
    /// √(f / 1 MHz)
    root: f64,
}

impl Point {
    pub(super) fn new(frequency: f64) -> Point {
        Point {
            omega: TAU * frequency,
            ln: (frequency / CAPACITANCE_AT).ln(),
            root: (frequency / SKIN_AT).sqrt(),
        }
    }

    /// The points of an axis.
    pub(super) fn of(axis: &Axis) -> impl Iterator<Item = Point> {
        (axis.omega.iter().zip(&axis.ln).zip(&axis.root)).map(|((omega, ln), root)| Point {
            omega: *omega,
            ln: *ln,
            root: *root,
        })
    }
}

impl Circuit {
    /// In words, for documents.
    pub fn title(self) -> &'static str {
        match self {
            Circuit::Dispersive => "R-L-C with dispersion and skin effect",
            Circuit::DispersiveEddy => "R-L-C with dispersion and eddy currents",
            Circuit::Ladder(_) => "R-C ladder with inductance and eddy currents",
        }
    }

    /// How many parameters it has.
    pub(super) fn parameters(self) -> usize {
        match self {
            Circuit::Dispersive => 5,
            Circuit::DispersiveEddy => 6,
            Circuit::Ladder(stages) => 3 + 2 * stages,
        }
    }

    /// Whether a parameter is the logarithm of an element.
    pub(super) fn is_logarithm(self, parameter: usize) -> bool {
        self.elements()
            .get(parameter)
            .is_some_and(|element| element.logarithm)
    }

    /// The elements in order.
    pub(super) fn elements(self) -> &'static [Element] {
        match self {
            Circuit::Dispersive => &DISPERSIVE,
            Circuit::DispersiveEddy => &DISPERSIVE_EDDY,
            Circuit::Ladder(_) => LADDER.get(..self.parameters()).unwrap_or(&LADDER),
        }
    }

    /// What does not depend on frequency, once for all points.
    pub(super) fn prepare(self, p: &[f64]) -> Prepared {
        let mut value = [0.0; MOST];
        for (k, (v, p)) in value.iter_mut().zip(p).enumerate() {
            *v = if self.is_logarithm(k) { p.exp() } else { *p };
        }
        let mut rotation = Complex64::ONE;
        if !matches!(self, Circuit::Ladder(_)) {
            let exponent = value[3] - 1.0;
            let size = 1.0 / (TAU * CAPACITANCE_AT * value[2]);
            rotation = Complex64::from_polar(size, exponent * FRAC_PI_2);
        }
        Prepared {
            circuit: self,
            value,
            rotation,
        }
    }

    /// Impedance of the capacitive branch alone.
    pub(super) fn capacitive_branch(self, p: &[f64], frequency: f64) -> Complex64 {
        let prepared = self.prepare(p);
        let mut scratch = [Complex64::ZERO; MOST];
        let at = Point::new(frequency);
        match self {
            Circuit::Dispersive | Circuit::DispersiveEddy => prepared.dispersive(at, &mut scratch),
            Circuit::Ladder(stages) => prepared.ladder(stages, at, &mut scratch),
        }
    }
}

/// A circuit with its elements, ready for evaluation.
#[derive(Debug, Clone, Copy)]
pub(super) struct Prepared {
    circuit: Circuit,
    /// The elements themselves, where the parameter is a logarithm.
    value: [f64; MOST],
    /// Of the constant-phase element at 1 kHz.
    rotation: Complex64,
}

impl Prepared {
    /// Z in Ω; `derivatives` receives dZ/dp for each parameter.
    #[inline]
    pub(super) fn evaluate(&self, at: Point, derivatives: &mut [Complex64; MOST]) -> Complex64 {
        derivatives[0] = Complex64::ONE;
        derivatives[1] = Complex64::new(0.0, at.omega);
        let series = Complex64::new(self.value[0], at.omega * self.value[1]);
        match self.circuit {
            Circuit::Dispersive => {
                let skin = at.root * self.value[4];
                derivatives[4] = Complex64::new(at.root, at.root);
                series + Complex64::new(skin, skin) + self.dispersive(at, derivatives)
            }
            Circuit::DispersiveEddy => {
                series + self.dispersive(at, derivatives) + self.eddy(4, at, derivatives)
            }
            Circuit::Ladder(stages) => {
                series + self.eddy(2, at, derivatives) + self.ladder(stages, at, derivatives)
            }
        }
    }

    /// The constant-phase element of parameters 2 and 3: `(jω/ω1)^(a−1) / (ω1 C1)`.
    #[inline]
    fn dispersive(&self, at: Point, derivatives: &mut [Complex64; MOST]) -> Complex64 {
        let z = self.rotation * ((self.value[3] - 1.0) * at.ln).exp();
        derivatives[2] = -z;
        derivatives[3] = z * Complex64::new(at.ln, FRAC_PI_2);
        z
    }

    /// Parameter `k`, R, in parallel with the next, L.
    #[inline]
    fn eddy(&self, k: usize, at: Point, derivatives: &mut [Complex64; MOST]) -> Complex64 {
        let r = self.value[k];
        let x = Complex64::new(0.0, at.omega * self.value[k + 1]);
        let share = x / (r + x);
        let z = r * share;
        derivatives[k] = z * share;
        derivatives[k + 1] = z * (1.0 - share);
        z
    }

    /// Parameters from 4 on, C1, R1, C2, … Cn: each C in parallel with its R and the rest.
    fn ladder(&self, stages: usize, at: Point, derivatives: &mut [Complex64; MOST]) -> Complex64 {
        // From the last stage inwards; the gain of what lies nearer is applied on the way back.
        let mut gains = [Complex64::ZERO; MOST];
        let mut z = Complex64::ZERO;
        for k in (0..stages).rev() {
            let (c, r) = (4 + 2 * k, 5 + 2 * k);
            let admittance = Complex64::new(0.0, at.omega * self.value[c]);
            if k + 1 < stages {
                let branch = self.value[r] + z;
                let gain = (1.0 + admittance * branch).inv();
                z = branch * gain;
                // dz/d(branch) = (z/branch)²
                gains[k] = gain * gain;
                derivatives[r] = gains[k] * self.value[r];
            } else {
                z = admittance.inv();
            }
            derivatives[c] = -z * z * admittance;
        }
        let mut gain = Complex64::ONE;
        for k in 0..stages {
            derivatives[4 + 2 * k] *= gain;
            if k + 1 < stages {
                derivatives[5 + 2 * k] *= gain;
            }
            gain *= gains[k];
        }
        z
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn derivatives_are_those_of_the_impedance() {
        let eddy = [(0.02f64).ln(), (2e-9f64).ln()];
        let ladder = [50e-6f64, 0.1, 30e-6, 0.3, 20e-6].map(f64::ln);
        let cases = [
            (
                Circuit::Dispersive,
                vec![2e-3, 0.5e-9, (4.6e-6f64).ln(), 0.017, 3e-4],
            ),
            (
                Circuit::DispersiveEddy,
                [vec![2e-3, 0.5e-9, (4.6e-6f64).ln(), 0.017], eddy.to_vec()].concat(),
            ),
            (
                Circuit::Ladder(3),
                [vec![0.05, 1e-8], eddy.to_vec(), ladder.to_vec()].concat(),
            ),
        ];
        for (circuit, p) in cases {
            assert_eq!(p.len(), circuit.parameters());
            assert_eq!(p.len(), circuit.elements().len());
            for f in [1e3, 3e4, 1e6, 6.5e7] {
                let at = Point::new(f);
                let mut derivatives = [Complex64::ZERO; MOST];
                let z = circuit.prepare(&p).evaluate(at, &mut derivatives);
                for (k, derivative) in derivatives.iter().enumerate().take(p.len()) {
                    let h = 1e-6 * p[k].abs().max(1e-12);
                    let mut scratch = [Complex64::ZERO; MOST];
                    let (mut up, mut down) = (p.clone(), p.clone());
                    up[k] += h;
                    down[k] -= h;
                    let by_difference = (circuit.prepare(&up).evaluate(at, &mut scratch)
                        - circuit.prepare(&down).evaluate(at, &mut scratch))
                        / (2.0 * h);
                    let error = (by_difference - derivative).norm();
                    let scale = derivative.norm() + 1e-8 * z.norm() / h;
                    assert!(
                        error < 1e-5 * scale,
                        "{circuit:?} parameter {k} at {f} Hz: {error:e}"
                    );
                }
            }
        }
    }

    #[test]
    fn the_loss_angle_of_the_dispersive_element_is_constant() {
        // tan δ = tan(aπ/2), C falls by 1 − 10^−a a decade.
        let p = [0.0, 0.0, (1e-6f64).ln(), 0.02, 0.0];
        let of = |f: f64| Circuit::Dispersive.capacitive_branch(&p, f);
        for f in [1e2, 1e3, 1e6] {
            let z = of(f);
            assert!((-z.re / z.im - (0.01 * std::f64::consts::PI).tan()).abs() < 1e-12);
        }
        let c = |f: f64| -1.0 / (TAU * f * of(f).im);
        assert!((c(1e4) / c(1e3) - 10f64.powf(-0.02)).abs() < 1e-12);
    }
}
