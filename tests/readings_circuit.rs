//! The equivalent circuit: against scipy's least squares, against a published-form reference case,
//! and that a fit which does not describe the part is never read from.

mod readings_support;

use num_complex::Complex64;
use readings_support::*;
use reelgate::readings::circuit::{Circuit, CircuitFit, fit};
use reelgate::readings::{Budget, Characteristic as Ch, Reader, Value};
use reelgate::sweep::Sweep;
use serde_json::{Value as Json, json};
use std::f64::consts::TAU;
use std::io::Write as _;
use std::process::{Command, Stdio};

/// The Python that has scipy: `REELGATE_PYTHON`, else the `.venv` that `tests/run` makes.
fn python() -> String {
    std::env::var("REELGATE_PYTHON")
        .unwrap_or_else(|_| format!("{}/.venv/bin/python", env!("CARGO_MANIFEST_DIR")))
}

fn scipy(cases: &[Json]) -> Vec<Json> {
    let tool = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/tools/scipy_fit.py");
    let mut child = Command::new(python())
        .arg(tool)
        .env("OPENBLAS_NUM_THREADS", "1")
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .unwrap_or_else(|e| panic!("{}: {e}; run tests/run, which makes it", python()));
    let input = serde_json::to_vec(cases).unwrap();
    child.stdin.take().unwrap().write_all(&input).unwrap();
    let output = child.wait_with_output().unwrap();
    assert!(output.status.success(), "{tool} failed");
    serde_json::from_slice(&output.stdout).expect("JSON from scipy_fit.py")
}

/// Elements that are visible in the sweep: index, name, value.
fn visible(fit: &CircuitFit) -> Vec<(usize, &str, f64)> {
    fit.parameters
        .iter()
        .enumerate()
        .filter(|(_, p)| p.standard_uncertainty.is_some())
        .map(|(k, p)| (k, p.name, p.value))
        .collect()
}

fn case(sweep: &Sweep, elements: &[(&str, f64)]) -> Json {
    let re: Vec<f64> = sweep.impedance.iter().map(|z| z.re).collect();
    let im: Vec<f64> = sweep.impedance.iter().map(|z| z.im).collect();
    let names: Vec<&str> = elements.iter().map(|e| e.0).collect();
    let start: Vec<f64> = elements.iter().map(|e| e.1).collect();
    json!({"frequency": sweep.frequency, "re": re, "im": im, "elements": names, "start": start})
}

#[test]
fn scipy_finds_the_same_elements_and_the_same_covariance() {
    let mut sweeps = Vec::new();
    for part in parts() {
        let exact = clean(&part.network, &grid(1e3, 65e6, 25));
        for seed in [1, 2] {
            sweeps.push((part.name, noisy(&exact, 2e-3, 2e-3, &mut Random::new(seed))));
        }
        sweeps.push((
            part.name,
            shunt_through(&format!("touchstone/{}_shunt.s2p", part.name)),
        ));
    }
    let fits: Vec<CircuitFit> = sweeps.iter().map(|(_, s)| fit(s).expect("a fit")).collect();
    let cases: Vec<Json> = fits
        .iter()
        .zip(&sweeps)
        .map(|(fit, (_, sweep))| {
            // Started elsewhere: every second element 10 % up, the others 10 % down.
            let start: Vec<(&str, f64)> = visible(fit)
                .into_iter()
                .map(|(k, name, value)| (name, value * if k % 2 == 0 { 1.1 } else { 0.9 }))
                .collect();
            case(sweep, &start)
        })
        .collect();
    let number = |v: &Json| v.as_f64().expect("a number");
    for ((fit, (name, _)), theirs) in fits.iter().zip(&sweeps).zip(scipy(&cases)) {
        let label = format!("{name} {:?}", fit.circuit);
        assert!(
            fit.notes
                .iter()
                .all(|n| n.code != "circuit_not_identifiable"),
            "{label}"
        );
        let elements = visible(fit);
        let sigma = |k: usize| fit.covariance[k][k].sqrt();
        for (i, (k, element, value)) in elements.iter().enumerate() {
            let other = number(&theirs["values"][i]);
            assert!(
                (value - other).abs() <= 2e-3 * sigma(*k) + 1e-9 * value.abs(),
                "{label} {element}: {value:e}, scipy {other:e}, sigma {:e}",
                sigma(*k)
            );
            for (j, (l, ..)) in elements.iter().enumerate() {
                let (ours, other) = (fit.covariance[*k][*l], number(&theirs["covariance"][i][j]));
                assert!(
                    (ours - other).abs() <= 5e-3 * sigma(*k) * sigma(*l),
                    "{label} covariance of {element} and {}: {ours:e}, scipy {other:e}",
                    elements[j].1
                );
            }
        }
    }
}

#[test]
fn reference_case_of_the_dispersive_model() {
    // cnls_reference.csv: the model itself with 0.2 % noise, fitted by scipy, in logarithms.
    let (_, rows) = table("cnls_reference.csv");
    let number = |row: &[String], k: usize| row[k].parse::<f64>().unwrap();
    let sweep = Sweep {
        frequency: rows.iter().map(|r| number(r, 0)).collect(),
        impedance: rows
            .iter()
            .map(|r| Complex64::new(number(r, 3), number(r, 4)))
            .collect(),
        level: None,
    };
    let fit = fit(&sweep).expect("a fit");
    assert_eq!(fit.circuit, Circuit::Dispersive);
    assert!(fit.described, "{:?}", fit.notes);
    let reference = json("cnls_reference.json");
    let of = |key: &str, k: usize| reference[key][k].as_f64().unwrap();
    let names = ["c_1", "dispersion", "r_0", "r_skin_1mhz", "l"];
    for (k, name) in names.into_iter().enumerate() {
        let p = fit.parameter(name).expect(name);
        let index = fit.parameters.iter().position(|q| q.name == name).unwrap();
        let logarithm = name != "dispersion";
        let (value, scale) = if logarithm {
            (p.value.ln(), p.value)
        } else {
            (p.value, 1.0)
        };
        let sigma = fit.covariance[index][index].sqrt() / scale;
        let their_sigma = of("std_from_covariance", k);
        assert!(
            (value - of("estimate", k)).abs() < 1e-3 * their_sigma,
            "{name}: {value}"
        );
        assert!(
            (sigma / their_sigma - 1.0).abs() < 1e-3,
            "{name}: {sigma} {their_sigma}"
        );
        // And the truth of the model lies within four standard deviations.
        assert!((value - of("true", k)).abs() < 4.0 * sigma, "{name}");
    }
    let s2 = fit.residual.rms.powi(2) * 2.0 * 121.0 / (2.0 * 121.0 - 5.0);
    assert!((s2 / reference["residual_variance_s2"].as_f64().unwrap() - 1.0).abs() < 1e-2);
    // 0.2 % complex is 0.14 % for each of ln|Z| and phase.
    assert!(
        (fit.residual.noise / 2e-3 * 2f64.sqrt() - 1.0).abs() < 0.2,
        "{:?}",
        fit.residual
    );
}

/// A thread keeps room and functions of frequency from fit to fit: they change no bit of it.
#[test]
fn a_fit_does_not_depend_on_what_was_fitted_before() {
    let sweeps: Vec<Sweep> = (parts().iter().zip([50, 83, 11, 25, 40, 7]))
        .map(|(part, points)| clean(&part.network, &grid(1e3, 65e6, points)))
        .collect();
    let fresh = |sweep: &Sweep| {
        std::thread::scope(|scope| scope.spawn(|| fit(sweep).expect("a fit")).join())
            .expect("no panic")
    };
    let alone: Vec<CircuitFit> = sweeps.iter().map(fresh).collect();
    for (sweep, alone) in sweeps
        .iter()
        .zip(&alone)
        .chain(sweeps.iter().zip(&alone).rev())
    {
        assert_eq!(&fit(sweep).expect("a fit"), alone);
    }
}

/// A circuit with dispersion and skin effect as the model has it.
fn dispersive(f: f64) -> Complex64 {
    let element = Complex64::new(0.0, f / 1e3).powf(-(1.0 - 0.0175)) / (TAU * 1e3 * 4.6e-6);
    let skin = 0.35e-3 * (f / 1e6).sqrt() * Complex64::new(1.0, 1.0);
    2.5e-3 + skin + Complex64::new(0.0, TAU * f * 0.48e-9) + element
}

#[test]
fn covariance_agrees_with_monte_carlo() {
    let frequency = grid(1e3, 65e6, 25);
    let exact = Sweep {
        impedance: frequency.iter().map(|f| dispersive(*f)).collect(),
        frequency,
        level: None,
    };
    let draws = 400;
    let mut sums = vec![(0.0, 0.0, 0.0); 5];
    for draw in 0..draws {
        let sweep = noisy(&exact, 1.4e-3, 1.4e-3, &mut Random::new(draw));
        let fit = fit(&sweep).expect("a fit");
        assert_eq!(fit.circuit, Circuit::Dispersive);
        for (k, sum) in sums.iter_mut().enumerate() {
            let v = fit.parameters[k].value;
            *sum = (sum.0 + v, sum.1 + v * v, sum.2 + fit.covariance[k][k]);
        }
    }
    let n = draws as f64;
    for (sum, square, covariance) in sums {
        let drawn = (square / n - (sum / n).powi(2)).sqrt();
        // 400 draws give a standard deviation to 3.5 %.
        assert!(
            ((covariance / n).sqrt() / drawn - 1.0).abs() < 0.12,
            "{drawn:e}"
        );
    }
}

#[test]
fn fitted_readings_hold_the_truth() {
    // c_1khz is the capacitive branch's, freed of the inductance's share, which is below 1e-6 at
    // 1 kHz for all parts but the electrolytic (7e-5).
    let budget = Budget::of(&station(0.0, 0.0));
    for part in parts() {
        let exact = clean(&part.network, &grid(1e3, 65e6, 50));
        let z = part.network.impedance(1e3);
        let truth = -1.0 / (TAU * 1e3 * z.im);
        for seed in 1..=20 {
            let sweep = noisy(&exact, 5e-3, 1.7e-3, &mut Random::new(seed));
            let reader = Reader::new(&sweep, &budget);
            let reading = reader.read(&anywhere(Ch::FittedCapacitance)).lowest;
            let label = format!("{} seed {seed}: {reading:?}, truth {truth:e}", part.name);
            let value = reading.known_value().expect(&label);
            let u = reading.standard_uncertainty.expect(&label);
            assert!((value - truth).abs() < 4.0 * u + 5e-3 * truth, "{label}");
            assert!(u < 0.01 * truth, "{label}");
        }
    }
}

#[test]
fn the_fit_is_drawn_where_it_is_asked_for() {
    let part = part("mlcc_4u7_0805_x7r");
    let sweep = clean(&part.network, &grid(1e3, 65e6, 50));
    let fit = fit(&sweep).expect("a fit");
    let curve = fit.impedance(&[2e3, 1e6, 3.3e7]);
    for (f, z) in [2e3, 1e6, 3.3e7].into_iter().zip(curve) {
        let exact = part.network.impedance(f);
        assert!((z - exact).norm() < 0.01 * exact.norm(), "{f}: {z} {exact}");
    }
    let rms = |fit: &CircuitFit| {
        let sum: f64 = fit
            .impedance(&sweep.frequency)
            .iter()
            .zip(&sweep.impedance)
            .map(|(a, b)| ((a - b) / b.norm()).norm_sqr())
            .sum();
        (sum / (2.0 * sweep.frequency.len() as f64)).sqrt()
    };
    assert!((rms(&fit) / fit.residual.rms - 1.0).abs() < 1e-9);
}

#[test]
fn a_fit_that_does_not_describe_the_part_is_said_and_not_read() {
    let budget = Budget::of(&station(1e-3, 1e-3));
    let frequency = grid(1e3, 65e6, 50);
    // Two parts in parallel: an anti-resonance that no circuit of ours has.
    let series = |r, l, c| Network::Series(vec![Network::R(r), Network::L(l), Network::C(c)]);
    let both = Network::Parallel(vec![
        series(5e-3, 5e-9, 4.7e-6),
        series(20e-3, 1e-9, 100e-9),
    ]);
    let resonant = clean(&both, &frequency);
    // A contact that opened: half an ohm more from 1 MHz on.
    let mut opened = clean(&part("mlcc_4u7_0805_x7r").network, &frequency);
    for (f, z) in opened.frequency.iter().zip(&mut opened.impedance) {
        if *f > 1e6 {
            *z += 0.5;
        }
    }
    for sweep in [resonant, opened] {
        let reader = Reader::new(&sweep, &budget);
        let fit = reader.circuit().as_ref().expect("a fit");
        assert!(!fit.described);
        assert!(!fit.notes.is_empty());
        for characteristic in [Ch::FittedCapacitance, Ch::FittedResistance] {
            let reading = reader.read(&anywhere(characteristic)).lowest;
            assert_eq!(reading.value, Value::Missing);
            assert_eq!(reading.warnings[0], fit.notes[0]);
        }
    }
}

#[test]
fn what_cannot_be_fitted_is_refused_with_its_reason() {
    let network = part("mlcc_4u7_0805_x7r").network;
    let cases = [
        (
            clean(&network, &grid(1e3, 65e6, 3)),
            "circuit_too_few_points",
        ),
        (
            clean(&network, &grid(1e4, 5e5, 50)),
            "circuit_too_few_points",
        ),
        (
            clean(&Network::R(1.0), &grid(1e3, 65e6, 50)),
            "circuit_not_capacitive",
        ),
        (
            clean(&Network::L(1e-6), &grid(1e3, 65e6, 50)),
            "circuit_not_capacitive",
        ),
        (
            Sweep {
                frequency: vec![],
                impedance: vec![],
                level: None,
            },
            "circuit_too_few_points",
        ),
    ];
    for (sweep, code) in cases {
        assert_eq!(fit(&sweep).expect_err(code).code, code);
    }
    let budget = Budget::of(&station(1e-3, 1e-3));
    let late = clean(&network, &grid(2e3, 65e6, 50));
    let reading = Reader::new(&late, &budget)
        .read(&anywhere(Ch::FittedCapacitance))
        .lowest;
    assert_eq!(reading.warnings[0].code, "frequency_outside_sweep");
}

#[test]
fn any_course_is_survived() {
    for seed in 0..200 {
        let mut random = Random::new(seed);
        let mut sweep = clean(&Network::C(1e-6), &grid(1e3, 65e6, 10));
        for z in &mut sweep.impedance {
            let (a, b) = random.normal_pair();
            *z = if seed % 2 == 0 {
                Complex64::new(a, b)
            } else {
                *z * (1.0 + 0.3 * a) + b
            };
        }
        sweep.impedance[0].im = -sweep.impedance[0].im.abs();
        if let Ok(fit) = fit(&sweep) {
            assert!(fit.residual.rms.is_finite() || !fit.described);
            for p in &fit.parameters {
                assert!(
                    p.standard_uncertainty.is_none_or(|u| !u.is_nan()),
                    "{fit:?}"
                );
            }
        }
    }
}
