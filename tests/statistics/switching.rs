//! Switching rules replayed.

use crate::reference::path;
use reelgate::statistics::sampling::Severity;
use reelgate::statistics::switching::{Change, LotResult, REDUCED_FROM_SCORE, State, replay};
use serde_json::Value;

fn traces() -> Vec<Value> {
    let text = std::fs::read_to_string(path("s1_switching.json")).unwrap();
    let file: Value = serde_json::from_str(&text).unwrap();
    file["traces"].as_array().unwrap().clone()
}

/// Ten histories over all the rules of ISO 2859-1:1999 clause 9, lot by lot, from an independent
/// state machine.
#[test]
fn every_trace() {
    let traces = traces();
    assert_eq!(traces.len(), 10);
    for trace in traces {
        let name = trace["name"].as_str().unwrap();
        let mut state = State::default();
        let input = trace["input"].as_array().unwrap();
        let expected = trace["trace"].as_array().unwrap();
        assert_eq!(input.len(), expected.len());
        for (lot, row) in input.iter().zip(expected) {
            assert_eq!(state.severity.to_string(), row["severity"], "{name}");
            let plan = &trace["plan"][state.severity.to_string()];
            let count = lot["d"].as_u64().unwrap();
            let mut result =
                LotResult::of_count(count, plan[0].as_u64().unwrap(), plan[1].as_u64());
            assert_eq!(
                result.accepted,
                row["accepted"].as_bool().unwrap(),
                "{name}"
            );
            result.original = lot.get("resub").is_none();
            let step = state.after(result);
            state = step.state;
            let next = if state.discontinued {
                "discontinued".to_owned()
            } else {
                state.severity.to_string()
            };
            assert_eq!(next, row["next"], "{name}, lot {}", row["lot"]);
            let changed = row["severity"] != row["next"];
            assert_eq!(step.change.is_some(), changed, "{name}");
            assert_eq!(
                u64::from(state.score),
                row["score"].as_u64().unwrap(),
                "{name}"
            );
        }
    }
}

fn clean() -> LotResult {
    LotResult::of_count(0, 3, Some(2))
}

fn bad() -> LotResult {
    LotResult::of_count(4, 3, Some(2))
}

#[test]
fn reduced_inspection_needs_leave_and_ends_without_it() {
    let waiting = LotResult {
        reduced_allowed: false,
        ..clean()
    };
    let steps = replay(State::default(), &[waiting; 12]);
    let last = steps.last().unwrap();
    assert_eq!(last.state.severity, Severity::Normal);
    assert!(last.state.score >= REDUCED_FROM_SCORE);
    let reduced = last.state.after(clean());
    assert_eq!(reduced.change, Some(Change::ScoreReached));
    let back = reduced.state.after(waiting);
    assert_eq!(back.change, Some(Change::ReducedNoLongerAllowed));
    assert_eq!(back.state, State::default());
}

#[test]
fn discontinuation_stays_until_resumed_on_tightened() {
    let steps = replay(State::default(), &[bad(); 7]);
    assert_eq!(steps[1].change, Some(Change::TwoOfFiveNotAccepted));
    assert_eq!(steps[6].change, Some(Change::FiveNotAcceptedOnTightened));
    let stopped = steps[6].state;
    assert_eq!(stopped.after(clean()).state, stopped);
    assert_eq!(State::resumed().severity, Severity::Tightened);
    let again = replay(State::resumed(), &[clean(); 5]);
    assert_eq!(again[4].change, Some(Change::FiveAccepted));
}

#[test]
fn every_change_names_its_clause() {
    for change in [
        Change::TwoOfFiveNotAccepted,
        Change::FiveAccepted,
        Change::ScoreReached,
        Change::NotAcceptedOnReduced,
        Change::ReducedNoLongerAllowed,
        Change::FiveNotAcceptedOnTightened,
    ] {
        assert!(change.text().contains("ISO 2859-1:1999 9."));
    }
}
