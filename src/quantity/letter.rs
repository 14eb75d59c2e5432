//! Tolerance letters of IEC 60062 (the clauses on letter codes for tolerances).

use super::tolerance::wrong;
use super::{Deviation, Dimension, QuantityError, Tolerance};

/// Below this nominal capacitance B, C, D, F and G are in picofarads (IEC 60062).
const PICOFARAD_LETTERS_BELOW: f64 = 10e-12;

/// Lower and upper deviation as a ratio.
const RELATIVE: [(char, f64, f64); 18] = [
    ('E', -0.000_05, 0.000_05),
    ('L', -0.000_1, 0.000_1),
    ('P', -0.000_2, 0.000_2),
    ('W', -0.000_5, 0.000_5),
    ('B', -0.001, 0.001),
    ('C', -0.002_5, 0.002_5),
    ('D', -0.005, 0.005),
    ('F', -0.01, 0.01),
    ('G', -0.02, 0.02),
    ('H', -0.03, 0.03),
    ('J', -0.05, 0.05),
    ('K', -0.1, 0.1),
    ('M', -0.2, 0.2),
    ('N', -0.3, 0.3),
    ('Q', -0.1, 0.3),
    ('S', -0.2, 0.5),
    ('T', -0.1, 0.5),
    ('Z', -0.2, 0.8),
];

/// Symmetric deviation in farad for capacitors below 10 pF.
const PICOFARAD: [(char, f64); 5] = [
    ('B', 0.1e-12),
    ('C', 0.25e-12),
    ('D', 0.5e-12),
    ('F', 1e-12),
    ('G', 2e-12),
];

/// The tolerance that a letter stands for; resistances, capacitances and (common practice)
/// inductances have letters.
pub(super) fn tolerance(
    text: &str,
    dimension: Dimension,
    nominal: Option<f64>,
) -> Result<Tolerance, QuantityError> {
    let lettered = matches!(
        dimension,
        Dimension::Capacitance | Dimension::Resistance | Dimension::Inductance
    );
    let letter = text.chars().next().unwrap_or(' ');
    if !lettered {
        let fault = format!("is no tolerance of {}", dimension.a_noun());
        return Err(wrong(text, &fault, dimension));
    }
    let picofarad = PICOFARAD.iter().find(|(l, _)| *l == letter);
    if let (Some((_, farads)), Dimension::Capacitance) = (picofarad, dimension) {
        match nominal.filter(|n| n.is_finite()) {
            None => return Err(needs_nominal(text, dimension)),
            Some(nominal) if nominal.abs() < PICOFARAD_LETTERS_BELOW => {
                return Ok(Tolerance::symmetric(Deviation::Absolute(*farads)));
            }
            Some(_) => {}
        }
    }
    match RELATIVE.iter().find(|(l, _, _)| *l == letter) {
        Some((_, lower, upper)) => Ok(Tolerance {
            lower: Deviation::Relative(*lower),
            upper: Deviation::Relative(*upper),
        }),
        None => Err(unknown(text, letter, dimension)),
    }
}

fn needs_nominal(text: &str, dimension: Dimension) -> QuantityError {
    wrong(
        text,
        "is in pF below 10 pF and in % from 10 pF on, and no nominal value is known",
        dimension,
    )
    .hint("give the nominal value, or write the tolerance out")
}

fn unknown(text: &str, letter: char, dimension: Dimension) -> QuantityError {
    let upper = letter.to_ascii_uppercase();
    let error = wrong(text, "is no tolerance letter of IEC 60062", dimension);
    if upper != letter && RELATIVE.iter().any(|(l, _, _)| *l == upper) {
        error.hint(format!("the letters are capitals: `{upper}`"))
    } else {
        error.hint("write the tolerance out, such as `+80 % / -20 %`")
    }
}
