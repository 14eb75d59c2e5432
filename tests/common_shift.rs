//! A shift common to the whole lot: how often it is found where there is one and where there is
//! none, and what a lot record says of it.

use reelgate::lot::{Common, CommonShift, LotSeries, common_shift};
use reelgate::statistics::random::Random;
use reelgate::statistics::summary::quartiles_of;
use std::f64::consts::TAU;
use std::fmt::Write;
use std::fs;
use std::path::Path;
use std::process::Command;

const LOTS: usize = 12;
const PARTS: usize = 32;

/// Logarithms of what a part reads against the mean of all lots.
#[derive(Clone, Copy, Default)]
struct Part {
    capacitance: f64,
    resistance: f64,
    inductance: f64,
}

/// What a lot has beside its chance, part by part.
type Mark<'a> = &'a dyn Fn(usize, Part) -> Part;

/// An invented supplier: lots differ by 1 % in C, 4 % in R, 1 % in L (standard deviations), parts of
/// a lot by 1.5 %, 5 %, 1.5 %.
fn lot(random: &mut Random, mark: Mark) -> LotSeries {
    let of_lot = [0.01, 0.04, 0.01].map(|s| s * random.normal());
    let parts: Vec<Part> = (0..PARTS)
        .map(|i| {
            let mut draw = |k: usize, s: f64| of_lot[k] + s * random.normal();
            let part = Part {
                capacitance: draw(0, 0.015),
                resistance: draw(1, 0.05),
                inductance: draw(2, 0.015),
            };
            mark(i, part)
        })
        .collect();
    let of = |value: &dyn Fn(&Part) -> f64| {
        let all: Vec<f64> = parts.iter().map(|p| value(p).exp()).collect();
        quartiles_of(&all).expect("parts")
    };
    LotSeries {
        at: 1e3,
        n: PARTS as u64,
        capacitance: of(&|p| p.capacitance),
        srf: of(&|p| -0.5 * (p.capacitance + p.inductance)),
        resistance: of(&|p| p.resistance),
        esl: of(&|p| p.inductance),
    }
}

/// Shares of lots in which a scaled impedance, and a shifted ESL, is found.
fn found(seed: u64, runs: usize, mark: Mark) -> [f64; 2] {
    let mut random = Random::seeded(seed);
    let mut count = [0usize; 2];
    for _ in 0..runs {
        let before: Vec<LotSeries> = (0..LOTS).map(|_| lot(&mut random, &|_, p| p)).collect();
        let now = lot(&mut random, mark);
        match common_shift(now, &before, vec![]).found {
            Some(Common::ImpedanceScaled) => count[0] += 1,
            Some(Common::EslShifted) => count[1] += 1,
            _ => {}
        }
    }
    count.map(|c| c as f64 / runs as f64)
}

/// Every quantity of the lot and every lot normal: the two-sided level of 1 % is the most that may
/// be found, within what 4000 draws can tell (three standard deviations: 0.5 %).
#[test]
fn stable_lots_are_left_alone() {
    let [scaled, esl] = found(11, 4000, &|_, p| p);
    println!("stable: scaled {scaled}, ESL {esl}");
    assert!(scaled <= 0.002, "{scaled}");
    assert!(esl <= 0.015, "{esl}");
    assert!(
        esl > 0.001,
        "a test at 1 % that never errs tests nothing: {esl}"
    );
}

#[test]
fn a_jig_and_a_reference_are_found() {
    let inductance = |p: Part, by: f64| Part {
        inductance: p.inductance + f64::ln(by),
        ..p
    };
    // A jig that adds inductance: L alone.
    for (by, least) in [(1.05, 0.85), (1.10, 0.99)] {
        let [scaled, esl] = found(12, 1000, &|_, p| inductance(p, by));
        println!("ESL × {by}: scaled {scaled}, ESL {esl}");
        assert!(esl >= least && scaled <= 0.002, "{by}: {scaled} {esl}");
    }
    // A reference of 1/k of what is stated: |Z| reads k times.
    let reads = |p: Part, k: f64| Part {
        capacitance: p.capacitance - f64::ln(k),
        resistance: p.resistance + f64::ln(k),
        inductance: p.inductance + f64::ln(k),
    };
    for (k, least) in [(1.05, 0.6), (1.10, 0.95), (0.90, 0.95)] {
        let [scaled, esl] = found(13, 1000, &|_, p| reads(p, k));
        println!("|Z| × {k}: scaled {scaled}, ESL {esl}");
        assert!(scaled >= least, "{k}: {scaled} {esl}");
    }
}

/// A lot of more layers has more capacitance and less resistance, as by one factor, but its SRF has
/// moved; a third of the parts from elsewhere is no shift of the whole lot.
#[test]
fn what_parts_do_by_themselves_is_not_taken_for_the_bench() {
    let layers = |p: Part, k: f64| Part {
        capacitance: p.capacitance + f64::ln(k),
        resistance: p.resistance - f64::ln(k),
        ..p
    };
    for k in [1.03, 1.10, 0.92] {
        let [scaled, esl] = found(14, 1000, &|_, p| layers(p, k));
        println!("C × {k}, R / {k}: scaled {scaled}, ESL {esl}");
        assert!(scaled <= 0.01 && esl <= 0.02, "{k}: {scaled} {esl}");
    }
    let mixed = |i: usize, p: Part| Part {
        inductance: p.inductance + if i.is_multiple_of(3) { 0.3 } else { 0.0 },
        ..p
    };
    let [scaled, esl] = found(15, 1000, &mixed);
    println!("a third of the parts: scaled {scaled}, ESL {esl}");
    assert!(scaled <= 0.002 && esl <= 0.03, "{scaled} {esl}");
}

#[test]
fn without_lots_before_nothing_is_said() {
    let mut random = Random::seeded(1);
    let mut draw = || lot(&mut random, &|_, p| p);
    let two = [draw(), draw()];
    let CommonShift { shifts, found, .. } = common_shift(draw(), &two, vec![]);
    assert!(shifts.is_empty() && found.is_none());
}

/// An invented two-channel bench and a 4.7 µF part of 0.5 nH and 5 mΩ.
const STATION: &str = r#"station: BENCH-9
method: series_reference
reference: {resistance: 1.000 Ω, tolerance: 0.1 %}
layout:
  columns: {frequency: "Frequency (Hz)", a_re: "A Re (V)", a_im: "A Im (V)", b_re: "B Re (V)", b_im: "B Im (V)"}
uncertainty: {magnitude: 0.2 %, phase: 0.05 °}
"#;
const LIMITS: &str = "part: RG-9
revision: 1
characteristics:
  capacitance: {at: 10 kHz, nominal: 4.7 µF, tolerance: ±20 %}
acceptance: {fixed: {sample: 8, accept: 0}}
";

/// Writes a lot: the true reference, and inductance that the jig adds.
fn write_lot(site: &Path, number: usize, reference: f64, jig: f64) -> String {
    let name = format!("26K-{:04}", 9100 + number);
    let folder = site.join("lots").join(&name);
    fs::create_dir_all(folder.join("sweeps")).expect("a folder");
    let text = format!(
        "lot: {name}\npart: RG-9\nsupplier: SUP-9\nquantity: 500\nstation: BENCH-9\nmeasured: 2026-10-05T09:12:00+02:00\nsweeps: sweeps\n"
    );
    fs::write(folder.join("lot.yaml"), text).expect("a lot file");
    let mut random = Random::seeded(1000 + number as u64);
    let of_lot = [0.01, 0.03, 0.005].map(|s| s * random.normal());
    for part in 1..=8 {
        let mut draw = |k: usize, s: f64| (of_lot[k] + s * random.normal()).exp();
        let (c, r, l) = (
            4.7e-6 * draw(0, 0.01),
            5e-3 * draw(1, 0.02),
            0.5e-9 * draw(2, 0.005) + jig,
        );
        let mut sweep = "Frequency (Hz),A Re (V),A Im (V),B Re (V),B Im (V)\n".to_owned();
        for i in 0..=200 {
            let f = 1e3 * 65e3f64.powf(f64::from(i) / 200.0);
            let x = TAU * f * l - 1.0 / (TAU * f * c);
            let noise = |random: &mut Random| 1e-6 * random.normal();
            let (a_re, a_im) = (0.1 * (r + reference), 0.1 * x);
            let (b_re, b_im) = (0.1 * r + noise(&mut random), 0.1 * x + noise(&mut random));
            let _ = writeln!(sweep, "{f:.4},{a_re:.9e},{a_im:.9e},{b_re:.9e},{b_im:.9e}");
        }
        fs::write(folder.join(format!("sweeps/{part:03}.csv")), sweep).expect("a sweep");
    }
    name
}

fn reelgate(site: &Path, args: &[&str]) -> String {
    let output = Command::new(env!("CARGO_BIN_EXE_reelgate"))
        .args(args)
        .current_dir(site)
        .env("REELGATE_NOW", "2026-11-02T08:00:00+01:00")
        .env_remove("REELGATE_SITE")
        .output()
        .expect("reelgate runs");
    let err = String::from_utf8_lossy(&output.stderr).into_owned();
    assert_eq!(output.status.code(), Some(0), "{args:?}: {err}");
    String::from_utf8(output.stdout).expect("text")
}

/// Whole program: lots as they are, then one with a reference of 0.93 Ω, then one with 0.12 nH more
/// in the jig; nothing but capacitance is bounded, so that every lot is accepted.
#[test]
fn record_terminal_and_pdf_say_so() {
    let site = tempfile::tempdir().expect("a folder");
    let site = site.path();
    for folder in ["limits/parts", "limits/stations"] {
        fs::create_dir_all(site.join(folder)).expect("a folder");
    }
    fs::write(site.join("limits/parts/RG-9.yaml"), LIMITS).expect("a limit file");
    fs::write(site.join("limits/stations/BENCH-9.yaml"), STATION).expect("a station file");
    let judge = |name: &str| -> serde_json::Value {
        let text = reelgate(
            site,
            &["judge", "--format", "json", &format!("lots/{name}")],
        );
        serde_json::from_str(&text).expect("a record")
    };
    let codes = |record: &serde_json::Value| -> Vec<String> {
        let all = record["warnings"].as_array().expect("warnings").iter();
        all.filter_map(|w| w["code"].as_str().map(str::to_owned))
            .collect()
    };
    for number in 0..6 {
        let record = judge(&write_lot(site, number, 1.0, 0.0));
        let common = &record["findings"]["common_shift"];
        assert_eq!(common["lot"]["n"], 8, "{common}");
        // 4.7 µF and 0.5 nH, whatever the lot's own chance.
        let esl = common["lot"]["esl"][1].as_f64().expect("an ESL");
        assert!((esl / 0.5e-9 - 1.0).abs() < 0.03, "{esl}");
        assert_eq!(common["shifts"].is_array(), number >= 3, "{common}");
        assert!(common["found"].is_null(), "{common}");
    }

    let scaled = judge(&write_lot(site, 6, 0.93, 0.0));
    assert!(
        codes(&scaled).contains(&"impedance_scaled".to_owned()),
        "{scaled}"
    );
    let factor = scaled["findings"]["common_shift"]["factor"].as_f64();
    let factor = factor.expect("a factor");
    assert!((factor * 0.93 - 1.0).abs() < 0.03, "{factor}");

    let jig = write_lot(site, 7, 1.0, 0.12e-9);
    let text = reelgate(site, &["judge", &format!("lots/{jig}")]);
    let flat = text.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(flat.contains("ESL of the whole lot"), "{text}");
    let record = judge(&jig);
    assert!(
        codes(&record).contains(&"esl_shifted".to_owned()),
        "{record}"
    );
    let step = record["explanation"].as_array().expect("steps").iter();
    assert_eq!(step.filter(|s| s["about"] == "whole lot").count(), 1);

    let name = record["record"].as_str().expect("a name");
    let pdf = site.join(format!("records/certificates/{name}.pdf"));
    let output = Command::new("pdftotext").arg(&pdf).arg("-").output();
    let text = String::from_utf8(output.expect("pdftotext").stdout).expect("text");
    let flat = text.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(flat.contains("ESL of the whole lot"), "{text}");
    reelgate(site, &["records", "verify"]);
}
