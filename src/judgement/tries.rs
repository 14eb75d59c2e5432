//! Which of several tries at one part counts.

use super::PartVerdict;
use crate::diagnostic::Note;
use crate::limits::Retest;

/// One try as the rule sees it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct TryOutcome<'a> {
    #[allow(missing_docs)]
    pub verdict: PartVerdict,
    /// Why it was set aside, as lot files spell it; such a try never counts.
    pub set_aside: Option<&'a str>,
}

/// Which try counts, and what the rule says of the others.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Standing {
    /// Index of the try that counts; `None` where every try was set aside.
    pub counts: Option<usize>,
    /// Index of the last try that was not allowed.
    pub refused: Option<usize>,
    /// Whether one more try would be allowed, and count.
    pub may_follow: bool,
}

/// The first try that was not set aside counts. A later one takes its place only where the try before it
/// came out `unmeasured` or `nonconforming` and `retest` still allows one more after such an outcome; any
/// other further try is refused. Without any try one may follow.
pub fn standing(tries: &[TryOutcome], retest: &Retest) -> Standing {
    let mut kept = (0..tries.len()).filter(|i| tries[*i].set_aside.is_none());
    let Some(mut counting) = kept.next() else {
        return Standing {
            counts: None,
            refused: None,
            may_follow: true,
        };
    };
    let mut left = *retest;
    let (mut refused, mut before) = (None, counting);
    for index in kept {
        match allowance(&mut left, tries[counting].verdict) {
            Some(count) if *count > 0 && counting == before => {
                *count -= 1;
                counting = index;
            }
            _ => refused = Some(index),
        }
        before = index;
    }
    let last = counting == before;
    let more = allowance(&mut left, tries[counting].verdict).is_some_and(|count| *count > 0);
    Standing {
        counts: Some(counting),
        refused,
        may_follow: last && more,
    }
}

fn allowance(left: &mut Retest, verdict: PartVerdict) -> Option<&mut u32> {
    match verdict {
        PartVerdict::Unmeasured => Some(&mut left.unmeasured),
        PartVerdict::Nonconforming => Some(&mut left.nonconforming),
        _ => None,
    }
}

/// The fault of a part all of whose sweeps were set aside.
pub(super) fn nothing_left() -> Note {
    Note::new(
        "all_set_aside",
        "every sweep of this part was set aside: measure it again",
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use PartVerdict::*;

    const NONE: Retest = Retest {
        unmeasured: 0,
        nonconforming: 0,
    };
    const ONE: Retest = Retest {
        unmeasured: 1,
        nonconforming: 0,
    };

    fn of(list: &[(PartVerdict, bool)], retest: &Retest) -> (Option<usize>, Option<usize>, bool) {
        let tries: Vec<TryOutcome> = list
            .iter()
            .map(|(verdict, aside)| TryOutcome {
                verdict: *verdict,
                set_aside: aside.then_some("misplaced"),
            })
            .collect();
        let s = standing(&tries, retest);
        (s.counts, s.refused, s.may_follow)
    }

    #[test]
    fn what_counts() {
        assert_eq!(of(&[], &NONE), (None, None, true));
        assert_eq!(of(&[(Conforming, false)], &ONE), (Some(0), None, false));
        assert_eq!(of(&[(Unmeasured, false)], &NONE), (Some(0), None, false));
        assert_eq!(of(&[(Unmeasured, false)], &ONE), (Some(0), None, true));
        let twice = [(Unmeasured, false), (Conforming, false)];
        assert_eq!(of(&twice, &ONE), (Some(1), None, false));
        assert_eq!(of(&twice, &NONE), (Some(0), Some(1), false));
    }

    #[test]
    fn what_was_set_aside_takes_no_retest_away() {
        let list = [
            (Nonconforming, true),
            (Unmeasured, false),
            (Conforming, false),
        ];
        assert_eq!(of(&list, &ONE), (Some(2), None, false));
        assert_eq!(of(&list[..1], &ONE), (None, None, true));
    }
}
