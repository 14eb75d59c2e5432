//! Bounds of the share nonconforming.

use crate::reference::assert_near;
use reelgate::statistics::distributions::{
    binomial_cdf, binomial_sf, hypergeometric_cdf, hypergeometric_sf,
};
use reelgate::statistics::share::{lot_lower_bound, lot_upper_bound, lower_bound, upper_bound};

/// None in n: the bound is 1 − (1 − confidence)^(1/n); with 59 values 4.95 %, the sample of Wilks' 95/95.
#[test]
fn none_in_the_sample() {
    for n in [1_u64, 10, 59, 200, 1250] {
        let exact = 1.0 - 0.05_f64.powf(1.0 / n as f64);
        assert_near(upper_bound(n, 0, 0.95).unwrap(), exact, 1e-12);
    }
    assert_eq!(lower_bound(59, 0, 0.95), Ok(0.0));
    assert_eq!(upper_bound(5, 5, 0.95), Ok(1.0));
}

/// The definition of Clopper & Pearson (1934): at the bound the count, or a more extreme one, has
/// just 1 − confidence.
#[test]
fn the_bounds_have_their_defining_probability() {
    for (n, count) in [(20, 1), (125, 3), (200, 10), (50, 49)] {
        let upper = upper_bound(n, count, 0.95).unwrap();
        assert_near(binomial_cdf(count, n, upper), 0.05, 1e-11);
        let lower = lower_bound(n, count, 0.975).unwrap();
        assert_near(binomial_sf(count - 1, n, lower), 0.025, 1e-11);
    }
}

/// Every small lot against the definition, by trying all numbers.
#[test]
fn the_bounds_of_a_lot_are_those_of_the_definition() {
    for (lot, n) in [(8_u64, 3), (20, 5), (20, 20), (100, 37)] {
        for count in 0..=n.min(6) {
            let likely = |marked: &u64| hypergeometric_cdf(count, lot, *marked, n) > 0.05;
            let upper = (count..=lot).rfind(likely).unwrap();
            assert_eq!(lot_upper_bound(lot, n, count, 0.95), Ok(upper));
            let lower = (count..=lot)
                .find(|marked| count == 0 || hypergeometric_sf(count - 1, lot, *marked, n) > 0.05);
            assert_eq!(lot_lower_bound(lot, n, count, 0.95), Ok(lower.unwrap()));
        }
    }
}

/// A whole lot inspected leaves no doubt.
#[test]
fn a_lot_inspected_whole_is_known() {
    assert_eq!(lot_upper_bound(500, 500, 3, 0.99), Ok(3));
    assert_eq!(lot_lower_bound(500, 500, 3, 0.99), Ok(3));
}

#[test]
fn what_does_not_exist_is_said() {
    assert!(upper_bound(0, 0, 0.95).is_err());
    assert!(upper_bound(5, 6, 0.95).is_err());
    assert!(upper_bound(5, 1, 1.0).is_err());
    assert!(lot_upper_bound(4, 5, 1, 0.95).is_err());
}
