//! Referral of class 2 capacitance to the referee time since last heat.
//!
//! `C(t) = C(1 h) (1 − k log10(t / 1 h))` (IEC 60384-9 and -22, annex on ageing), so
//! `C_ref = C (1 − k log10 t_ref) / (1 − k log10 t)` with both times in hours.

use super::{Reading, Value};
use crate::diagnostic::Note;

/// What the referral needs.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Referral {
    /// Relative loss per decade of hours, 0 to 0.10.
    pub per_decade: f64,
    /// Hours since the part was last heated above the Curie range.
    pub age: f64,
    /// Referee time in hours.
    pub refer_to: f64,
}

/// Why a value cannot be referred.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum AgeingError {
    /// The law holds from 1 h to 1e5 h after last heat; the age in hours is outside.
    AgeOutsideLaw(f64),
}

impl Referral {
    /// The factor `C_ref / C`.
    ///
    /// # Errors
    /// An age outside 1 h to 1e5 h: the logarithmic law is not defined there.
    pub fn factor(&self) -> Result<f64, AgeingError> {
        if !(1.0..=1e5).contains(&self.age) {
            return Err(AgeingError::AgeOutsideLaw(self.age));
        }
        Ok((1.0 - self.per_decade * self.refer_to.log10())
            / (1.0 - self.per_decade * self.age.log10()))
    }
}

/// Refers a capacitance reading; the value as measured comes back beside it.
///
/// The ageing rate is taken as known to ±40 % (rectangular; common practice, no source: published
/// rates of one dielectric scatter about so much), which adds to the uncertainty.
///
/// # Errors
/// An age outside the law.
pub fn refer(
    reading: &Reading,
    referral: &Referral,
) -> Result<(Reading, Option<f64>), AgeingError> {
    let factor = referral.factor()?;
    let Value::Known(measured) = reading.value else {
        return Ok((reading.clone(), None));
    };
    let mut referred = reading.clone();
    referred.value = Value::Known(measured * factor);
    referred.standard_uncertainty = reading.standard_uncertainty.map(|u| {
        let rate = 0.4 / 3f64.sqrt() * referral.per_decade;
        (u * factor).hypot(measured * rate * (referral.age / referral.refer_to).log10())
    });
    referred.warnings.push(Note::new(
        "referred_to_referee_time",
        format!(
            "referred from {:.0} h to {:.0} h after last heat: factor {:.5}",
            referral.age, referral.refer_to, factor
        ),
    ));
    Ok((referred, Some(measured)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_decades_of_hours_as_the_law_says() {
        // Worked by hand: k = 2.5 %, 100 h to 1000 h: (1 - 0.075)/(1 - 0.05).
        let referral = Referral {
            per_decade: 0.025,
            age: 100.0,
            refer_to: 1000.0,
        };
        assert!((referral.factor().unwrap() - 0.925 / 0.95).abs() < 1e-15);
    }

    #[test]
    fn at_the_referee_time_nothing_changes() {
        let referral = Referral {
            per_decade: 0.07,
            age: 1000.0,
            refer_to: 1000.0,
        };
        assert_eq!(referral.factor(), Ok(1.0));
    }

    #[test]
    fn outside_the_law_is_refused() {
        for age in [0.0, 0.99, 1.1e5, -5.0, f64::NAN] {
            assert!(
                Referral {
                    per_decade: 0.025,
                    age,
                    refer_to: 1000.0
                }
                .factor()
                .is_err(),
                "{age}"
            );
        }
    }
}
