//! The chain from numbers to verdict can be followed: what a step says comes out of what it says goes in.

mod lot_support;

use lot_support::*;
use reelgate::judgement::{PartRecord, PartVerdict};
use reelgate::limits::{
    Acceptance, Action, CapabilityRule, Limits, MixedRule, NotNormal, OutlierMethod, OutlierRule,
    TrendRule,
};
use reelgate::lot::{History, LotJudgement, LotVerdict, PastClass, PastLot, Step, severity_state};
use reelgate::statistics::distributions::normal_quantile;
use reelgate::statistics::sampling::Severity;
use reelgate::statistics::variables::estimated_share;

/// The number behind a label of a step, in SI: `mean 1.0042 µF` is 1.0042e-6.
fn number(text: &str, label: &str) -> f64 {
    let words: Vec<&str> = text
        .split([' ', ',', ';', '\u{a0}', '\u{202f}'])
        .filter(|word| !word.is_empty())
        .collect();
    let at = words.iter().position(|word| *word == label);
    let at = at.unwrap_or_else(|| panic!("{label} in {text}"));
    let value: f64 = words[at + 1].parse().unwrap_or_else(|_| panic!("{text}"));
    let scale = match words.get(at + 2).copied().unwrap_or("") {
        "µF" => 1e-6,
        "nF" => 1e-9,
        "pF" => 1e-12,
        "%" => 1e-2,
        _ => 1.0,
    };
    value * scale
}

fn near(found: f64, expected: f64, relative: f64) {
    assert!(
        (found - expected).abs() <= relative * expected.abs().max(1e-12),
        "{found} for {expected}"
    );
}

/// The only step of a rule.
fn step<'a>(judgement: &'a LotJudgement, rule: &str) -> &'a Step {
    let mut found = judgement
        .explanation
        .iter()
        .filter(|step| step.rule.contains(rule));
    let first = found.next();
    first.unwrap_or_else(|| panic!("{rule} in {:?}", judgement.explanation))
}

fn normal_parts(n: usize, mean: f64, s: f64) -> Vec<PartRecord> {
    (0..n)
        .map(|i| {
            // In an order that is no trend.
            let place = (i * 13 + 3) % n;
            let z = normal_quantile((place as f64 + 0.5) / n as f64);
            part(i, PartVerdict::Conforming, mean + s * z)
        })
        .collect()
}

fn complete(judgement: &LotJudgement) {
    for step in &judgement.explanation {
        for text in [
            &step.about,
            &step.rule,
            &step.source,
            &step.numbers,
            &step.result,
        ] {
            assert!(!text.trim().is_empty(), "{step:?}");
        }
        let sourced = [
            "ISO",
            "JCGM",
            "NIST",
            "AEC",
            "law",
            "limit file",
            "docs/",
            "19",
        ];
        assert!(sourced.iter().any(|s| step.source.contains(s)), "{step:?}");
    }
    let last = judgement.explanation.last().expect("a step");
    assert_eq!(last.result, judgement.verdict.name());
    for reason in &judgement.reasons {
        assert!(
            last.numbers.contains(&reason.code),
            "{} in {last:?}",
            reason.code
        );
    }
}

fn with_every_rule() -> Limits {
    let of = || vec![KEY.to_owned()];
    let mut limits = limits(aql(0.65));
    limits.capability_rules = ["cp", "cpk", "pp", "ppk"]
        .map(|index| CapabilityRule {
            of: of(),
            index: index.into(),
            min: 1.0,
        })
        .into();
    limits.outlier_rules = OutlierMethod::ALL
        .into_iter()
        .filter(|method| *method != OutlierMethod::Joint)
        .map(|method| OutlierRule {
            of: of(),
            method,
            alpha: method.has_alpha().then_some(0.01),
            allowed: 0,
        })
        .collect();
    limits.mixed_rules = vec![MixedRule {
        of: of(),
        alpha: 0.01,
    }];
    limits.trend_rules = vec![TrendRule {
        of: of(),
        action: Action::Warn,
    }];
    limits
}

/// Capability, share and counts of a lot with every rule of one characteristic.
#[test]
fn every_rule_has_a_step_and_the_capability_can_be_followed() {
    let limits = with_every_rule();
    let judgement = judged(
        &lot(4000),
        &limits,
        &station(),
        &normal_parts(200, 1.01e-6, 0.02e-6),
    );
    complete(&judgement);
    for rule in [
        "CP = ",
        "CPK = ",
        "PP = ",
        "PPK = ",
        "studentized deviate",
        "test of Grubbs",
        "0.6745",
        "median ± 6",
        "two populations",
        "like the accepted lots before",
        "give the code letter",
        "code letter, AQL and severity",
        "95 %",
        "share nonconforming",
        "a reading conforms",
    ] {
        let any = judgement
            .explanation
            .iter()
            .any(|step| step.rule.contains(rule));
        assert!(any, "{rule}");
    }
    let ppk = step(&judgement, "PPK = ");
    let of = |label| number(&ppk.numbers, label);
    let (l, u, mean, s) = (of("L"), of("U"), of("mean"), of("s"));
    let by_hand = f64::min(u - mean, mean - l) / (3.0 * s);
    let said: f64 = ppk
        .result
        .split(' ')
        .next()
        .expect("a number")
        .parse()
        .expect("a number");
    near(said, by_hand, 1e-3);

    let esd = step(&judgement, "studentized deviate");
    let (r, lambda) = (number(&esd.numbers, "R"), number(&esd.numbers, "λ"));
    assert!(r <= lambda && esd.result == "none", "{esd:?}");

    let counted = step(&judgement, "d nonconforming and e undecided");
    assert_eq!(counted.numbers, "n 200, d 0, e 0");
    assert_eq!(counted.result, "d + e 0 ≤ Ac 3: accept");
}

/// The smallest n for N 100, quality limit 5 %, risk 10 %: D = 5, n = 37, probability 0.0934
/// (exact rationals, tests/reference/statistics/s1_zero_acceptance_ltpd.csv).
#[test]
fn a_zero_acceptance_sample_can_be_followed() {
    let limits = limits(Acceptance::ZeroAcceptance {
        quality_limit: 0.05,
        consumers_risk: 0.10,
    });
    let judgement = judged(&lot(100), &limits, &station(), &parts(37, &[]));
    complete(&judgement);
    let found = step(&judgement, "smallest n with Ac 0");
    assert_eq!(
        found.numbers,
        "N 100, quality limit 5 %, D = 5, consumer's risk 10 %"
    );
    // By hand: the product over i = 0..36 of (95 − i)/(100 − i) is 0.0934, over 0..35 0.1009.
    let by_hand = |n: u32| -> f64 {
        (0..n)
            .map(|i| f64::from(95 - i) / f64::from(100 - i))
            .product()
    };
    assert!(by_hand(37) <= 0.10 && by_hand(36) > 0.10);
    let expected = format!(
        "n 37, Ac 0: probability {:.4}; with n 36 it would be {:.4}",
        by_hand(37),
        by_hand(36)
    );
    assert_eq!(found.result, expected);
}

fn by_variables() -> Limits {
    limits(Acceptance::Variables {
        level: "II".into(),
        aql: vec![("A".into(), 1.0)],
        not_normal: NotNormal::Hold,
    })
}

/// Q and the estimated shares of two limits.
#[test]
fn sampling_by_variables_can_be_followed() {
    let judgement = judged(
        &lot(1000),
        &by_variables(),
        &station(),
        &normal_parts(35, 1.03e-6, 0.03e-6),
    );
    complete(&judgement);
    let found = step(&judgement, "Q = (U − mean) / s");
    let of = |label| number(&found.numbers, label);
    let (mean, s) = (of("mean"), of("s"));
    near(of("Q_U"), (of("U") - mean) / s, 2e-3);
    near(of("Q_L"), (mean - of("L")) / s, 2e-3);
    near(of("p_U"), estimated_share(of("Q_U"), 35), 2e-3);
    let section = &judgement.sampling.classes["A"].variables[0];
    near(of("M"), section.m, 1e-3);
    assert!(
        found.result.contains("≤ M") || found.result.contains("> M"),
        "{found:?}"
    );
}

/// Ten lots in a row by variables that the next tighter AQL would accept too bring reduced inspection
/// where the limit file allows it, with the smaller sample and the next larger AQL; one that it would
/// not accept begins the count anew.
#[test]
fn ten_good_lots_by_variables_bring_reduced_inspection() {
    let limits = by_variables();
    let past = |number: usize, tighter: bool| PastLot {
        record: format!("L{number}-0"),
        lot: format!("L{number}"),
        measured: "2026-10-01T08:00:00+02:00".into(),
        verdict: LotVerdict::Accept,
        conditions_met: true,
        complete: true,
        station: "BENCH-1".into(),
        series: None,
        classes: [(
            "A".to_owned(),
            PastClass {
                severity: Some(Severity::Normal),
                aql: Some(1.0),
                code_letter: Some("J".into()),
                n: 35,
                ac: 2,
                nonconforming: 0,
                undecided: 0,
                by_variables: true,
                accepted_one_step_tighter: tighter,
                verdict: LotVerdict::Accept,
                before: None,
            },
        )]
        .into(),
        characteristics: [].into(),
    };
    let after = |tighter: &[bool], allowed: bool| {
        let history = History {
            lots: tighter
                .iter()
                .enumerate()
                .map(|(i, t)| past(i, *t))
                .collect(),
            set: vec![],
        };
        severity_state(&history, &limits.acceptance, Severity::Normal, allowed).expect("severities")
    };
    assert_eq!(after(&[true; 9], true).classes["A"].severity, "normal");
    assert_eq!(after(&[true; 10], false).classes["A"].severity, "normal");
    let mut broken = [true; 12];
    broken[4] = false;
    assert_eq!(after(&broken, true).classes["A"].score, 21);
    let reduced = after(&[true; 10], true);
    let state = &reduced.classes["A"];
    assert_eq!(
        (state.severity.as_str(), state.changes[0].lots.len()),
        ("reduced", 10)
    );
    let plan =
        reelgate::lot::plan_in_state(&limits.acceptance, 1000, Some(reduced)).expect("a plan");
    let class = plan.classes["A"].variables.expect("a plan by variables");
    // Letter J: 15 items, AQL 1.5 (MIL-STD-414 Tables B-1 and B-3).
    assert_eq!((class.n, class.k, class.m), (15, 1.65, 0.0431));
}
