//! The circuits, their impedance and its derivatives.

use super::exponential::exp;
use crate::readings::grid::{Axis, LN_AT, ROOT_AT};
use crate::statistics::lanes::{Kernel, LANES, Lanes, Simd, chunks, wide};
use num_complex::Complex64;
use std::f64::consts::{FRAC_PI_2, TAU};

/// Frequency at which the dispersive capacitance is stated, Hz.
pub(super) const CAPACITANCE_AT: f64 = LN_AT;
/// Frequency at which the skin resistance is stated, Hz.
pub(super) const SKIN_AT: f64 = ROOT_AT;
/// Most parameters of a circuit.
pub(super) const MOST: usize = 11;

/// Most stages of a ladder.
const MOST_STAGES: usize = (MOST - 3) / 2;

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

const fn linear(unit: &'static str, name: &'static str) -> Element {
    Element {
        name,
        unit,
        logarithm: false,
    }
}

const fn logarithm(unit: &'static str, name: &'static str) -> Element {
    Element {
        name,
        unit,
        logarithm: true,
    }
}

const DISPERSIVE: [Element; 5] = [
    linear("Ω", "r_0"),
    linear("H", "l"),
    logarithm("F", "c_1"),
    linear("1", "dispersion"),
    linear("Ω", "r_skin_1mhz"),
];
const DISPERSIVE_EDDY: [Element; 6] = [
    linear("Ω", "r_0"),
    linear("H", "l"),
    logarithm("F", "c_1"),
    linear("1", "dispersion"),
    logarithm("Ω", "r_eddy"),
    logarithm("H", "l_eddy"),
];
/// Of the longest ladder; shorter ones end with an earlier capacitance.
const LADDER: [Element; MOST] = [
    linear("Ω", "r_0"),
    linear("H", "l"),
    logarithm("Ω", "r_eddy"),
    logarithm("H", "l_eddy"),
    logarithm("F", "c_1"),
    logarithm("Ω", "r_1"),
    logarithm("F", "c_2"),
    logarithm("Ω", "r_2"),
    logarithm("F", "c_3"),
    logarithm("Ω", "r_3"),
    logarithm("F", "c_4"),
];

/// Eight numbers each of a frequency, of an impedance or of a derivative.
pub(super) type Eight = [f64; LANES];
/// Real and imaginary parts of the derivatives with respect to each parameter.
pub(super) type Derivatives = [[Eight; 2]; MOST];

/// What the circuits need of eight frequencies.
#[derive(Debug, Clone, Copy)]
pub(super) struct Points<'a> {
    /// 2πf in rad/s
    omega: &'a Eight,
    /// ln(f / 1 kHz)
    ln: &'a Eight,
    /// √(f / 1 MHz)
    root: &'a Eight,
}

impl Points<'_> {
    /// The points of an axis.
    #[inline(always)]
    pub(super) fn of(axis: &Axis) -> impl Iterator<Item = Points<'_>> {
        (chunks(&axis.omega).iter())
            .zip(chunks(&axis.ln))
            .zip(chunks(&axis.root))
            .map(|((omega, ln), root)| Points { omega, ln, root })
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

    /// Z in Ω of the circuit with parameters `p` at each frequency in Hz.
    pub(super) fn impedance(self, p: &[f64], frequency: &[f64]) -> Vec<Complex64> {
        self.curve(p, frequency, false)
    }

    /// Impedance in Ω of the capacitive branch alone, at a frequency in Hz.
    pub(super) fn capacitive_branch(self, p: &[f64], frequency: f64) -> Complex64 {
        let curve = self.curve(p, &[frequency], true);
        curve.first().copied().unwrap_or_default()
    }

    fn curve(self, p: &[f64], frequency: &[f64], branch: bool) -> Vec<Complex64> {
        let mut impedance = Vec::new();
        wide(Curve {
            circuit: self.prepare(p),
            axis: &Axis::new(frequency),
            branch,
            impedance: &mut impedance,
        });
        impedance.truncate(frequency.len());
        impedance
    }
}

/// Impedances of a circuit, or of its capacitive branch, at the points of an axis.
struct Curve<'a> {
    circuit: Prepared,
    axis: &'a Axis,
    branch: bool,
    impedance: &'a mut Vec<Complex64>,
}

impl Kernel for Curve<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) {
        let mut derivatives = NONE;
        for at in Points::of(self.axis) {
            let z = if self.branch {
                self.circuit.branch(simd, at, &mut derivatives)
            } else {
                self.circuit.evaluate(simd, at, &mut derivatives)
            };
            let mut parts = [[0.0; LANES]; 2];
            z.store(&mut parts);
            let [re, im] = parts;
            for k in 0..LANES {
                self.impedance.push(Complex64::new(re[k], im[k]));
            }
        }
    }
}

/// No derivatives yet.
pub(super) const NONE: Derivatives = [[[0.0; LANES]; 2]; MOST];

/// Complex numbers in lanes.
#[derive(Clone, Copy)]
pub(super) struct Wide<S: Simd> {
    pub(super) re: Lanes<S>,
    pub(super) im: Lanes<S>,
}

impl<S: Simd> Wide<S> {
    #[inline(always)]
    pub(super) fn new(re: Lanes<S>, im: Lanes<S>) -> Self {
        Wide { re, im }
    }

    #[inline(always)]
    pub(super) fn of(simd: S, [re, im]: &[Eight; 2]) -> Self {
        Wide::new(Lanes::of(simd, re), Lanes::of(simd, im))
    }

    #[inline(always)]
    pub(super) fn all(simd: S, value: Complex64) -> Self {
        Wide::new(Lanes::all(simd, value.re), Lanes::all(simd, value.im))
    }

    #[inline(always)]
    pub(super) fn store(self, to: &mut [Eight; 2]) {
        self.re.store(&mut to[0]);
        self.im.store(&mut to[1]);
    }

    #[inline(always)]
    pub(super) fn plus(self, other: Self) -> Self {
        Wide::new(self.re.plus(other.re), self.im.plus(other.im))
    }

    #[inline(always)]
    pub(super) fn minus(self, other: Self) -> Self {
        Wide::new(self.re.minus(other.re), self.im.minus(other.im))
    }

    #[inline(always)]
    pub(super) fn times(self, other: Self) -> Self {
        Wide::new(
            self.re.times(other.re).minus(self.im.times(other.im)),
            self.re.times(other.im).plus(self.im.times(other.re)),
        )
    }

    #[inline(always)]
    pub(super) fn scaled(self, by: Lanes<S>) -> Self {
        Wide::new(self.re.times(by), self.im.times(by))
    }

    /// Re a Re b + Im a Im b
    #[inline(always)]
    pub(super) fn along(self, other: Self) -> Lanes<S> {
        self.re.times(other.re).plus(self.im.times(other.im))
    }

    #[inline(always)]
    fn inverse(self, simd: S) -> Self {
        let inverse = Lanes::all(simd, 1.0).over(self.along(self));
        let minus = Lanes::all(simd, 0.0).minus(self.im);
        Wide::new(self.re, minus).scaled(inverse)
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
    #[inline(always)]
    pub(super) fn evaluate<S: Simd>(
        &self,
        simd: S,
        at: Points,
        derivatives: &mut Derivatives,
    ) -> Wide<S> {
        let omega = Lanes::of(simd, at.omega);
        derivatives[0] = [[1.0; LANES], [0.0; LANES]];
        derivatives[1] = [[0.0; LANES], *at.omega];
        let series = Wide::new(
            Lanes::all(simd, self.value[0]),
            omega.times(Lanes::all(simd, self.value[1])),
        );
        let rise = match self.circuit {
            Circuit::Dispersive => {
                let skin = Lanes::of(simd, at.root).times(Lanes::all(simd, self.value[4]));
                derivatives[4] = [*at.root, *at.root];
                Wide::new(skin, skin)
            }
            Circuit::DispersiveEddy => self.eddy(simd, 4, omega, derivatives),
            Circuit::Ladder(_) => self.eddy(simd, 2, omega, derivatives),
        };
        let branch = self.branch(simd, at, derivatives);
        series.plus(rise).plus(branch)
    }

    /// Impedance of the capacitive branch alone.
    #[inline(always)]
    fn branch<S: Simd>(&self, simd: S, at: Points, derivatives: &mut Derivatives) -> Wide<S> {
        match self.circuit {
            Circuit::Dispersive | Circuit::DispersiveEddy => self.dispersive(simd, at, derivatives),
            Circuit::Ladder(stages) => self.ladder(simd, stages, at, derivatives),
        }
    }

    /// The constant-phase element of parameters 2 and 3: `(jω/ω1)^(a−1) / (ω1 C1)`.
    #[inline(always)]
    fn dispersive<S: Simd>(&self, simd: S, at: Points, derivatives: &mut Derivatives) -> Wide<S> {
        let mut power = [0.0; LANES];
        for (power, ln) in power.iter_mut().zip(at.ln) {
            *power = exp((self.value[3] - 1.0) * ln);
        }
        let z = Wide::all(simd, self.rotation).scaled(Lanes::of(simd, &power));
        let minus = Lanes::all(simd, -1.0);
        z.scaled(minus).store(&mut derivatives[2]);
        let ln = Wide::new(Lanes::of(simd, at.ln), Lanes::all(simd, FRAC_PI_2));
        z.times(ln).store(&mut derivatives[3]);
        z
    }

    /// Parameter `k`, R, in parallel with the next, L.
    #[inline(always)]
    fn eddy<S: Simd>(
        &self,
        simd: S,
        k: usize,
        omega: Lanes<S>,
        derivatives: &mut Derivatives,
    ) -> Wide<S> {
        let r = Lanes::all(simd, self.value[k]);
        let x = omega.times(Lanes::all(simd, self.value[k + 1]));
        let square = x.times(x);
        let inverse = Lanes::all(simd, 1.0).over(r.times(r).plus(square));
        // jx/(r + jx)
        let share = Wide::new(square, r.times(x)).scaled(inverse);
        let z = share.scaled(r);
        z.times(share).store(&mut derivatives[k]);
        let rest = Wide::all(simd, Complex64::ONE).minus(share);
        z.times(rest).store(&mut derivatives[k + 1]);
        z
    }

    /// Parameters from 4 on, C1, R1, C2, … Cn: each C in parallel with its R and the rest.
    #[inline(always)]
    fn ladder<S: Simd>(
        &self,
        simd: S,
        stages: usize,
        at: Points,
        derivatives: &mut Derivatives,
    ) -> Wide<S> {
        let none = Lanes::all(simd, 0.0);
        let one = Wide::all(simd, Complex64::ONE);
        let omega = Lanes::of(simd, at.omega);
        // From the last stage inwards; the gain of what lies nearer is applied on the way back.
        let mut gains = [[[0.0; LANES]; 2]; MOST_STAGES];
        let mut z = Wide::all(simd, Complex64::ZERO);
        for k in (0..stages).rev() {
            let (c, r) = (4 + 2 * k, 5 + 2 * k);
            let admittance = Wide::new(none, omega.times(Lanes::all(simd, self.value[c])));
            if k + 1 < stages {
                let resistance = Lanes::all(simd, self.value[r]);
                let branch = Wide::new(z.re.plus(resistance), z.im);
                let gain = one.plus(admittance.times(branch)).inverse(simd);
                z = branch.times(gain);
                // dz/d(branch) = (z/branch)²
                let square = gain.times(gain);
                square.store(&mut gains[k]);
                square.scaled(resistance).store(&mut derivatives[r]);
            } else {
                z = admittance.inverse(simd);
            }
            let square = z.times(z).times(admittance);
            Wide::all(simd, Complex64::ZERO)
                .minus(square)
                .store(&mut derivatives[c]);
        }
        let mut gain = one;
        for k in 0..stages {
            for d in &mut derivatives[4 + 2 * k..][..if k + 1 < stages { 2 } else { 1 }] {
                Wide::of(simd, d).times(gain).store(d);
            }
            gain = gain.times(Wide::of(simd, &gains[k]));
        }
        z
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Impedance and derivatives at one point.
    struct One<'a>(Prepared, &'a Axis);

    impl Kernel for One<'_> {
        type Output = (Complex64, Vec<Complex64>);

        #[inline(always)]
        fn run<S: Simd>(self, simd: S) -> Self::Output {
            let mut derivatives = NONE;
            let mut z = [[0.0; LANES]; 2];
            for at in Points::of(self.1) {
                self.0.evaluate(simd, at, &mut derivatives).store(&mut z);
            }
            let first = |[re, im]: &[Eight; 2]| Complex64::new(re[0], im[0]);
            (first(&z), derivatives.iter().map(first).collect())
        }
    }

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
                let axis = Axis::new(&[f]);
                let (z, derivatives) = wide(One(circuit.prepare(&p), &axis));
                for (k, derivative) in derivatives.iter().enumerate().take(p.len()) {
                    let h = 1e-6 * p[k].abs().max(1e-12);
                    let (mut up, mut down) = (p.clone(), p.clone());
                    up[k] += h;
                    down[k] -= h;
                    let at = |p: &[f64]| circuit.impedance(p, &[f])[0];
                    let by_difference = (at(&up) - at(&down)) / (2.0 * h);
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
