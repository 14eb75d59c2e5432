//! A reading: a value, or a bound on it, or nothing; with uncertainty and warnings.

use super::uncertainty::combined;
use super::{Budget, Characteristic, Equivalent, Place};
use crate::diagnostic::Note;

/// What is to be read.
#[derive(Debug, Clone, Copy, PartialEq)]
#[allow(missing_docs)]
pub struct Request {
    pub characteristic: Characteristic,
    pub place: Place,
    /// Matters for capacitance alone.
    pub equivalent: Equivalent,
}

/// What is known of a value, in the characteristic's SI unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Value {
    /// The value itself, finite.
    Known(f64),
    /// It lies above this.
    Above(f64),
    /// It lies below this.
    Below(f64),
    /// The sweep does not hold it.
    Missing,
}

/// The value of one characteristic of one part.
#[derive(Debug, Clone, PartialEq)]
pub struct Reading {
    #[allow(missing_docs)]
    pub value: Value,
    /// In the unit of the value; `None` where the station states no instrument uncertainty.
    pub standard_uncertainty: Option<f64>,
    /// Hz: where the value lies, for characteristics that the sweep places.
    pub frequency: Option<f64>,
    /// Why it is missing, or what to know about it.
    pub warnings: Vec<Note>,
}

/// The lowest and the highest reading over the place asked for; the same reading twice where the
/// place is one frequency.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Extremes {
    pub lowest: Reading,
    pub highest: Reading,
}

/// What a sweep gives for a characteristic, with what its uncertainty depends on.
#[derive(Debug, Clone)]
pub(super) struct Estimate {
    pub(super) value: f64,
    /// Hz
    pub(super) frequency: Option<f64>,
    /// dy/d ln|Z| for a common relative error of all |Z|.
    pub(super) per_log_magnitude: f64,
    /// dy/dφ for a common error of all phases.
    pub(super) per_radian: f64,
    /// Standard uncertainty from the points' scatter about the fit.
    pub(super) scatter: f64,
    pub(super) warnings: Vec<Note>,
}

/// An estimate, or a reading that is a bound or is missing.
pub(super) type Outcome = Result<Estimate, Reading>;

impl Estimate {
    /// A value proportional to |Z| (`share` 1), inverse to it (−1), or free of it (0).
    pub(super) fn new(value: f64, share: f64, per_radian: f64, scatter: f64) -> Estimate {
        Estimate {
            value,
            frequency: None,
            per_log_magnitude: share * value,
            per_radian,
            scatter,
            warnings: Vec::new(),
        }
    }

    pub(super) fn at(mut self, frequency: f64) -> Estimate {
        self.frequency = Some(frequency);
        self
    }

    /// The reading with the uncertainty that a budget gives it.
    ///
    /// A resistance or loss that the points' scatter hides is no value: noise of either sign would
    /// conform to a maximum. What is known then is that it lies below the estimate and twice its
    /// uncertainty.
    pub(super) fn into_reading(self, characteristic: Characteristic, budget: &Budget) -> Reading {
        let u = budget
            .components(characteristic, &self)
            .map(|c| combined(&c));
        let hidden = self.value <= 0.0 || self.scatter > self.value;
        let most = self.value.max(0.0) + 2.0 * u.unwrap_or(0.0).max(self.scatter);
        let mut reading = Reading::known(self.value, u);
        if reading.value == Value::Missing {
            return reading;
        }
        reading.frequency = self.frequency;
        reading.warnings = self.warnings;
        if hidden && characteristic.is_loss() && most > 0.0 && most.is_finite() {
            let shown = match characteristic.unit() {
                "1" => format!("{:.3} %", 100.0 * most),
                unit => crate::quantity::engineering(most, unit, 3),
            };
            reading.value = Value::Below(most);
            reading.warnings.push(Note::new(
                "hidden_by_noise",
                format!(
                    "the noise of the sweep hides the {}: it is known only to lie below {shown}; average more, or use a jig made for this impedance",
                    characteristic.title(),
                ),
            ));
        }
        reading
    }
}

impl Reading {
    /// A reading that could not be had, and why.
    pub fn missing(code: &str, text: impl Into<String>) -> Reading {
        Reading {
            value: Value::Missing,
            standard_uncertainty: None,
            frequency: None,
            warnings: vec![Note::new(code, text)],
        }
    }

    /// A known value; one that is not finite is missing.
    pub fn known(value: f64, standard_uncertainty: Option<f64>) -> Reading {
        if !value.is_finite() {
            return Reading::missing("not_finite", "the sweep gives no finite value here");
        }
        Reading {
            value: Value::Known(value),
            standard_uncertainty: standard_uncertainty.filter(|u| u.is_finite()),
            frequency: None,
            warnings: Vec::new(),
        }
    }

    /// The value where it is known.
    pub fn known_value(&self) -> Option<f64> {
        match self.value {
            Value::Known(value) => Some(value),
            _ => None,
        }
    }
}
