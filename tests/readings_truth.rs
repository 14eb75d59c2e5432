//! Readings of sweeps that no code of this program computed, against exact values.
//!
//! Sweeps: a circuit simulator (ngspice 39.3, two voltage channels over a series reference) and a
//! network library (scikit-rf 2.2.0, Touchstone). Truth: 50-digit evaluation of the same networks
//! (mpmath 1.4.1), `tests/reference/readings/README.md`. Tolerances: the files carry 14 digits, so
//! what is left is the truncation of the local fit at 50 points a decade; a hundredth of the
//! accuracy wanted of noisy sweeps (SRF 0.1 %, ESR minimum 3 %, capacitance 0.15 %) is demanded.

mod readings_support;

use readings_support::*;
use reelgate::readings::{Characteristic as Ch, Equivalent, Place, Request, Value};
use reelgate::sweep::Sweep;
use std::f64::consts::TAU;

const SRF: f64 = 1e-5;
const ESR_MINIMUM: f64 = 3e-4;
const CAPACITANCE: f64 = 1.5e-5;
const DISSIPATION: f64 = 1e-4;

fn close(what: &str, measured: f64, truth: f64, tolerance: f64) {
    let error = measured / truth - 1.0;
    assert!(
        error.abs() <= tolerance,
        "{what}: {measured:e}, truth {truth:e}, off by {error:.2e}"
    );
}

/// Whether a part's resonance lies inside 1 kHz to 65 MHz.
fn resonates(name: &str) -> bool {
    name != "c0g_1n_0402"
}

fn check(label: &str, part: &Part, sweep: &Sweep) {
    let t = |quantity| truth(part.name, quantity);
    if resonates(part.name) {
        close(
            &format!("{label} SRF"),
            value(sweep, &anywhere(Ch::Srf)),
            t("SRF_Hz"),
            SRF,
        );
    }
    let minimum = read(sweep, &anywhere(Ch::EsrMinimum)).lowest;
    let what = format!("{label} ESR minimum");
    close(
        &what,
        minimum.known_value().expect(&what),
        t("ESRmin_in_1k_65M_ohm"),
        ESR_MINIMUM,
    );
    // A flat minimum is hard to place: R grows with the square of the distance.
    close(
        &what,
        minimum.frequency.expect(&what),
        t("f_ESRmin_in_1k_65M_Hz"),
        5e-3,
    );
    let esr = value(sweep, &at(Ch::Esr, 1e5));
    close(
        &format!("{label} ESR at 100 kHz"),
        esr,
        t("ESR_100kHz_ohm"),
        1e-4,
    );
    let z = value(sweep, &at(Ch::Impedance, 1e5));
    close(
        &format!("{label} |Z| at 100 kHz"),
        z,
        t("absZ_100kHz_ohm"),
        1e-5,
    );
    let f = t("f_test_Hz");
    if f >= 1e3 {
        check_at_test_frequency(label, part.name, sweep, f);
    }
}

fn check_at_test_frequency(label: &str, part: &str, sweep: &Sweep, f: f64) {
    let t = |quantity| truth(part, quantity);
    let what = format!("{label} at {f} Hz");
    close(
        &what,
        value(sweep, &at(Ch::Capacitance, f)),
        t("C_test_F"),
        CAPACITANCE,
    );
    let parallel = Request {
        equivalent: Equivalent::Parallel,
        ..at(Ch::Capacitance, f)
    };
    close(&what, value(sweep, &parallel), t("Cp_test_F"), CAPACITANCE);
    close(
        &what,
        value(sweep, &at(Ch::DissipationFactor, f)),
        t("D_test"),
        DISSIPATION,
    );
    close(
        &what,
        value(sweep, &at(Ch::Esr, f)),
        t("ESR_test_ohm"),
        DISSIPATION,
    );
    close(
        &what,
        value(sweep, &at(Ch::Impedance, f)),
        t("absZ_test_ohm"),
        CAPACITANCE,
    );
}

#[test]
fn the_networks_of_the_tests_are_those_of_the_truth() {
    for part in parts() {
        let f = truth(part.name, "f_test_Hz");
        let z = part.network.impedance(f);
        close(
            part.name,
            -1.0 / (TAU * f * z.im),
            truth(part.name, "C_test_F"),
            1e-13,
        );
        close(part.name, z.re, truth(part.name, "ESR_test_ohm"), 1e-11);
        let z = part.network.impedance(truth(part.name, "SRF_Hz"));
        assert!(
            z.im.abs() < 1e-12,
            "{}: X = {:e} at resonance",
            part.name,
            z.im
        );
        close(part.name, z.re, truth(part.name, "ESR_at_SRF_ohm"), 1e-12);
    }
}

#[test]
fn simulator_sweeps_over_a_series_reference() {
    for part in parts() {
        let sweep = two_channel(&format!("ngspice/{}_rref1.csv", part.name), 1.0, 0.3e-9);
        check(&format!("{} (1 Ω)", part.name), &part, &sweep);
    }
    let sweep = two_channel("ngspice/c0g_1n_0402_rref100.csv", 100.0, 0.8e-9);
    check("c0g_1n_0402 (100 Ω)", &part("c0g_1n_0402"), &sweep);
}

#[test]
fn simulator_sweeps_from_20_hz_hold_the_120_hz_values() {
    // 20 points a decade: the local fit sees 16 points.
    for name in ["polymer_47u", "alu_330u"] {
        let sweep = two_channel(&format!("ngspice/{name}_lf.csv"), 1.0, 0.3e-9);
        check_at_test_frequency(name, name, &sweep, 120.0);
    }
}

#[test]
fn network_library_sweeps() {
    for part in parts() {
        let sweep = shunt_through(&format!("touchstone/{}_shunt.s2p", part.name));
        check(&format!("{} (shunt-through)", part.name), &part, &sweep);
    }
    let sweep = series_through("touchstone/c0g_1n_0402_series.s2p");
    check("c0g_1n_0402 (series-through)", &part("c0g_1n_0402"), &sweep);
}

#[test]
fn inductance_is_the_two_term_value_where_the_reading_says() {
    // L = (dX/dω + X/ω)/2 of the exact network at the reading's own frequency.
    for part in parts().iter().filter(|p| resonates(p.name)) {
        let sweep = clean(&part.network, &grid(1e3, 65e6, 50));
        let reading = read(&sweep, &anywhere(Ch::Esl)).lowest;
        let f = reading.frequency.expect(part.name);
        let x = |f: f64| part.network.impedance(f).im;
        let h = 1e-4;
        let slope = (x(f * (1.0 + h)) - x(f * (1.0 - h))) / (2.0 * h);
        let exact = (slope + x(f)) / (2.0 * TAU * f);
        close(
            part.name,
            reading.known_value().expect(part.name),
            exact,
            2e-4,
        );
    }
}

#[test]
fn a_resonance_beyond_the_sweep_is_a_bound() {
    let sweep = two_channel("ngspice/c0g_1n_0402_rref100.csv", 100.0, 0.8e-9);
    let reading = read(&sweep, &anywhere(Ch::Srf)).lowest;
    let last = *sweep.frequency.last().unwrap();
    assert_eq!(reading.value, Value::Above(last));
    assert_eq!(reading.warnings[0].code, "srf_outside_sweep");
    // Inductive from the start: the same part's sweep cut to its upper end.
    let film = clean(&part("film_1u_pp").network, &grid(5e6, 60e6, 50));
    assert_eq!(
        read(&film, &anywhere(Ch::Srf)).lowest.value,
        Value::Below(5e6)
    );
}

#[test]
fn the_minimum_of_impedance_is_not_the_resonance() {
    // The electrolytic's |Z| minimum lies 29 % above its SRF.
    let sweep = shunt_through("touchstone/alu_330u_shunt.s2p");
    let srf = value(&sweep, &anywhere(Ch::Srf));
    let least = sweep
        .impedance
        .iter()
        .zip(&sweep.frequency)
        .min_by(|a, b| a.0.norm().total_cmp(&b.0.norm()))
        .unwrap();
    assert!(least.1 / srf > 1.25, "{} against {srf}", least.1);
}

#[test]
fn extremes_over_a_band() {
    for part in parts() {
        let sweep = clean(&part.network, &grid(1e3, 65e6, 50));
        for characteristic in [Ch::Impedance, Ch::Esr] {
            let place = Place::Between(1.3e5, 2.1e6);
            let extremes = read(
                &sweep,
                &Request {
                    place,
                    ..anywhere(characteristic)
                },
            );
            // Truth: the points and the ends, from the network.
            let exact: Vec<f64> = sweep
                .frequency
                .iter()
                .copied()
                .filter(|f| *f > 1.3e5 && *f < 2.1e6)
                .chain([1.3e5, 2.1e6])
                .map(|f| part.network.impedance(f))
                .map(|z| {
                    if characteristic == Ch::Esr {
                        z.re
                    } else {
                        z.norm()
                    }
                })
                .collect();
            let least = exact.iter().copied().fold(f64::INFINITY, f64::min);
            let most = exact.iter().copied().fold(0.0, f64::max);
            close(
                part.name,
                extremes.lowest.known_value().unwrap(),
                least,
                1e-4,
            );
            close(
                part.name,
                extremes.highest.known_value().unwrap(),
                most,
                1e-4,
            );
        }
    }
}

#[test]
fn what_the_sweep_does_not_hold_is_missing_and_said() {
    let sweep = clean(&part("alu_330u").network, &grid(1e3, 65e6, 50));
    let cases = [
        (at(Ch::Capacitance, 120.0), "frequency_outside_sweep"),
        (at(Ch::Impedance, 70e6), "frequency_outside_sweep"),
        (at(Ch::Capacitance, 1e6), "not_capacitive"),
        (at(Ch::DissipationFactor, 1e6), "not_capacitive"),
        (anywhere(Ch::Capacitance), "frequency_missing"),
    ];
    for (request, code) in cases {
        let reading = read(&sweep, &request).lowest;
        assert_eq!(reading.value, Value::Missing, "{request:?}");
        assert_eq!(reading.warnings[0].code, code, "{request:?}");
    }
    let band = Request {
        place: Place::Between(100.0, 1e5),
        ..anywhere(Ch::Esr)
    };
    assert_eq!(
        read(&sweep, &band).highest.warnings[0].code,
        "frequency_outside_sweep"
    );
}

#[test]
fn coarse_grids_still_read_between_the_points() {
    // Ten points a decade, the least that a station would use: 1 % of the values is demanded.
    for part in parts().iter().filter(|p| resonates(p.name)) {
        let sweep = clean(&part.network, &grid(1e3, 65e6, 10));
        close(
            part.name,
            value(&sweep, &anywhere(Ch::Srf)),
            truth(part.name, "SRF_Hz"),
            1e-3,
        );
        let esr = value(&sweep, &anywhere(Ch::EsrMinimum));
        close(
            part.name,
            esr,
            truth(part.name, "ESRmin_in_1k_65M_ohm"),
            1e-2,
        );
        let z = part.network.impedance(1.7e4);
        let c = value(&sweep, &at(Ch::Capacitance, 1.7e4));
        close(part.name, c, -1.0 / (TAU * 1.7e4 * z.im), 1e-3);
    }
}
