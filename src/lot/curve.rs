//! The operating characteristic of a plan: how probably a lot of a given quality is accepted.

use crate::statistics::operating_characteristic::{
    acceptance_probability, acceptance_probability_of_lot, quality_at,
};
use crate::statistics::variables;
use serde::{Deserialize, Serialize};

/// Points of the curve but for the one at zero.
const STEPS: u32 = 40;
/// The curve ends at this multiple of the consumer's risk quality.
const BEYOND: f64 = 1.6;

/// The operating characteristic of a single sampling plan by attributes.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct OperatingCharacteristic {
    /// `binomial` (lots of a long series, ISO 2859-1:1999 clause 12 and table 10) or
    /// `hypergeometric` (this lot, its size known).
    pub law: String,
    /// Share nonconforming, a ratio, that is accepted with a probability of 95 %.
    pub producers_risk_quality: f64,
    /// Share nonconforming, a ratio, that is accepted with a probability of 10 %.
    pub consumers_risk_quality: f64,
    /// Share nonconforming and probability of acceptance, both ratios, ascending.
    pub points: Vec<[f64; 2]>,
}

impl OperatingCharacteristic {
    /// Of a process that keeps making such lots; `None` where the whole lot is inspected, or
    /// nothing is rejected.
    pub fn binomial(n: u64, ac: u64, lot: u64) -> Option<OperatingCharacteristic> {
        if n >= lot || n <= ac {
            return None;
        }
        let consumers = quality_at(n, ac, 0.10);
        let last = (BEYOND * consumers).min(1.0);
        Some(OperatingCharacteristic {
            law: "binomial".to_owned(),
            producers_risk_quality: quality_at(n, ac, 0.95),
            consumers_risk_quality: consumers,
            points: (0..=STEPS)
                .map(|i| f64::from(i) / f64::from(STEPS) * last)
                .map(|p| [p, acceptance_probability(n, ac, p)])
                .collect(),
        })
    }

    /// Of sampling by variables with one limit, k form (noncentral t law, ISO 3951-1 annex).
    pub fn variables(n: u64, k: f64) -> OperatingCharacteristic {
        let consumers = variables::quality_at(n, k, 0.10);
        let last = (BEYOND * consumers).min(1.0);
        let at = |p: f64| {
            if p > 0.0 {
                variables::acceptance_probability(n, k, p)
            } else {
                1.0
            }
        };
        OperatingCharacteristic {
            law: "noncentral t".to_owned(),
            producers_risk_quality: variables::quality_at(n, k, 0.95),
            consumers_risk_quality: consumers,
            points: (0..=STEPS)
                .map(|i| f64::from(i) / f64::from(STEPS) * last)
                .map(|p| [p, at(p)])
                .collect(),
        }
    }

    /// Of this very lot: shares are whole parts of it.
    pub fn hypergeometric(n: u64, ac: u64, lot: u64) -> Option<OperatingCharacteristic> {
        if n >= lot || n <= ac {
            return None;
        }
        let at = |bad: u64| acceptance_probability_of_lot(lot, bad, n, ac);
        let share = |bad: u64| bad as f64 / lot as f64;
        // The law falls with the number of nonconforming parts: bisection finds where.
        let least = |pa: f64| {
            let (mut low, mut high) = (0, lot);
            while high - low > 1 {
                let middle = low + (high - low) / 2;
                if at(middle) >= pa {
                    low = middle
                } else {
                    high = middle
                }
            }
            (low, high)
        };
        let (producers, _) = least(0.95);
        let (_, consumers) = least(0.10);
        let last = ((BEYOND * consumers as f64).ceil() as u64).min(lot);
        let mut counts: Vec<u64> = (0..=u64::from(STEPS))
            .map(|i| i * last / u64::from(STEPS))
            .collect();
        counts.dedup();
        Some(OperatingCharacteristic {
            law: "hypergeometric".to_owned(),
            producers_risk_quality: share(producers),
            consumers_risk_quality: share(consumers),
            points: counts
                .into_iter()
                .map(|bad| [share(bad), at(bad)])
                .collect(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_risk_points_of_code_letter_l_at_aql_0_65() {
        // scipy 1.17.1: beta.ppf(1 - Pa, Ac + 1, n - Ac) for n 200, Ac 3.
        let curve = OperatingCharacteristic::binomial(200, 3, 4000).expect("a curve");
        assert!((curve.producers_risk_quality - 0.006859719101091239).abs() < 1e-12);
        assert!((curve.consumers_risk_quality - 0.03309747022756343).abs() < 1e-12);
        assert_eq!(curve.points[0], [0.0, 1.0]);
        assert!(curve.points.windows(2).all(|w| w[1][1] <= w[0][1]));
    }

    #[test]
    fn a_lot_inspected_whole_has_no_curve() {
        assert_eq!(OperatingCharacteristic::binomial(10, 0, 10), None);
        assert_eq!(OperatingCharacteristic::hypergeometric(10, 0, 10), None);
    }

    #[test]
    fn the_hypergeometric_risk_points_are_whole_parts() {
        let curve = OperatingCharacteristic::hypergeometric(37, 0, 100).expect("a curve");
        let bad = (curve.consumers_risk_quality * 100.0).round() as u64;
        assert!(acceptance_probability_of_lot(100, bad, 37, 0) < 0.10);
        assert!(acceptance_probability_of_lot(100, bad - 1, 37, 0) >= 0.10);
    }
}
