//! Reference parts as exact networks, their sweeps with and without noise, and the delivered files.
//!
//! The parts are finite R-L-C networks, so the impedance is exact to rounding at any frequency;
//! the figures of merit in `reference/readings/true_values.csv` were computed from the same
//! networks with 50 digits (mpmath 1.4.1). All parts are invented.
#![allow(dead_code)]

pub mod bound;

use num_complex::Complex64;
use reelgate::readings::{Budget, Characteristic, Equivalent, Extremes, Place, Request};
use reelgate::station::{Method, Station, Uncertainty};
use reelgate::sweep::Sweep;
use std::f64::consts::TAU;

/// A two-terminal network.
pub enum Network {
    R(f64),
    L(f64),
    C(f64),
    Series(Vec<Network>),
    Parallel(Vec<Network>),
}

use Network::{C, L, Parallel, R, Series};

impl Network {
    pub fn impedance(&self, f: f64) -> Complex64 {
        let jw = Complex64::new(0.0, TAU * f);
        match self {
            R(r) => Complex64::new(*r, 0.0),
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

/// A relaxing branch: capacitance with its corner; R carries six digits as in the netlists.
fn debye(c: f64, corner: f64) -> Network {
    let r = 1.0 / (TAU * corner * c);
    Series(vec![R(format!("{r:.5e}").parse().unwrap()), C(c)])
}

fn rl(r: f64, l: f64) -> Network {
    Parallel(vec![R(r), L(l)])
}

/// A capacitor with a leakage and eight relaxations one decade apart from 31.6 Hz.
fn dispersive(c: f64, leakage: f64, step: f64) -> Network {
    let mut all = vec![C(c), R(leakage)];
    all.extend((0..8).map(|k| debye(step, 31.6 * 10f64.powi(k))));
    Parallel(all)
}

/// A reference part.
pub struct Part {
    pub name: &'static str,
    pub network: Network,
}

/// The six reference parts.
pub fn parts() -> Vec<Part> {
    let part = |name, network| Part { name, network };
    vec![
        part(
            "mlcc_100n_0402_x7r",
            Series(vec![
                R(14e-3),
                L(0.30e-9),
                rl(3e-3, 60e-12),
                rl(8e-3, 40e-12),
                rl(30e-3, 20e-12),
                dispersive(78e-9, 10e9, 2.85e-9),
            ]),
        ),
        part(
            "mlcc_4u7_0805_x7r",
            Series(vec![
                R(2.2e-3),
                L(0.45e-9),
                rl(1.2e-3, 80e-12),
                rl(3e-3, 60e-12),
                rl(10e-3, 40e-12),
                dispersive(3.35e-6, 100e6, 0.19e-6),
            ]),
        ),
        part("polymer_47u", polymer()),
        part(
            "c0g_1n_0402",
            Series(vec![
                R(45e-3),
                L(0.34e-9),
                rl(25e-3, 60e-12),
                rl(60e-3, 40e-12),
                dispersive(1.004e-9, 100e9, 0.29e-12),
            ]),
        ),
        part("alu_330u", electrolytic()),
        part(
            "film_1u_pp",
            Series(vec![
                R(4e-3),
                L(10e-9),
                rl(3e-3, 1.5e-9),
                rl(15e-3, 1e-9),
                dispersive(0.9935e-6, 30e9, 0.29e-9),
            ]),
        ),
    ]
}

pub fn part(name: &str) -> Part {
    parts()
        .into_iter()
        .find(|p| p.name == name)
        .expect("a reference part")
}

fn polymer() -> Network {
    let third = Parallel(vec![C(12e-6), Series(vec![R(40e-3), C(8e-6)])]);
    let second = Parallel(vec![C(13e-6), Series(vec![R(14e-3), third])]);
    let first = Parallel(vec![
        C(13e-6),
        R(100e3),
        debye(0.9e-6, 30.0),
        debye(0.9e-6, 200.0),
        debye(0.4e-6, 1e3),
        Series(vec![R(6e-3), second]),
    ]);
    Series(vec![
        R(4e-3),
        L(1.4e-9),
        rl(2e-3, 0.3e-9),
        rl(8e-3, 0.2e-9),
        R(2e-3),
        first,
    ])
}

fn electrolytic() -> Network {
    let third = Parallel(vec![C(70e-6), Series(vec![R(400e-3), C(20e-6)])]);
    let second = Parallel(vec![C(110e-6), Series(vec![R(150e-3), third])]);
    let first = Parallel(vec![
        C(105e-6),
        R(50e3),
        debye(8e-6, 5.0),
        debye(14e-6, 40.0),
        debye(12e-6, 300.0),
        Series(vec![R(60e-3), second]),
    ]);
    Series(vec![
        R(45e-3),
        L(11e-9),
        rl(30e-3, 3e-9),
        rl(100e-3, 2e-9),
        R(20e-3),
        first,
    ])
}

/// A logarithmic grid from `from` up to `to`, `per_decade` points a decade.
pub fn grid(from: f64, to: f64, per_decade: usize) -> Vec<f64> {
    let n = (per_decade as f64 * (to / from).log10() + 1e-9).floor() as i32;
    (0..=n)
        .map(|k| from * 10f64.powf(f64::from(k) / per_decade as f64))
        .collect()
}

pub fn clean(network: &Network, frequency: &[f64]) -> Sweep {
    Sweep {
        frequency: frequency.to_vec(),
        impedance: frequency.iter().map(|f| network.impedance(*f)).collect(),
        level: None,
    }
}

/// Multiplies each impedance by `(1 + magnitude n1) exp(j phase n2)`; `phase` in rad.
pub fn noisy(sweep: &Sweep, magnitude: f64, phase: f64, random: &mut Random) -> Sweep {
    let mut noisy = sweep.clone();
    for z in &mut noisy.impedance {
        let (n1, n2) = random.normal_pair();
        *z *= (1.0 + magnitude * n1) * Complex64::from_polar(1.0, phase * n2);
    }
    noisy
}

/// SplitMix64 with the Box-Muller transform: the same numbers on every machine.
pub struct Random(u64);

impl Random {
    pub fn new(seed: u64) -> Random {
        Random(seed.wrapping_mul(0x2545_F491_4F6C_DD1D) ^ 0x9E37_79B9_7F4A_7C15)
    }

    /// Uniform in (0, 1).
    pub fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        ((z ^ (z >> 31)) as f64 + 0.5) / 18_446_744_073_709_551_616.0
    }

    /// Two independent standard normal deviates.
    pub fn normal_pair(&mut self) -> (f64, f64) {
        let radius = (-2.0 * self.uniform().ln()).sqrt();
        let angle = TAU * self.uniform();
        (radius * angle.cos(), radius * angle.sin())
    }
}

fn reference(path: &str) -> String {
    let path = format!(
        "{}/tests/reference/readings/{path}",
        env!("CARGO_MANIFEST_DIR")
    );
    std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}"))
}

/// A delimited reference file: heading and rows as text.
pub fn table(path: &str) -> (Vec<String>, Vec<Vec<String>>) {
    let mut reader = csv::Reader::from_reader(std::io::Cursor::new(reference(path)));
    let heading = reader
        .headers()
        .unwrap()
        .iter()
        .map(str::to_owned)
        .collect();
    let rows = reader
        .records()
        .map(|row| row.unwrap().iter().map(str::to_owned).collect())
        .collect();
    (heading, rows)
}

pub fn json(path: &str) -> serde_json::Value {
    serde_json::from_str(&reference(path)).expect("a JSON reference file")
}

/// One figure of merit of a part from `true_values.csv`.
pub fn truth(part: &str, quantity: &str) -> f64 {
    let (heading, rows) = table("true_values.csv");
    let column = heading
        .iter()
        .position(|h| h == quantity)
        .expect("a column");
    let row = rows.iter().find(|r| r[0] == part).expect("a part");
    row[column].parse().expect("a number")
}

/// A sweep of two voltage channels over a series reference: `Z = Zref B/(A − B)`.
pub fn two_channel(path: &str, resistance: f64, inductance: f64) -> Sweep {
    let (_, rows) = table(path);
    let mut sweep = Sweep {
        frequency: vec![],
        impedance: vec![],
        level: None,
    };
    for row in rows {
        let v: Vec<f64> = row.iter().map(|t| t.parse().unwrap()).collect();
        let (a, b) = (Complex64::new(v[1], v[2]), Complex64::new(v[3], v[4]));
        sweep.frequency.push(v[0]);
        sweep
            .impedance
            .push(Complex64::new(resistance, TAU * v[0] * inductance) * b / (a - b));
    }
    sweep
}

/// A two-port Touchstone file in hertz and RI over 50 Ω, the part in shunt: `Z = 25 S21/(1−S21)`.
pub fn shunt_through(path: &str) -> Sweep {
    through(path, |s21| 25.0 * s21 / (1.0 - s21))
}

/// The same with the part in series: `Z = 100 (1−S21)/S21`.
pub fn series_through(path: &str) -> Sweep {
    through(path, |s21| 100.0 * (1.0 - s21) / s21)
}

fn through(path: &str, impedance: impl Fn(Complex64) -> Complex64) -> Sweep {
    let mut sweep = Sweep {
        frequency: vec![],
        impedance: vec![],
        level: None,
    };
    for line in reference(path)
        .lines()
        .filter(|l| !l.starts_with(['!', '#']))
    {
        let v: Vec<f64> = line
            .split_whitespace()
            .map(|t| t.parse().unwrap())
            .collect();
        sweep.frequency.push(v[0]);
        sweep.impedance.push(impedance(Complex64::new(v[3], v[4])));
    }
    sweep
}

/// A station that states these standard uncertainties and nothing else.
pub fn station(magnitude: f64, phase: f64) -> Station {
    Station {
        name: "TEST".into(),
        instrument: None,
        jig: None,
        method: Method::Direct,
        reference: None,
        layout: None,
        compensation: Default::default(),
        uncertainty: Uncertainty {
            magnitude: Some(magnitude),
            phase: Some(phase),
            temperature: None,
            repeatability: vec![],
        },
        watch: None,
        instrument_link: None,
        jig_check: None,
    }
}

/// A budget in which the fit's scatter is the only contribution.
pub fn scatter_only() -> Budget {
    Budget::of(&station(0.0, 0.0))
}

pub fn at(characteristic: Characteristic, frequency: f64) -> Request {
    Request {
        characteristic,
        place: Place::At(frequency),
        equivalent: Equivalent::Series,
    }
}

pub fn anywhere(characteristic: Characteristic) -> Request {
    Request {
        characteristic,
        place: Place::Anywhere,
        equivalent: Equivalent::Series,
    }
}

pub fn read(sweep: &Sweep, request: &Request) -> Extremes {
    reelgate::readings::read(sweep, request, &scatter_only())
}

/// The known value of a reading; fails the test with what the reading says where there is none.
pub fn value(sweep: &Sweep, request: &Request) -> f64 {
    let reading = read(sweep, request).lowest;
    reading
        .known_value()
        .unwrap_or_else(|| panic!("{request:?}: {reading:?}"))
}
