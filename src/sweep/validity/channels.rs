//! What two voltage channels tell about the cause of an impossible sweep.

use crate::diagnostic::Note;
use crate::station::Reference;
use crate::sweep::Sweep;
use crate::sweep::faults::hertz;
use num_complex::Complex64;

/// The two channels in V on the sweep's frequency list.
#[derive(Debug, Clone, Default)]
pub(super) struct Channels {
    pub a: Vec<Complex64>,
    pub b: Vec<Complex64>,
}

/// A channel at its ceiling holds its level to this (relative) …
const FLAT: f64 = 3e-4;
/// … over so many points …
const FEWEST: usize = 4;
/// … and leaves it at once by more than this.
const KINK: f64 = 3e-3;

impl Channels {
    /// The likely cause of a sweep that is known to be faulty, where the channels show one.
    pub fn cause(&self, sweep: &Sweep, reference: Option<Reference>) -> Option<Note> {
        for (name, channel) in [("A", &self.a), ("B", &self.b)] {
            if let Some((from, to)) = ceiling(channel) {
                let level = channel.get(from).map_or(f64::NAN, |v| v.norm());
                let f = |i: usize| hertz(sweep.frequency.get(i).copied().unwrap_or(f64::NAN));
                return Some(Note::new(
                    "channel_clipped",
                    format!(
                        "channel {name} stands at {level:.3} V from {} to {}, as when its input is overdriven: choose a larger range or less drive, and measure again",
                        f(from),
                        f(to)
                    ),
                ));
            }
        }
        self.wiring(sweep, reference?)
    }

    /// Whether another wiring would make the sweep that of a capacitor.
    fn wiring(&self, sweep: &Sweep, reference: Reference) -> Option<Note> {
        let points = || {
            let channels = self.a.iter().copied().zip(self.b.iter().copied());
            sweep
                .frequency
                .iter()
                .map(|&f| reference.impedance(f))
                .zip(channels)
        };
        let divided = |(zref, (a, b)): (Complex64, (Complex64, Complex64))| zref * b / (a - b);
        let swapped = points().map(|(zref, (a, b))| divided((zref, (b, a))));
        let inverted = points().map(|(zref, (a, b))| divided((zref, (a, -b))));
        let exchanged = points().map(|(zref, (a, b))| divided((zref, (a, a - b))));
        let code_and_text = if is_capacitor(swapped) {
            (
                "channels_swapped",
                "the sweep makes sense with channels A and B swapped: check the cables",
            )
        } else if is_capacitor(inverted) {
            (
                "channel_inverted",
                "the sweep makes sense with channel B inverted: check the polarity of its probe",
            )
        } else if is_capacitor(exchanged) {
            (
                "part_and_reference_exchanged",
                "the sweep makes sense with the part in the place of the reference: check the jig and its cables",
            )
        } else {
            return None;
        };
        Some(Note::new(
            code_and_text.0,
            format!("{}, and measure again", code_and_text.1),
        ))
    }
}

/// Capacitive at the low end and without negative resistance nearly everywhere.
fn is_capacitor(impedance: impl Iterator<Item = Complex64>) -> bool {
    let impedance: Vec<Complex64> = impedance.collect();
    let low = impedance.iter().take(8);
    let capacitive = low.filter(|z| z.im < -0.5 * z.norm()).count() >= 7;
    let passive = impedance.iter().filter(|z| z.re > -0.05 * z.norm()).count();
    capacitive && passive * 10 >= impedance.len() * 9
}

/// First and last point of a stretch at the channel's largest level that is flat and ends in a kink.
/// A level that saturates by itself leaves its plateau little by little.
fn ceiling(channel: &[Complex64]) -> Option<(usize, usize)> {
    let level: Vec<f64> = channel.iter().map(|v| v.norm()).collect();
    let most = level.iter().copied().fold(0.0, f64::max);
    let flat = |v: &f64| *v > most * (1.0 - FLAT);
    let first = level.iter().position(flat)?;
    let length = level.iter().skip(first).take_while(|v| flat(v)).count();
    let last = first + length - 1;
    let outside = [first.checked_sub(1), Some(last + 1)];
    let kink = outside
        .into_iter()
        .flatten()
        .filter_map(|i| level.get(i))
        .any(|v| *v < most * (1.0 - KINK));
    (length >= FEWEST && kink).then_some((first, last))
}
