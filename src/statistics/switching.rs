//! Switching between normal, tightened and reduced inspection: ISO 2859-1:1999 clause 9.
//!
//! A pure state machine over the lots of one supplier, part and class of nonconformity, in the
//! order in which they were first submitted. The record of each lot gives a [`LotResult`];
//! [`replay`] gives the state for the next lot and why.

use super::sampling::Severity;

/// Switching score from which reduced inspection may begin (9.3.3.2).
pub const REDUCED_FROM_SCORE: u32 = 30;

/// Consecutive lots within which two not accepted bring tightened inspection (9.3.1).
const TIGHTENED_WITHIN: u32 = 5;

/// Consecutive accepted lots that end tightened inspection (9.3.2).
const NORMAL_AFTER: u32 = 5;

/// Lots not accepted on tightened inspection that end acceptance (9.4).
const DISCONTINUED_AFTER: u32 = 5;

/// One lot as the rules see it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct LotResult {
    /// The verdict by the plan in force.
    pub accepted: bool,
    /// Acceptance number of the plan in force.
    pub ac: u64,
    /// Whether the same sample would have been accepted with the AQL one step tighter; only asked
    /// where Ac ≥ 2.
    pub accepted_one_step_tighter: bool,
    /// First submission. A lot that was presented again after it was not accepted does not count.
    pub original: bool,
    /// Production is steady, and the responsible authority finds reduced inspection desirable.
    pub reduced_allowed: bool,
}

impl LotResult {
    /// The result of an original lot with that many nonconforming in the sample.
    ///
    /// `ac_tighter` is the acceptance number for the same sample with the AQL one step tighter
    /// ([`one_step_tighter`](super::sampling::one_step_tighter)), where there is one.
    pub fn of_count(nonconforming: u64, ac: u64, ac_tighter: Option<u64>) -> Self {
        Self {
            accepted: nonconforming <= ac,
            ac,
            accepted_one_step_tighter: ac_tighter.is_some_and(|tighter| nonconforming <= tighter),
            original: true,
            reduced_allowed: true,
        }
    }

    /// What the lot adds to the switching score; `None` resets it to 0 (9.3.3.2, single sampling).
    fn score(self) -> Option<u32> {
        if self.ac >= 2 {
            return self.accepted_one_step_tighter.then_some(3);
        }
        self.accepted.then_some(2)
    }
}

/// Where the switching rules stand before the next lot.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct State {
    /// Severity for the next lot.
    pub severity: Severity,
    /// Acceptance inspection is discontinued until the supplier has acted; then [`State::resumed`].
    pub discontinued: bool,
    /// Switching score, kept on normal inspection.
    pub score: u32,
    /// On normal inspection, lots since the last one not accepted, itself not counted.
    pub lots_since_not_accepted: Option<u32>,
    /// On tightened inspection, accepted lots in a row.
    pub accepted_in_row: u32,
    /// On tightened inspection, lots not accepted since it began.
    pub not_accepted: u32,
}

/// Why the severity changed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Change {
    /// Normal to tightened: two of five or fewer consecutive lots not accepted.
    TwoOfFiveNotAccepted,
    /// Tightened to normal: five consecutive lots accepted.
    FiveAccepted,
    /// Normal to reduced: the switching score reached 30, production steady, authority agrees.
    ScoreReached,
    /// Reduced to normal: a lot not accepted.
    NotAcceptedOnReduced,
    /// Reduced to normal: production irregular, or reduced inspection no longer wanted.
    ReducedNoLongerAllowed,
    /// Discontinued: five lots not accepted on tightened inspection.
    FiveNotAcceptedOnTightened,
}

impl Change {
    /// Its clause of ISO 2859-1:1999.
    pub fn clause(self) -> &'static str {
        match self {
            Self::TwoOfFiveNotAccepted => "9.3.1",
            Self::FiveAccepted => "9.3.2",
            Self::ScoreReached => "9.3.3",
            Self::NotAcceptedOnReduced | Self::ReducedNoLongerAllowed => "9.3.4",
            Self::FiveNotAcceptedOnTightened => "9.4",
        }
    }

    /// In words, with the clause.
    pub fn text(self) -> &'static str {
        match self {
            Self::TwoOfFiveNotAccepted => {
                "normal to tightened: two of five or fewer consecutive lots were not accepted (ISO 2859-1:1999 9.3.1)"
            }
            Self::FiveAccepted => {
                "tightened to normal: five consecutive lots were accepted (ISO 2859-1:1999 9.3.2)"
            }
            Self::ScoreReached => {
                "normal to reduced: the switching score reached 30, production is steady and reduced inspection is wanted (ISO 2859-1:1999 9.3.3)"
            }
            Self::NotAcceptedOnReduced => {
                "reduced to normal: a lot was not accepted (ISO 2859-1:1999 9.3.4)"
            }
            Self::ReducedNoLongerAllowed => {
                "reduced to normal: production is irregular or reduced inspection is no longer wanted (ISO 2859-1:1999 9.3.4)"
            }
            Self::FiveNotAcceptedOnTightened => {
                "discontinued: five lots were not accepted on tightened inspection (ISO 2859-1:1999 9.4)"
            }
        }
    }
}

/// The state after a lot, and the change that the lot brought.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Step {
    pub state: State,
    pub change: Option<Change>,
}

impl Default for State {
    /// Normal inspection, with which everything begins (9.1).
    fn default() -> Self {
        Self::at(Severity::Normal)
    }
}

impl State {
    /// The beginning of inspection at a severity, as after a decision by the responsible authority.
    pub fn at(severity: Severity) -> Self {
        Self {
            severity,
            discontinued: false,
            score: 0,
            lots_since_not_accepted: None,
            accepted_in_row: 0,
            not_accepted: 0,
        }
    }

    /// After discontinuation and action by the supplier: tightened inspection (9.4).
    pub fn resumed() -> Self {
        Self::at(Severity::Tightened)
    }

    /// The state after one more lot. A lot that is not original changes nothing, nor does any after
    /// discontinuation.
    pub fn after(self, lot: LotResult) -> Step {
        if self.discontinued || !lot.original {
            return Step {
                state: self,
                change: None,
            };
        }
        match self.severity {
            Severity::Normal => self.after_on_normal(lot),
            Severity::Tightened => self.after_on_tightened(lot),
            Severity::Reduced => self.after_on_reduced(lot),
        }
    }

    fn after_on_normal(self, lot: LotResult) -> Step {
        let near = |since: u32| since < TIGHTENED_WITHIN - 1;
        if !lot.accepted && self.lots_since_not_accepted.is_some_and(near) {
            return Self::changed(Severity::Tightened, Change::TwoOfFiveNotAccepted);
        }
        let score = lot
            .score()
            .map_or(0, |gain| self.score.saturating_add(gain));
        let lots_since_not_accepted = if lot.accepted {
            self.lots_since_not_accepted.map(|n| n.saturating_add(1))
        } else {
            Some(0)
        };
        let state = Self {
            score,
            lots_since_not_accepted,
            ..self
        };
        if score >= REDUCED_FROM_SCORE && lot.reduced_allowed {
            return Step {
                state: Self {
                    score,
                    ..Self::at(Severity::Reduced)
                },
                change: Some(Change::ScoreReached),
            };
        }
        Step {
            state,
            change: None,
        }
    }

    fn after_on_tightened(self, lot: LotResult) -> Step {
        if lot.accepted {
            let accepted_in_row = self.accepted_in_row.saturating_add(1);
            if accepted_in_row >= NORMAL_AFTER {
                return Self::changed(Severity::Normal, Change::FiveAccepted);
            }
            return Step {
                state: Self {
                    accepted_in_row,
                    ..self
                },
                change: None,
            };
        }
        let not_accepted = self.not_accepted.saturating_add(1);
        let discontinued = not_accepted >= DISCONTINUED_AFTER;
        Step {
            state: Self {
                accepted_in_row: 0,
                not_accepted,
                discontinued,
                ..self
            },
            change: discontinued.then_some(Change::FiveNotAcceptedOnTightened),
        }
    }

    fn after_on_reduced(self, lot: LotResult) -> Step {
        if !lot.accepted {
            return Self::changed(Severity::Normal, Change::NotAcceptedOnReduced);
        }
        if !lot.reduced_allowed {
            return Self::changed(Severity::Normal, Change::ReducedNoLongerAllowed);
        }
        Step {
            state: self,
            change: None,
        }
    }

    fn changed(severity: Severity, change: Change) -> Step {
        Step {
            state: Self::at(severity),
            change: Some(change),
        }
    }
}

/// The steps through a history of lots, oldest first; the last state is the one for the next lot.
pub fn replay(start: State, lots: &[LotResult]) -> Vec<Step> {
    let mut state = start;
    lots.iter()
        .map(|lot| {
            let step = state.after(*lot);
            state = step.state;
            step
        })
        .collect()
}
