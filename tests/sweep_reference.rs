//! Sweeps that no code of ours computed, against the exact impedance of the networks in them.
//!
//! The two-channel sweeps come from ngspice 39.3 (netlist of one of them beside its sweep), the
//! Touchstone files from scikit-rf 2.2.0; the networks of ideal elements are in `sweep_support`.

mod sweep_support;

use reelgate::station::{Column, Method, Reference, Standard};
use reelgate::sweep::{RawFile, Standards, read_file, touchstone};
use std::f64::consts::TAU;
use sweep_support::*;

fn two_channel_station() -> reelgate::station::Station {
    station(Method::SeriesReference, Some(two_channel()))
}

#[test]
fn simulator_sweeps_give_the_exact_impedance() {
    for name in [
        "mlcc_100n_0402_x7r",
        "mlcc_4u7_0805_x7r",
        "polymer_47u",
        "alu_330u",
        "film_1u_pp",
    ] {
        let file = reference_file(&format!("sweeps/simulator/{name}_rref1.csv"));
        let sweep = sweep(&file, &two_channel_station());
        assert_eq!(sweep.frequency.len(), 241);
        // The simulator's frequencies have ten digits, its voltages fourteen; 1 - B/A loses
        // four of them at 1.7 kΩ over 1 Ω.
        let error = largest_error(&sweep, &part(name));
        assert!(error < 2e-7, "{name}: {error:e}");
        let level = sweep.level.expect("two channels");
        assert!(level.iter().all(|v| *v > 0.0 && *v < 2.0));
    }
}

#[test]
fn another_reference_impedance() {
    let mut station = two_channel_station();
    station.reference = Some(Reference {
        resistance: 100.0,
        tolerance: 0.0,
        inductance: 0.8e-9,
    });
    let file = reference_file("sweeps/simulator/c0g_1n_0402_rref100.csv");
    let error = largest_error(&sweep(&file, &station), &part("c0g_1n_0402"));
    assert!(error < 2e-7, "{error:e}");
}

#[test]
fn the_inductance_of_the_reference_matters() {
    let mut station = two_channel_station();
    station.reference = Some(Reference {
        resistance: 1.0,
        tolerance: 0.0,
        inductance: 0.0,
    });
    let file = reference_file("sweeps/simulator/mlcc_4u7_0805_x7r_rref1.csv");
    let sweep = sweep(&file, &station);
    let (f, z) = (sweep.frequency[240], sweep.impedance[240]);
    let truth = part("mlcc_4u7_0805_x7r").impedance(f);
    // Z_read = Z / (1 + jωL/R): 7 degrees at 63 MHz.
    let expected = truth / num_complex::Complex64::new(1.0, TAU * f * 0.3e-9);
    assert!(((z - expected) / truth).norm() < 1e-7);
    assert!(((z - truth) / truth).norm() > 0.1);
}

#[test]
fn touchstone_sweeps_of_a_network_library_give_the_exact_impedance() {
    for (file, name, method, tolerance) in [
        (
            "mlcc_100n_0402_x7r_shunt.s2p",
            "mlcc_100n_0402_x7r",
            Method::ShuntThrough,
            1e-10,
        ),
        (
            "mlcc_4u7_0805_x7r_shunt.s2p",
            "mlcc_4u7_0805_x7r",
            Method::ShuntThrough,
            1e-10,
        ),
        // Each port arm has 15 mΩ + 0.3 nH, which the transfer impedance is free of.
        (
            "mlcc_4u7_0805_x7r_shunt_arms.s2p",
            "mlcc_4u7_0805_x7r",
            Method::ShuntThrough,
            1e-10,
        ),
        (
            "c0g_1n_0402_series.s2p",
            "c0g_1n_0402",
            Method::SeriesThrough,
            1e-10,
        ),
        (
            "alu_330u_reflect.s1p",
            "alu_330u",
            Method::Reflection,
            1e-10,
        ),
        // Nine digits in the file; at 1 kHz 1 - S21 keeps seven of them.
        (
            "dialect_hz_ri.s2p",
            "mlcc_100n_0402_x7r",
            Method::ShuntThrough,
            5e-7,
        ),
        (
            "dialect_khz_ma.s2p",
            "mlcc_100n_0402_x7r",
            Method::ShuntThrough,
            5e-6,
        ),
        (
            "dialect_mhz_db.s2p",
            "mlcc_100n_0402_x7r",
            Method::ShuntThrough,
            5e-6,
        ),
        (
            "dialect_default_optionline.s2p",
            "mlcc_100n_0402_x7r",
            Method::ShuntThrough,
            5e-6,
        ),
        (
            "dialect_shuffled_lower.s2p",
            "mlcc_100n_0402_x7r",
            Method::ShuntThrough,
            5e-7,
        ),
        (
            "dialect_v1_zparam.s1p",
            "mlcc_100n_0402_x7r",
            Method::Direct,
            1e-8,
        ),
        (
            "dialect_v2_zparam.ts",
            "mlcc_100n_0402_x7r",
            Method::Direct,
            1e-8,
        ),
    ] {
        let sweep = sweep(
            &reference_file(&format!("touchstone/{file}")),
            &station(method, None),
        );
        let error = largest_error(&sweep, &part(name));
        assert!(error < tolerance, "{file}: {error:e}");
        assert_eq!(sweep.level, None);
    }
}

#[test]
fn the_cable_braids_of_a_shunt_jig_add_what_theory_says() {
    let sweep = sweep(
        &reference_file("touchstone/mlcc_4u7_0805_x7r_shunt_groundloop.s2p"),
        &station(Method::ShuntThrough, None),
    );
    let part = part("mlcc_4u7_0805_x7r");
    for (&f, z) in sweep.frequency.iter().zip(&sweep.impedance) {
        let loop_impedance = num_complex::Complex64::new(24e-3, TAU * f * 1e-6);
        let expected = part.impedance(f) + 144e-6 / loop_impedance;
        assert!(((z - expected) / expected).norm() < 1e-9);
    }
}

#[test]
fn two_port_data_are_ordered_as_the_versions_say() {
    let read = |name: &str| {
        let file = reference_file(&format!("touchstone/{name}"));
        touchstone::read(&file.bytes, None).unwrap_or_else(|e| panic!("{name}: {e:?}"))
    };
    let one = read("dialect_v1_nonreciprocal.s2p");
    for other in [
        "dialect_v2_21_12_nonreciprocal.ts",
        "dialect_v2_12_21_nonreciprocal.ts",
    ] {
        assert_eq!(one, read(other), "{other}");
    }
    // S12 was made half of S21.
    let s = one.at(3);
    assert!((s[1] - 0.5 * s[2]).norm() < 1e-9);
    let attempt = sweep_support::one(
        &reference_file("touchstone/dialect_v1_nonreciprocal.s2p"),
        &station(Method::ShuntThrough, None),
    );
    assert_eq!(codes(&attempt), ["not_reciprocal"]);
}

#[test]
fn a_jig_of_the_other_kind_is_noticed() {
    for (file, method) in [
        ("c0g_1n_0402_series.s2p", Method::ShuntThrough),
        ("mlcc_4u7_0805_x7r_shunt.s2p", Method::SeriesThrough),
        ("mlcc_4u7_0805_x7r_shunt.s2p", Method::Reflection),
        ("mlcc_4u7_0805_x7r_shunt.s2p", Method::Direct),
        ("alu_330u_reflect.s1p", Method::ShuntThrough),
        ("alu_330u_reflect.s1p", Method::SeriesReference),
    ] {
        let attempt = sweep_support::one(
            &reference_file(&format!("touchstone/{file}")),
            &station(method, None),
        );
        assert_eq!(codes(&attempt), ["method_mismatch"], "{file} {method:?}");
    }
}

fn fixture_station(fixture: &str) -> reelgate::station::Station {
    let standard = |which: &str, resistance, inductance, capacitance| {
        Some(Standard {
            sweep: format!("sweeps/fixture/{fixture}_{which}.csv"),
            resistance,
            inductance,
            capacitance,
        })
    };
    let mut station = station(
        Method::Direct,
        Some(layout(&[
            (Column::Frequency, "f_Hz"),
            (Column::Resistance, "Z_re_ohm"),
            (Column::Reactance, "Z_im_ohm"),
        ])),
    );
    station.compensation.open = standard("open", 0.0, 0.0, 0.0);
    station.compensation.short = standard("short", 0.12e-3, 0.15e-9, 0.0);
    station.compensation.load = standard("load", 49.9, 0.6e-9, 5e-14);
    station
}

fn standards(station: &reelgate::station::Station, fixture: &str) -> Standards {
    let files: Vec<RawFile> = ["open", "short", "load"]
        .iter()
        .map(|s| reference_file(&format!("sweeps/fixture/{fixture}_{s}.csv")))
        .collect();
    Standards::read(&files, station).unwrap_or_else(|e| panic!("{e:?}"))
}

#[test]
fn a_lumped_jig_is_compensated_from_standards_on_a_coarser_list() {
    // Standards at 10 a decade, part at 50: the interpolation as R, L and G, C leaves 1e-4 of
    // the arm; as plain real and imaginary part it would leave 18 % at resonance.
    for (name, tolerance) in [
        ("mlcc_4u7_0805_x7r", 3e-3),
        ("mlcc_100n_0402_x7r", 3e-3),
        ("polymer_47u", 3e-3),
        ("c0g_1n_0402", 3e-3),
    ] {
        let file = reference_file(&format!("sweeps/fixture/F1_dut_{name}.csv"));
        for with_load in [true, false] {
            let mut station = fixture_station("F1");
            if !with_load {
                station.compensation.load = None;
            }
            let standards = standards(&station, "F1");
            let attempt = read_file(&file, &station, Some(&standards)).remove(0);
            let sweep = attempt.sweep.unwrap_or_else(|e| panic!("{name}: {e:?}"));
            let error = largest_error(&sweep, &part(name));
            println!("{name} load {with_load}: {error:e}");
            assert!(error < tolerance, "{name} load {with_load}: {error:e}");
        }
    }
}

#[test]
fn standards_that_are_named_must_be_used() {
    let station = fixture_station("F1");
    let file = reference_file("sweeps/fixture/F1_dut_mlcc_4u7_0805_x7r.csv");
    assert_eq!(
        codes(&sweep_support::one(&file, &station)),
        ["compensation_missing"]
    );
    let faults = Standards::read(&[], &station).expect_err("nothing there");
    assert_eq!(
        faults.iter().map(|f| f.code.as_str()).collect::<Vec<_>>(),
        ["standard_missing"; 3]
    );
    // Open and short mixed up.
    let mut mixed = station.clone();
    std::mem::swap(&mut mixed.compensation.open, &mut mixed.compensation.short);
    let files: Vec<RawFile> = ["open", "short", "load"]
        .iter()
        .map(|s| reference_file(&format!("sweeps/fixture/F1_{s}.csv")))
        .collect();
    assert_eq!(
        Standards::read(&files, &mixed).expect_err("mixed up")[0].code,
        "standard_implausible"
    );
    // A load that is another one, and a short whose contact flickers at one point.
    let mut wrong = station.clone();
    if let Some(load) = &mut wrong.compensation.load {
        load.resistance = 100.0;
    }
    let fault = &Standards::read(&files, &wrong).expect_err("another load")[0];
    assert_eq!(fault.code, "standard_implausible");
    assert!(fault.text.contains("0.499 times"), "{fault:?}");
    let mut flickers = files.clone();
    let text = String::from_utf8_lossy(&files[1].bytes).into_owned();
    let lines: Vec<String> = text
        .lines()
        .enumerate()
        .map(|(i, line)| {
            let (f, z) = line.split_once(',').expect("columns");
            let (re, im) = z.split_once(',').expect("columns");
            match re.parse::<f64>() {
                Ok(re) if i == 30 => format!("{f},{},{im}", re + 0.05),
                _ => line.to_owned(),
            }
        })
        .collect();
    flickers[1].bytes = (lines.join("\n") + "\n").into_bytes();
    let fault = &Standards::read(&flickers, &station).expect_err("a bad contact")[0];
    // On so coarse a list one point off and a step look alike.
    assert!(
        ["intermittent_contact", "step_in_sweep"].contains(&fault.code.as_str()),
        "{fault:?}"
    );
    assert!(fault.text.starts_with("short standard, "), "{fault:?}");
    // With cable in the jig the standards are as sound.
    for fixture in ["F1", "F2"] {
        standards(&fixture_station(fixture), fixture);
    }
    // A standard that does not reach as far as the sweep.
    let mut short = files.clone();
    let text = String::from_utf8_lossy(&short[1].bytes)
        .lines()
        .take(30)
        .collect::<Vec<_>>()
        .join("\n")
        + "\n";
    short[1].bytes = text.into_bytes();
    let standards = Standards::read(&short, &station).expect("readable");
    let attempt = read_file(&file, &station, Some(&standards)).remove(0);
    assert_eq!(codes(&attempt), ["compensation_range"]);
    // A damaged standard.
    let mut damaged = files;
    damaged[2].bytes.truncate(700);
    let fault = &Standards::read(&damaged, &station).expect_err("damaged")[0];
    assert!(fault.text.contains("F1_load.csv"), "{}", fault.text);
    let mut alone = station;
    alone.compensation.open = None;
    alone.compensation.short = None;
    damaged
        .iter_mut()
        .for_each(|f| *f = reference_file(&f.name));
    assert_eq!(
        Standards::read(&damaged, &alone).expect_err("load alone")[0].code,
        "compensation_incomplete"
    );
}
