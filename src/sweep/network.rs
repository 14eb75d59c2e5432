//! Network parameters and their conversion.
//!
//! Scattering parameters relate to real port impedances `R_k`; with `r = diag(√R_k)`:
//! `Z = r (1-S)⁻¹ (1+S) r` and `S = r⁻¹ (Z-R)(Z+R)⁻¹ r`
//! (Pozar, Microwave Engineering, 4th edition, section 4.3, generalised to unequal real ports as
//! in Kurokawa, IEEE Trans. MTT-13 (1965) 194).

use num_complex::Complex64;

/// What kind of parameters a network is described by.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Parameter {
    /// S
    Scattering,
    /// Y in siemens
    Admittance,
    /// Z in ohm
    Impedance,
}

/// A linear network against frequency; values denormalised (ohm, siemens).
#[derive(Debug, Clone, PartialEq)]
pub struct Network {
    /// Number of ports, at least 1.
    pub ports: usize,
    /// Hz
    pub frequency: Vec<f64>,
    #[allow(missing_docs)]
    pub parameter: Parameter,
    /// `ports × ports` values a frequency, row by row (N11 N12 … N21 N22 …).
    pub values: Vec<Complex64>,
    /// Port impedances in ohm, one a port, positive.
    pub reference: Vec<f64>,
}

impl Network {
    /// The matrix at one point, row by row; empty outside the sweep.
    pub fn at(&self, point: usize) -> &[Complex64] {
        let size = self.ports * self.ports;
        let start = point.saturating_mul(size);
        self.values.get(start..start + size).unwrap_or_default()
    }

    /// Scattering parameters in the order of `values`; `None` where a matrix is singular.
    pub fn scattering(&self) -> Option<Vec<Complex64>> {
        let one = identity(self.ports);
        self.each(|m| match self.parameter {
            Parameter::Scattering => Some(m.to_vec()),
            Parameter::Impedance => {
                // (z-1)(z+1)⁻¹ with z normalised by r⁻¹ on both sides.
                let z = self.scaled(m, -0.5);
                right_divide(&subtract(&z, &one), &add(&z, &one), self.ports)
            }
            Parameter::Admittance => {
                let y = self.scaled(m, 0.5);
                right_divide(&subtract(&one, &y), &add(&one, &y), self.ports)
            }
        })
    }

    /// Impedance parameters in ohm in the order of `values`; `None` where a matrix is singular.
    pub fn impedance(&self) -> Option<Vec<Complex64>> {
        let one = identity(self.ports);
        self.each(|m| match self.parameter {
            Parameter::Impedance => Some(m.to_vec()),
            Parameter::Admittance => right_divide(&one, m, self.ports),
            Parameter::Scattering => {
                let z = right_divide(&add(&one, m), &subtract(&one, m), self.ports)?;
                Some(self.scaled(&z, 0.5))
            }
        })
    }

    fn each(
        &self,
        convert: impl Fn(&[Complex64]) -> Option<Vec<Complex64>>,
    ) -> Option<Vec<Complex64>> {
        let mut converted = Vec::with_capacity(self.values.len());
        for matrix in self.values.chunks(self.ports * self.ports) {
            converted.extend(convert(matrix)?);
        }
        Some(converted)
    }

    /// `r^(2·power) m r^(2·power)`, that is element (i,k) times `(R_i R_k)^power`.
    fn scaled(&self, matrix: &[Complex64], power: f64) -> Vec<Complex64> {
        let of = |port: usize| self.reference.get(port).copied().unwrap_or(f64::NAN);
        matrix
            .iter()
            .enumerate()
            .map(|(at, value)| {
                let (row, column) = (at / self.ports, at % self.ports);
                value * (of(row) * of(column)).powf(power)
            })
            .collect()
    }
}

fn identity(ports: usize) -> Vec<Complex64> {
    let one = |at: usize| if at / ports == at % ports { 1.0 } else { 0.0 };
    (0..ports * ports).map(|at| one(at).into()).collect()
}

fn add(a: &[Complex64], b: &[Complex64]) -> Vec<Complex64> {
    a.iter().zip(b).map(|(x, y)| x + y).collect()
}

fn subtract(a: &[Complex64], b: &[Complex64]) -> Vec<Complex64> {
    a.iter().zip(b).map(|(x, y)| x - y).collect()
}

/// `a b⁻¹` by Gaussian elimination with column pivoting on the transposed system.
fn right_divide(a: &[Complex64], b: &[Complex64], n: usize) -> Option<Vec<Complex64>> {
    // x b = a  ⇔  bᵀ xᵀ = aᵀ; rows of `m` are those of bᵀ followed by those of aᵀ.
    let width = 2 * n;
    let mut m = vec![Complex64::default(); n * width];
    for i in 0..n {
        for k in 0..n {
            *m.get_mut(i * width + k)? = *b.get(k * n + i)?;
            *m.get_mut(i * width + n + k)? = *a.get(k * n + i)?;
        }
    }
    for column in 0..n {
        let size = |row: usize| m.get(row * width + column).map_or(0.0, |v| v.norm());
        let pivot = (column..n).max_by(|&p, &q| size(p).total_cmp(&size(q)))?;
        if size(pivot) == 0.0 {
            return None;
        }
        for k in 0..width {
            m.swap(column * width + k, pivot * width + k);
        }
        let scale = m.get(column * width + column)?.finv();
        for k in column..width {
            *m.get_mut(column * width + k)? *= scale;
        }
        for row in (0..n).filter(|&row| row != column) {
            let factor = *m.get(row * width + column)?;
            for k in column..width {
                let part = factor * *m.get(column * width + k)?;
                *m.get_mut(row * width + k)? -= part;
            }
        }
    }
    let mut x = vec![Complex64::default(); n * n];
    for i in 0..n {
        for k in 0..n {
            *x.get_mut(k * n + i)? = *m.get(i * width + n + k)?;
        }
    }
    x.iter().all(|v| v.is_finite()).then_some(x)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(a: &[Complex64], b: &[Complex64]) -> bool {
        a.len() == b.len()
            && a.iter()
                .zip(b)
                .all(|(x, y)| (x - y).norm() < 1e-12 * (1.0 + y.norm()))
    }

    #[test]
    fn conversions_undo_each_other_with_unequal_ports() {
        let c = Complex64::new;
        let network = Network {
            ports: 2,
            frequency: vec![1.0],
            parameter: Parameter::Scattering,
            values: vec![c(0.1, 0.2), c(0.3, -0.1), c(0.5, 0.4), c(-0.2, 0.3)],
            reference: vec![50.0, 75.0],
        };
        let z = network.impedance().expect("regular");
        let as_z = Network {
            parameter: Parameter::Impedance,
            values: z,
            ..network.clone()
        };
        assert!(close(&as_z.scattering().expect("regular"), &network.values));
        let y = right_divide(&identity(2), &as_z.values, 2).expect("regular");
        let as_y = Network {
            parameter: Parameter::Admittance,
            values: y,
            ..network.clone()
        };
        assert!(close(&as_y.scattering().expect("regular"), &network.values));
        assert!(close(&as_y.impedance().expect("regular"), &as_z.values));
    }

    #[test]
    fn one_port_reflection_is_the_textbook_formula() {
        let s = Complex64::new(0.3, -0.6);
        let network = Network {
            ports: 1,
            frequency: vec![1.0],
            parameter: Parameter::Scattering,
            values: vec![s],
            reference: vec![75.0],
        };
        let expected = 75.0 * (1.0 + s) / (1.0 - s);
        assert!(close(&network.impedance().expect("regular"), &[expected]));
    }

    #[test]
    fn an_open_one_port_has_no_impedance() {
        let network = Network {
            ports: 1,
            frequency: vec![1.0],
            parameter: Parameter::Scattering,
            values: vec![Complex64::new(1.0, 0.0)],
            reference: vec![50.0],
        };
        assert_eq!(network.impedance(), None);
    }
}
