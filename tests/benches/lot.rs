//! Where the time of judging a lot goes: reading, readings, statistics, PDF, each apart, and each as
//! a ratio to a floor measured in the same run.
//!
//! Below the table stands what a sweep's numbers cost beside getting them: validity, readings and
//! equivalent circuit, each as a ratio to reading and parsing the same files with the csv crate, which
//! is what a program like this would be written with; and the three together also beside what getting
//! them costs here, with and without the digest that the record needs.
//!
//! The floor is what cannot be saved: the SHA-256 of the sweep files' bytes, which the record needs.
//! `cargo bench --bench lot` prints a table; `-- 1250` sets the number of parts (125 where none is
//! given), each with 401 points.

use num_complex::Complex64;
use reelgate::certificate::{self, Curve, Paper};
use reelgate::judgement::{judge_part, judge_try};
use reelgate::readings::{Budget, Characteristic, Equivalent, Place, Reader, Request, circuit};
use reelgate::record::{Occasion, Sources, make, sha256};
use reelgate::statistics::sampling::Severity;
use reelgate::sweep::validity::{self, Evidence};
use reelgate::sweep::{Attempt, RawFile, Sweep, read_file};
use std::f64::consts::TAU;
use std::hint::black_box;
use std::io::Write;
use std::time::{Duration, Instant};

const POINTS: usize = 401;
const RUNS: usize = 15;

const LOT: &str = "lot: BENCHMARK\npart: RG-0475-X7R\nquantity: 100000\nstation: BENCH-1\nmeasured: 2026-10-05T09:12:00+02:00\nsweeps: sweeps\n";
const LIMITS: &str = "part: RG-0475-X7R
revision: 1
characteristics:
  capacitance: {at: 1 kHz, nominal: 4.7 µF, tolerance: ±10 %}
  dissipation_factor: {at: 1 kHz, max: 5 %}
  esr: {at: 1 MHz, max: 20 mΩ}
  impedance: {at: 100 kHz, max: 0.45 Ω}
  esr_minimum: {max: 6 mΩ}
  srf: {min: 1 MHz}
acceptance: {fixed: {sample: 32, accept: 0}}
";
const STATION: &str = "station: BENCH-1
method: direct
layout: {columns: {frequency: Frequency (Hz), resistance: R (Ohm), reactance: X (Ohm)}}
uncertainty: {magnitude: 0.2 %, phase: 0.05 °}
";

/// A number in -0.5 .. 0.5 that looks random and is always the same.
fn scatter(i: usize, part: usize, k: usize) -> f64 {
    let mut x = (i as u64) << 32 ^ (part as u64) << 8 ^ k as u64;
    for _ in 0..3 {
        x = (x ^ x >> 31).wrapping_mul(0x9E37_79B9_7F4A_7C15);
    }
    (x >> 11) as f64 / (1u64 << 53) as f64 - 0.5
}

/// A sweep of a series R-L-C whose dielectric has a constant loss angle, and with it the dispersion
/// that goes with one; the values are invented.
fn sweep(part: usize) -> RawFile {
    let (c, l) = (4.65e-6 * (1.0 + 0.04 * scatter(0, part, 9)), 0.5e-9);
    let exponent = -(1.0 - 0.02 * std::f64::consts::FRAC_2_PI);
    let mut bytes = b"Frequency (Hz),R (Ohm),X (Ohm)\n".to_vec();
    for i in 0..POINTS {
        let f = 1e3 * 65e3f64.powf(i as f64 / (POINTS - 1) as f64);
        let w = TAU * f;
        let dielectric = Complex64::new(0.0, f / 1e3).powf(exponent) / (TAU * 1e3 * c);
        let noise = Complex64::new(1.0 + 2e-3 * scatter(i, part, 1), 6e-4 * scatter(i, part, 2));
        let z = (dielectric + Complex64::new(3e-3, w * l)) * noise;
        let _ = writeln!(bytes, "{f:.3},{:.7e},{:.7e}", z.re, z.im);
    }
    RawFile {
        name: format!("sweeps/{part:04}.csv"),
        bytes,
    }
}

fn text(name: &str, text: &str) -> RawFile {
    RawFile {
        name: name.to_owned(),
        bytes: text.as_bytes().to_vec(),
    }
}

/// Median of several runs.
fn time<T>(mut work: impl FnMut() -> T) -> Duration {
    let mut all: Vec<Duration> = (0..RUNS)
        .map(|_| {
            let start = Instant::now();
            black_box(work());
            start.elapsed()
        })
        .collect();
    all.sort();
    all[RUNS / 2]
}

fn main() {
    let parts = std::env::args()
        .skip(1)
        .find_map(|a| a.parse().ok())
        .unwrap_or(125);
    let sources = Sources {
        site: None,
        lot: text("lot.yaml", LOT),
        limits: text("limits/parts/RG-0475-X7R.yaml", LIMITS),
        station: text("limits/stations/BENCH-1.yaml", STATION),
        compensation: vec![],
        sweeps: (1..=parts).map(sweep).collect(),
    };
    let limits = reelgate::limits::read(&sources.limits.name, &sources.limits.bytes)
        .expect("the limit file");
    let station = reelgate::station::read(&sources.station.name, &sources.station.bytes)
        .expect("the station file");
    let lot = reelgate::lot::read(&sources.lot.name, &sources.lot.bytes).expect("the lot file");
    let budget = Budget::of(&station);
    let attempts: Vec<Attempt> = sources
        .sweeps
        .iter()
        .flat_map(|f| read_file(f, &station, None))
        .collect();
    let judge = |a: &Attempt| {
        judge_part(
            &[(a, judge_try(a, &limits, &budget, None), None)],
            &limits.retest,
        )
        .0
    };
    let records: Vec<_> = attempts.iter().map(judge).collect();
    let plan =
        reelgate::lot::plan(&limits.acceptance, lot.quantity, Severity::Normal).expect("a plan");
    let occasion = Occasion {
        approvals: Default::default(),
        issued: "2026-10-05T10:00:00+02:00".to_owned(),
        severity: Severity::Normal,
        history: reelgate::lot::History::default(),
        supersedes: None,
        further: vec![],
    };
    let whole = || make(&sources, &occasion, &|| ()).expect("a record");
    let made = whole();
    assert_eq!(
        made.record.sampling.unmeasured,
        0,
        "{:?}",
        made.record.parts.iter().find(|p| !p.faults.is_empty())
    );
    let curves: Vec<Curve> = made
        .curves
        .iter()
        .map(|c| Curve {
            part: c.part.clone(),
            verdict: c.verdict,
            frequency: c.sweep.frequency.clone(),
            impedance: c.sweep.impedance.clone(),
        })
        .collect();
    let files = certificate::Sources {
        limit_file: Some(LIMITS),
        station_file: Some(STATION),
        ledger: None,
        signature: None,
    };

    let floor = time(|| {
        sources
            .sweeps
            .iter()
            .map(|f| sha256(&f.bytes))
            .collect::<Vec<_>>()
    });
    let rows = [
        ("floor: SHA-256 of the sweep files", floor),
        (
            "reading and validity, one core",
            time(|| {
                sources
                    .sweeps
                    .iter()
                    .map(|f| read_file(f, &station, None))
                    .collect::<Vec<_>>()
            }),
        ),
        (
            "readings and judgement, one core",
            time(|| attempts.iter().map(judge).collect::<Vec<_>>()),
        ),
        (
            "plan, conditions, statistics",
            time(|| {
                reelgate::lot::judge(
                    &lot,
                    &limits,
                    &station,
                    &plan,
                    &records,
                    vec![],
                    &reelgate::lot::History::default(),
                )
            }),
        ),
        ("the whole record, all cores", time(whole)),
        ("JSON", time(|| reelgate::record::to_bytes(&made.record))),
        (
            "PDF",
            time(|| certificate::render(&made.record, &curves, &files, Paper::A4)),
        ),
    ];
    let pieces = pieces(&sources, &station, &budget, &attempts, &judge);
    let mut out = std::io::stdout().lock();
    let _ = writeln!(
        out,
        "{parts} parts of {POINTS} points, median of {RUNS} runs\n"
    );
    for (name, duration) in rows {
        let ratio = duration.as_secs_f64() / floor.as_secs_f64();
        let _ = writeln!(
            out,
            "{name:<36} {:>10.2} ms {ratio:>8.2} × floor",
            duration.as_secs_f64() * 1e3
        );
    }
    let _ = writeln!(out, "\neach sweep, one core");
    let each = |duration: &Duration| duration.as_secs_f64() * 1e6 / parts as f64;
    let [csv, parsing, digest, valid, read, fit] = [0, 1, 2, 3, 4, 5].map(|k| each(&pieces[k].1));
    for (name, duration) in &pieces {
        let each = each(duration);
        let _ = writeln!(
            out,
            "{name:<44} {each:>10.1} µs {:>8.2} × the csv crate",
            each / csv
        );
    }
    let beside = valid + read + fit;
    for (name, getting) in [
        ("the csv crate", csv),
        ("reading and parsing", parsing),
        ("reading, digest and parsing", parsing + digest),
    ] {
        let _ = writeln!(
            out,
            "{:<44} {beside:>10.1} µs {:>8.2} × {name}",
            "validity, readings and circuit",
            beside / getting
        );
    }
}

/// The files' numbers by the csv crate with the standard library's numbers: a floor that a careful
/// program has without work of its own.
fn by_csv_crate(file: &RawFile) -> Vec<[f64; 3]> {
    let mut reader = csv::Reader::from_reader(file.bytes.as_slice());
    let mut record = csv::ByteRecord::new();
    let mut rows = Vec::new();
    while reader.read_byte_record(&mut record).expect("rows") {
        let value = |i: usize| -> f64 {
            let text = std::str::from_utf8(&record[i]).expect("text");
            text.parse().expect("a number")
        };
        rows.push([value(0), value(1), value(2)]);
    }
    rows
}

fn each<I, T>(items: &[I], work: impl Fn(&I) -> T) -> Vec<T> {
    items.iter().map(work).collect()
}

/// What the limit file bounds.
const REQUESTS: [Request; 6] = [
    request(Characteristic::Capacitance, Place::At(1e3)),
    request(Characteristic::DissipationFactor, Place::At(1e3)),
    request(Characteristic::Esr, Place::At(1e6)),
    request(Characteristic::Impedance, Place::At(1e5)),
    request(Characteristic::EsrMinimum, Place::Anywhere),
    request(Characteristic::Srf, Place::Anywhere),
];

const fn request(characteristic: Characteristic, place: Place) -> Request {
    Request {
        characteristic,
        place,
        equivalent: Equivalent::Series,
    }
}

/// What a sweep costs beside getting it.
fn pieces(
    sources: &Sources,
    station: &reelgate::station::Station,
    budget: &Budget,
    attempts: &[Attempt],
    judge: &dyn Fn(&Attempt) -> reelgate::judgement::PartRecord,
) -> Vec<(&'static str, Duration)> {
    let evidence = Evidence::of(station);
    let sweeps: Vec<&Sweep> = attempts
        .iter()
        .filter_map(|a| a.sweep.as_ref().ok())
        .collect();
    let read = |f: &RawFile| read_file(f, station, None);
    let readings = |s: &&Sweep| {
        let reader = Reader::new(s, budget);
        REQUESTS.map(|request| reader.read(&request))
    };
    // In turn, so that whatever else the machine does falls on all of them alike.
    let mut steps: [&mut dyn FnMut(); 7] = [
        &mut || drop(black_box(each(&sources.sweeps, by_csv_crate))),
        &mut || drop(black_box(each(&sources.sweeps, |f| sha256(&f.bytes)))),
        &mut || drop(black_box(each(&sources.sweeps, read))),
        &mut || drop(black_box(each(&sweeps, |s| validity::check(s, &evidence)))),
        &mut || drop(black_box(each(&sweeps, readings))),
        &mut || drop(black_box(each(attempts, judge))),
        &mut || drop(black_box(each(&sweeps, |s| circuit::fit(s)))),
    ];
    let mut durations: [Vec<Duration>; 7] = Default::default();
    for _ in 0..RUNS {
        for (step, durations) in steps.iter_mut().zip(&mut durations) {
            let start = Instant::now();
            step();
            durations.push(start.elapsed());
        }
    }
    let [csv, digest, whole, valid, readings, judged, fit] = durations.map(|mut all| {
        all.sort();
        all[RUNS / 2]
    });
    vec![
        ("reading and parsing by the csv crate", csv),
        (
            "reading and parsing (without digest, validity)",
            whole.saturating_sub(digest + valid),
        ),
        ("digest", digest),
        ("validity", valid),
        ("readings", readings),
        ("equivalent circuit", fit),
        ("judgement of the readings", judged.saturating_sub(readings)),
    ]
}
