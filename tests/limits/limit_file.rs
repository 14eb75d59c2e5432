//! Limit files.

use super::{LIMITS, listed, with};
use reelgate::limits::{self, Acceptance, DecisionRuleKind, Limits, Retest};
use reelgate::readings::{Equivalent, Place};

fn read(text: &str) -> Result<Limits, reelgate::diagnostic::Faults> {
    limits::read("part.yaml", text.as_bytes())
}

fn only(piece: &str, by: &str, fault: &str) {
    assert_eq!(listed(read(&with(LIMITS, piece, by))), [fault], "{by}");
}

fn near(a: Option<f64>, b: f64) -> bool {
    a.is_some_and(|a| (a - b).abs() <= 1e-12 * b.abs())
}

#[test]
fn a_valid_file_resolves_to_absolute_windows() {
    let limits = read(LIMITS).expect("a valid file");
    assert_eq!(
        (limits.part.as_str(), limits.revision.as_str()),
        ("RG-0475-X7R", "3")
    );
    let keys: Vec<_> = limits
        .bounds
        .iter()
        .map(|b| (b.key.as_str(), b.class.as_str()))
        .collect();
    assert_eq!(
        keys,
        [
            ("capacitance@1kHz", "A"),
            ("esr_minimum", "A"),
            ("srf", "B"),
            ("dissipation_factor@1kHz", "B"),
            ("impedance@100kHz", "A"),
            ("impedance@700kHz..4MHz", "A"),
        ]
    );
    let capacitance = &limits.bounds[0];
    assert!(near(capacitance.lower, 4.23e-6) && near(capacitance.upper, 5.17e-6));
    assert_eq!(capacitance.nominal, Some(4.7e-6));
    assert_eq!(capacitance.place, Place::At(1e3));
    assert_eq!(
        (limits.bounds[1].lower, limits.bounds[1].place),
        (None, Place::Anywhere)
    );
    assert_eq!(limits.bounds[5].place, Place::Between(700e3, 4e6));
    let drive = limits.conditions.drive.expect("a drive");
    assert!(near(drive.lower, 0.8) && near(drive.upper, 1.2));
    assert_eq!(limits.conditions.equivalent, Equivalent::Series);
    assert_eq!(limits.conditions.ageing.map(|a| a.refer_to), Some(3.6e6));
    assert_eq!(
        limits.decision_rule.kind,
        DecisionRuleKind::GuardedAcceptance
    );
    let Acceptance::Attributes { level, aql } = &limits.acceptance else {
        panic!("{:?}", limits.acceptance)
    };
    assert_eq!(
        (level.as_str(), aql.as_slice()),
        ("II", &[("A".into(), 0.65), ("B".into(), 1.5)][..])
    );
    assert_eq!(limits.capability_rules[0].of, ["capacitance@1kHz"]);
    assert_eq!(
        limits.outlier_rules[0].of,
        ["capacitance@1kHz", "esr_minimum", "srf"]
    );
    assert_eq!(
        limits.retest,
        Retest {
            unmeasured: 1,
            nonconforming: 0
        }
    );
}

#[test]
fn what_a_short_file_leaves_out_has_its_stated_meaning() {
    let text = "part: P\nrevision: \"010\"\ncharacteristics: {srf: {min: 1 MHz}}\n\
                acceptance: {fixed: {sample: 32, accept: 0}}\n";
    let limits = read(text).expect("a valid file");
    assert_eq!(limits.revision, "010");
    assert_eq!(
        limits.decision_rule.kind,
        DecisionRuleKind::SimpleAcceptance
    );
    assert_eq!(limits.bounds[0].class, "A");
    assert_eq!(limits.retest, Retest::default());
    assert!(limits.capability_rules.is_empty() && limits.outlier_rules.is_empty());
    assert_eq!(
        limits.acceptance,
        Acceptance::Fixed {
            sample: 32,
            accept: 0
        }
    );
}

#[test]
fn the_other_kinds_of_acceptance() {
    let zero = with(
        LIMITS,
        "  attributes: {level: II, aql: {A: 0.65, B: 1.5}}",
        "  zero_acceptance: {quality_limit: 1 %, consumers_risk: 10 %}",
    );
    let expected = Acceptance::ZeroAcceptance {
        quality_limit: 0.01,
        consumers_risk: 0.1,
    };
    assert_eq!(read(&zero).expect("valid").acceptance, expected);
    let variables = with(LIMITS, "  attributes:", "  variables:");
    let acceptance = read(&variables).expect("valid").acceptance;
    assert!(matches!(acceptance, Acceptance::Variables { .. }));
}

#[test]
fn a_tolerance_is_a_letter_or_two_deviations_too() {
    for (tolerance, lower, upper) in [
        ("K", 4.23e-6, 5.17e-6),
        ("+80 % / -20 %", 3.76e-6, 8.46e-6),
        ("±0.1 µF", 4.6e-6, 4.8e-6),
    ] {
        let limits = read(&with(
            LIMITS,
            "±10 %, class",
            &format!("{tolerance}, class"),
        ))
        .expect("valid");
        let bound = &limits.bounds[0];
        assert!(
            near(bound.lower, lower) && near(bound.upper, upper),
            "{tolerance}: {bound:?}"
        );
    }
}

#[test]
fn keys_unknown_twice_or_missing() {
    only(
        "tolerance: ±10 %, class",
        "toleranse: ±10 %, class",
        "unknown_key toleranse",
    );
    only(
        "esr_minimum:        {max: 6 mΩ",
        "esr_minimum: {max: 5 mΩ, max: 6 mΩ",
        "duplicate_key max",
    );
    only(
        "revision: 3",
        "revision: 3\nrevision: 4",
        "duplicate_key revision",
    );
    only("revision: 3\n", "", "missing_key");
    only("revision: 3", "revision:", "missing_value revision");
    only("index: cpk, ", "", "missing_key capability");
    let text = LIMITS.split("acceptance:  ").next().expect("a first part");
    assert_eq!(listed(read(text)), ["missing_key"]);
    let text = with(
        LIMITS,
        "  attributes: {level: II, aql: {A: 0.65, B: 1.5}}",
        "  {}",
    );
    assert_eq!(listed(read(&text)), ["missing_key acceptance"]);
    only(
        "  attributes: {",
        "  fixed: {sample: 8, accept: 0}\n  attributes: {",
        "two_ways attributes",
    );
}

#[test]
fn a_misspelt_key_names_its_nearest_neighbour() {
    let faults = read(&with(LIMITS, "decision_rule:", "decision_rul:")).expect_err("a fault");
    let hints: Vec<_> = faults.iter().filter_map(|f| f.hint.as_deref()).collect();
    assert_eq!(hints, ["did you mean `decision_rule`?"]);
}

#[test]
fn bounds_that_cannot_be() {
    only(
        "{min: 1.9 MHz, max: 2.9 MHz",
        "{min: 2.9 MHz, max: 1.9 MHz",
        "min_above_max 2.9 MHz",
    );
    only(
        "{min: 1.9 MHz, max: 2.9 MHz",
        "{min: 2.9 MHz, max: 2.9 MHz",
        "min_above_max 2.9 MHz",
    );
    only(
        "nominal: 4.7 µF, ",
        "",
        "tolerance_without_nominal tolerance",
    );
    only("tolerance: ±10 %, class", "class", "no_limit capacitance");
    only(
        "tolerance: ±10 %",
        "tolerance: ±10 %, min: 4 µF",
        "two_ways tolerance",
    );
    only("{at: 1 kHz, nominal", "{nominal", "missing_at capacitance");
    only("{max: 6 mΩ", "{at: 1 kHz, max: 6 mΩ", "misplaced_key at");
    only(
        "{at: 100 kHz, max: 0.40 Ω}",
        "{max: 0.40 Ω}",
        "missing_at {",
    );
    only(
        "{at: 100 kHz,",
        "{at: 1 kHz, between: [1 kHz, 2 kHz],",
        "at_and_between between",
    );
    only("[700 kHz, 4 MHz]", "[4 MHz, 700 kHz]", "reversed 4 MHz");
    only("[700 kHz, 4 MHz]", "[700 kHz]", "bad_band between");
    only(
        "[700 kHz, 4 MHz]",
        "700 kHz .. 4 MHz",
        "bad_band 700 kHz .. 4 MHz",
    );
    only(
        "{at: 100 kHz,",
        "{between: [700 kHz, 4 MHz],",
        "duplicate_bound {",
    );
    only("max: 6 mΩ", "max: -6 mΩ", "impossible_value -6 mΩ");
    only("max: 6 mΩ", "max: 0 Ω", "impossible_value 0 Ω");
    only("max: 5 %", "max: 5", "impossible_value 5");
    only(
        "tolerance: ±10 %",
        "tolerance: ±100 %",
        "impossible_tolerance ±100 %",
    );
    only("class: A}\n  esr", "class: A B}\n  esr", "bad_class A B");
    only("max: 0.40 Ω", "max: 0.40 F", "not_a_quantity 0.40 F");
    only("max: 0.40 Ω", "max: 0.40", "not_a_quantity 0.40");
}

#[test]
fn frequencies_outside_of_any_sweep() {
    for outside in ["100 mHz", "11 GHz", "0 Hz", "-1 kHz"] {
        let text = with(LIMITS, "at: 100 kHz", &format!("at: {outside}"));
        assert_eq!(
            listed(read(&text)),
            [format!("frequency_outside {outside}")]
        );
    }
    only("at: 100 kHz", "at: 1 µF", "not_a_quantity 1 µF");
    for inside in ["1 Hz", "10 GHz"] {
        read(&with(LIMITS, "at: 100 kHz", &format!("at: {inside}"))).expect("an end of the range");
    }
}

/// ISO 2859-1:1999 table 2-A prints the series of AQLs from 0.010 to 10.
#[test]
fn aqls_of_the_series_for_every_class() {
    for (aql, hint) in [
        ("0.7", "its neighbours are 0.65 and 1.0"),
        ("20", "the highest is 10"),
        ("0.001", "the lowest is 0.010"),
    ] {
        let text = with(LIMITS, "A: 0.65", &format!("A: {aql}"));
        let faults = read(&text).expect_err("a fault");
        let all: Vec<_> = faults.iter().map(|f| (f.code, f.hint.as_deref())).collect();
        assert_eq!(all, [("aql_not_in_series", Some(hint))]);
    }
    only("{A: 0.65, B: 1.5}", "{A: 0.65}", "class_without_aql aql");
    only(
        "{A: 0.65, B: 1.5}",
        "{A: 0.65, B: 1.5, C: 4.0}",
        "class_without_bound C",
    );
    only(
        "{A: 0.65, B: 1.5}",
        "{A: 0.65 %, B: 1.5}",
        "not_a_number 0.65 %",
    );
    only("level: II", "level: IV", "unknown_value IV");
    only("level: II,", "level: 2,", "unknown_value 2");
}

#[test]
fn rules_that_say_nothing_are_refused() {
    only("{of: capacitance,", "{of: esl,", "rule_without_bound esl");
    only(
        "{of: capacitance,",
        "{of: capacitanse,",
        "rule_without_bound capacitanse",
    );
    only(
        "{of: capacitance,",
        "{of: capacitance@2kHz,",
        "rule_without_bound capacitance@2kHz",
    );
    only("esr_minimum, srf]", "srf, srf]", "duplicate_entry srf");
    only("[capacitance, esr_minimum, srf]", "[]", "empty_list of");
    only(
        "of: capacitance, index: cpk",
        "of: esr_minimum, index: cp",
        "index_needs_two_limits cp",
    );
    only("alpha: 0.01", "alpha: 1", "impossible_value 1");
    only("allowed: 0", "allowed: 0.5", "out_of_range 0.5");
    only("generalized_esd", "eyesight", "unknown_value eyesight");
    only(
        "generalized_esd",
        "modified_z",
        "alpha_without_meaning 0.01",
    );
    only(
        "of: [capacitance, esr_minimum, srf], method: generalized_esd",
        "of: srf, method: joint",
        "joint_of_one srf",
    );
    only(
        "{kind: guarded_acceptance",
        "{kind: simple_acceptance",
        "no_effect coverage_factor",
    );
    only(
        "kind: guarded_acceptance",
        "kind: guarded",
        "unknown_value guarded",
    );
    only("coverage_factor: 2", "coverage_factor: 0", "out_of_range 0");
    only("unmeasured: 1", "unmeasured: -1", "out_of_range -1");
    only("min: 1.33", "min: 1,33", "unknown_key 33");
}

#[test]
fn conditions_that_cannot_be() {
    only(
        "18 °C .. 28 °C",
        "28 °C .. 18 °C",
        "not_a_quantity 28 °C .. 18 °C",
    );
    only(
        "18 °C .. 28 °C",
        "18 °C .. 280 °C",
        "impossible_value 18 °C .. 280 °C",
    );
    only(
        "1.0 Vrms ± 20 %",
        "-1.0 V .. 1.0 V",
        "impossible_value -1.0 V .. 1.0 V",
    );
    only(
        "equivalent: series ",
        "equivalent: serial ",
        "unknown_value serial",
    );
    only(
        "per_decade: 2.5 %",
        "per_decade: 2.5",
        "impossible_value 2.5",
    );
    only(
        "per_decade: 2.5 %",
        "per_decade: 0.025",
        "share_without_sign 0.025",
    );
    let no_capacitance = "part: P\nrevision: 1\nconditions: {ageing: {per_decade: 2 %, refer_to: 48 h}}\n\
        characteristics: {srf: {min: 1 MHz}}\nacceptance: {fixed: {sample: 32, accept: 0}}\n";
    assert_eq!(listed(read(no_capacitance)), ["no_effect conditions"]);
    only(
        "coverage_factor: 2}\n\nacc",
        "coverage_factor: 2}\nretest: {}\n\nacc",
        "duplicate_key retest",
    );
}

/// As data sheets write it: ppm of class 1 and film, percent of class 2 and electrolytics.
#[test]
fn temperature_coefficients() {
    let with_coefficient = |text: &str| {
        let line = format!("equivalent: series\n  temperature_coefficient: {{{text}}}\n");
        read(&with(LIMITS, "equivalent: series ", &format!("{line}  #")))
    };
    for (text, expected) in [
        ("capacitance: 0.1 %/K", 1e-3),
        ("capacitance: -200 ppm/K", -2e-4),
        ("capacitance: +500 ppm / °C", 5e-4),
        ("capacitance: ±30 ppm/°C", 3e-5),
        ("capacitance: 0.2 % per K", 2e-3),
    ] {
        let limits = with_coefficient(text).expect("a valid file");
        let [(of, share)] = limits.conditions.temperature_coefficients[..] else {
            panic!("{text}")
        };
        assert_eq!(of.name(), "capacitance");
        assert!(near(Some(share), expected), "{text}: {share}");
    }
    for (text, fault) in [
        ("capacitance: 0.1 %", "not_per_kelvin 0.1 %"),
        ("capacitance: 0.001/K", "share_without_sign 0.001/K"),
        ("capacitance: 0 %/K", "impossible_value 0 %/K"),
        ("capacitance: 11 %/K", "impossible_value 11 %/K"),
        ("capacitance: much %/K", "not_a_quantity much %/K"),
        ("capacity: 0.1 %/K", "unknown_key capacity"),
        ("esl: 0.1 %/K", "no_effect conditions"),
    ] {
        assert_eq!(listed(with_coefficient(text)), [fault], "{text}");
    }
    let none = read(LIMITS).expect("a valid file").conditions;
    assert!(none.temperature_coefficients.is_empty());
}

#[test]
fn code_and_description_agree_with_the_nominal_value() {
    read(&with(LIMITS, "revision: 3", "revision: 3\ncode: 475")).expect("4.7 µF");
    read(&with(LIMITS, "revision: 3", "revision: 3\ncode: 475K")).expect("4.7 µF");
    let code = |code: &str| with(LIMITS, "revision: 3", &format!("revision: 3\ncode: {code}"));
    assert_eq!(listed(read(&code("476"))), ["capacitance_disagrees 476"]);
    assert_eq!(listed(read(&code("4n7"))), ["capacitance_disagrees 4n7"]);
    assert_eq!(listed(read(&code("none"))), ["bad_capacitance_code none"]);
    only(
        "description: 4.7 µF",
        "description: 47 µF",
        "capacitance_disagrees 47 µF ±10 % 25 V X7R 0805 multilayer ceramic",
    );
    read(&with(
        LIMITS,
        "description: 4.7 µF",
        "description: ceramic, 4700 nF,",
    ))
    .expect("the same");
}

#[test]
fn names_that_cannot_name_a_file() {
    for name in ["RG/0475", "..", "CON", "nul.txt", "a\\b", "RG 0475.", "RGµ"] {
        let text = with(LIMITS, "part: RG-0475-X7R", &format!("part: {name}"));
        assert_eq!(listed(read(&text)), [format!("name_not_safe {name}")]);
    }
}

#[test]
fn a_file_among_the_parts_is_named_as_its_part() {
    let path = |path: &str| limits::read(path, LIMITS.as_bytes());
    path("limits/parts/RG-0475-X7R.yaml").expect("its own name");
    path("elsewhere/x.yaml").expect("not among the parts");
    let listed = listed(path("limits/parts/RG-0475.yaml"));
    assert_eq!(listed, ["name_differs_from_file RG-0475-X7R"]);
}
