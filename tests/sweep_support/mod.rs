//! Stations, and the reference parts as networks of ideal R, L and C with exactly known impedance.
#![allow(dead_code)]

use num_complex::Complex64;
use reelgate::station::{Column, Compensation, Layout, Method, Reference, Station, Uncertainty};
use reelgate::sweep::{Attempt, RawFile, Sweep, read_file};
use std::f64::consts::TAU;
use std::path::PathBuf;

/// A network of ideal elements.
pub enum Net {
    R(f64),
    L(f64),
    C(f64),
    Series(Vec<Net>),
    Parallel(Vec<Net>),
}
use Net::{C, L, Parallel, R, Series};

impl Net {
    pub fn impedance(&self, f: f64) -> Complex64 {
        let jw = Complex64::new(0.0, TAU * f);
        match self {
            R(r) => (*r).into(),
            L(l) => jw * l,
            C(c) => (jw * c).inv(),
            Series(all) => all.iter().map(|n| n.impedance(f)).sum(),
            Parallel(all) => all
                .iter()
                .map(|n| n.impedance(f).inv())
                .sum::<Complex64>()
                .inv(),
        }
    }
}

fn rl(r: f64, l: f64) -> Net {
    Parallel(vec![R(r), L(l)])
}

/// Series R-C with its corner at `f0`; R has six significant digits, as in the netlists.
fn relaxation(c: f64, f0: f64) -> Net {
    let r: f64 = format!("{:.5e}", 1.0 / (TAU * f0 * c))
        .parse()
        .expect("number");
    Series(vec![R(r), C(c)])
}

fn decades(c: f64, first: f64, n: i32) -> impl Iterator<Item = Net> {
    (0..n).map(move |k| relaxation(c, first * 10f64.powi(k)))
}

/// The reference parts by name: class 2 and class 1 ceramic, polymer, electrolytic, film.
pub fn part(name: &str) -> Net {
    match name {
        "mlcc_100n_0402_x7r" => {
            let mut body = vec![C(78e-9), R(10e9)];
            body.extend(decades(2.85e-9, 31.6, 8));
            Series(vec![
                R(14e-3),
                L(0.30e-9),
                rl(3e-3, 60e-12),
                rl(8e-3, 40e-12),
                rl(30e-3, 20e-12),
                Parallel(body),
            ])
        }
        "mlcc_4u7_0805_x7r" => {
            let mut body = vec![C(3.35e-6), R(100e6)];
            body.extend(decades(0.19e-6, 31.6, 8));
            Series(vec![
                R(2.2e-3),
                L(0.45e-9),
                rl(1.2e-3, 80e-12),
                rl(3e-3, 60e-12),
                rl(10e-3, 40e-12),
                Parallel(body),
            ])
        }
        "c0g_1n_0402" => {
            let mut body = vec![C(1.004e-9), R(100e9)];
            body.extend(decades(0.29e-12, 31.6, 8));
            Series(vec![
                R(45e-3),
                L(0.34e-9),
                rl(25e-3, 60e-12),
                rl(60e-3, 40e-12),
                Parallel(body),
            ])
        }
        "film_1u_pp" => {
            let mut body = vec![C(0.9935e-6), R(30e9)];
            body.extend(decades(0.29e-9, 31.6, 8));
            Series(vec![
                R(4e-3),
                L(10e-9),
                rl(3e-3, 1.5e-9),
                rl(15e-3, 1e-9),
                Parallel(body),
            ])
        }
        "polymer_47u" => {
            let ladder = Series(vec![
                R(6e-3),
                Parallel(vec![
                    C(13e-6),
                    Series(vec![
                        R(14e-3),
                        Parallel(vec![C(12e-6), Series(vec![R(40e-3), C(8e-6)])]),
                    ]),
                ]),
            ]);
            let body = vec![
                C(13e-6),
                R(100e3),
                relaxation(0.9e-6, 30.0),
                relaxation(0.9e-6, 200.0),
                relaxation(0.4e-6, 1e3),
                ladder,
            ];
            Series(vec![
                R(4e-3),
                L(1.4e-9),
                rl(2e-3, 0.3e-9),
                rl(8e-3, 0.2e-9),
                R(2e-3),
                Parallel(body),
            ])
        }
        "alu_330u" => {
            let ladder = Series(vec![
                R(60e-3),
                Parallel(vec![
                    C(110e-6),
                    Series(vec![
                        R(150e-3),
                        Parallel(vec![C(70e-6), Series(vec![R(400e-3), C(20e-6)])]),
                    ]),
                ]),
            ]);
            let body = vec![
                C(105e-6),
                R(50e3),
                relaxation(8e-6, 5.0),
                relaxation(14e-6, 40.0),
                relaxation(12e-6, 300.0),
                ladder,
            ];
            Series(vec![
                R(45e-3),
                L(11e-9),
                rl(30e-3, 3e-9),
                rl(100e-3, 2e-9),
                R(20e-3),
                Parallel(body),
            ])
        }
        other => panic!("no part {other}"),
    }
}

pub const PARTS: [&str; 6] = [
    "mlcc_100n_0402_x7r",
    "mlcc_4u7_0805_x7r",
    "polymer_47u",
    "alu_330u",
    "film_1u_pp",
    "c0g_1n_0402",
];

pub fn layout(columns: &[(Column, &str)]) -> Layout {
    Layout {
        columns: columns.iter().map(|(c, h)| (*c, (*h).to_owned())).collect(),
        peak: false,
    }
}

/// The columns of the two-channel reference sweeps.
pub fn two_channel() -> Layout {
    layout(&[
        (Column::Frequency, "f_Hz"),
        (Column::ARe, "A_re_V"),
        (Column::AIm, "A_im_V"),
        (Column::BRe, "B_re_V"),
        (Column::BIm, "B_im_V"),
    ])
}

pub fn resistance_reactance() -> Layout {
    layout(&[
        (Column::Frequency, "f_Hz"),
        (Column::Resistance, "Z_re_ohm"),
        (Column::Reactance, "Z_im_ohm"),
    ])
}

pub fn station(method: Method, layout: Option<Layout>) -> Station {
    Station {
        name: "BENCH-T".to_owned(),
        instrument: None,
        jig: None,
        method,
        reference: (method == Method::SeriesReference).then_some(Reference {
            resistance: 1.0,
            tolerance: 0.0,
            inductance: 0.3e-9,
        }),
        layout,
        compensation: Compensation::default(),
        uncertainty: Uncertainty::default(),
        watch: None,
        instrument_link: None,
        jig_check: None,
    }
}

pub fn reference_file(path: &str) -> RawFile {
    let full = PathBuf::from(env!("CARGO_MANIFEST_DIR"))
        .join("tests/reference")
        .join(path);
    let bytes = std::fs::read(&full).unwrap_or_else(|e| panic!("{}: {e}", full.display()));
    RawFile {
        name: path.to_owned(),
        bytes,
    }
}

pub fn one(file: &RawFile, station: &Station) -> Attempt {
    let mut attempts = read_file(file, station, None);
    assert_eq!(attempts.len(), 1);
    attempts.remove(0)
}

pub fn sweep(file: &RawFile, station: &Station) -> Sweep {
    let attempt = one(file, station);
    attempt
        .sweep
        .unwrap_or_else(|faults| panic!("{}: {faults:?}", file.name))
}

/// Largest relative error of the impedance against the part's own.
pub fn largest_error(sweep: &Sweep, part: &Net) -> f64 {
    let error = |(f, z): (&f64, &Complex64)| {
        let truth = part.impedance(*f);
        ((z - truth) / truth).norm()
    };
    sweep
        .frequency
        .iter()
        .zip(&sweep.impedance)
        .map(error)
        .fold(0.0, f64::max)
}

pub fn codes(attempt: &Attempt) -> Vec<String> {
    match &attempt.sweep {
        Ok(_) => Vec::new(),
        Err(faults) => faults.iter().map(|f| f.code.clone()).collect(),
    }
}

/// Normal random numbers from a seed (SplitMix64 and Box-Muller): the same on every machine.
pub struct Random(pub u64);

impl Random {
    fn unit(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 53) as f64
    }

    pub fn uniform(&mut self, from: f64, to: f64) -> f64 {
        from + (to - from) * self.unit()
    }

    /// Complex normal with unit mean square.
    pub fn complex(&mut self) -> Complex64 {
        let radius = (-(1.0 - self.unit()).ln()).sqrt();
        Complex64::from_polar(radius, TAU * self.unit())
    }
}
