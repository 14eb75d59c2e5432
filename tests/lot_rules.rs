//! Lot rules on published data: what holds a lot that every part passes.

mod lot_support;

use lot_support::*;
use reelgate::judgement::{PartRecord, PartVerdict};
use reelgate::limits::{Acceptance, Bound, Limits, MixedRule, OutlierMethod, OutlierRule};
use reelgate::lot::{LotJudgement, LotVerdict};
use reelgate::readings::{Characteristic, Place};
use serde_json::Value;
use std::fs;

fn reference(name: &str) -> String {
    fs::read_to_string(format!("tests/reference/statistics/{name}")).expect("reference data")
}

/// Limits that every part is inside, with a rule for outliers.
fn outliers(method: OutlierMethod, alpha: Option<f64>, of: &[&str], sample: usize) -> Limits {
    let mut limits = limits(Acceptance::Fixed {
        sample: sample as u64,
        accept: 0,
    });
    limits.outlier_rules = vec![OutlierRule {
        of: of.iter().map(|key| (*key).to_owned()).collect(),
        method,
        alpha,
        allowed: 0,
    }];
    limits
}

fn lot_of(values: &[f64]) -> Vec<PartRecord> {
    let numbered = values.iter().enumerate();
    numbered
        .map(|(i, v)| part(i, PartVerdict::Conforming, *v))
        .collect()
}

fn result<'a>(judgement: &'a LotJudgement, rule: &str) -> &'a str {
    let step = judgement
        .explanation
        .iter()
        .find(|step| step.rule.contains(rule));
    &step.expect("a step of the chain").result
}

/// Rosner (1983), 54 values; NIST/SEMATECH e-Handbook 1.3.5.17.3: three outliers, 6.01, 5.42 and
/// 5.34, that hide one another: neither the first nor the second step of the test is significant.
#[test]
fn three_outliers_that_mask_one_another_are_found() {
    let text = reference("s4_rosner_data.csv");
    let rosner: Vec<f64> = text.lines().filter_map(|line| line.parse().ok()).collect();
    assert_eq!(rosner.len(), 54);
    // As capacitances inside the limits.
    let values: Vec<f64> = rosner.iter().map(|x| 1e-6 + 1e-9 * x).collect();
    let sample = lot_of(&values);
    let masked: Vec<String> = [6.01, 5.42, 5.34]
        .iter()
        .map(|x| {
            let at = rosner.iter().position(|v| v == x).expect("in the data");
            sample[at].part.clone()
        })
        .collect();
    let found = |method, alpha| {
        let judgement = judged(
            &lot(4000),
            &outliers(method, alpha, &[KEY], 54),
            &station(),
            &sample,
        );
        (
            judgement.verdict,
            judgement.statistics[KEY].outliers.clone(),
        )
    };
    assert_eq!(
        found(OutlierMethod::GeneralizedEsd, Some(0.05)),
        (LotVerdict::Hold, masked)
    );
    assert_eq!(
        found(OutlierMethod::Grubbs, Some(0.05)),
        (LotVerdict::Accept, vec![]),
        "a test for a single outlier sees none of the three"
    );
}

/// Seven parts, one far: the limits by hand. Modified z of 1.06 µF: median 1.000, MAD 0.002, so
/// 0.6745 · 0.060/0.002 = 20.2; quartiles 0.9985 and 1.0025, sigma 0.00296, 6 sigma 0.0178.
#[test]
fn robust_methods_see_a_far_part_in_a_small_lot() {
    let micro = [0.997, 0.998, 0.999, 1.000, 1.002, 1.003, 1.060];
    let sample = lot_of(&micro.map(|v| v * 1e-6));
    for method in [OutlierMethod::ModifiedZ, OutlierMethod::PartAverage] {
        let limits = outliers(method, None, &[KEY], 7);
        let judgement = judged(&lot(4000), &limits, &station(), &sample);
        assert_eq!(
            outcome(&judgement),
            (LotVerdict::Hold, vec!["outliers_found"])
        );
        assert_eq!(judgement.statistics[KEY].outliers, ["007"]);
        assert_eq!(result(&judgement, "outliers"), "007: holds the lot");
    }
}

/// The second characteristic of a lot, bound and readings.
const SRF: &str = "srf";

/// Capacitance wanders by ± 5 nF and the self-resonance follows it, f = 1/(2π√(LC)), with a
/// scatter of its own of ± 0.02 %; one part has neither far from the others.
fn capacitance_and_resonance(n: usize, odd: usize) -> (Limits, Vec<PartRecord>) {
    let mut limits = outliers(OutlierMethod::Joint, Some(0.01), &[KEY, SRF], n);
    limits.bounds.push(Bound {
        key: SRF.into(),
        characteristic: Characteristic::Srf,
        place: Place::Anywhere,
        lower: Some(4e6),
        upper: Some(6e6),
        nominal: None,
        class: "A".into(),
    });
    let scatter = |i: usize, by: f64| (i as f64 * by).fract() - 0.5;
    let sample = (0..n)
        .map(|i| {
            let capacitance = 1e-6 + 1e-8 * scatter(i, 0.618_034);
            let follows = if i == odd {
                2e-6 - capacitance
            } else {
                capacitance
            };
            let own = 1.0 + 4e-4 * scatter(i, 0.414_214);
            let resonance = own / (std::f64::consts::TAU * (1e-9 * follows).sqrt());
            let mut part = part(i, PartVerdict::Conforming, capacitance);
            let mut reading = part.readings[KEY].clone();
            reading.value = Some(resonance);
            part.readings.insert(SRF.into(), reading);
            part
        })
        .collect();
    (limits, sample)
}

#[test]
fn a_part_inside_every_limit_and_unlike_its_lot_is_found() {
    // Part 009 lies near the upper end of its lot, 0.444 of the range above the middle (8 · 0.618034 = 4.944).
    let odd = 8;
    let (joint, sample) = capacitance_and_resonance(60, odd);
    let judgement = judged(&lot(4000), &joint, &station(), &sample);
    assert_eq!(
        outcome(&judgement),
        (LotVerdict::Hold, vec!["joint_outliers_found"])
    );
    let section = &judgement.findings.joint[0];
    assert_eq!(section.outliers.len(), 1);
    assert_eq!(section.outliers[0].part, "009");
    assert!(section.outliers[0].squared_distance > section.critical.expect("a test"));
    assert!(result(&judgement, "Mahalanobis").starts_with("009 ("));
    for key in [KEY, SRF] {
        assert!(judgement.statistics[key].outliers.is_empty(), "{key} alone");
    }
    let again = judged(&lot(4000), &joint, &station(), &sample);
    assert_eq!(again, judgement, "the same parts, the same record");

    let (_, alike) = capacitance_and_resonance(60, usize::MAX);
    let clean = judged(&lot(4000), &joint, &station(), &alike);
    assert_eq!(clean.verdict, LotVerdict::Accept);
    let few = judged(&lot(4000), &joint, &station(), &sample[..19]);
    assert!(
        outcome(&few).1.contains(&"outliers_not_available"),
        "ten parts a characteristic are needed"
    );
}

/// The data of a published example, as capacitances.
fn example(id: &str, scale: f64) -> Vec<PartRecord> {
    let all: Value = serde_json::from_str(&reference("s10_dip_examples.json")).expect("JSON");
    let examples = all["examples"].as_array().expect("examples");
    let example = examples.iter().find(|e| e["id"] == id).expect("an example");
    let data = example["data_sorted"].as_array().expect("data");
    let values: Vec<f64> = data
        .iter()
        .map(|v| 1e-6 + scale * v.as_f64().expect("a number"))
        .collect();
    lot_of(&values)
}

fn mixed(sample: &[PartRecord], alpha: f64) -> LotJudgement {
    let mut limits = limits(Acceptance::Fixed {
        sample: sample.len() as u64,
        accept: 0,
    });
    limits.mixed_rules = vec![MixedRule {
        of: vec![KEY.into()],
        alpha,
    }];
    judged(&lot(4000), &limits, &station(), sample)
}

/// Eruptions of a geyser, 272 durations: two kinds. Mixture of mclust 6.0.0 (equal and unequal
/// spread): shares 0.3486 and 0.6514, means 2.0190 and 4.2737, BIC 1 negated 854.05, 2 580.75.
#[test]
fn two_populations_in_one_lot_are_held_and_listed() {
    let sample = example("eruptions", 1e-9);
    let judgement = mixed(&sample, 0.05);
    assert_eq!(outcome(&judgement), (LotVerdict::Hold, vec!["mixed_lot"]));
    let section = &judgement.findings.mixed[0];
    let gain = section.bic_one.expect("a fit") - section.bic_two.expect("a fit");
    // The criterion moves with the unit, its difference does not.
    let published = -580.751_687_012_266_5 + 854.045_656_367_776_7;
    assert!((gain - published).abs() < 1e-2, "{gain}");
    let means = [2.018_992_696_663_033, 4.273_708_296_141_096];
    for (group, mean) in section.groups.iter().zip(means) {
        assert!(
            ((group.mean - 1e-6) / 1e-9 - mean).abs() < 1e-3,
            "{}",
            group.mean
        );
    }
    let sizes = [0, 1].map(|i| section.groups[i].parts.len());
    assert_eq!(sizes.iter().sum::<usize>(), 272);
    assert!((sizes[0] as f64 / 272.0 - 0.348_569_6).abs() < 0.02);
    assert!(judgement.reasons[0].text.contains("parts 001, 002"));
}

/// Ratings of 63 statistics faculties, Hartigan & Hartigan (1985): dip 0.0595, p 0.087.
#[test]
fn a_dip_that_is_not_significant_holds_nothing() {
    let judgement = mixed(&example("statfaculty", 1e-10), 0.05);
    assert_eq!(judgement.verdict, LotVerdict::Accept);
    let section = &judgement.findings.mixed[0];
    assert!((section.dip.expect("a dip") - 0.059_523_8).abs() < 1e-6);
    let p = section.dip_p_value.expect("a p-value");
    assert!((p - 0.087).abs() < 0.02, "{p}");
}
