//! Facts of the trade, by the whole middle of the program. Common practice, no source, where nothing
//! else is said.

mod readings_support;

use num_complex::Complex64;
use readings_support::{at, clean, grid, part, scatter_only};
use reelgate::lot::History;
use reelgate::readings::{Characteristic, Reader};
use reelgate::record::{LotRecord, Occasion, PartVerdict, Sources, make};
use reelgate::statistics::sampling::Severity;
use reelgate::sweep::RawFile;
use std::f64::consts::TAU;
use std::fmt::Write;

const STATION: &str = r#"station: BENCH-9
method: direct
layout: {columns: {frequency: "f (Hz)", resistance: "R (Ohm)", reactance: "X (Ohm)"}}
uncertainty: {magnitude: 0.2 %, phase: 0.02 °}
"#;

/// A bench whose sweeps hold the level at the part, in V rms.
const TWO_CHANNELS: &str = r#"station: BENCH-9
method: series_reference
reference: {resistance: 10 Ω}
layout:
  columns: {frequency: "f (Hz)", a_re: "A Re (V)", a_im: "A Im (V)", b_re: "B Re (V)", b_im: "B Im (V)"}
uncertainty: {magnitude: 0.2 %, phase: 0.02 °}
"#;

fn text(name: &str, text: &str) -> RawFile {
    RawFile {
        name: name.to_owned(),
        bytes: text.as_bytes().to_vec(),
    }
}

/// The record of one part.
fn record(station: &str, characteristics: &str, conditions: &str, sweep: &str) -> LotRecord {
    let limits = format!(
        "part: RG-9\nrevision: 1\n{conditions}characteristics:\n{characteristics}acceptance: {{fixed: {{sample: 1, accept: 0}}}}\n"
    );
    let lot = "lot: 26K-9000\npart: RG-9\nquantity: 1\nstation: BENCH-9\nmeasured: 2026-10-05T09:12:00+02:00\nsweeps: sweeps\n";
    let sources = Sources {
        site: None,
        lot: text("lot.yaml", lot),
        limits: text("RG-9.yaml", &limits),
        station: text("BENCH-9.yaml", station),
        compensation: vec![],
        sweeps: vec![text("sweeps/1.csv", sweep)],
    };
    let occasion = Occasion {
        issued: "2026-10-05T10:00:00+02:00".to_owned(),
        severity: Severity::Normal,
        history: History::default(),
        supersedes: None,
        further: vec![],
        approvals: Default::default(),
    };
    match make(&sources, &occasion, &|| ()) {
        Ok(made) => made.record,
        Err(refusal) => panic!("{refusal:?}"),
    }
}

/// A sweep of a series R-L-C.
fn series(c: f64, r: f64, l: f64) -> String {
    let mut sweep = "f (Hz),R (Ohm),X (Ohm)\n".to_owned();
    for f in grid(1e3, 65e6, 50) {
        let x = TAU * f * l - 1.0 / (TAU * f * c);
        let _ = writeln!(sweep, "{f:.6e},{r:.9e},{x:.9e}");
    }
    sweep
}

/// A 0603 multilayer part of some tens of microfarad has about 1 nH to 1.5 nH and a few milliohm at
/// resonance: what such a part's sweep is made of comes back, and from SRF and capacitance alone too.
#[test]
fn a_large_0603_part_has_a_nanohenry_and_a_few_milliohm() {
    let bounds = "  capacitance: {at: 1 kHz, nominal: 22 µF, tolerance: ±20 %}\n  esl: {min: 1 nH, max: 1.5 nH}\n  esr_minimum: {min: 1 mΩ, max: 9 mΩ}\n";
    for (l, inside) in [(1.2e-9, true), (1.7e-9, false), (0.8e-9, false)] {
        let record = record(STATION, bounds, "", &series(22e-6, 3e-3, l));
        let part = &record.parts[0];
        let esl = part.readings["esl"].value.expect("an ESL");
        assert!((esl / l - 1.0).abs() < 1e-3, "{esl}");
        let circuit = part.series.expect("a series circuit");
        assert!((circuit.inductance() / l - 1.0).abs() < 1e-3, "{circuit:?}");
        assert!(
            (circuit.resistance / 3e-3 - 1.0).abs() < 1e-3,
            "{circuit:?}"
        );
        assert_eq!(part.verdict == PartVerdict::Conforming, inside, "{l}");
    }
}

/// The capacitance of a class 2 part falls towards resonance: between 1 kHz and the SRF the reference
/// part loses 9.6 % by its two-term inductance there (its finite network, 50 digits: 4.4933 µF at 1 kHz,
/// 0.5332 nH at the SRF of 3.42031 MHz). The series reading stands higher on the way, by the inductance
/// (at a third of the SRF up to 1/(1 − 1/9)), which is why nobody may take it for the capacitance.
#[test]
fn class_2_capacitance_falls_towards_resonance() {
    let sweep = clean(&part("mlcc_4u7_0805_x7r").network, &grid(1e3, 65e6, 50));
    let budget = scatter_only();
    let reader = Reader::new(&sweep, &budget);
    let circuit = reader
        .series(&at(Characteristic::Capacitance, 1e3))
        .expect("a series circuit");
    // Of equal SRF, capacitances are inverse to inductances.
    let at_resonance = circuit.capacitance * circuit.inductance() / 0.5332e-9;
    let loss = 1.0 - at_resonance / circuit.capacitance;
    assert!((loss - 0.096).abs() < 1e-3, "{loss}");
    let third = circuit.srf / 3.0;
    let seen = reader.read(&at(Characteristic::Capacitance, third));
    let seen = seen.lowest.known_value().expect("a capacitance");
    let stands = seen / at_resonance;
    assert!(
        stands > 1.05 && stands < 1.0 / (1.0 - 1.0 / 9.0),
        "{stands}"
    );
}

/// A two-channel sweep at a drive, of a part of that capacitance.
fn at_drive(volts: f64, c: f64) -> String {
    let mut sweep = "f (Hz),A Re (V),A Im (V),B Re (V),B Im (V)\n".to_owned();
    for f in grid(1e3, 65e6, 50) {
        let z = Complex64::new(5e-3, TAU * f * 0.5e-9 - 1.0 / (TAU * f * c));
        // So driven that the part has its voltage at 1 kHz.
        let current = volts * TAU * 1e3 * c;
        let (b, a) = (current * z, current * (z + 10.0));
        let _ = writeln!(
            sweep,
            "{f:.6e},{:.9e},{:.9e},{:.9e},{:.9e}",
            a.re, a.im, b.re, b.im
        );
    }
    sweep
}

/// Capacitance reads otherwise at another drive (at a higher one lower; makers' curves of single parts
/// go the other way as well), by more than a tolerance allows. So nothing is made of a reading at
/// another drive than demanded, whichever way it lies: the part is unmeasured, never rejected and
/// never accepted, and the lot is held with what to do.
#[test]
fn another_drive_is_not_judged() {
    let bounds = "  capacitance: {at: 1 kHz, nominal: 4.7 µF, tolerance: ±5 %}\n";
    let conditions = "conditions: {drive: 1.0 Vrms ± 20 %}\n";
    let judged = |volts: f64, c: f64| record(TWO_CHANNELS, bounds, conditions, &at_drive(volts, c));
    let good = judged(1.0, 4.7e-6);
    assert_eq!(good.parts[0].verdict, PartVerdict::Conforming);
    assert_eq!(good.verdict.name(), "accept", "{:?}", good.reasons);
    for (volts, c) in [(2.0, 4.3e-6), (2.0, 4.7e-6), (0.1, 4.3e-6), (0.1, 4.7e-6)] {
        let record = judged(volts, c);
        let part = &record.parts[0];
        assert_eq!(part.verdict, PartVerdict::Unmeasured, "{volts} V");
        let drive = part.drive.expect("a drive");
        assert!((drive / volts - 1.0).abs() < 1e-3, "{drive}");
        assert_eq!(part.faults[0].code, "drive_out_of_range");
        assert!(part.faults[0].text.contains("set the drive"), "{part:?}");
        assert_eq!(record.verdict.name(), "hold", "{volts} V");
    }
}

/// 0.1 W at 1 A rms is an ESR of 0.1 Ω (P = I² R); 50 mV of ripple at 1 A is an impedance of 50 mΩ.
#[test]
fn limits_from_loss_and_ripple() {
    let (watts, amperes, volts) = (0.1, 1.0, 0.05);
    let bounds = format!(
        "  esr: {{at: 100 kHz, max: {} Ω}}\n  impedance: {{between: [50 kHz, 200 kHz], max: {} mΩ}}\n",
        watts / (amperes * amperes),
        1e3 * volts / amperes
    );
    // 330 µF: 1.5 mΩ to 10 mΩ of reactance in the band.
    let verdicts = |r: f64| {
        let record = record(STATION, &bounds, "", &series(330e-6, r, 2e-9));
        let readings = &record.parts[0].readings;
        let of = |key: &str| readings[key].verdict == PartVerdict::Conforming;
        (of("esr@100kHz"), of("impedance@50kHz..200kHz"))
    };
    for (r, loses, ripples) in [
        (0.045, 0.045, 0.0457),
        (0.055, 0.055, 0.0556),
        (0.099, 0.099, 0.0993),
        (0.101, 0.101, 0.1013),
    ] {
        let expected = (
            amperes * amperes * loses <= watts,
            amperes * ripples <= volts,
        );
        assert_eq!(verdicts(r), expected, "{r} Ω");
    }
}
