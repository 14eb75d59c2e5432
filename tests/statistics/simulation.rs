//! Simulated lots against the computed laws.

use reelgate::statistics::operating_characteristic::{
    acceptance_probability, acceptance_probability_of_lot,
};
use reelgate::statistics::random::Random;
use reelgate::statistics::sampling::{InspectionLevel, Severity, plan_for};
use reelgate::statistics::variables;

const LOTS: u32 = 100_000;

/// Accepted lots of that probability lie within this many standard errors but for one run in 16 000.
const ERRORS: f64 = 4.0;

fn assert_rate(accepted: u32, probability: f64) {
    let rate = f64::from(accepted) / f64::from(LOTS);
    let error = (probability * (1.0 - probability) / f64::from(LOTS)).sqrt();
    assert!(
        (rate - probability).abs() <= ERRORS * error,
        "{rate} for {probability} ± {error}"
    );
}

/// 100 000 lots from a process with 2.9 % nonconforming, letter K at AQL 1.0 (n = 125, Ac 3): half
/// of them are accepted.
#[test]
fn attributes_from_a_process() {
    let plan = plan_for(2000, InspectionLevel::II, 1.0, Severity::Normal).unwrap();
    assert_eq!((plan.n, plan.ac), (125, 3));
    let mut random = Random::seeded(2859);
    for p in [0.011, 0.029, 0.053] {
        let accepted = (0..LOTS)
            .filter(|_| {
                let mut count = 0;
                for _ in 0..plan.n {
                    count += u64::from(random.uniform() < p);
                    if count > plan.ac {
                        break;
                    }
                }
                count <= plan.ac
            })
            .count();
        assert_rate(accepted as u32, acceptance_probability(plan.n, plan.ac, p));
    }
}

/// Samples of 20 drawn without replacement from lots of 80 that hold 6 nonconforming items,
/// accepted at 0 and at 1.
#[test]
fn attributes_from_a_lot() {
    let (lot, nonconforming, n) = (80_usize, 6_usize, 20_usize);
    let mut random = Random::seeded(37);
    let mut accepted = [0; 2];
    for _ in 0..LOTS {
        let (mut bad, mut count) = (nonconforming, 0);
        for drawn in 0..n {
            if random.below(lot - drawn) < bad {
                bad -= 1;
                count += 1;
            }
        }
        for (ac, total) in accepted.iter_mut().enumerate() {
            *total += u32::from(count <= ac);
        }
    }
    for (ac, total) in accepted.into_iter().enumerate() {
        let law =
            acceptance_probability_of_lot(lot as u64, nonconforming as u64, n as u64, ac as u64);
        assert_rate(total, law);
    }
}

/// Normal lots with 8.5 % beyond an upper limit against the plan of five items at AQL 1.0.
#[test]
fn variables_from_a_process() {
    let plan = variables::plan_of_size(5, 1.0).unwrap();
    let p = 0.085;
    let limit = reelgate::statistics::distributions::normal_upper_quantile(p);
    let mut random = Random::seeded(3951);
    let accepted = (0..LOTS)
        .filter(|_| {
            let values: Vec<f64> = (0..plan.n).map(|_| random.normal()).collect();
            plan.judge(&values, None, Some(limit)).unwrap().accepted
        })
        .count();
    let law = variables::acceptance_probability(plan.n, plan.k, p);
    assert_rate(accepted as u32, law);
}
