//! Whether there is a part at all, given what it should be.

use crate::diagnostic::Note;
use crate::quantity::engineering;
use crate::sweep::{Attempt, Sweep};
use std::f64::consts::TAU;

/// A capacitance below the nominal by this factor is no capacitor of that kind but the jig's
/// stray; a wrong part that is nearer is left to the limits.
const NO_PART: f64 = 30.0;

/// Refuses sweeps that show the stray capacitance of an open jig where a part of the nominal
/// capacitance (F) was expected.
///
/// A small part and an open jig look alike; only the nominal value tells them apart.
pub fn expect_capacitance(attempts: &mut [Attempt], nominal: f64) {
    for attempt in attempts {
        let Ok(sweep) = &attempt.sweep else { continue };
        let Some(found) = apparent(sweep).filter(|found| *found * NO_PART < nominal) else {
            continue;
        };
        attempt.sweep = Err(vec![Note::new(
            "open_contact",
            format!(
                "no part, or its contacts are open: the sweep shows {} where {} was expected; insert the part again and measure",
                engineering(found, "F", 3),
                engineering(nominal, "F", 3)
            ),
        )]);
    }
}

/// The median of `-1/(ωX)` over the points with capacitive reactance. Noise goes out of it, and
/// resonance only makes it larger.
fn apparent(sweep: &Sweep) -> Option<f64> {
    let points = sweep.frequency.iter().zip(&sweep.impedance);
    let mut values: Vec<f64> = points
        .filter(|(_, z)| z.im < 0.0)
        .map(|(f, z)| -1.0 / (TAU * f * z.im))
        .collect();
    let middle = values.len() / 2;
    if values.is_empty() {
        return None;
    }
    Some(*values.select_nth_unstable_by(middle, f64::total_cmp).1)
}

#[cfg(test)]
mod tests {
    use super::*;
    use num_complex::Complex64;

    fn attempt(capacitance: f64) -> Attempt {
        let frequency: Vec<f64> = (1..=50).map(|i| 1e4 * f64::from(i)).collect();
        let impedance = frequency
            .iter()
            .map(|f| Complex64::new(0.01, TAU * f * 1e-9 - 1.0 / (TAU * f * capacitance)))
            .collect();
        Attempt {
            part: "1".to_owned(),
            attempt: 1,
            file: "1.csv".to_owned(),
            sha256: String::new(),
            sweep: Ok(Sweep {
                frequency,
                impedance,
                level: None,
            }),
            notes: Vec::new(),
        }
    }

    #[test]
    fn an_open_jig_is_no_part_and_a_wrong_part_is_one() {
        let mut attempts = vec![
            attempt(20e-12),
            attempt(10e-9),
            attempt(100e-9),
            attempt(4.7e-6),
        ];
        expect_capacitance(&mut attempts, 100e-9);
        let refused: Vec<bool> = attempts.iter().map(|a| a.sweep.is_err()).collect();
        assert_eq!(refused, [true, false, false, false]);
    }
}
