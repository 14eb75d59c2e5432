//! Touchstone reading against scikit-rf (BSD-3-Clause, from the Python package index), on every
//! Touchstone file that its package ships.
//!
//! `tests/run` sets up the Python environment in `.venv`; `REELGATE_PYTHON` names another one.

use num_complex::Complex64;
use reelgate::sweep::touchstone;
use serde_json::Value;
use std::path::{Path, PathBuf};
use std::process::Command;

fn python() -> PathBuf {
    match std::env::var_os("REELGATE_PYTHON") {
        Some(python) => python.into(),
        None => Path::new(env!("CARGO_MANIFEST_DIR")).join(".venv/bin/python"),
    }
}

fn dump() -> Value {
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/tools/scikit_rf_dump.py");
    let python = python();
    let advice = "run tests/run once: it sets up Python with scikit-rf in .venv";
    let output = Command::new(&python)
        .arg(script)
        .output()
        .unwrap_or_else(|e| panic!("{}: {e}; {advice}", python.display()));
    let errors = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{errors}\n{advice}");
    serde_json::from_slice(&output.stdout).expect("the script writes JSON")
}

fn complex(list: &Value) -> Vec<Complex64> {
    let number = |v: &Value, i: usize| v[i].as_f64().expect("a number");
    let list = list.as_array().expect("a list");
    list.iter()
        .map(|v| Complex64::new(number(v, 0), number(v, 1)))
        .collect()
}

/// Largest difference, relative to the largest element of the network where it is above 1.
fn largest_difference(ours: &[Complex64], theirs: &[Complex64]) -> f64 {
    assert_eq!(ours.len(), theirs.len());
    let differ = |(a, b): (&Complex64, &Complex64)| (a - b).norm() / b.norm().max(1.0);
    ours.iter().zip(theirs).map(differ).fold(0.0, f64::max)
}

/// Matrix by matrix. 1-S loses digits as |Z| grows over the port impedance, and at an ideal open
/// (several of the files hold one) scikit-rf nudges S to stay finite: such points are left out.
/// A lossless junction has no impedance matrix at all. Returns the number of points compared.
fn compare_impedance(path: &str, ours: &[Complex64], theirs: &[Complex64], size: usize) -> usize {
    assert_eq!(ours.len(), theirs.len());
    let mut compared = 0;
    for (a, b) in ours.chunks(size).zip(theirs.chunks(size)) {
        let largest = b.iter().map(|z| z.norm()).fold(0.0, f64::max);
        if largest > 1e7 {
            continue;
        }
        let differ = a
            .iter()
            .zip(b)
            .map(|(x, y)| (x - y).norm())
            .fold(0.0, f64::max);
        assert!(
            differ <= 1e-10 * largest * (1.0 + largest / 50.0),
            "{path}: {differ:e} of {largest:e}"
        );
        compared += 1;
    }
    compared
}

#[test]
fn every_shipped_file_reads_the_same() {
    let dump = dump();
    let files = dump["files"].as_array().expect("files");
    // The package of version 2.2.0 ships 19; fewer would make this test hollow.
    assert!(files.len() >= 19, "only {} files", files.len());
    let mut with_impedance = 0;
    for file in files {
        let path = file["path"].as_str().expect("path");
        let ports = file["ports"].as_u64().expect("ports") as usize;
        let bytes = std::fs::read(path).expect("readable");
        let network =
            touchstone::read(&bytes, Some(ports)).unwrap_or_else(|e| panic!("{path}: {e:?}"));
        assert_eq!(network.ports, ports, "{path}");
        let frequency = file["frequency"].as_array().expect("frequencies");
        assert_eq!(network.frequency.len(), frequency.len(), "{path}");
        for (ours, theirs) in network.frequency.iter().zip(frequency) {
            let theirs = theirs.as_f64().expect("a number");
            assert!(
                (ours - theirs).abs() <= 1e-12 * theirs,
                "{path}: {ours} {theirs}"
            );
        }
        // Both read the same decimal text: only rounding of the polar forms may differ.
        let s = network.scattering().expect("scattering");
        assert!(
            largest_difference(&s, &complex(&file["s"])) < 1e-12,
            "{path}"
        );
        if let (Some(z), false) = (network.impedance(), file["z"].is_null()) {
            let compared = compare_impedance(path, &z, &complex(&file["z"]), ports * ports);
            with_impedance += usize::from(compared * 10 >= frequency.len() * 9);
        }
    }
    assert!(
        with_impedance >= 15,
        "only {with_impedance} files had an impedance to compare"
    );
}
