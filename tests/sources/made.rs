//! Stations and sweeps for these tests; every sweep is another one.

use reelgate::station::{self, Station};
use std::f64::consts::TAU;
use std::fmt::Write;

/// Points of a whole sweep in these tests.
pub const POINTS: usize = 60;

/// A station whose sweeps have columns of resistance and reactance. `more` is added to its file.
pub fn station(more: &str) -> Station {
    let text = format!(
        "station: T\nmethod: direct\nlayout:\n  columns: {{frequency: \"Frequency (Hz)\", \
         resistance: \"R (Ohm)\", reactance: \"X (Ohm)\"}}\n{more}"
    );
    station::read("t.yaml", text.as_bytes()).unwrap_or_else(|faults| panic!("{faults}"))
}

/// The `watch` of a station file.
pub fn watch(more: &str) -> station::Watch {
    let text = format!("watch: {{folder: sweeps{more}}}\n");
    station(&text).watch.expect("a watch")
}

/// A sweep of so many points as a program saves it. No two of different `seed` are the same.
pub fn sweep_of(points: usize, seed: u64) -> String {
    let mut text = String::from("made for a test\nFrequency (Hz),R (Ohm),X (Ohm)\n");
    let mut state = seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) | 1;
    for i in 0..points {
        // xorshift64 (Marsaglia 2003) for a little noise.
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        let noise = 1.0 + (state >> 40) as f64 / (1u64 << 24) as f64 * 1e-3;
        let frequency = 100.0 * 10f64.powf(i as f64 / 10.0);
        let reactance = TAU * frequency * 1e-9 - 1.0 / (TAU * frequency * 100e-9);
        let _ = writeln!(
            text,
            "{frequency:.6e},{:.9e},{:.9e}",
            0.02 * noise,
            reactance * noise
        );
    }
    text
}

/// A whole sweep.
pub fn sweep(seed: u64) -> String {
    sweep_of(POINTS, seed)
}
