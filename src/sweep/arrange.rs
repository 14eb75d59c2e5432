//! The frequency list: sorted, without duplicates and gaps, or refused.

use super::faults::hertz;
use super::raw::{RawSweep, pick};
use crate::diagnostic::Note;
use std::cell::RefCell;

/// Fewer points than this are no sweep.
const FEWEST_POINTS: usize = 5;

/// A step this many times the usual one is a hole in the list.
const GAP: f64 = 1.7;

/// Frequencies nearer to each other than this (relative) are the same.
const SAME: f64 = 1e-9;

thread_local! {
    /// The last list that was found whole as it stood: the sweeps of a lot share theirs.
    static WHOLE: RefCell<Vec<f64>> = const { RefCell::new(Vec::new()) };
}

fn is_known(frequency: &[f64]) -> bool {
    frequency.len() >= FEWEST_POINTS
        && WHOLE.with(|whole| whole.try_borrow().is_ok_and(|whole| *whole == frequency))
}

fn keep(frequency: &[f64]) {
    WHOLE.with(|whole| {
        if let Ok(mut whole) = whole.try_borrow_mut() {
            frequency.clone_into(&mut whole);
        }
    });
}

/// Sorts a sweep by frequency and refuses what cannot be a whole sweep.
///
/// # Errors
/// Frequencies that are not positive, duplicates, too few points, a missing stretch.
pub(super) fn arrange(raw: &mut RawSweep, notes: &mut Vec<Note>) -> Result<(), Vec<Note>> {
    if is_known(&raw.frequency) {
        return Ok(());
    }
    let refuse = |note: Note| Err(vec![note]);
    if let Some(at) = raw
        .frequency
        .iter()
        .position(|f| !(f.is_finite() && *f > 0.0))
    {
        let (line, found) = (
            line(raw, at),
            raw.frequency.get(at).copied().unwrap_or(f64::NAN),
        );
        return refuse(Note::new(
            "frequency_not_positive",
            format!("line {line}: the frequency is {found} Hz, expected a positive number"),
        ));
    }
    if !raw.frequency.is_sorted() {
        sort(raw, notes);
    }
    if let Some(note) = duplicate(raw) {
        return refuse(note);
    }
    let points = raw.frequency.len();
    if points < FEWEST_POINTS {
        return refuse(Note::new(
            "too_few_points",
            format!(
                "the sweep has {points} point(s), at least {FEWEST_POINTS} are needed: the file is not whole or the sweep was stopped"
            ),
        ));
    }
    match gap(&raw.frequency) {
        Some(note) => refuse(note),
        None => {
            keep(&raw.frequency);
            Ok(())
        }
    }
}

fn line(raw: &RawSweep, at: usize) -> u32 {
    raw.lines.get(at).copied().unwrap_or(0)
}

fn sort(raw: &mut RawSweep, notes: &mut Vec<Note>) {
    let descending = raw.frequency.is_sorted_by(|a, b| a >= b);
    let of = |i: &usize| raw.frequency.get(*i).copied().unwrap_or(f64::NAN);
    let mut order: Vec<usize> = (0..raw.frequency.len()).collect();
    order.sort_by(|i, j| of(i).total_cmp(&of(j)));
    raw.frequency = pick(&raw.frequency, &order);
    raw.lines = pick(&raw.lines, &order);
    raw.measured.reorder(&order);
    let how = if descending {
        "in descending order"
    } else {
        "not in order"
    };
    notes.push(Note::new(
        "sorted",
        format!("the frequencies stood {how} and were sorted"),
    ));
}

fn duplicate(raw: &RawSweep) -> Option<Note> {
    let pairs = raw.frequency.iter().zip(raw.frequency.iter().skip(1));
    let mut same = pairs.enumerate().filter(|(_, (f, g))| *g - *f <= SAME * *f);
    let (at, (frequency, _)) = same.next()?;
    let more = match same.count() {
        0 => String::new(),
        more => format!(" ({more} more of this kind)"),
    };
    let (first, second) = (line(raw, at), line(raw, at + 1));
    let (first, second) = (first.min(second), first.max(second));
    let frequency = hertz(*frequency);
    Some(if raw.measured.same(at, at + 1) {
        Note::new(
            "duplicate_frequency",
            format!(
                "lines {first} and {second} are the same point at {frequency}{more}: export the part again"
            ),
        )
    } else {
        Note::new(
            "conflicting_frequency",
            format!(
                "lines {first} and {second} give different values at {frequency}{more}: two sweeps are in one file; measure the part again"
            ),
        )
    })
}

/// A missing stretch: a step that is out of proportion in an otherwise even list (in log or
/// linear frequency), or to both its neighbours in a list of segments.
fn gap(frequency: &[f64]) -> Option<Note> {
    let steps = |scale: fn(f64) -> f64| -> Vec<f64> {
        frequency
            .windows(2)
            .filter_map(|w| Some(scale(*w.get(1)?) - scale(*w.first()?)))
            .collect()
    };
    let log = steps(f64::ln);
    let linear = steps(|f| f);
    let by_log = evenness(&log);
    let by_linear = evenness(&linear);
    let (steps, even) = if by_linear > by_log {
        (&linear, by_linear)
    } else {
        (&log, by_log)
    };
    // Whole hertz leave steps uneven at the low end; that is no hole.
    let whole = frequency.iter().all(|f| f.fract() == 0.0);
    let rounding = |at: usize| match frequency.get(at) {
        Some(f) if whole && by_linear <= by_log => 2.5 / f,
        _ => 0.0,
    };
    let (at, usual) = if even >= EVEN {
        let usual = median(steps);
        let is_gap = |(i, s): &(usize, &f64)| **s > GAP * usual + rounding(*i);
        let found = steps.iter().enumerate().filter(is_gap).count();
        let first = steps.iter().enumerate().find(is_gap).map(|(i, _)| i);
        // Many wide steps are a coarser segment, not holes.
        if found * 10 <= steps.len() {
            (first?, usual)
        } else {
            local_gap(steps, rounding)?
        }
    } else {
        local_gap(steps, rounding)?
    };
    let (from, to) = (frequency.get(at)?, frequency.get(at + 1)?);
    let missing = (steps.get(at)? / usual).round().max(2.0) - 1.0;
    Some(Note::new(
        "gap",
        format!(
            "no points between {} and {}, where the other steps lead one to expect about {missing:.0}: the sweep is not whole; measure the part again",
            hertz(*from),
            hertz(*to)
        ),
    ))
}

/// The share of steps from which a list is called even.
const EVEN: f64 = 0.6;

/// The share of steps within a tenth of the median step.
fn evenness(steps: &[f64]) -> f64 {
    let usual = median(steps);
    let near = steps
        .iter()
        .filter(|s| (**s - usual).abs() <= 0.1 * usual)
        .count();
    near as f64 / steps.len().max(1) as f64
}

fn local_gap(steps: &[f64], rounding: impl Fn(usize) -> f64) -> Option<(usize, f64)> {
    steps
        .windows(3)
        .enumerate()
        .find_map(|(i, window)| match *window {
            [before, step, after] => {
                let usual = f64::max(before, after);
                (step > GAP * usual + rounding(i + 1)).then_some((i + 1, usual))
            }
            _ => None,
        })
}

fn median(values: &[f64]) -> f64 {
    let mut sorted = values.to_vec();
    let middle = sorted.len() / 2;
    if sorted.is_empty() {
        return f64::NAN;
    }
    *sorted.select_nth_unstable_by(middle, f64::total_cmp).1
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::sweep::raw::Measured;
    use num_complex::Complex64;

    fn code(frequency: Vec<f64>) -> String {
        let z = (0..frequency.len())
            .map(|i| Complex64::new(i as f64, 0.0))
            .collect();
        let lines = (2..).take(frequency.len()).collect();
        let mut raw = RawSweep {
            frequency,
            lines,
            measured: Measured::Impedance(z),
        };
        match arrange(&mut raw, &mut Vec::new()) {
            Ok(()) => String::new(),
            Err(notes) => notes[0].code.clone(),
        }
    }

    fn log_list(points: usize, per_decade: f64) -> Vec<f64> {
        (0..points)
            .map(|i| 100.0 * 10f64.powf(i as f64 / per_decade))
            .collect()
    }

    fn without(mut list: Vec<f64>, holes: std::ops::Range<usize>) -> Vec<f64> {
        list.drain(holes);
        list
    }

    #[test]
    fn whole_lists_pass() {
        for per_decade in [5.0, 10.0, 50.0, 200.0] {
            assert_eq!(code(log_list(60, per_decade)), "");
        }
        assert_eq!(code((1..200).map(|i| 1e3 * f64::from(i)).collect()), "");
        // Rounded to whole hertz from 20 Hz, 50 a decade.
        let mut rounded: Vec<f64> = (0..200)
            .map(|i| (20.0 * 10f64.powf(f64::from(i) / 50.0)).round())
            .collect();
        rounded.dedup();
        assert_eq!(code(rounded), "");
        // Segments of different density.
        let mut segments = log_list(21, 10.0);
        let from = *segments.last().expect("points");
        segments.extend((1..100).map(|i| from * 10f64.powf(f64::from(i) / 50.0)));
        assert_eq!(code(segments), "");
        // Spot frequencies.
        assert_eq!(code(vec![100.0, 120.0, 1e3, 1e4, 1e5]), "");
    }

    #[test]
    fn holes_are_found() {
        for holes in [30..31, 30..45, 5..6] {
            assert_eq!(
                code(without(log_list(80, 20.0), holes.clone())),
                "gap",
                "{holes:?}"
            );
            let linear: Vec<f64> = (1..100).map(|i| 1e5 * f64::from(i)).collect();
            assert_eq!(code(without(linear, holes)), "gap");
        }
    }

    #[test]
    fn a_list_that_was_whole_before_hides_no_fault_of_another() {
        let whole = log_list(60, 20.0);
        let mut descending = whole.clone();
        descending.reverse();
        let mut twice = whole.clone();
        twice[30] = twice[29];
        for _ in 0..2 {
            assert_eq!(code(whole.clone()), "");
            assert_eq!(code(without(whole.clone(), 30..31)), "gap");
            assert_eq!(code(whole[..4].to_vec()), "too_few_points");
            assert_eq!(code(twice.clone()), "conflicting_frequency");
            assert_eq!(code(descending.clone()), "");
            assert_eq!(code(vec![]), "too_few_points");
        }
    }

    #[test]
    fn other_faults_of_the_list() {
        assert_eq!(
            code(vec![1.0, 2.0, 3.0, 0.0, 5.0]),
            "frequency_not_positive"
        );
        assert_eq!(
            code(vec![1.0, 2.0, -3.0, 4.0, 5.0]),
            "frequency_not_positive"
        );
        assert_eq!(code(vec![1.0, 2.0, 3.0, 4.0]), "too_few_points");
        assert_eq!(code(vec![]), "too_few_points");
        assert_eq!(code(vec![1.0, 2.0, 2.0, 3.0, 4.0]), "conflicting_frequency");
    }
}
