//! Uncertainty budgets: the table makes the reading's uncertainty, and the Monte-Carlo method
//! (JCGM 101:2008) agrees with first-order propagation.

mod readings_support;

use num_complex::Complex64;
use readings_support::*;
use reelgate::readings::{
    Budget, Characteristic as Ch, Equivalent, Place, Request, budget_table, combined, read,
};
use reelgate::station::{Method, Reference, Repeatability, Station};
use std::f64::consts::TAU;

const MAGNITUDE: f64 = 2e-3;
const PHASE: f64 = 0.05 * TAU / 360.0;
const TOLERANCE: f64 = 1e-3;
/// Standard uncertainty of the part's temperature in K, and what it does to the invented parts.
const TEMPERATURE: f64 = 0.8;
const COEFFICIENTS: [(Ch, f64); 4] = [
    (Ch::Capacitance, 1e-3),
    (Ch::Esr, -1.5e-2),
    (Ch::EsrMinimum, -1e-2),
    (Ch::Srf, -5e-4),
];

fn coefficient(of: Ch) -> f64 {
    let found = COEFFICIENTS.iter().find(|(ch, _)| *ch == of);
    found.map_or(0.0, |(_, share)| *share)
}

fn bench() -> Station {
    let mut station = station(MAGNITUDE, PHASE);
    station.method = Method::SeriesReference;
    station.reference = Some(Reference {
        resistance: 1.0,
        tolerance: TOLERANCE,
        inductance: 0.0,
    });
    station.uncertainty.temperature = Some(TEMPERATURE);
    station.uncertainty.repeatability = vec![
        ("capacitance".into(), Repeatability::Relative(1e-3)),
        ("esr_minimum".into(), Repeatability::Absolute(1e-4)),
        ("srf".into(), Repeatability::Relative(5e-4)),
    ];
    station
}

fn requests() -> Vec<Request> {
    let parallel = Request {
        equivalent: Equivalent::Parallel,
        ..at(Ch::Capacitance, 1e4)
    };
    vec![
        at(Ch::Capacitance, 1e4),
        parallel,
        at(Ch::DissipationFactor, 1e4),
        at(Ch::Esr, 1e5),
        at(Ch::Impedance, 1e5),
        anywhere(Ch::EsrMinimum),
        anywhere(Ch::Srf),
        anywhere(Ch::Esl),
        Request {
            place: Place::Between(1e5, 3e5),
            ..anywhere(Ch::Esr)
        },
    ]
}

#[test]
fn the_table_makes_the_uncertainty_of_the_reading() {
    let budget = Budget::of(&bench());
    for part in parts() {
        let exact = clean(&part.network, &grid(1e3, 65e6, 50));
        let sweep = noisy(&exact, 1e-3, 1e-3, &mut Random::new(7));
        for request in requests() {
            let table = budget_table(&sweep, &request, &budget);
            let reading = read(&sweep, &request, &budget).highest;
            match reading.standard_uncertainty {
                Some(u) => {
                    assert_eq!(combined(&table), u, "{} {request:?}", part.name);
                    for c in &table {
                        assert_eq!(
                            c.contribution,
                            (c.sensitivity * c.standard_uncertainty).abs()
                        );
                    }
                }
                None => assert!(table.is_empty() && reading.known_value().is_none()),
            }
        }
    }
}

#[test]
fn sensitivities_are_the_derivatives() {
    // Central differences of the reading itself, all magnitudes or all phases moved together. A
    // common error of the phase is not causal, so that the fit resists a little of it: 2 %.
    let budget = Budget::of(&bench());
    for part in parts() {
        let sweep = clean(&part.network, &grid(1e3, 65e6, 50));
        for request in requests() {
            let table = budget_table(&sweep, &request, &budget);
            let moved = |factor: Complex64| {
                let mut moved = sweep.clone();
                moved.impedance.iter_mut().for_each(|z| *z *= factor);
                read(&moved, &request, &budget).highest.known_value()
            };
            let h = 1e-5;
            for (line, up, down) in [
                (
                    0,
                    Complex64::new(1.0 + h, 0.0),
                    Complex64::new(1.0 - h, 0.0),
                ),
                (
                    1,
                    Complex64::from_polar(1.0, h),
                    Complex64::from_polar(1.0, -h),
                ),
            ] {
                let (Some(up), Some(down)) = (moved(up), moved(down)) else {
                    continue;
                };
                let slope = (up - down) / (2.0 * h);
                let stated = table[line].sensitivity;
                let scale = up.abs().max(slope.abs());
                assert!(
                    (slope - stated).abs() <= 0.02 * scale,
                    "{} {request:?} {}: {stated:e}, by difference {slope:e}",
                    part.name,
                    table[line].name
                );
            }
        }
    }
}

#[test]
fn monte_carlo_agrees() {
    // Each draw: one error of magnitude, phase and reference common to the sweep, fresh noise at
    // every point, one repeatability, one
    // temperature of the part. 2000 draws give a standard deviation to 1.6 %.
    let (magnitude_noise, phase_noise) = (2e-3, 1e-3);
    let budget = Budget::of(&bench()).with_temperature_coefficients(&COEFFICIENTS);
    for name in ["mlcc_4u7_0805_x7r", "polymer_47u"] {
        let exact = clean(&part(name).network, &grid(1e3, 65e6, 50));
        let all = requests();
        let mut sums = vec![(0.0, 0.0, 0.0); all.len()];
        let draws = 2000;
        for draw in 0..draws {
            let mut random = Random::new(1000 + draw);
            let (a, b) = random.normal_pair();
            let reference = TOLERANCE * (2.0 * random.uniform() - 1.0);
            let warmer = TEMPERATURE * random.normal_pair().0;
            let factor =
                Complex64::from_polar((1.0 + MAGNITUDE * a) * (1.0 + reference), PHASE * b);
            let mut sweep = noisy(&exact, magnitude_noise, phase_noise, &mut random);
            sweep.impedance.iter_mut().for_each(|z| *z *= factor);
            for (request, sum) in all.iter().zip(&mut sums) {
                let reading = read(&sweep, request, &budget).highest;
                let repeat = match request.characteristic {
                    Ch::Capacitance => 1e-3 * reading.known_value().unwrap(),
                    Ch::EsrMinimum => 1e-4,
                    Ch::Srf => 5e-4 * reading.known_value().unwrap(),
                    _ => 0.0,
                };
                let changed = 1.0 + coefficient(request.characteristic) * warmer;
                let value =
                    reading.known_value().unwrap() * changed + repeat * random.normal_pair().0;
                let u = reading.standard_uncertainty.unwrap();
                *sum = (sum.0 + value, sum.1 + value * value, sum.2 + u * u);
            }
        }
        for (request, (sum, squares, stated)) in all.iter().zip(sums) {
            let n = draws as f64;
            let drawn = (squares / n - (sum / n) * (sum / n)).sqrt();
            let stated = (stated / n).sqrt();
            // JCGM 101 clause 8: agreement within the digits that matter; here 12 %, because the
            // scatter is itself estimated from each sweep.
            assert!(
                (stated / drawn - 1.0).abs() < 0.12,
                "{name} {request:?}: stated {stated:e}, drawn {drawn:e}"
            );
        }
    }
}

/// The budget of a 4.7 µF part, worked by hand: a temperature known within ±2 K (rectangular, so
/// 2 K/√3) and 0.1 % a kelvin are 0.12 % of the capacitance.
#[test]
fn the_temperature_term_needs_both_its_halves() {
    let sweep = clean(&part("mlcc_4u7_0805_x7r").network, &grid(1e3, 65e6, 50));
    let mut bench = bench();
    bench.uncertainty.temperature = Some(2.0 / 3f64.sqrt());
    let request = at(Ch::Capacitance, 1e4);
    let line = |budget: &Budget, request: &Request| {
        let table = budget_table(&sweep, request, budget);
        let found = table.iter().find(|c| c.unit == "K").cloned();
        (found, combined(&table))
    };
    let told = Budget::of(&bench).with_temperature_coefficients(&[(Ch::Capacitance, 1e-3)]);
    let value = read(&sweep, &request, &told).highest.known_value().unwrap();
    let (temperature, with) = line(&told, &request);
    let share = temperature.expect("a line").contribution / value;
    assert_eq!(format!("{:.2} %", 100.0 * share), "0.12 %");
    let (none, without) = line(&Budget::of(&bench), &request);
    assert!(none.is_none());
    assert!(
        (with.powi(2) - without.powi(2) - (share * value).powi(2)).abs() < 1e-12 * with.powi(2)
    );
    // Of another characteristic nothing is known.
    assert!(line(&told, &at(Ch::Impedance, 1e4)).0.is_none());
    bench.uncertainty.temperature = None;
    let silent = Budget::of(&bench).with_temperature_coefficients(&[(Ch::Capacitance, 1e-3)]);
    assert_eq!(line(&silent, &request), (None, without));
}

#[test]
fn the_phase_term_rules_the_esr_far_from_resonance() {
    // 4.7 µF at 10 kHz: |X| = 3.7 Ω, R = 0.1 Ω; 0.05° of phase is 3.2 mΩ.
    let sweep = clean(&part("mlcc_4u7_0805_x7r").network, &grid(1e3, 65e6, 50));
    let budget = Budget::of(&bench());
    let table = budget_table(&sweep, &at(Ch::Esr, 1e4), &budget);
    let x = part("mlcc_4u7_0805_x7r").network.impedance(1e4).im;
    let phase = table.iter().find(|c| c.unit == "rad").unwrap();
    assert!((phase.contribution / (PHASE * x.abs()) - 1.0).abs() < 1e-3);
    assert!(phase.contribution > 0.99 * combined(&table));
}

#[test]
fn what_the_station_does_not_state_is_not_known() {
    let sweep = clean(&part("mlcc_4u7_0805_x7r").network, &grid(1e3, 65e6, 50));
    let u = |magnitude, phase, request: &Request| {
        let mut station = station(0.0, 0.0);
        (station.uncertainty.magnitude, station.uncertainty.phase) = (magnitude, phase);
        read(&sweep, request, &Budget::of(&station))
            .lowest
            .standard_uncertainty
    };
    let capacitance = at(Ch::Capacitance, 1e4);
    let esr = at(Ch::Esr, 1e4);
    assert!(u(Some(1e-3), None, &capacitance).is_some());
    assert!(u(None, Some(1e-3), &capacitance).is_none());
    assert!(u(Some(1e-3), None, &esr).is_none());
    assert!(u(None, Some(1e-3), &at(Ch::DissipationFactor, 1e4)).is_some());
    for request in requests() {
        assert!(u(None, None, &request).is_none(), "{request:?}");
        assert!(u(Some(1e-3), Some(1e-3), &request).is_some(), "{request:?}");
    }
}
