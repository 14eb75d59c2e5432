//! What the lots before say to a lot: severity by the switching rules, and likeness.

mod lot_support;

use indexmap::IndexMap;
use lot_support::*;
use reelgate::judgement::PartVerdict;
use reelgate::limits::{Acceptance, Action, TrendRule};
use reelgate::lot::{
    History, LotJudgement, LotVerdict, PastCharacteristic, PastClass, PastLot, SeveritySet, judge,
    plan, plan_in_state, severity_state,
};
use reelgate::statistics::sampling::Severity;
use serde_json::Value;

fn set(after: usize, severity: Severity, reason: &str) -> SeveritySet {
    SeveritySet {
        after,
        class: None,
        severity,
        reason: reason.into(),
        by: Some("QE-02".into()),
        time: "2026-10-01T08:00:00+02:00".into(),
        entry: 7,
    }
}

/// An earlier lot of one class, judged as its plan says.
fn past(number: usize, lot: &str, state: Option<Severity>, count: u64) -> PastLot {
    let switching = severity_state(
        &History {
            lots: vec![],
            set: state
                .map(|severity| set(0, severity, "a test"))
                .into_iter()
                .collect(),
        },
        &aql(0.65),
        Severity::Normal,
        true,
    );
    let plan = plan_in_state(&aql(0.65), 4000, switching).expect("a plan");
    let class = &plan.classes["A"];
    let verdict = if count > class.ac {
        LotVerdict::Reject
    } else {
        LotVerdict::Accept
    };
    PastLot {
        record: format!("{lot}-{number:012x}"),
        lot: lot.into(),
        measured: "2026-10-01T08:00:00+02:00".into(),
        verdict,
        conditions_met: true,
        complete: true,
        classes: IndexMap::from([(
            "A".to_owned(),
            PastClass {
                severity: class.severity,
                aql: class.aql,
                code_letter: class.code_letter.clone(),
                n: class.n,
                ac: class.ac,
                nonconforming: count,
                undecided: 0,
                by_variables: false,
                accepted_one_step_tighter: false,
                verdict,
                before: None,
            },
        )]),
        characteristics: IndexMap::new(),
        station: "BENCH-1".into(),
        series: None,
    }
}

/// Histories over the rules of ISO 2859-1:1999 clause 9, lot by lot, from an independent state
/// machine; those of code letter L, AQL 0.65 (Ac 3, one step tighter 2; tightened 2 and 1).
#[test]
fn severities_follow_published_sequences() {
    let text = std::fs::read_to_string("tests/reference/statistics/s1_switching.json")
        .expect("reference data");
    let file: Value = serde_json::from_str(&text).expect("JSON");
    let mut seen = Vec::new();
    for trace in file["traces"].as_array().expect("traces") {
        let plans = serde_json::json!({"normal": [3, 2], "tightened": [2, 1], "reduced": [2, 1]});
        if trace["plan"] != plans {
            continue;
        }
        let name = trace["name"].as_str().expect("a name");
        let mut history = History::default();
        let rows = trace["trace"].as_array().expect("rows");
        for (number, (lot, row)) in trace["input"]
            .as_array()
            .expect("lots")
            .iter()
            .zip(rows)
            .enumerate()
        {
            let state = severity_state(&history, &aql(0.65), Severity::Normal, true);
            let class = &state.expect("severities").classes["A"];
            assert_eq!(
                row["severity"],
                class.severity.as_str(),
                "{name}, lot {number}"
            );
            seen.push(class.severity.clone());
            let again = lot.get("resub").is_some();
            let label = if again { number - 1 } else { number };
            let severity = class.severity.parse().expect("a severity");
            let count = lot["d"].as_u64().expect("a count");
            history
                .lots
                .push(past(number, &format!("L{label}"), Some(severity), count));
        }
        let state = severity_state(&history, &aql(0.65), Severity::Normal, true);
        let class = &state.expect("severities").classes["A"];
        let last = rows.last().expect("a row");
        assert_eq!(class.discontinued, last["next"] == "discontinued", "{name}");
        assert_eq!(
            u64::from(class.score),
            last["score"].as_u64().expect("a score"),
            "{name}"
        );
    }
    for severity in ["normal", "tightened", "reduced"] {
        assert!(seen.iter().any(|s| s == severity), "{severity}");
    }
}

#[test]
fn what_is_no_result_does_not_count() {
    let state = |history: &History| {
        let all = severity_state(history, &aql(0.65), Severity::Normal, false);
        all.expect("severities").classes["A"].clone()
    };
    let rejected = |number: usize| past(number, &format!("L{number}"), None, 4);
    let mut history = History {
        lots: vec![rejected(0), rejected(1)],
        set: vec![],
    };
    let tightened = state(&history);
    assert_eq!(tightened.severity, "tightened");
    assert!(tightened.why.contains("9.3.1") && tightened.why.contains("L1"));

    history.lots[1].conditions_met = false;
    assert_eq!(
        (state(&history).severity.as_str(), state(&history).lots),
        ("normal", 1)
    );

    history.lots[1] = rejected(1);
    history.set = vec![set(2, Severity::Normal, "new tooling, audited")];
    let set = state(&history);
    assert_eq!((set.severity.as_str(), set.lots), ("normal", 0));
    assert!(set.why.contains("new tooling, audited"));

    let clean = History {
        lots: (0..20)
            .map(|i| past(i, &format!("L{i}"), None, 0))
            .collect(),
        set: vec![],
    };
    assert_eq!(
        state(&clean).severity,
        "normal",
        "reduced inspection is not wanted"
    );
    let none = Acceptance::Fixed {
        sample: 8,
        accept: 0,
    };
    assert_eq!(severity_state(&clean, &none, Severity::Normal, true), None);
}

#[test]
fn a_discontinued_supplier_is_held() {
    // Two lots not accepted, then five on tightened inspection (ISO 2859-1:1999 9.4).
    let mut history = History::default();
    for number in 0..7 {
        let severity = if number < 2 {
            Severity::Normal
        } else {
            Severity::Tightened
        };
        history
            .lots
            .push(past(number, &format!("L{number}"), Some(severity), 9));
    }
    let limits = limits(aql(0.65));
    let state = severity_state(&history, &limits.acceptance, Severity::Normal, false);
    let plan = plan_in_state(&limits.acceptance, 4000, state).expect("a plan");
    let judgement = judge(
        &lot(4000),
        &limits,
        &station(),
        &plan,
        &parts(200, &[]),
        vec![],
        &history,
    );
    assert_eq!(
        outcome(&judgement),
        (LotVerdict::Hold, vec!["inspection_discontinued"])
    );
    let class = &judgement.sampling.classes["A"];
    assert_eq!(
        (class.severity.as_deref(), class.ac),
        (Some("tightened"), 2)
    );
    assert!(
        judgement
            .explanation
            .iter()
            .any(|step| step.source.contains("9.4"))
    );
}

/// The lot of `means[last]` after accepted lots of the other means, each of 50 parts that spread
/// as this one does.
fn after(means: &[f64], action: Action) -> LotJudgement {
    let mut limits = limits(Acceptance::Fixed {
        sample: 50,
        accept: 0,
    });
    limits.trend_rules = vec![TrendRule {
        of: vec![KEY.into()],
        action,
    }];
    let (now, before) = means.split_last().expect("a lot");
    let sample: Vec<_> = (0..50)
        .map(|i| part(i, PartVerdict::Conforming, value(i) + now * 1e-9))
        .collect();
    let plan = plan(&limits.acceptance, 4000, Severity::Normal).expect("a plan");
    let of = |history: &History| {
        judge(
            &lot(4000),
            &limits,
            &station(),
            &plan,
            &sample,
            vec![],
            history,
        )
    };
    let own = of(&History::default()).statistics[KEY].clone();
    let mean = |x: f64| own.mean.expect("a mean") + (x - now) * 1e-9;
    let lots = before.iter().enumerate().map(|(i, x)| {
        let mut lot = past(i, &format!("L{i}"), None, 0);
        let spread = own.standard_deviation;
        let of = PastCharacteristic {
            n: 50,
            mean: mean(*x),
            standard_deviation: spread,
        };
        lot.characteristics.insert(KEY.into(), of);
        lot
    });
    of(&History {
        lots: lots.collect(),
        set: vec![],
    })
}

/// Flow rates of NIST/SEMATECH e-Handbook 6.3.2.2, ten values with the limits 45.816 and 55.804 of
/// their individuals chart, as lot means in nF.
const FLOW: [f64; 10] = [49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1];

#[test]
fn a_lot_is_held_against_the_lots_before() {
    let with = |next: f64| [FLOW.as_slice(), &[next]].concat();
    let inside = after(&with(50.9), Action::Hold);
    assert_eq!(inside.verdict, LotVerdict::Accept);
    assert_eq!(inside.findings.trend[0].history.len(), 10);

    let codes = |judgement: &LotJudgement| -> Vec<String> {
        judgement.warnings.iter().map(|w| w.code.clone()).collect()
    };
    let beyond = after(&with(60.0), Action::Hold);
    assert_eq!(
        outcome(&beyond),
        (LotVerdict::Hold, vec!["lot_unlike_previous"])
    );
    // By hand: mean 50.81, s 2.03385, t = 9.19/(2.03385 √1.1) = 4.308 on 9 degrees of freedom.
    let signals = &beyond.findings.trend[0].signals;
    assert!(signals[0].contains("t 4.31"), "{signals:?}");
    assert!(
        signals.iter().any(|s| s.contains("beyond 3 sigma")),
        "{signals:?}"
    );
    let warned = after(&with(60.0), Action::Warn);
    assert_eq!(warned.verdict, LotVerdict::Accept);
    assert!(codes(&warned).contains(&"lot_unlike_previous".to_owned()));
    let chart = |next: f64| {
        let judgement = after(&with(next), Action::Warn);
        let signals = judgement.findings.trend[0].signals.join("; ");
        signals.contains("beyond 3 sigma")
    };
    assert!(
        !chart(55.7) && chart(55.9) && !chart(45.9) && chart(45.7),
        "45.816 and 55.804"
    );

    let alone = after(&[50.0], Action::Hold);
    assert_eq!(alone.verdict, LotVerdict::Accept);
    assert!(codes(&alone).contains(&"no_history".to_owned()));
}

/// The record of a sample lot, read back from its bytes, as history of the next.
#[test]
fn a_record_becomes_history() {
    let site = tempfile::tempdir().expect("a folder");
    let copied = std::process::Command::new("cp")
        .args(["-r", "limits"])
        .arg(site.path())
        .status();
    assert!(copied.expect("cp").success());
    let output = std::process::Command::new(env!("CARGO_BIN_EXE_reelgate"))
        .args([
            "judge",
            "--format",
            "json",
            "--now",
            "2026-11-02T08:00:00+01:00",
        ])
        .arg("--site")
        .arg(site.path())
        .arg("sample-lots/26K-0457")
        .output()
        .expect("reelgate runs");
    let record = reelgate::record::from_bytes(&output.stdout).expect("a record");
    let past = PastLot::of(&record);
    assert_eq!(
        (past.lot.as_str(), past.verdict),
        ("26K-0457", LotVerdict::Accept)
    );
    assert!(past.conditions_met && past.complete);
    for (name, class) in &record.sampling.classes {
        let of = &past.classes[name];
        assert_eq!(
            (of.n, of.ac, of.severity),
            (class.n, class.ac, Some(Severity::Normal))
        );
    }
    assert_eq!(past.characteristics.len(), record.statistics.len());
    let history = History {
        lots: vec![past],
        set: vec![],
    };
    let acceptance = Acceptance::Attributes {
        level: "II".into(),
        aql: record
            .sampling
            .classes
            .iter()
            .map(|(name, class)| (name.clone(), class.aql.expect("an AQL")))
            .collect(),
    };
    let state = severity_state(&history, &acceptance, Severity::Normal, false).expect("severities");
    assert_eq!(state.history, [record.record]);
    assert!(state.classes.values().all(|c| c.lots == 1 && c.score >= 2));
}

/// Looking back over the last 40 records gives what looking back over all of them gives, since the
/// oldest brings the state that its own record found.
#[test]
fn a_window_gives_what_the_whole_history_gives() {
    let mut seed = 7_u64;
    let mut random = move |below: u64| {
        seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        (seed >> 33) % below
    };
    let mut all = History::default();
    let mut seen = std::collections::BTreeSet::new();
    for number in 0..600 {
        // Good years and bad ones.
        let bad = if number / 100 % 2 == 0 { 40 } else { 4 };
        let full = severity_state(&all, &aql(0.65), Severity::Normal, true).expect("severities");
        let from = all.lots.len().saturating_sub(40);
        let window = History {
            lots: all.lots[from..].to_vec(),
            set: all
                .set
                .iter()
                .filter(|s| s.after > from || from == 0)
                .map(|s| SeveritySet {
                    after: s.after - from,
                    ..s.clone()
                })
                .collect(),
        };
        let seen_here =
            severity_state(&window, &aql(0.65), Severity::Normal, true).expect("severities");
        let (mut full, short) = (full.classes["A"].clone(), seen_here.classes["A"].clone());
        seen.insert((full.severity.clone(), full.discontinued));
        let mut short = short;
        // What is shown of the way there is what is in view.
        for state in [&mut full, &mut short] {
            state.changes.clear();
            state.set = None;
            state.why.clear();
            state.cause.clear();
        }
        assert_eq!(short, full, "lot {number}");
        if full.discontinued && random(8) == 0 {
            all.set
                .push(set(all.lots.len(), Severity::Tightened, "acted"));
        }
        let count = if random(bad) == 0 { 9 } else { 0 };
        let severity = full.severity.parse().expect("a severity");
        let mut lot = past(number, &format!("L{number}"), Some(severity), count);
        let before = severity_state(&all, &aql(0.65), Severity::Normal, true).expect("severities");
        lot.classes["A"].before = Some(before.classes["A"].clone());
        all.lots.push(lot);
    }
    assert_eq!(
        seen.len(),
        4,
        "normal, tightened, reduced, discontinued: {seen:?}"
    );
}
