//! Whether a sweep is as long as its siblings: a file cut off between two rows reads without fault.

use crate::diagnostic::Note;
use crate::sweep::Attempt;
use crate::sweep::faults::hertz;

/// Fewer sweeps of one frequency list than this make no rule.
const FEWEST: usize = 3;

/// Refuses sweeps that lack points which most sweeps of the lot have.
///
/// Where more than half of the good sweeps (and at least three) share one frequency list, a sweep
/// whose list is a part of it is not whole. Sweeps on another list of their own are left alone.
pub fn complete(attempts: &mut [Attempt]) {
    let Some(usual) = usual_list(attempts) else {
        return;
    };
    for attempt in attempts {
        let Ok(sweep) = &attempt.sweep else { continue };
        let list = &sweep.frequency;
        if list.len() >= usual.len() || !is_part_of(list, &usual) {
            continue;
        }
        let (f, usual_end) = (hertz(last(list)), hertz(last(&usual)));
        attempt.sweep = Err(vec![Note::new(
            "incomplete_sweep",
            format!(
                "{} points up to {f}, where the other parts have {} up to {usual_end}: the sweep was stopped or the file cut off; measure or copy it again",
                list.len(),
                usual.len()
            ),
        )]);
    }
}

fn last(list: &[f64]) -> f64 {
    list.last().copied().unwrap_or(f64::NAN)
}

/// The frequency list of more than half of the good sweeps (majority vote of Boyer and Moore).
fn usual_list(attempts: &[Attempt]) -> Option<Vec<f64>> {
    let lists = || {
        attempts
            .iter()
            .filter_map(|a| a.sweep.as_ref().ok())
            .map(|s| &s.frequency)
    };
    let mut candidate: Option<&Vec<f64>> = None;
    let mut votes = 0usize;
    for list in lists() {
        match candidate {
            Some(c) if c == list => votes += 1,
            _ if votes == 0 => (candidate, votes) = (Some(list), 1),
            _ => votes -= 1,
        }
    }
    let candidate = candidate?;
    let all = lists().count();
    let same = lists().filter(|list| *list == candidate).count();
    (same >= FEWEST && same * 2 > all).then(|| candidate.clone())
}

/// Whether every frequency of an ascending list is in the other.
fn is_part_of(part: &[f64], whole: &[f64]) -> bool {
    let mut rest = whole.iter();
    part.iter().all(|f| rest.any(|g| (f - g).abs() <= 1e-9 * g))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::sweep::Sweep;
    use num_complex::Complex64;

    fn attempt(points: usize, scale: f64) -> Attempt {
        let frequency: Vec<f64> = (1..=points).map(|i| i as f64 * scale).collect();
        let impedance = vec![Complex64::new(1.0, -1.0); points];
        Attempt {
            part: "1".to_owned(),
            attempt: 1,
            file: "1.csv".to_owned(),
            sha256: String::new(),
            sweep: Ok(Sweep {
                frequency,
                impedance,
                level: None,
            }),
            notes: Vec::new(),
        }
    }

    #[test]
    fn a_shorter_sweep_among_whole_ones_is_refused() {
        let mut attempts = vec![
            attempt(100, 1.0),
            attempt(60, 1.0),
            attempt(100, 1.0),
            attempt(100, 1.0),
            attempt(50, 1.5),
        ];
        complete(&mut attempts);
        let refused: Vec<bool> = attempts.iter().map(|a| a.sweep.is_err()).collect();
        assert_eq!(refused, [false, true, false, false, false]);
    }

    #[test]
    fn few_sweeps_make_no_rule() {
        let mut attempts = vec![attempt(100, 1.0), attempt(60, 1.0), attempt(100, 1.0)];
        complete(&mut attempts);
        assert!(attempts.iter().all(|a| a.sweep.is_ok()));
    }
}
