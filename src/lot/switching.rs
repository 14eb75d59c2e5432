//! Severity of inspection by the switching rules, from the lots before: each class by itself.
//!
//! ISO 2859-1:1999 clause 9. What was not inspected as the plan demands (a condition not met, a
//! short sample that did not reject) is no result and is passed over; a class not decided counts as
//! not accepted; a lot presented again does not count.

use super::{History, LotVerdict, PastClass, PastLot};
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
    /// Lots that counted.
    pub lots: u64,
    /// One sentence, with the clause.
    pub why: String,
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
            (
                class.clone(),
                of_class(history, class, start, reduced_allowed),
            )
        })
        .collect();
    Some(Switching {
        classes,
        history: history.lots.iter().map(|lot| lot.record.clone()).collect(),
    })
}

fn of_class(history: &History, class: &str, start: Severity, reduced_allowed: bool) -> ClassState {
    let (begin, after) = match &history.set {
        Some(set) => (set.severity, set.after.min(history.lots.len())),
        None => (start, 0),
    };
    let mut state = State::at(begin);
    let mut last: Option<(Change, &str)> = None;
    let mut counted = 0;
    let (before, since) = history.lots.split_at(after);
    let mut seen: Vec<&str> = before.iter().map(|lot| lot.lot.as_str()).collect();
    for lot in since {
        let Some(result) = result(
            lot,
            class,
            reduced_allowed,
            !seen.contains(&lot.lot.as_str()),
        ) else {
            continue;
        };
        seen.push(&lot.lot);
        if !result.original {
            continue;
        }
        counted += 1;
        let step = state.after(result);
        state = step.state;
        if let Some(change) = step.change {
            last = Some((change, &lot.lot));
        }
    }
    ClassState {
        severity: state.severity.to_string(),
        discontinued: state.discontinued,
        score: state.score,
        lots: counted,
        why: why(history, begin, counted, last, state),
    }
}

fn result(lot: &PastLot, class: &str, reduced_allowed: bool, original: bool) -> Option<LotResult> {
    let of = lot.classes.get(class)?;
    let decided = lot.complete || of.verdict == LotVerdict::Reject;
    (lot.conditions_met && decided).then(|| {
        let tighter = ac_one_step_tighter(of);
        LotResult {
            accepted: of.verdict == LotVerdict::Accept,
            // By variables there is no count that a tighter plan could have accepted: no score.
            ac: if of.by_variables { u64::MAX } else { of.ac },
            accepted_one_step_tighter: !of.by_variables
                && tighter.is_some_and(|ac| of.nonconforming + of.undecided <= ac),
            original,
            reduced_allowed,
        }
    })
}

fn ac_one_step_tighter(of: &PastClass) -> Option<u64> {
    let letter: CodeLetter = of.code_letter.as_ref()?.parse().ok()?;
    one_step_tighter(letter, of.aql?, of.severity?).map(|plan| plan.ac)
}

fn why(
    history: &History,
    begin: Severity,
    counted: u64,
    last: Option<(Change, &str)>,
    state: State,
) -> String {
    let lots = match counted {
        0 => "no lot before this one counts".to_owned(),
        1 => "one lot before this one counts".to_owned(),
        many => format!("{many} lots before this one count"),
    };
    let score = match state.severity {
        Severity::Normal => format!(", switching score {}", state.score),
        _ => String::new(),
    };
    let cause = match (last, &history.set) {
        (Some((change, lot)), _) => format!("after lot {lot}, {}", change.text()),
        (None, Some(set)) => format!("set to {begin} by a person: {}", set.reason),
        (None, None) => format!("inspection begins {begin} (ISO 2859-1:1999 9.1)"),
    };
    format!("{cause}; {lots}{score}")
}
