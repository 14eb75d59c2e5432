//! A lot against the lots before it.

use crate::reference::{assert_near, assert_within, path, rows};
use reelgate::statistics::Undefined;
use reelgate::statistics::lot_to_lot::{
    EWMA_LAMBDA, EWMA_WIDTH, LotSpread, RunRule, control_limits, ewma, mean_shift, run_signals,
    spread_change,
};
use reelgate::statistics::random::Random;
use serde_json::Value;

/// NIST/SEMATECH e-Handbook 6.3.2.4: λ 0.3, target 50, s 2.0539: all averages as printed, none out;
/// the printed limits for large t are 52.5884 and 47.4115 (with a factor rounded to 0.4201).
#[test]
fn handbook_ewma() {
    let table = rows("s9_ewma_nist.csv");
    let values: Vec<f64> = table.iter().skip(1).map(|r| r.number("x")).collect();
    let found = ewma(&values, 50.0, 2.0539, 0.3, 3.0).unwrap();
    assert_eq!(found.len(), 20);
    for (point, row) in found.iter().zip(table.iter().skip(1)) {
        assert_near(point.value, row.number("ewma"), 1e-13);
        assert_within(point.value, row.number("ewma_printed"), 5.01e-3);
        assert_near(point.lower, row.number("lcl_t"), 1e-9);
        assert_near(point.upper, row.number("ucl_t"), 1e-9);
        assert!(!point.signal);
    }
    assert_within(found[19].upper, 52.5884, 1e-3);
    assert_within(found[19].lower, 47.4115, 1e-3);
}

/// NIST/SEMATECH e-Handbook 6.3.2.2: limits 55.8041 and 45.8159 as printed, with 1.128 for the exact 1.12838.
#[test]
fn handbook_individuals_chart() {
    let flow = [49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1];
    let found = control_limits(&flow).unwrap();
    assert_within(found.centre, 50.81, 1e-9);
    assert_within(found.upper, 55.8041, 2e-3);
    assert_within(found.lower, 45.8159, 2e-3);
}

/// Lucas & Saccucci (1990): a shift of one sigma is found after 10.5 lots on average (with limits
/// for large t; with those of the first lots a little sooner), a stable process signals once in
/// 500.
#[test]
fn ewma_run_lengths() {
    let mut random = Random::seeded(1990);
    let run = |random: &mut Random, shift: f64, most: usize| -> f64 {
        let values: Vec<f64> = (0..most).map(|_| shift + random.normal()).collect();
        let points = ewma(&values, 0.0, 1.0, EWMA_LAMBDA, EWMA_WIDTH).unwrap();
        let first = points.iter().position(|p| p.signal).unwrap();
        first as f64 + 1.0
    };
    let runs = 400;
    let shifted: f64 = (0..runs).map(|_| run(&mut random, 1.0, 200)).sum();
    assert_within(shifted / f64::from(runs), 10.0, 1.2);
    let stable: f64 = (0..runs).map(|_| run(&mut random, 0.0, 6000)).sum();
    assert_within(stable / f64::from(runs), 490.0, 100.0);
}

/// Thirteen cases by the conventions of Nelson (1984) and Western Electric (1956), from an
/// independent program.
#[test]
fn every_case_of_the_run_rules() {
    let text = std::fs::read_to_string(path("s9_run_rules.json")).unwrap();
    let file: Value = serde_json::from_str(&text).unwrap();
    let rules = [
        ("N1_WE1: 1 beyond 3s", RunRule::BeyondThreeSigma),
        ("7 same side (ISO 7870-2 variant)", RunRule::OneSide(7)),
        ("WE4: 8 same side", RunRule::OneSide(8)),
        ("N2: 9 same side", RunRule::OneSide(9)),
        ("N3: 6 in a row steadily up or down", RunRule::Trend),
        ("N4: 14 alternating", RunRule::Alternating),
        ("N5_WE2: 2 of 3 beyond 2s same side", RunRule::TwoOfThree),
        ("N6_WE3: 4 of 5 beyond 1s same side", RunRule::FourOfFive),
        ("N7: 15 within 1s", RunRule::FifteenWithin),
        ("N8: 8 beyond 1s, both sides allowed", RunRule::EightBeyond),
    ];
    let cases = file["cases"].as_object().unwrap();
    assert_eq!(cases.len(), 13);
    let mut signals = 0;
    for (name, case) in cases {
        let numbers = case["x"].as_array().unwrap();
        let values: Vec<f64> = numbers.iter().map(|x| x.as_f64().unwrap()).collect();
        let (centre, sigma) = (
            case["mu"].as_f64().unwrap(),
            case["sigma"].as_f64().unwrap(),
        );
        let expected = case["signals"].as_object().unwrap();
        assert!(
            expected
                .keys()
                .all(|key| rules.iter().any(|(k, _)| k == key))
        );
        for (key, rule) in rules {
            let found: Vec<u64> = run_signals(&values, centre, sigma, &[rule])
                .iter()
                .map(|signal| signal.index as u64 + 1)
                .collect();
            let wanted: Vec<u64> = expected.get(key).map_or_else(Vec::new, |list| {
                list.as_array()
                    .unwrap()
                    .iter()
                    .map(|i| i.as_u64().unwrap())
                    .collect()
            });
            assert_eq!(found, wanted, "{name}: {key}");
            signals += found.len();
        }
    }
    assert!(signals > 20);
}

/// t = (x − x̄)/(s √(1 + 1/m)); with x̄ = 2, s = 1, m = 3 and x = 2 + t √(4/3): the 97.5 % quantile
/// of two degrees of freedom, 4.3027, has p = 0.05.
#[test]
fn shift_of_the_mean() {
    let shifted = 2.0 + 4.302652729911275 * (4.0_f64 / 3.0).sqrt();
    let found = mean_shift(shifted, &[1.0, 2.0, 3.0]).unwrap();
    assert_near(found.p_value, 0.05, 1e-10);
    let below = mean_shift(4.0 - shifted, &[1.0, 2.0, 3.0]).unwrap();
    assert_near(below.p_value, 0.05, 1e-10);
    assert!(mean_shift(1.0, &[1.0, 2.0]).is_err());
    assert_eq!(mean_shift(1.0, &[2.0; 5]), Err(Undefined::ZeroSpread));
}

/// NIST/SEMATECH e-Handbook 1.3.5.9, ceramic strength: s 65.54909 and 61.85425 of 240 each, F =
/// 1.123037; two-sided limits 0.7756 and 1.2894 at 5 %: no change (from memory).
#[test]
fn change_of_the_spread() {
    let spread = |standard_deviation, n| LotSpread {
        standard_deviation,
        n,
    };
    let before = [spread(61.85425, 240)];
    let found = spread_change(spread(65.54909, 240), &before).unwrap();
    assert_near(found.statistic, 1.123037, 1e-6);
    assert!(found.p_value > 0.05);
    let at_limit = spread_change(spread(61.85425 * 1.2894_f64.sqrt(), 240), &before).unwrap();
    assert_within(at_limit.p_value, 0.05, 2e-4);
    let at_other = spread_change(spread(61.85425 * 0.7756_f64.sqrt(), 240), &before).unwrap();
    assert_within(at_other.p_value, 0.05, 2e-4);
    // Two equal lots pool to their own spread with the sum of their degrees of freedom.
    let pooled = spread_change(spread(1.0, 10), &[spread(2.0, 5), spread(2.0, 6)]).unwrap();
    assert_near(pooled.statistic, 0.25, 1e-14);
    assert!(spread_change(spread(1.0, 1), &before).is_err());
    assert!(spread_change(spread(1.0, 5), &[]).is_err());
    assert_eq!(
        spread_change(spread(0.0, 5), &before),
        Err(Undefined::ZeroSpread)
    );
}

#[test]
fn what_cannot_be_charted_is_said() {
    assert!(ewma(&[1.0], 0.0, 1.0, 0.0, 3.0).is_err());
    assert!(ewma(&[1.0], 0.0, 1.0, 0.2, f64::NAN).is_err());
    assert_eq!(ewma(&[1.0], 0.0, 0.0, 0.2, 3.0), Err(Undefined::ZeroSpread));
    assert_eq!(
        ewma(&[f64::NAN], 0.0, 1.0, 0.2, 3.0),
        Err(Undefined::NotFinite)
    );
    assert!(control_limits(&[1.0]).is_err());
    assert_eq!(control_limits(&[1.0; 4]), Err(Undefined::ZeroSpread));
    assert!(run_signals(&[], 0.0, 1.0, &RunRule::NELSON).is_empty());
}
