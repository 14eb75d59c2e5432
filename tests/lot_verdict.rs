//! The verdict on a lot from its parts: counting against the plan, conditions, precedence of reasons.
//!
//! Plans are those of ISO 2859-1:1999 tables 1 and 2-A: a lot of 4000 at level II has code letter L, and
//! AQL 0.65 gives n 200, Ac 3, Re 4.

mod lot_support;

use chrono::NaiveDate;
use lot_support::*;
use reelgate::judgement::{PartRecord, PartVerdict};
use reelgate::limits::{Acceptance, Ageing, CapabilityRule, OutlierMethod, OutlierRule, Window};
use reelgate::lot::{Lot, LotJudgement, LotVerdict, plan};
use reelgate::station::Station;
use reelgate::statistics::sampling::Severity;

#[test]
fn the_plan_of_4000_parts_accepts_up_to_three() {
    use PartVerdict::*;
    let (lot, limits, station) = (lot(4000), limits(aql(0.65)), station());
    let case =
        |others: &[(usize, PartVerdict)]| judged(&lot, &limits, &station, &parts(200, others));
    let accepted = case(&first(3, Nonconforming));
    let class = &accepted.sampling.classes["A"];
    assert_eq!(
        (class.n, class.ac, class.re, class.nonconforming),
        (200, 3, 4, 3)
    );
    assert_eq!(accepted.sampling.code_letter.as_deref(), Some("L"));
    assert_eq!(
        outcome(&accepted),
        (LotVerdict::Accept, vec!["accepted_by_plan"])
    );
    assert_eq!(
        outcome(&case(&first(4, Nonconforming))),
        (LotVerdict::Reject, vec!["nonconforming_over_ac"])
    );
}

#[test]
fn undecided_parts_are_counted_both_ways() {
    use PartVerdict::*;
    let (lot, limits, station) = (lot(4000), limits(aql(0.65)), station());
    let case = |others: &[(usize, PartVerdict)]| {
        judged(&lot, &limits, &station, &parts(200, others)).verdict
    };
    assert_eq!(
        case(&first(3, Undecided)),
        LotVerdict::Accept,
        "even if all three were nonconforming"
    );
    assert_eq!(case(&first(4, Undecided)), LotVerdict::Hold);
    let mut mixed = first(4, Nonconforming);
    mixed.push((10, Undecided));
    assert_eq!(
        case(&mixed),
        LotVerdict::Reject,
        "even if the undecided one were conforming"
    );
}

#[test]
fn a_short_sample_holds_but_a_proven_rejection_stands() {
    use PartVerdict::*;
    let (lot, limits, station) = (lot(4000), limits(aql(0.65)), station());
    assert_eq!(
        outcome(&judged(&lot, &limits, &station, &parts(199, &[]))),
        (LotVerdict::Hold, vec!["sample_too_small"])
    );
    let rejected = judged(
        &lot,
        &limits,
        &station,
        &parts(50, &first(4, Nonconforming)),
    );
    assert_eq!(
        outcome(&rejected),
        (
            LotVerdict::Reject,
            vec!["nonconforming_over_ac", "sample_too_small"]
        )
    );
}

#[test]
fn nothing_beyond_the_sample_or_unmeasured_is_ignored() {
    use PartVerdict::*;
    let (lot, limits, station) = (lot(4000), limits(aql(0.65)), station());
    let beyond = judged(
        &lot,
        &limits,
        &station,
        &parts(210, &[(205, Nonconforming)]),
    );
    assert_eq!(
        outcome(&beyond),
        (LotVerdict::Hold, vec!["nonconforming_beyond_sample"])
    );
    let unmeasured = judged(&lot, &limits, &station, &parts(200, &[(7, Unmeasured)]));
    assert_eq!(
        outcome(&unmeasured),
        (LotVerdict::Hold, vec!["unmeasured_parts"])
    );
    assert_eq!(
        unmeasured.statistics[KEY].n, 199,
        "a reading of an unmeasured part is no value"
    );
}

#[test]
fn a_lot_of_one_is_inspected_itself_and_a_small_lot_whole() {
    let station = station();
    let one = judged(&lot(1), &limits(aql(0.65)), &station, &parts(1, &[]));
    assert_eq!(one.verdict, LotVerdict::Accept);
    assert_eq!(one.sampling.required, 1);
    // Code letter B of a lot of 10 points by arrows to n 20 at AQL 0.65: more than the lot.
    let ten = judged(&lot(10), &limits(aql(0.65)), &station, &parts(10, &[]));
    assert_eq!(
        (ten.sampling.required, ten.verdict),
        (10, LotVerdict::Accept)
    );
    let eleven = judged(&lot(10), &limits(aql(0.65)), &station, &parts(11, &[]));
    assert_eq!(
        outcome(&eleven),
        (LotVerdict::Hold, vec!["more_parts_than_lot"])
    );
}

#[test]
fn a_fixed_sample_and_zero_acceptance() {
    use PartVerdict::*;
    let station = station();
    let fixed = limits(Acceptance::Fixed {
        sample: 32,
        accept: 1,
    });
    let case = |n, others: &[(usize, PartVerdict)]| {
        judged(&lot(500), &fixed, &station, &parts(n, others)).verdict
    };
    assert_eq!(case(32, &first(1, Nonconforming)), LotVerdict::Accept);
    assert_eq!(case(32, &first(2, Nonconforming)), LotVerdict::Reject);
    // Lot of 100 with 5 nonconforming: P(none in n) = C(95, n)/C(100, n) <= 0.10 first at n = 37
    // (hypergeometric law; 0.1016 at 36, 0.0952 at 37 by hand).
    let zero = limits(Acceptance::ZeroAcceptance {
        quality_limit: 0.05,
        consumers_risk: 0.10,
    });
    let judged = judged(&lot(100), &zero, &station, &parts(40, &[]));
    let risk = |n: u64| {
        (0..5)
            .map(|i| (100 - n - i) as f64 / (100 - i) as f64)
            .product::<f64>()
    };
    let n = judged.sampling.classes["all"].n;
    assert!(risk(n) <= 0.10 && risk(n - 1) > 0.10, "n {n}");
    assert_eq!(judged.sampling.classes["all"].ac, 0);
}

#[test]
fn every_unmet_condition_holds_whatever_the_counts_say() {
    use PartVerdict::*;
    let mut limits = limits(aql(0.65));
    limits.conditions.drive = Some(Window {
        lower: Some(0.8),
        upper: Some(1.2),
    });
    limits.conditions.temperature = Some(Window {
        lower: Some(18.0),
        upper: Some(28.0),
    });
    limits.conditions.ageing = Some(Ageing {
        per_decade: 0.025,
        refer_to: 3.6e6,
    });
    let (mut good, station) = (lot(4000), station());
    good.last_heat = NaiveDate::from_ymd_opt(2026, 7, 1).and_then(|d| d.and_hms_opt(0, 0, 0));
    good.label = Some("[)>\u{1e}06\u{1d}PRG-1\u{1d}Q4000\u{1d}1T26K-0001\u{1e}\u{4}".into());
    let sample = parts(200, &[]);
    let clean = judged(&good, &limits, &station, &sample);
    assert_eq!(clean.verdict, LotVerdict::Accept, "{:?}", clean.reasons);
    assert_eq!(clean.conditions.len(), 6);
    assert!(clean.conditions.iter().all(|c| c.met));

    let rejected = parts(200, &first(9, Nonconforming));
    let check = |code: &str, lot: &Lot, station: &Station| {
        for sample in [&sample, &rejected] {
            let judgement = judged(lot, &limits, station, sample);
            assert_eq!(judgement.verdict, LotVerdict::Hold, "{code}");
            assert_eq!(judgement.reasons[0].code, code);
        }
    };
    for drive in [None, Some(0.5), Some(1.3)] {
        check(
            "drive_out_of_range",
            &Lot {
                drive,
                ..good.clone()
            },
            &station,
        );
    }
    for temperature in [None, Some(17.9), Some(28.1)] {
        check(
            "temperature_out_of_range",
            &Lot {
                temperature,
                ..good.clone()
            },
            &station,
        );
    }
    let minutes_ago = good.measured.naive_local() - chrono::TimeDelta::minutes(30);
    for last_heat in [None, Some(minutes_ago)] {
        check(
            "ageing_unknown",
            &Lot {
                last_heat,
                ..good.clone()
            },
            &station,
        );
    }
    check(
        "calibration_expired",
        &Lot {
            measured: time("2027-03-03T00:00:00+01:00"),
            ..good.clone()
        },
        &{
            let mut fresh = station.clone();
            fresh.jig = None;
            fresh
        },
    );
    for measured in ["2026-10-05T19:50:01+02:00", "2026-10-05T07:49:00+02:00"] {
        check(
            "jig_check_expired",
            &Lot {
                measured: time(measured),
                ..good.clone()
            },
            &station,
        );
    }
    // 2026-W38 ends on Sunday 2026-09-20 (ISO 8601): 15 days before the measurement.
    for (code, weeks, expected) in [
        (Some("2638"), 2.0, true),
        (Some("2638"), 3.0, false),
        (Some("2641"), 3.0, false),
        (Some("2642"), 3.0, true),
        (Some("26AB"), 3.0, true),
        (None, 3.0, true),
    ] {
        let mut dated = limits.clone();
        dated.conditions.date_code_age = Some(weeks * 604_800.0);
        let lot = Lot {
            date_code: code.map(str::to_owned),
            ..good.clone()
        };
        let judgement = judged(&lot, &dated, &station, &sample);
        let first = judgement.reasons[0].code.as_str();
        assert_eq!(
            first == "date_code_out_of_range",
            expected,
            "{code:?} {weeks}"
        );
    }
    let mut late = good.clone();
    late.measured = time("2026-10-05T19:50:01+02:00");
    late.run.jig_checked = Some(time("2026-10-05T19:00:00+02:00"));
    assert_ne!(
        judged(&late, &limits, &station, &sample).reasons[0].code,
        "jig_check_expired",
        "a check of the run counts"
    );
    check(
        "label_mismatch",
        &Lot {
            quantity: 3900,
            ..good.clone()
        },
        &station,
    );
    check(
        "label_unreadable",
        &Lot {
            label: Some("[)>\u{1e}06".into()),
            ..good.clone()
        },
        &station,
    );
}

#[test]
fn lot_rules_hold_the_lot() {
    let mut limits = limits(aql(0.65));
    limits.capability_rules = vec![CapabilityRule {
        of: vec![KEY.into()],
        index: "cpk".into(),
        min: 1.33,
    }];
    limits.outlier_rules = vec![OutlierRule {
        of: vec![KEY.into()],
        method: OutlierMethod::GeneralizedEsd,
        alpha: Some(0.01),
        allowed: 0,
    }];
    let (lot, station) = (lot(4000), station());
    let mut sample = parts(200, &[]);
    assert_eq!(
        judged(&lot, &limits, &station, &sample).verdict,
        LotVerdict::Accept
    );

    sample[16] = part(16, PartVerdict::Conforming, 1.08e-6);
    let outlier = judged(&lot, &limits, &station, &sample);
    assert_eq!(
        outcome(&outlier),
        (LotVerdict::Hold, vec!["outliers_found"])
    );
    assert_eq!(outlier.statistics[KEY].outliers, ["017"]);

    for (i, p) in sample.iter_mut().enumerate() {
        *p = part(i, PartVerdict::Conforming, 1e-6 + 8.0 * (value(i) - 1e-6));
    }
    assert_eq!(
        outcome(&judged(&lot, &limits, &station, &sample)),
        (LotVerdict::Hold, vec!["capability_below_min"])
    );

    let same: Vec<PartRecord> = (0..200)
        .map(|i| part(i, PartVerdict::Conforming, 1e-6))
        .collect();
    let without_spread = judged(&lot, &limits, &station, &same);
    assert_eq!(without_spread.statistics[KEY].cpk, None);
    assert_eq!(without_spread.verdict, LotVerdict::Hold);
    assert_eq!(without_spread.reasons[0].code, "capability_not_available");
}

#[test]
fn one_sweep_for_two_parts_is_found_by_its_bytes() {
    let (lot, limits, station) = (lot(4000), limits(aql(0.65)), station());
    let mut sample = parts(200, &[]);
    sample[9].attempts[0].sha256 = sample[8].attempts[0].sha256.clone();
    let judgement = judged(&lot, &limits, &station, &sample);
    assert_eq!(
        outcome(&judgement),
        (LotVerdict::Hold, vec!["duplicate_sweep"])
    );
    assert!(
        judgement.reasons[0]
            .text
            .contains("009.csv, sweeps/010.csv"),
        "{}",
        judgement.reasons[0].text
    );
    // A long table is one file for all parts.
    for part in &mut sample {
        part.attempts[0].file = "all.csv".into();
        part.attempts[0].sha256 = "0".into();
    }
    assert_eq!(
        judged(&lot, &limits, &station, &sample).verdict,
        LotVerdict::Accept
    );
}

/// Values that follow normal quantiles.
fn normal_sample(n: usize, mean: f64, sigma: f64) -> Vec<PartRecord> {
    use reelgate::statistics::distributions::normal_quantile;
    (0..n)
        .map(|i| {
            part(
                i,
                PartVerdict::Conforming,
                mean + sigma * normal_quantile((i as f64 + 0.5) / n as f64),
            )
        })
        .collect()
}

#[test]
fn sampling_by_variables_needs_normality_and_says_what_it_did_instead() {
    use reelgate::limits::NotNormal;
    let rule = |not_normal| {
        limits(Acceptance::Variables {
            level: "II".into(),
            aql: vec![("A".into(), 1.0)],
            not_normal,
        })
    };
    let (lot, station) = (lot(1000), station());
    let hold = rule(NotNormal::Hold);
    // ISO 3951-1 by way of MIL-STD-414 table B-3: the plan is the same that `plan_for` was checked with.
    let needed = plan(&hold.acceptance, 1000, Severity::Normal)
        .expect("a plan")
        .required() as usize;
    assert!(
        needed < 80,
        "fewer parts than by attributes (letter J, n 80): {needed}"
    );

    let good = judged(&lot, &hold, &station, &normal_sample(needed, 1e-6, 0.02e-6));
    assert_eq!(
        outcome(&good),
        (LotVerdict::Accept, vec!["accepted_by_plan"])
    );
    let section = &good.sampling.classes["A"].variables[0];
    assert!(
        good.sampling.classes["A"].by_variables && section.normality_p_value.expect("a test") > 0.5
    );
    assert_eq!(section.form.as_deref(), Some("M"));

    let wide = judged(
        &lot,
        &hold,
        &station,
        &normal_sample(needed, 1.05e-6, 0.04e-6),
    );
    assert_eq!(
        outcome(&wide),
        (LotVerdict::Reject, vec!["variables_not_met"])
    );

    let mut skewed = normal_sample(needed, 1e-6, 0.02e-6);
    for (i, p) in skewed.iter_mut().enumerate() {
        let far = if i % 7 == 0 { 0.08e-6 } else { 0.0 };
        *p = part(
            i,
            PartVerdict::Conforming,
            1e-6 + far + 1e-9 * (i % 3) as f64,
        );
    }
    assert_eq!(
        outcome(&judged(&lot, &hold, &station, &skewed)),
        (LotVerdict::Hold, vec!["variables_not_decided"])
    );

    let instead = judged(&lot, &rule(NotNormal::Attributes), &station, &skewed);
    assert_eq!(
        outcome(&instead),
        (LotVerdict::Hold, vec!["sample_too_small"]),
        "80 parts are needed by attributes"
    );
    assert!(
        instead
            .warnings
            .iter()
            .any(|w| w.code == "judged_by_attributes")
    );
}

/// One bound with the capability rule, judged from a sample of those values.
fn with_capability(values: &[f64], index: &str, noise: f64, lower: Option<f64>) -> LotJudgement {
    use reelgate::station::Repeatability;
    let mut limits = limits(Acceptance::Fixed {
        sample: values.len() as u64,
        accept: 0,
    });
    limits.bounds[0].lower = lower;
    limits.capability_rules = vec![CapabilityRule {
        of: vec![KEY.into()],
        index: index.into(),
        min: 1.33,
    }];
    let mut station = station();
    station.uncertainty.repeatability =
        vec![("capacitance".into(), Repeatability::Absolute(noise))];
    let parts: Vec<PartRecord> = values
        .iter()
        .enumerate()
        .map(|(i, v)| part(i, PartVerdict::Conforming, *v))
        .collect();
    judged(&lot(4000), &limits, &station, &parts)
}

#[test]
fn an_index_is_stated_where_it_means_something() {
    let values = |n| -> Vec<f64> { (0..n).map(value).collect() };
    let both = Some(0.9e-6);
    // Below 8 values the shape that an index assumes cannot even be tested.
    let few = with_capability(&values(7), "ppk", 0.0, both);
    assert_eq!(
        outcome(&few),
        (LotVerdict::Hold, vec!["capability_not_available"])
    );
    assert!(
        few.reasons[0].text.contains("at least 8 values"),
        "{}",
        few.reasons[0].text
    );
    assert_eq!(few.statistics[KEY].ppk, None);
    assert!(
        with_capability(&values(8), "ppk", 0.0, both).statistics[KEY]
            .ppk
            .is_some()
    );
    let enough = with_capability(&values(25), "ppk", 0.0, both);
    assert_eq!(enough.verdict, LotVerdict::Accept);
    assert!(enough.statistics[KEY].at_least.is_none());

    // Noise as wide as the spread seen: the index says nothing of the parts but that it is no lower.
    let noisy = with_capability(&values(25), "ppk", 3e-9, both);
    let s = &noisy.statistics[KEY];
    assert_eq!(
        (s.ppk, s.at_least.and_then(|a| a.ppk)),
        (None, enough.statistics[KEY].ppk)
    );
    assert_eq!(noisy.verdict, LotVerdict::Accept);
    assert!(s.warnings.iter().any(|w| w.code == "ppk_undefined"));
}

/// Exact lower bound for one limit and the tolerance interval, against scipy 1.17.1.
#[test]
fn bounds_and_intervals_of_a_lot() {
    use reelgate::statistics::distributions::normal_quantile;
    let values: Vec<f64> = (0..43)
        .map(|i| 1e-6 + 2e-8 * normal_quantile((f64::from(i) + 0.5) / 43.0))
        .collect();
    let s = &with_capability(&values, "ppk", 0.0, None).statistics[KEY];
    let (sd, ppk) = (s.standard_deviation.expect("s"), s.ppk.expect("an index"));
    let near =
        |found: f64, wanted: f64| assert!((found / wanted - 1.0).abs() < 1e-8, "{found} {wanted}");
    // The integral of Odeh & Owen (1980) by scipy's quadrature.
    let [low, high] = s.tolerance_95_95.expect("an interval");
    near((high - low) / (2.0 * sd), 2.425_376_527_370_807);
    // nct of scipy.
    near(
        s.ppk_lower_95.expect("a bound") / ppk,
        0.811_483_898_558_543_6,
    );
    // Nothing nonconforming of 43 in 4000: the largest D with C(4000 - D, 43)/C(4000, 43) > 0.05.
    let share = with_capability(&values, "ppk", 0.0, None).sampling.classes["all"]
        .share_nonconforming_upper_95
        .expect("a bound");
    let none = |d: f64| {
        (0..43)
            .map(|i| 1.0 - d / (4000.0 - f64::from(i)))
            .product::<f64>()
    };
    let most = share * 4000.0;
    assert!(none(most) > 0.05 && none(most + 1.0) <= 0.05, "{most}");
}
