//! Points and steps that a part cannot make: contacts that open, ranges that change.

use super::noise::Noise;
use crate::diagnostic::Note;
use crate::sweep::Sweep;
use crate::sweep::faults::hertz;

/// A deviation of so many times the noise is none of it: for complex normal noise the chance is
/// exp(-64), and even where the noise is estimated a factor of two too low, exp(-16).
const SIGNIFICANT: f64 = 8.0;

/// Deviations below this are of no account however quiet the sweep is (relative).
const OF_ACCOUNT: f64 = 3e-3;

/// Above this relative noise a quotient of channels has outliers of its own.
const QUIET: f64 = 0.1;

/// A jump that was found.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Jump {
    frequency: f64,
    kind: Kind,
    /// Places with a jump in the whole sweep.
    places: usize,
}

#[derive(Debug, Clone, Copy, PartialEq)]
enum Kind {
    /// The impedance rose many times over.
    Opened,
    /// The impedance moved at a point or a few.
    Moved,
    /// All further points are scaled.
    Step,
}

/// How far a point is beyond what no jump is, from its squared deviation (relative), squared impedance and
/// variance; not positive where it is not. By squares, as hardly a point is.
#[inline(always)]
pub(super) fn beyond(deviation: f64, square: f64, variance: f64) -> f64 {
    let of_account = deviation - OF_ACCOUNT * OF_ACCOUNT;
    let significant = deviation * square - SIGNIFICANT * SIGNIFICANT * variance;
    if of_account > 0.0 { significant } else { 0.0 }
}

/// Finds the largest jump of a sweep.
pub(super) fn find(sweep: &Sweep, noise: &Noise) -> Option<Jump> {
    if !noise.jumps_anywhere() {
        return None;
    }
    let is_jump = |i: usize| {
        let level = noise.at(i);
        let (deviation, interpolation) = noise.deviation_of(sweep, i)?;
        let size = deviation.norm();
        let allowed = SIGNIFICANT * level + 3.0 * interpolation + OF_ACCOUNT;
        (level < QUIET && size > allowed).then_some((i, size))
    };
    let points = noise.square().iter().zip(noise.variance());
    let found: Vec<(usize, f64)> = noise
        .deviation()
        .iter()
        .zip(points)
        .enumerate()
        .filter(|(_, (d, (s, v)))| beyond(**d, **s, **v) > 0.0)
        .filter_map(|(i, _)| is_jump(i))
        .collect();
    // Each point disturbs the deviations of two neighbours on either side.
    let places = found.chunk_by(|(a, _), (b, _)| b - a <= 2).count();
    let (worst, _) = found
        .iter()
        .copied()
        .max_by(|(_, a), (_, b)| a.total_cmp(b))?;
    Some(Jump {
        frequency: sweep.frequency.get(worst).copied()?,
        kind: kind(sweep, noise, worst, places),
        places,
    })
}

fn kind(sweep: &Sweep, noise: &Noise, at: usize, places: usize) -> Kind {
    let z = |i: Option<usize>| {
        i.and_then(|i| sweep.impedance.get(i))
            .map_or(f64::NAN, |z| z.norm())
    };
    let neighbours = z(at.checked_sub(3)).max(z(Some(at + 3)));
    if z(Some(at)) > 5.0 * neighbours {
        return Kind::Opened;
    }
    // A contact that fails does so again and again. At a step the two points beside it deviate alike and in opposite senses; at a single point
    // the neighbours deviate by two thirds.
    let Some((here, _)) = noise.deviation_of(sweep, at) else {
        return Kind::Moved;
    };
    let beside = [at.checked_sub(1), Some(at + 1)];
    let opposite = beside
        .into_iter()
        .flatten()
        .filter_map(|i| noise.deviation_of(sweep, i))
        .any(|(d, _)| (d * here.conj()).re < 0.0 && d.norm() > 0.8 * here.norm());
    if opposite && places == 1 {
        Kind::Step
    } else {
        Kind::Moved
    }
}

impl Jump {
    pub fn into_note(self) -> Note {
        let at = hertz(self.frequency);
        let more = match self.places {
            0 | 1 => String::new(),
            n => format!(" (and at {} more places)", n - 1),
        };
        match self.kind {
            Kind::Opened => Note::new(
                "intermittent_contact",
                format!("contact opened at about {at}{more}: reseat the part and measure again"),
            ),
            Kind::Moved => Note::new(
                "intermittent_contact",
                format!(
                    "the impedance jumps at about {at}{more}, as with an unsteady contact: reseat the part and measure again"
                ),
            ),
            Kind::Step => Note::new(
                "step_in_sweep",
                format!(
                    "the impedance steps at about {at}{more}, as when a range changes or a contact shifts: check the instrument's ranges and measure again"
                ),
            ),
        }
    }
}
