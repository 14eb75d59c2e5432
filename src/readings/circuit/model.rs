//! The circuits, their impedance and its derivatives.

use num_complex::Complex64;
use std::f64::consts::{FRAC_PI_2, TAU};

/// Frequency at which the dispersive capacitance is stated, Hz.
pub(super) const CAPACITANCE_AT: f64 = 1e3;
/// Frequency at which the skin resistance is stated, Hz.
pub(super) const SKIN_AT: f64 = 1e6;
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
        match self {
            Circuit::Dispersive => parameter == 2,
            Circuit::DispersiveEddy => matches!(parameter, 2 | 4 | 5),
            Circuit::Ladder(_) => parameter >= 2,
        }
    }

    /// Names in order and units; the value of a logarithm is given as the quantity itself.
    pub(super) fn names(self) -> Vec<(String, &'static str, bool)> {
        let mut all: Vec<(String, &'static str, bool)> =
            vec![("r_0".into(), "Ω", false), ("l".into(), "H", false)];
        let eddy = [
            ("r_eddy".to_owned(), "Ω", true),
            ("l_eddy".to_owned(), "H", true),
        ];
        let dispersion = [
            ("c_1".to_owned(), "F", true),
            ("dispersion".to_owned(), "1", false),
        ];
        match self {
            Circuit::Dispersive => {
                all.extend(dispersion);
                all.push(("r_skin_1mhz".into(), "Ω", false));
            }
            Circuit::DispersiveEddy => all.extend(dispersion.into_iter().chain(eddy)),
            Circuit::Ladder(stages) => {
                all.extend(eddy);
                for k in 1..=stages {
                    all.push((format!("c_{k}"), "F", true));
                    if k < stages {
                        all.push((format!("r_{k}"), "Ω", true));
                    }
                }
            }
        }
        all
    }

    /// Z in Ω; `derivatives` receives dZ/dp for each parameter.
    pub(super) fn evaluate(
        self,
        p: &[f64],
        at: Point,
        derivatives: &mut [Complex64; MOST],
    ) -> Complex64 {
        let jw = Complex64::new(0.0, at.omega);
        derivatives[0] = Complex64::ONE;
        derivatives[1] = jw;
        let series = p[0] + jw * p[1];
        match self {
            Circuit::Dispersive => {
                let skin = Complex64::new(at.root, at.root);
                derivatives[4] = skin;
                series + skin * p[4] + dispersive(&p[2..4], at, &mut derivatives[2..4])
            }
            Circuit::DispersiveEddy => {
                series
                    + dispersive(&p[2..4], at, &mut derivatives[2..4])
                    + eddy(&p[4..6], at, &mut derivatives[4..6])
            }
            Circuit::Ladder(stages) => {
                series
                    + eddy(&p[2..4], at, &mut derivatives[2..4])
                    + ladder(&p[4..3 + 2 * stages], at, &mut derivatives[4..])
            }
        }
    }

    /// Impedance of the capacitive branch alone.
    pub(super) fn capacitive_branch(self, p: &[f64], frequency: f64) -> Complex64 {
        let mut scratch = [Complex64::ZERO; MOST];
        let at = Point::new(frequency);
        match self {
            Circuit::Dispersive | Circuit::DispersiveEddy => {
                dispersive(&p[2..4], at, &mut scratch[2..4])
            }
            Circuit::Ladder(stages) => ladder(&p[4..3 + 2 * stages], at, &mut scratch[4..]),
        }
    }
}

/// The constant-phase element of ln C1 and a: `(jω/ω1)^(a−1) / (ω1 C1)`.
fn dispersive(p: &[f64], at: Point, derivatives: &mut [Complex64]) -> Complex64 {
    let exponent = p[1] - 1.0;
    let size = (exponent * at.ln - p[0]).exp() / (TAU * CAPACITANCE_AT);
    let z = Complex64::from_polar(size, exponent * FRAC_PI_2);
    derivatives[0] = -z;
    derivatives[1] = z * Complex64::new(at.ln, FRAC_PI_2);
    z
}

/// ln R in parallel with ln L.
fn eddy(p: &[f64], at: Point, derivatives: &mut [Complex64]) -> Complex64 {
    let r = p[0].exp();
    let x = Complex64::new(0.0, at.omega * p[1].exp());
    let share = x / (r + x);
    let z = r * share;
    derivatives[0] = z * share;
    derivatives[1] = z * (1.0 - share);
    z
}

/// ln C1, ln R1, ln C2, … ln Cn: each capacitance in parallel with its resistance and the rest.
fn ladder(p: &[f64], at: Point, derivatives: &mut [Complex64]) -> Complex64 {
    let stages = p.len().div_ceil(2);
    // From the last stage inwards; `gain` of what lies deeper is applied on the way back.
    let mut gains = [Complex64::ZERO; MOST];
    let mut z = Complex64::ZERO;
    for k in (0..stages).rev() {
        let admittance = Complex64::new(0.0, at.omega * p[2 * k].exp());
        let deeper = 2 * k + 1 < p.len();
        if deeper {
            let r = p[2 * k + 1].exp();
            let branch = r + z;
            z = branch / (1.0 + admittance * branch);
            // dz/d(branch) = (z/branch)²
            let gain = z / branch;
            gains[k] = gain * gain;
            derivatives[2 * k + 1] = gains[k] * r;
        } else {
            z = admittance.inv();
        }
        derivatives[2 * k] = -z * z * admittance;
    }
    let mut gain = Complex64::ONE;
    for k in 0..stages {
        derivatives[2 * k] *= gain;
        if 2 * k + 1 < p.len() {
            derivatives[2 * k + 1] *= gain;
        }
        gain *= gains[k];
    }
    z
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
            assert_eq!(p.len(), circuit.names().len());
            for f in [1e3, 3e4, 1e6, 6.5e7] {
                let at = Point::new(f);
                let mut derivatives = [Complex64::ZERO; MOST];
                let z = circuit.evaluate(&p, at, &mut derivatives);
                for (k, derivative) in derivatives.iter().enumerate().take(p.len()) {
                    let h = 1e-6 * p[k].abs().max(1e-12);
                    let mut scratch = [Complex64::ZERO; MOST];
                    let (mut up, mut down) = (p.clone(), p.clone());
                    up[k] += h;
                    down[k] -= h;
                    let by_difference = (circuit.evaluate(&up, at, &mut scratch)
                        - circuit.evaluate(&down, at, &mut scratch))
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
