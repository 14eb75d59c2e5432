//! Location and spread.

use crate::reference::{assert_near, assert_within, numbers, rows};
use reelgate::statistics::Undefined;
use reelgate::statistics::distributions::chi_mean_ratio;
use reelgate::statistics::summary::{
    D2_OF_TWO, Summary, moving_range_degrees_of_freedom, moving_range_sigma,
};

/// NIST StRD univariate data sets: certified mean and standard deviation.
///
/// The data have no exact binary form: half a unit in the last place of the largest value is what a
/// double may lose of the spread, whatever the algorithm (NumAcc4: 8 digits left). An algorithm
/// that adds squares loses them all.
#[test]
fn nist_strd_univariate() {
    let certified = rows("s7_strd_univariate_certified.csv");
    assert_eq!(certified.len(), 9);
    for row in certified.iter() {
        let name = row.text("name");
        let summary = Summary::of(&numbers(&format!("strd/{name}.txt"))).unwrap();
        let largest = summary.maximum.abs().max(summary.minimum.abs());
        let represented = f64::EPSILON * largest / row.number("sd_certified");
        assert_eq!(summary.n, row.count("n"));
        assert_near(summary.mean, row.number("mean_certified"), 2e-15);
        let deviation = summary.standard_deviation.unwrap();
        assert_near(deviation, row.number("sd_certified"), 1e-14 + represented);
    }
}

/// NIST/SEMATECH e-Handbook 6.3.2.2, flow rates: mean 50.81, mean moving range 1.8778, as printed.
#[test]
fn nist_individuals_chart() {
    let flow = [49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1];
    let sigma = moving_range_sigma(&flow).unwrap();
    assert_within(sigma * D2_OF_TWO, 1.8778, 5e-5);
    // With the printed constant 1.128 the handbook's limits 55.8041 and 45.8159.
    let mean = Summary::of(&flow).unwrap().mean;
    let reach = 3.0 * sigma * D2_OF_TWO / 1.128;
    assert_within(mean + reach, 55.8041, 5e-5);
    assert_within(mean - reach, 45.8159, 5e-5);
}

/// The constant c4 of ASTM E2587, computed with 30 digits.
#[test]
fn control_chart_constants() {
    for row in rows("s3_control_constants.csv").iter() {
        let n = row.number("n");
        assert_near(chi_mean_ratio(n - 1.0), row.number("c4"), 1e-14);
        if n == 2.0 {
            assert_near(D2_OF_TWO, row.number("d2"), 1e-15);
        }
    }
}

/// Two values have one range, whose law is that of one degree of freedom; of many, the variance tends to
/// 0.826 σ²/(n − 1) (Cryer & Ryan 1990), so that ν tends to (n − 1)/(2 · 0.826).
#[test]
fn degrees_of_freedom_of_the_moving_range() {
    assert_near(moving_range_degrees_of_freedom(2).unwrap(), 1.0, 1e-12);
    let many = moving_range_degrees_of_freedom(100_001).unwrap();
    assert_near(many / 1e5, 1.0 / (2.0 * 0.826), 1e-3);
    assert!(moving_range_degrees_of_freedom(1).is_err());
}

#[test]
fn medians_of_odd_and_even_samples() {
    let median = |values: &[f64]| Summary::of(values).unwrap().median;
    assert_eq!(median(&[3.0, 1.0, 2.0]), 2.0);
    assert_eq!(median(&[4.0, 1.0, 3.0, 2.0]), 2.5);
}

#[test]
fn what_does_not_exist_is_said() {
    assert_eq!(
        Summary::of(&[]),
        Err(Undefined::TooFewValues {
            needed: 1,
            found: 0
        })
    );
    assert_eq!(Summary::of(&[1.0, f64::NAN]), Err(Undefined::NotFinite));
    assert_eq!(
        Summary::of(&[f64::MAX, -f64::MAX]).map(|s| s.standard_deviation),
        Err(Undefined::NotFinite)
    );
    let one = Summary::of(&[4.7e-6]).unwrap();
    assert_eq!(one.mean, 4.7e-6);
    assert!(one.standard_deviation.is_err());
    let equal = Summary::of(&[0.1; 7]).unwrap();
    assert_eq!((equal.mean, equal.standard_deviation), (0.1, Ok(0.0)));
}
