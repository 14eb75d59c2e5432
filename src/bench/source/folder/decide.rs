//! When a file is taken: from what it holds, whether its writer closed it, and how long it has been
//! quiet. No clock and no file here.

use super::whole::Length;
use crate::bench::source::Proof;
use std::time::Duration;

/// How long a file that has all its points, but was not seen to be closed, must be quiet.
pub const QUICK: Duration = Duration::from_millis(50);

/// How long a file that does not read as a sweep must be quiet before it is given to the reader,
/// which says what is wrong with it.
pub const UNREADABLE: Duration = Duration::from_secs(2);

/// How long a file that is certainly not whole may be quiet before something is said, and one that
/// its writer keeps open before it is taken for whole.
pub const PATIENCE: Duration = Duration::from_secs(10);

/// What is known of a file.
#[derive(Debug, Clone, Copy)]
pub struct State {
    /// What it holds: `None` where it does not read as a sweep.
    pub length: Option<Length>,
    /// Nothing in it.
    pub empty: bool,
    /// A file refused before had the same length: the analyser is set so.
    pub again: bool,
    /// Its writer has closed it, or it came by renaming, and nothing was written since.
    pub closed: bool,
    /// It was seen to be written, and not yet to be closed.
    pub writing: bool,
    /// A sweep under this name was taken before, so that what is read may be half of that.
    pub overwritten: bool,
    /// How long nothing has changed.
    pub quiet: Duration,
    /// As the station file has it.
    pub settle: Duration,
}

/// What to do with it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Decision {
    /// It is whole.
    Take(Proof),
    /// Look again when it has been quiet for so long.
    Wait(Duration),
    /// It stays unfinished.
    Refuse,
}

/// Decides.
pub fn decide(state: &State) -> Decision {
    let settle = state.settle;
    let patience = PATIENCE.max(settle);
    // An open file is not settled by being quiet: its writer may only pause.
    let settled = if state.writing { patience } else { settle };
    let after = |needed: Duration, then: Decision| {
        if state.quiet >= needed {
            then
        } else {
            Decision::Wait(needed)
        }
    };
    if state.empty {
        return after(patience, Decision::Refuse);
    }
    match state.length {
        Some(Length::Whole) if state.closed => Decision::Take(Proof::ClosedAndWhole),
        Some(Length::Whole) if !state.overwritten => {
            after(QUICK.min(settled), Decision::Take(Proof::Whole))
        }
        Some(Length::Whole | Length::Unknown) => after(settled, Decision::Take(Proof::Settled)),
        Some(Length::Short) if state.again && state.closed => {
            after(settled, Decision::Take(Proof::Settled))
        }
        Some(Length::Short) if state.again => after(patience, Decision::Take(Proof::Settled)),
        Some(Length::Short) => after(patience, Decision::Refuse),
        None if state.writing => after(patience, Decision::Take(Proof::Unreadable)),
        None => after(UNREADABLE.max(settle), Decision::Take(Proof::Unreadable)),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const MS: Duration = Duration::from_millis(1);

    fn state(length: Option<Length>) -> State {
        State {
            length,
            empty: false,
            again: false,
            closed: false,
            writing: false,
            overwritten: false,
            quiet: Duration::ZERO,
            settle: 500 * MS,
        }
    }

    #[test]
    fn a_closed_file_with_all_its_points_is_not_waited_for() {
        let state = State {
            closed: true,
            ..state(Some(Length::Whole))
        };
        assert_eq!(decide(&state), Decision::Take(Proof::ClosedAndWhole));
    }

    #[test]
    fn all_points_without_a_close_need_a_short_quiet() {
        let mut state = state(Some(Length::Whole));
        assert_eq!(decide(&state), Decision::Wait(QUICK));
        state.quiet = QUICK;
        assert_eq!(decide(&state), Decision::Take(Proof::Whole));
        // Half of the sweep before may still stand in a file that is overwritten.
        state.overwritten = true;
        assert_eq!(decide(&state), Decision::Wait(500 * MS));
        state.writing = true;
        assert_eq!(decide(&state), Decision::Wait(PATIENCE));
    }

    #[test]
    fn a_file_of_unknown_length_settles_unless_its_writer_has_it_open() {
        let mut state = state(Some(Length::Unknown));
        state.quiet = 499 * MS;
        assert_eq!(decide(&state), Decision::Wait(500 * MS));
        state.quiet = 500 * MS;
        assert_eq!(decide(&state), Decision::Take(Proof::Settled));
        state.writing = true;
        assert_eq!(decide(&state), Decision::Wait(PATIENCE));
    }

    #[test]
    fn a_short_file_is_never_taken_for_whole_until_the_same_length_comes_again() {
        let mut state = state(Some(Length::Short));
        for closed in [false, true] {
            state.closed = closed;
            state.quiet = PATIENCE - MS;
            assert_eq!(decide(&state), Decision::Wait(PATIENCE));
            state.quiet = PATIENCE;
            assert_eq!(decide(&state), Decision::Refuse);
        }
        state.again = true;
        assert_eq!(decide(&state), Decision::Take(Proof::Settled));
    }

    #[test]
    fn an_empty_file_is_never_taken() {
        let mut state = state(None);
        state.empty = true;
        state.closed = true;
        state.quiet = UNREADABLE;
        assert_eq!(decide(&state), Decision::Wait(PATIENCE));
        state.quiet = PATIENCE;
        assert_eq!(decide(&state), Decision::Refuse);
    }

    #[test]
    fn what_does_not_read_as_a_sweep_is_given_to_the_reader_in_the_end() {
        let mut state = state(None);
        assert_eq!(decide(&state), Decision::Wait(UNREADABLE));
        state.quiet = UNREADABLE;
        assert_eq!(decide(&state), Decision::Take(Proof::Unreadable));
    }
}
