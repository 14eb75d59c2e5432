//! Sweep files. The first byte of the input says which station or which name the file has.

use reelgate::station::{Station, read as read_station};
use reelgate::sweep::{Attempt, RawFile, Standards, read_file};
use std::sync::LazyLock;

fn stations(texts: [&str; 5]) -> [Station; 5] {
    texts.map(|text| {
        read_station("F.yaml", format!("station: F\n{text}\n").as_bytes()).expect("a station file")
    })
}

static TABLES: LazyLock<[Station; 5]> = LazyLock::new(|| {
    stations([
        "method: direct\nlayout: {columns: {frequency: f, resistance: R, reactance: X}}",
        "method: series_reference\nreference: {resistance: 1 Ω}\n\
         layout: {columns: {frequency: f, a_re: a, a_im: b, b_re: c, b_im: d}}",
        "method: direct\nlayout: {columns: {frequency: f, capacitance: C, esr: R}}",
        "method: series_reference\nreference: {resistance: 1 Ω}\n\
         layout: {columns: {frequency: f, ratio_db: g, phase: p}}",
        "method: direct\nlayout: {columns: {frequency: f, resistance: R, reactance: X}}\n\
         compensation: {short: {sweep: 001.csv, resistance: 0.1 mΩ}}",
    ])
});

/// A table: `0` resistance and reactance, `1` two channels, `2` capacitance and resistance, `3`
/// ratio in dB and phase, `4` the sweep of a standard, and of a part.
pub fn delimited(bytes: &[u8]) {
    let Some((which, bytes)) = bytes.split_first() else {
        return;
    };
    let Some(station) = TABLES.get(usize::from(which % 5)) else {
        return;
    };
    let file = raw("001.csv", bytes);
    if station.compensation.short.is_none() {
        return all_sound(&read_file(&file, station, None), bytes);
    }
    match Standards::read(std::slice::from_ref(&file), station) {
        Ok(standards) => all_sound(&read_file(&file, station, Some(&standards)), bytes),
        Err(notes) => assert!(!notes.is_empty()),
    }
}

static NETWORKS: LazyLock<[Station; 5]> = LazyLock::new(|| {
    stations([
        "method: reflection",
        "method: shunt_through",
        "method: series_through",
        "method: reflection",
        "method: shunt_through",
    ])
});

/// A Touchstone file: `0` one port in reflection, `1` two ports in shunt, `2` two ports in series,
/// `3` one port of impedances, `4` without the number of ports in the name.
pub fn touchstone(bytes: &[u8]) {
    let Some((which, bytes)) = bytes.split_first() else {
        return;
    };
    let which = usize::from(which % 5);
    let names = ["001.s1p", "001.s2p", "001.s2p", "001.z1p", "001.ts"];
    if let (Some(name), Some(station)) = (names.get(which), NETWORKS.get(which)) {
        all_sound(&read_file(&raw(name, bytes), station, None), bytes);
    }
}

fn raw(name: &str, bytes: &[u8]) -> RawFile {
    RawFile {
        name: name.to_owned(),
        bytes: bytes.to_vec(),
    }
}

/// At least one try; a sweep that was taken is finite and sorted, one that was not says why.
fn all_sound(attempts: &[Attempt], bytes: &[u8]) {
    assert!(!attempts.is_empty() && attempts.len() <= bytes.len() + 1);
    for attempt in attempts {
        match &attempt.sweep {
            Err(faults) => {
                assert!(!faults.is_empty());
                let text: usize = faults.iter().map(|f| f.text.len()).sum();
                assert!(
                    text < 16 * 1024 + 8 * bytes.len(),
                    "as long as the file: {text}"
                );
            }
            Ok(sweep) => {
                let f = &sweep.frequency;
                assert!(f.len() >= 2 && f.len() <= bytes.len());
                assert!(f.iter().all(|f| f.is_finite() && *f > 0.0));
                assert!(f.windows(2).all(|pair| pair[0] < pair[1]));
                assert_eq!(sweep.impedance.len(), f.len());
                assert!(sweep.impedance.iter().all(|z| z.is_finite()));
                if let Some(level) = &sweep.level {
                    assert_eq!(level.len(), f.len());
                    assert!(level.iter().all(|v| v.is_finite()));
                }
            }
        }
    }
}
