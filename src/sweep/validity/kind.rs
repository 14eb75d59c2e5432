//! Whether there is a part, and whether it is a capacitor.

use super::noise::Noise;
use super::order::median;
use super::{Evidence, UNUSABLE};
use crate::diagnostic::Note;
use crate::sweep::Sweep;
use crate::sweep::faults::hertz;

/// A part never below so many times the reference is none, or cannot be measured with it.
const OVER_REFERENCE: f64 = 100.0;

/// A part that reads more than this share of the open jig is not there.
const OF_OPEN: f64 = 0.5;

/// Nothing in the jig, or nothing that can be told from noise.
pub(super) fn no_part(sweep: &Sweep, evidence: &Evidence, noise: &Noise) -> Option<Note> {
    if let Some((open, read)) = &evidence.open {
        let near = open
            .iter()
            .zip(read)
            .filter(|(o, z)| z.norm_sqr() > OF_OPEN * OF_OPEN * o.norm_sqr())
            .count();
        if near * 2 > read.len() {
            return Some(open_contact("the jig reads as it does when open"));
        }
    }
    let least = noise.least().sqrt();
    if evidence
        .reference
        .is_some_and(|r| least > OVER_REFERENCE * r.resistance)
    {
        return Some(open_contact(&format!(
            "the impedance is never below {least:.0} Ω, over {OVER_REFERENCE} times the reference"
        )));
    }
    let n = sweep.impedance.len();
    let usable = noise.usable_points();
    if usable * 4 > n {
        return None;
    }
    let median = median(noise.square().iter().copied()).sqrt();
    Some(if median > 1e3 {
        open_contact("the impedance is high and nearly all noise")
    } else {
        Note::new(
            "noise_floor",
            format!(
                "at {} of {n} points the noise is more than {:.0} % of the impedance: check cables and drive, and measure again",
                n - usable,
                UNUSABLE * 100.0
            ),
        )
    })
}

fn open_contact(why: &str) -> Note {
    Note::new(
        "open_contact",
        format!("no part, or its contacts are open ({why}): insert the part again and measure"),
    )
}

/// A point is active only beyond so many times its noise.
const SIGNIFICANT: f64 = 4.0;

/// No part gives power: `Re Z ≥ 0`, up to noise and the uncertainty of the phase.
pub(super) fn passive(sweep: &Sweep, evidence: &Evidence, noise: &Noise) -> Option<Note> {
    if !noise.is_negative_anywhere() {
        return None;
    }
    let tolerance = evidence.phase_tolerance();
    let active: Vec<usize> = sweep
        .impedance
        .iter()
        .enumerate()
        .filter(|(i, z)| {
            z.re < 0.0
                && noise.usable(*i)
                && z.re < -(SIGNIFICANT * noise.at(*i) + tolerance) * z.norm()
        })
        .map(|(i, _)| i)
        .collect();
    let adjacent = active
        .windows(2)
        .any(|w| w.first().zip(w.last()).is_some_and(|(a, b)| b - a == 1));
    let many = active.len() >= 2 && active.len() * 100 > sweep.impedance.len();
    if !adjacent && !many {
        return None;
    }
    let f = |i: Option<&usize>| {
        hertz(
            i.and_then(|&i| sweep.frequency.get(i))
                .copied()
                .unwrap_or(f64::NAN),
        )
    };
    Some(Note::new(
        "not_passive",
        format!(
            "the resistance is negative at {} points from {} to {}, which no part does: check cabling, channel skew and calibration, and measure again",
            active.len(),
            f(active.first()),
            f(active.last())
        ),
    ))
}

/// So many points at the low end tell what kind of part it is.
const LOW_END: usize = 8;

/// A capacitor's reactance is at least this share of its impedance at the low end.
const REACTIVE: f64 = 0.2;

/// A low end of less than this in Ω is called a short.
const SHORT: f64 = 0.1;

/// At the low end, the reactance must be that of a capacitor.
pub(super) fn capacitive(sweep: &Sweep, noise: &Noise) -> Option<Note> {
    let points = noise.im().iter().zip(noise.square()).enumerate();
    let low = points
        .filter(|(i, _)| noise.usable(*i))
        .map(|(_, (im, square))| (*im, *square))
        .take(LOW_END.min(sweep.impedance.len().div_ceil(3)));
    let (mut looked_at, mut capacitive, mut least) = (0, 0, f64::INFINITY);
    for (im, square) in low {
        looked_at += 1;
        capacitive += usize::from(im < 0.0 && im * im > REACTIVE * REACTIVE * square);
        least = square.min(least);
    }
    if capacitive * 2 > looked_at {
        return None;
    }
    let size = least.sqrt();
    Some(if size < SHORT {
        Note::new(
            "short_contact",
            format!(
                "the sweep is that of a short ({:.3} mΩ at the low end, no capacitance): look for a bridge in the jig or a shorted part; discharge parts before handling, as local rules say",
                size * 1e3
            ),
        )
    } else {
        Note::new(
            "not_capacitive",
            "the low end of the sweep is not that of a capacitor: is the right part in the jig, and are cables and ranges right?",
        )
    })
}

/// Points in a row that make a crossing.
const IN_A_ROW: u64 = 3;

/// Whether a reactance stands out by five times the noise and a fiftieth of the impedance, from its
/// squared magnitude and variance.
#[inline(always)]
fn is_significant(reactance: f64, square: f64, variance: f64) -> bool {
    let (noise, share) = (25.0 * variance, 4e-4 * square);
    reactance * reactance > if noise > share { noise } else { share }
}

/// Whether enough points are capacitive behind the first inductive one that there can be a second
/// resonance: a quick look, as there hardly ever is one.
fn turns_back(noise: &Noise) -> bool {
    let (im, square, variance) = (noise.im(), noise.square(), noise.variance());
    let all = im.iter().zip(square).zip(variance);
    let mut inductive =
        all.map(|((x, square), variance)| *x > 0.0 && is_significant(*x, *square, *variance));
    let Some(first) = inductive.position(|is| is) else {
        return false;
    };
    let [im, square, variance] = [im, square, variance].map(|v| v.get(first..).unwrap_or_default());
    let mut capacitive = 0u64;
    for ((x, square), variance) in im.iter().zip(square).zip(variance) {
        capacitive += u64::from((*x < 0.0) & is_significant(*x, *square, *variance));
    }
    capacitive >= IN_A_ROW
}

/// A capacitor with its leads resonates once in series; more crossings of the reactance are
/// another part beside it.
pub(super) fn one_resonance(sweep: &Sweep, noise: &Noise) -> Option<Note> {
    if !turns_back(noise) {
        return None;
    }
    let mut sign = -1;
    let mut crossings = Vec::new();
    let mut run = (0, 0);
    let points = noise.im().iter().zip(noise.square()).zip(noise.variance());
    for (((x, square), variance), f) in points.zip(&sweep.frequency) {
        let now = match is_significant(*x, *square, *variance) {
            true if *x < 0.0 => -1,
            true => 1,
            false => 0,
        };
        run = (now, if now == run.0 { run.1 + 1 } else { 1 });
        // Several points in a row, so that outliers make no crossing.
        if run.1 == IN_A_ROW && now != sign && now != 0 {
            sign = now;
            crossings.push(*f);
        }
    }
    let anti = crossings.get(1)?;
    Some(Note::new(
        "multiple_resonances",
        format!(
            "the reactance turns capacitive again at about {}: another part is connected in parallel; clear the jig and measure again",
            hertz(*anti)
        ),
    ))
}
