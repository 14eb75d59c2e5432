//! Severity of inspection by the switching rules, from the lots before: each class by itself.
//!
//! ISO 2859-1:1999 clause 9. What was not inspected as the plan demands (a condition not met, a
//! short sample that did not reject) is no result and is passed over; a class not decided counts as
//! not accepted; a lot presented again does not count. A person can set a severity, from which the
//! rules then go on.
//!
//! The oldest lot in view brings the state that its own record found, so that looking back over a few
//! lots gives the same as looking back over all.

use super::{History, LotVerdict, PastClass, PastLot, SeveritySet};
use crate::limits::Acceptance;
use crate::statistics::sampling::{CodeLetter, Severity, one_step_tighter};
use crate::statistics::switching::{Change, LotResult, State};
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};

/// Where the switching rules stand for a lot.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Switching {
    /// By class.
    pub classes: IndexMap<String, ClassState>,
    /// Records of the lots before, oldest first.
    pub history: Vec<String>,
}

/// The state of one class.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ClassState {
    /// `normal`, `tightened`, `reduced`.
    pub severity: String,
    /// Inspection is discontinued until the supplier has acted.
    pub discontinued: bool,
    /// Switching score, on normal inspection.
    pub score: u32,
    /// On normal inspection, lots since the last one not accepted.
    #[serde(default)]
    pub lots_since_not_accepted: Option<u32>,
    /// On tightened inspection, accepted lots in a row.
    #[serde(default)]
    pub accepted_in_row: u32,
    /// On tightened inspection, lots not accepted since it began.
    #[serde(default)]
    pub not_accepted: u32,
    /// Lots that counted.
    pub lots: u64,
    /// What brought this severity: a change by the rules, a person, or that inspection begins so.
    #[serde(default)]
    pub cause: String,
    /// The cause and how many lots counted, in one sentence with the clause.
    pub why: String,
    /// Changes after the lots in view, oldest first.
    #[serde(default)]
    pub changes: Vec<ChangeSection>,
    /// The latest decision of a person in view.
    #[serde(default)]
    pub set: Option<SetSection>,
}

/// One change of severity.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ChangeSection {
    /// `normal`, `tightened`, `reduced`, `discontinued`.
    pub from: String,
    pub to: String,
    /// In words, with the clause.
    pub rule: String,
    /// Of ISO 2859-1:1999.
    pub clause: String,
    /// The lot after which it came; null where a person or the limit file brought it.
    pub after: Option<String>,
    /// Its record.
    pub record: Option<String>,
    /// Lots that brought it, as far as in view.
    pub lots: Vec<String>,
}

/// A severity that a person set.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct SetSection {
    pub severity: String,
    pub reason: String,
    pub by: Option<String>,
    /// RFC 3339 with offset.
    pub time: String,
    /// Index of its entry in the ledger.
    pub entry: u64,
}

impl Switching {
    /// The severity of a class; normal where the rules know nothing of it.
    pub fn severity(&self, class: &str) -> Severity {
        let state = self.classes.get(class);
        state
            .and_then(|state| state.severity.parse().ok())
            .unwrap_or(Severity::Normal)
    }
}

impl ClassState {
    /// As the rules count it.
    fn state(&self) -> State {
        State {
            severity: self.severity.parse().unwrap_or(Severity::Normal),
            discontinued: self.discontinued,
            score: self.score,
            lots_since_not_accepted: self.lots_since_not_accepted,
            accepted_in_row: self.accepted_in_row,
            not_accepted: self.not_accepted,
        }
    }
}

/// The state before the next lot, for each class of an acceptance by AQL; `None` for others, which
/// have no severities.
///
/// `start` is the severity with which inspection begins; `reduced_allowed` that the responsible
/// authority wants reduced inspection and production is steady (9.3.3.1 b, c).
pub fn severity_state(
    history: &History,
    acceptance: &Acceptance,
    start: Severity,
    reduced_allowed: bool,
) -> Option<Switching> {
    let (Acceptance::Attributes { aql, .. } | Acceptance::Variables { aql, .. }) = acceptance
    else {
        return None;
    };
    let classes = aql
        .iter()
        .map(|(class, _)| {
            let mut replay = Replay::begin(history, class, start);
            replay.all(history, class, reduced_allowed);
            (class.clone(), replay.section())
        })
        .collect();
    Some(Switching {
        classes,
        history: history.lots.iter().map(|lot| lot.record.clone()).collect(),
    })
}

/// The rules on their way through the lots of one class.
struct Replay<'a> {
    state: State,
    cause: String,
    lots: u64,
    changes: Vec<ChangeSection>,
    set: Option<&'a SeveritySet>,
    /// Lots that counted since the last change, and whether they were accepted.
    since: Vec<(&'a str, bool)>,
    /// Lots that counted since the score was 0.
    scoring: Vec<&'a str>,
}

impl<'a> Replay<'a> {
    fn begin(history: &History, class: &str, start: Severity) -> Self {
        let mut all = history.lots.iter();
        let first = all.find_map(|lot| lot.classes.get(class));
        let before = first.and_then(|of| of.before.as_ref());
        let begins = || format!("inspection begins {start} (ISO 2859-1:1999 9.1)");
        Replay {
            state: before.map_or(State::at(start), ClassState::state),
            cause: before.map_or_else(begins, |before| before.cause.clone()),
            lots: before.map_or(0, |before| before.lots),
            changes: Vec::new(),
            set: None,
            since: Vec::new(),
            scoring: Vec::new(),
        }
    }

    fn all(&mut self, history: &'a History, class: &str, reduced_allowed: bool) {
        let mut seen: Vec<&str> = Vec::new();
        for (number, lot) in history.lots.iter().enumerate() {
            self.by_person(history, class, number);
            let original = !seen.contains(&lot.lot.as_str());
            let Some(result) = result(lot, class, reduced_allowed, original) else {
                continue;
            };
            seen.push(&lot.lot);
            if original {
                self.after(lot, result);
            }
        }
        self.by_person(history, class, history.lots.len());
        if self.state.severity == Severity::Reduced && !reduced_allowed {
            let why = Change::ReducedNoLongerAllowed;
            let rule = (why.text(), why.clause());
            self.change(State::at(Severity::Normal), rule, None, Vec::new());
            self.cause = why.text().to_owned();
        }
    }

    /// Decisions made when so many lots had been recorded.
    fn by_person(&mut self, history: &'a History, class: &str, number: usize) {
        let last = history.lots.len();
        let here = |set: &&SeveritySet| {
            set.after.min(last) == number && set.class.as_deref().is_none_or(|of| of == class)
        };
        for set in history.set.iter().filter(here) {
            let by = set
                .by
                .as_ref()
                .map_or("a person".to_owned(), |by| by.clone());
            let day: String = set.time.chars().take(10).collect();
            let clause = if self.state.discontinued {
                "9.4"
            } else {
                "9.1"
            };
            let rule = format!(
                "set to {} by {by} on {day}, entry {} (ISO 2859-1:1999 {clause}): {}",
                set.severity, set.entry, set.reason
            );
            self.change(State::at(set.severity), (&rule, clause), None, Vec::new());
            self.cause = rule;
            self.lots = 0;
            self.set = Some(set);
        }
    }

    fn after(&mut self, lot: &'a PastLot, result: LotResult) {
        self.lots += 1;
        let step = self.state.after(result);
        if self.state.discontinued {
            return;
        }
        self.since.push((&lot.lot, result.accepted));
        self.scoring.push(&lot.lot);
        let Some(change) = step.change else {
            if step.state.score == 0 {
                self.scoring.clear();
            }
            self.state = step.state;
            return;
        };
        let lots = self.brought(change, lot);
        let (shown, more) = named(&lots);
        self.cause = format!("after lot {}, {}: {shown}{more}", lot.lot, change.text());
        let rule = (change.text(), change.clause());
        self.change(step.state, rule, Some(lot), lots);
    }

    /// The lots that brought a change, as far as they are in view.
    fn brought(&self, change: Change, last: &PastLot) -> Vec<String> {
        let not_accepted = || self.since.iter().filter(|(_, accepted)| !accepted);
        let accepted = self.since.iter().filter(|(_, accepted)| *accepted);
        let name = |(lot, _): &(&str, bool)| (*lot).to_owned();
        match change {
            Change::TwoOfFiveNotAccepted => newest(not_accepted().map(name).collect(), 2),
            Change::FiveNotAcceptedOnTightened => newest(not_accepted().map(name).collect(), 5),
            Change::FiveAccepted => newest(accepted.map(name).collect(), 5),
            Change::ScoreReached => self.scoring.iter().map(|lot| (*lot).to_owned()).collect(),
            Change::NotAcceptedOnReduced | Change::ReducedNoLongerAllowed => vec![last.lot.clone()],
        }
    }

    fn change(
        &mut self,
        to: State,
        (rule, clause): (&str, &str),
        after: Option<&PastLot>,
        lots: Vec<String>,
    ) {
        self.changes.push(ChangeSection {
            from: word(self.state),
            to: word(to),
            rule: rule.to_owned(),
            clause: clause.to_owned(),
            after: after.map(|lot| lot.lot.clone()),
            record: after.map(|lot| lot.record.clone()),
            lots,
        });
        self.state = to;
        self.scoring.clear();
        // What is not accepted on tightened inspection is counted through to discontinuation.
        if !to.discontinued {
            self.since.clear();
        }
    }

    fn section(self) -> ClassState {
        let state = self.state;
        let lots = match self.lots {
            0 => "no lot before this one counts".to_owned(),
            1 => "one lot before this one counts".to_owned(),
            many => format!("{many} lots before this one count"),
        };
        let count = match (state.discontinued, state.severity) {
            (true, _) => String::new(),
            (_, Severity::Normal) => format!(", switching score {}", state.score),
            (_, Severity::Tightened) => format!(
                ", {} accepted in a row, {} not accepted on tightened inspection",
                state.accepted_in_row, state.not_accepted
            ),
            (_, Severity::Reduced) => String::new(),
        };
        ClassState {
            severity: state.severity.to_string(),
            discontinued: state.discontinued,
            score: state.score,
            lots_since_not_accepted: state.lots_since_not_accepted,
            accepted_in_row: state.accepted_in_row,
            not_accepted: state.not_accepted,
            lots: self.lots,
            why: format!("{}; {lots}{count}", self.cause),
            cause: self.cause,
            changes: self.changes,
            set: self.set.map(|set| SetSection {
                severity: set.severity.to_string(),
                reason: set.reason.clone(),
                by: set.by.clone(),
                time: set.time.clone(),
                entry: set.entry,
            }),
        }
    }
}

fn word(state: State) -> String {
    if state.discontinued {
        "discontinued".to_owned()
    } else {
        state.severity.to_string()
    }
}

fn newest(mut lots: Vec<String>, count: usize) -> Vec<String> {
    let from = lots.len().saturating_sub(count);
    lots.split_off(from)
}

/// `lots L1, L2`, at most fifteen of them.
fn named(lots: &[String]) -> (String, &'static str) {
    const MOST: usize = 15;
    let from = lots.len().saturating_sub(MOST);
    let shown = lots.get(from..).unwrap_or(lots).join(", ");
    let words = if lots.len() == 1 { "lot" } else { "lots" };
    let more = if from > 0 { " and others before" } else { "" };
    (format!("{words} {shown}"), more)
}

fn result(lot: &PastLot, class: &str, reduced_allowed: bool, original: bool) -> Option<LotResult> {
    let of = lot.classes.get(class)?;
    let decided = lot.complete || of.verdict == LotVerdict::Reject;
    (lot.conditions_met && decided).then(|| {
        let tighter = ac_one_step_tighter(of);
        LotResult {
            accepted: of.verdict == LotVerdict::Accept,
            // By variables there is no Ac: ten lots in a row that one step tighter accepts too.
            ac: if of.by_variables { u64::MAX } else { of.ac },
            accepted_one_step_tighter: if of.by_variables {
                of.accepted_one_step_tighter
            } else {
                tighter.is_some_and(|ac| of.nonconforming + of.undecided <= ac)
            },
            original,
            reduced_allowed,
        }
    })
}

fn ac_one_step_tighter(of: &PastClass) -> Option<u64> {
    let letter: CodeLetter = of.code_letter.as_ref()?.parse().ok()?;
    one_step_tighter(letter, of.aql?, of.severity?).map(|plan| plan.ac)
}
