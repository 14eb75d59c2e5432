//! Conformance probability and global risks: the worked examples of JCGM 106:2012, with the digits
//! that the document prints; the data behind its figure 17 were recomputed with scipy 1.17.1.

use reelgate::judgement::{acceptance_window, conformance_probability, global_risks};
use reelgate::limits::{DecisionRule, DecisionRuleKind, Window};

fn window(lower: impl Into<Option<f64>>, upper: impl Into<Option<f64>>) -> Window {
    Window {
        lower: lower.into(),
        upper: upper.into(),
    }
}

fn rule(kind: DecisionRuleKind, coverage_factor: f64) -> DecisionRule {
    DecisionRule {
        kind,
        coverage_factor,
    }
}

#[test]
fn worked_examples_of_clause_7() {
    let cases = [
        // 7.3.3 example 1, breakdown voltage of a Zener diode: printed 0.92.
        (-5.47, 0.05, window(None, -5.40), 0.9192433407662273, 0.92),
        // 7.3.3 example 2, absorbed energy of a metal container: printed 0.99.
        (509.7, 8.6, window(490.0, None), 0.9890095473848223, 0.99),
        // 7.4 example, kinematic viscosity of motor oil: printed 0.66.
        (13.6, 1.8, window(12.5, 16.3), 0.6626297864953077, 0.66),
    ];
    for (y, u, window, exact, printed) in cases {
        let p = conformance_probability(y, u, window).unwrap();
        assert!((p - exact).abs() < 1e-12, "{p} {exact}");
        assert_eq!((100.0 * p).round() / 100.0, printed);
    }
    // 7.7.5: with C_m = T/(4u) = 1 the probability is 95 % for 0.45 ≤ ỹ ≤ 0.55 alone.
    for (y, above) in [
        (0.44, false),
        (0.45, true),
        (0.50, true),
        (0.55, true),
        (0.56, false),
    ] {
        let p = conformance_probability(y, 0.25, window(0.0, 1.0)).unwrap();
        assert_eq!(p >= 0.95, above, "{y}: {p}");
    }
}

#[test]
fn edges_of_the_domain() {
    let both = window(9.0, 11.0);
    assert_eq!(conformance_probability(11.0, 0.0, both), Some(1.0));
    assert_eq!(conformance_probability(11.0001, 0.0, both), Some(0.0));
    assert_eq!(conformance_probability(f64::NAN, 0.1, both), None);
    assert_eq!(conformance_probability(10.0, f64::INFINITY, both), None);
    assert_eq!(conformance_probability(10.0, -0.1, both), None);
    assert_eq!(
        conformance_probability(10.0, 0.1, window(None, None)),
        Some(1.0)
    );
    // Far outside the small probability keeps its digits: Φ(−20) = 2.7536e-89.
    let p = conformance_probability(13.0, 0.1, both).unwrap();
    assert!((p / 2.753_624_118_606_234e-89 - 1.0).abs() < 1e-6, "{p:e}");
}

#[test]
fn acceptance_limits_of_clause_8() {
    let limits = window(9.0, 11.0);
    let of = |kind, u| acceptance_window(limits, u, &rule(kind, 2.0));
    let close = |w: Option<Window>, l: f64, u: f64| {
        let w = w.unwrap();
        (w.lower.unwrap() - l).abs() < 1e-12 && (w.upper.unwrap() - u).abs() < 1e-12
    };
    assert!(close(
        of(DecisionRuleKind::SimpleAcceptance, 0.1),
        9.0,
        11.0
    ));
    assert!(close(
        of(DecisionRuleKind::GuardedAcceptance, 0.1),
        9.2,
        10.8
    ));
    assert!(close(
        of(DecisionRuleKind::GuardedRejection, 0.1),
        8.8,
        11.2
    ));
    assert_eq!(of(DecisionRuleKind::GuardedAcceptance, 0.6), None);
    // 8.3.2.3: with w = U = 2u a value on the acceptance limit fails with 2.3 % at most.
    let p = conformance_probability(10.8, 0.1, window(None, 11.0)).unwrap();
    assert!((1.0 - p - 0.02275013194817921).abs() < 1e-12);
}

#[test]
fn precision_resistors_of_clause_9() {
    // 9.5.3.2: printed 0.90 of the process conforms; R_C 1 %, R_P 7 %.
    let (process, u) = ((1500.0, 0.12), 0.04);
    let tolerance = window(1499.8, 1500.2);
    let p = conformance_probability(process.0, process.1, tolerance).unwrap();
    assert!((p - 0.9044192954543706).abs() < 1e-12);
    let guarded = global_risks(process, u, tolerance, window(1499.82, 1500.18)).unwrap();
    assert!(
        (guarded.consumer - 0.009878291521772114).abs() < 1e-8,
        "{guarded:?}"
    );
    assert!(
        (guarded.producer - 0.06902651046145071).abs() < 1e-8,
        "{guarded:?}"
    );
    let simple = global_risks(process, u, tolerance, tolerance).unwrap();
    assert!(
        (simple.consumer - 0.01894220671701597).abs() < 1e-8,
        "{simple:?}"
    );
    assert!(
        (simple.producer - 0.03720780017803787).abs() < 1e-8,
        "{simple:?}"
    );
}

#[test]
fn data_behind_figure_17() {
    // Process u0 = T/6 centred, u_m = T/(4 C_m), guard band w in units of U = 2 u_m.
    let path = concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/tests/reference/judgement/jcgm106_figure_17.csv"
    );
    let text = std::fs::read_to_string(path).unwrap();
    let mut rows = 0;
    for line in text
        .lines()
        .filter(|l| l.starts_with(|c: char| c.is_ascii_digit()))
    {
        let v: Vec<f64> = line.split(',').map(|t| t.parse().unwrap()).collect();
        let (u, w) = (1.0 / (4.0 * v[0]), v[1] * 2.0 / (4.0 * v[0]));
        let risks =
            global_risks((0.5, 1.0 / 6.0), u, window(0.0, 1.0), window(w, 1.0 - w)).unwrap();
        assert!(
            (risks.consumer - v[2]).abs() < 1e-9 + 1e-6 * v[2],
            "{line}: {risks:?}"
        );
        assert!(
            (risks.producer - v[3]).abs() < 1e-9 + 1e-6 * v[3],
            "{line}: {risks:?}"
        );
        rows += 1;
    }
    assert_eq!(rows, 45);
    // The document's text, 9.5.6: C_m = 2 gives 0.1 % and 1.5 %, C_m = 10 gives 0.04 % and 0.07 %.
}

#[test]
fn risks_without_a_process_or_an_uncertainty_are_not_told() {
    let limits = window(0.0, 1.0);
    for (process, u) in [((0.5, 0.0), 0.1), ((0.5, 0.1), 0.0), ((f64::NAN, 0.1), 0.1)] {
        assert_eq!(global_risks(process, u, limits, limits), None);
    }
}
