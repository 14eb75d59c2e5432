//! Capability indices and their bounds.

use crate::reference::{assert_near, assert_within, rows};
use reelgate::statistics::Undefined;
use reelgate::statistics::capability::{
    Capability, cp_lower_bound, cpk_lower_bound, one_sided_lower_bound, worth_stating,
};

/// NIST/SEMATECH e-Handbook 6.3.2.2, flow rates, with limits 45 and 57 of our own: within-lot and
/// overall indices recomputed independently.
#[test]
fn indices_of_the_handbook_flow_rates() {
    let flow = [49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1];
    let found = Capability::of(&flow, Some(45.0), Some(57.0));
    assert_near(found.sigma_within.unwrap(), 1.6641372266835128, 1e-13);
    assert_near(found.sigma_overall.unwrap(), 2.0338523927649117, 1e-13);
    // The independent values used d2 = 1.128 to three decimals.
    let rounding = 1.128 / reelgate::statistics::summary::D2_OF_TWO;
    assert_near(found.cp.unwrap() * rounding, 1.2014201183431947, 1e-12);
    assert_near(found.cpk.unwrap() * rounding, 1.163375147928994, 1e-12);
    assert_near(found.pp.unwrap(), 0.983355531165715, 1e-12);
    assert_near(found.ppk.unwrap(), 0.9522159393454677, 1e-12);
}

/// NIST GEAR data, limits 0.985 and 1.010 of our own.
#[test]
fn indices_of_the_gear_data() {
    let gear = rows("s3_gear_data.csv").column("diameter");
    let found = Capability::of(&gear, Some(0.985), Some(1.010));
    assert_near(found.sigma_within.unwrap(), 0.005326313339842332, 1e-12);
    assert_near(found.cp.unwrap(), 0.782279674667058, 1e-12);
    assert_near(found.cpk.unwrap(), 0.7735181423107816, 1e-12);
    assert_near(found.pp.unwrap(), 0.6635976731211076, 1e-12);
    assert_near(found.ppk.unwrap(), 0.6561653791821467, 1e-12);
}

/// NIST/SEMATECH e-Handbook 6.1.6: limits 8 and 20, mean 16, s = 2: Cp 1, Cpu 0.6667, Cpl 1.3333,
/// Cpk 0.6667. Three values with that mean and s.
#[test]
fn handbook_definition_example() {
    let values = [14.0, 16.0, 18.0];
    let both = Capability::of(&values, Some(8.0), Some(20.0));
    assert_near(both.pp.unwrap(), 1.0, 1e-15);
    assert_within(both.ppk.unwrap(), 0.6667, 5e-5);
    let upper = Capability::of(&values, None, Some(20.0));
    assert_within(upper.ppk.unwrap(), 0.6667, 5e-5);
    assert_eq!(upper.pp, Err(Undefined::OneSided));
    let lower = Capability::of(&values, Some(8.0), None);
    assert_within(lower.ppk.unwrap(), 1.3333, 5e-5);
}

#[test]
fn an_index_that_does_not_exist_says_why() {
    let equal = Capability::of(&[1.0; 5], Some(0.5), Some(1.5));
    assert_eq!(equal.cpk, Err(Undefined::ZeroSpread));
    assert_eq!(equal.pp, Err(Undefined::ZeroSpread));
    let none = Capability::of(&[1.0, 2.0], None, None);
    assert_eq!(none.cpk, Err(Undefined::NoLimit));
    let reversed = Capability::of(&[1.0, 2.0], Some(2.0), Some(1.0));
    assert_eq!(reversed.ppk, Err(Undefined::LimitsReversed));
    let one = Capability::of(&[1.0], Some(0.5), Some(1.5));
    assert_eq!(
        one.ppk,
        Err(Undefined::TooFewValues {
            needed: 2,
            found: 1
        })
    );
}

/// Every bound of the grid: one-sided at its confidence, two-sided at half the tail.
#[test]
fn every_bound_of_the_grid() {
    let grid = rows("s3_capability_bounds.csv");
    assert_eq!(grid.len(), 297);
    for row in grid.iter() {
        let (n, index, confidence) = (row.count("n"), row.number("index_hat"), row.number("conf"));
        let nu = (n - 1) as f64;
        let two_sided = 1.0 - 0.5 * (1.0 - confidence);
        let cp = |confidence| cp_lower_bound(index, nu, confidence).unwrap();
        let cpk = |confidence| cpk_lower_bound(index, n, nu, confidence).unwrap();
        assert_near(cp(confidence), row.number("Cp_lower"), 1e-10);
        assert_near(cp(two_sided), row.number("Cp_lo2"), 1e-10);
        assert_within(cpk(confidence), row.number("bissell_lower"), 1e-12);
        assert_within(cpk(two_sided), row.number("bissell_lo2"), 1e-12);
        let exact = one_sided_lower_bound(index, n, confidence).unwrap();
        assert_within(exact, row.number("exact_onesided_lower"), 1e-9);
    }
}

/// Montgomery, Introduction to Statistical Quality Control, process capability: n = 20, s = 1.75,
/// limits 38 and 62, Cp 2.29, 95 % interval from 1.57 with the table's rounding (exactly 1.5649);
/// Cpk 1.33 from 0.88 (from memory).
#[test]
fn montgomery_intervals() {
    let cp = cp_lower_bound(24.0 / 10.5, 19.0, 0.975).unwrap();
    assert_within(cp, 1.57, 0.006);
    assert_within(cp, 1.5649450045377398, 1e-10);
    let cpk = cpk_lower_bound(1.33, 20, 19.0, 0.975).unwrap();
    assert_within(cpk, 0.88, 0.005);
}

/// An index is refused where it would mean nothing, and says why.
#[test]
fn an_index_that_means_nothing_is_refused() {
    assert_eq!(worth_stating(8, 1.0, None), Ok(()));
    assert_eq!(
        worth_stating(7, 1.0, None),
        Err(Undefined::TooFewValues {
            needed: 8,
            found: 7
        })
    );
    assert_eq!(worth_stating(8, 0.0, None), Err(Undefined::ZeroSpread));
    assert_eq!(worth_stating(8, 1.0, Some(0.7)), Ok(()));
    let noise = worth_stating(8, 1.0, Some(0.8)).unwrap_err();
    assert!(noise.text().starts_with("64 % of the variance"), "{noise}");
    assert_eq!(
        worth_stating(8, f64::NAN, Some(0.1)),
        Err(Undefined::NotFinite)
    );
    // Below 25 values a Cpk of 1.33 does not show 1.00 at 95 %.
    assert!(cpk_lower_bound(1.33, 24, 23.0, 0.95).unwrap() < 1.0);
}
