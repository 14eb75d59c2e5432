//! Sampling by variables.

use crate::reference::{assert_near, assert_within, rows};
use reelgate::statistics::Undefined;
use reelgate::statistics::sampling::{
    AQL_SERIES, CodeLetter, InspectionLevel, Severity, neighbouring_aqls,
};
use reelgate::statistics::variables::{
    Form, Plan, acceptance_probability, estimated_share, one_step_tighter, plan_for,
    plan_of_letter, plan_of_size, quality_at,
};

/// The data of all four examples of MIL-STD-414 section B.
const EXAMPLE: [f64; 5] = [197.0, 188.0, 184.0, 205.0, 201.0];

/// MIL-STD-414 Tables B-1 and B-3, all samples in use and AQLs to 10; and the identity between the forms, M = p(k), within
/// the digits of the printed k.
#[test]
fn every_cell_of_the_tables() {
    let mut cells = 0;
    for row in rows("s2_mil414_normal_s_method.csv").iter() {
        let (n, aql) = (row.count("n"), row.number("aql_percent"));
        if [20, 30, 40].contains(&n) || aql > 10.0 {
            continue;
        }
        cells += 1;
        let plan = plan_of_size(n, aql).unwrap();
        assert_eq!(plan.n, n);
        assert_eq!(plan.k, row.number("k_B1"));
        assert_near(plan.m, row.number("M_B3_percent") / 100.0, 1e-15);
        let digit = if plan.k < 1.0 { 0.0006 } else { 0.006 };
        let (most, least) = (
            estimated_share(plan.k - digit, n),
            estimated_share(plan.k + digit, n),
        );
        assert!(least <= plan.m && plan.m <= most, "{n} {aql}");
    }
    assert_eq!(cells, 140);
}

/// Beta cdf grid: Lieberman & Resnikoff (1955), MIL-STD-414 Table B-5.
#[test]
fn every_estimated_share() {
    for row in rows("s2_phat_s_method.csv").iter() {
        let (n, q) = (row.count("n"), row.number("Q"));
        let expected = row.number("p_percent") / 100.0;
        // At the largest Q possible the share is 0 but for the rounding of B.
        assert_within(
            estimated_share(q, n),
            expected,
            1e-7 * expected.sqrt() + 1e-8,
        );
        assert_near(estimated_share(-q, n) + estimated_share(q, n), 1.0, 1e-12);
    }
}

/// MIL-STD-414 examples B-1 and B-2: U = 209, AQL 1.0, n = 5: s 8.81, Q 1.59 ≥ k 1.53; p 2.19 % ≤ M 3.32 %: accepted.
#[test]
fn mil_std_414_one_limit() {
    let plan = plan_of_size(5, 1.0).unwrap();
    assert_eq!((plan.n, plan.k, plan.m), (5, 1.53, 0.0332));
    let found = plan.judge(&EXAMPLE, None, Some(209.0)).unwrap();
    assert_eq!((found.form, found.accepted), (Form::K, true));
    assert_eq!(found.mean, 195.0);
    assert_within(found.standard_deviation, 8.81, 7e-3);
    assert_within(found.q_upper.unwrap(), 1.59, 5e-3);
    assert_within(estimated_share(1.59, 5), 0.0219, 5e-5);
    assert_near(found.p_upper, 0.02182311752038682, 1e-11);
    assert!(found.p() <= plan.m);
}

/// Example B-3: L = 180, U = 209 with one AQL: p 2.85 % (from the rounded Q 1.59 and 1.70) ≤ M 3.32 %: accepted.
#[test]
fn mil_std_414_two_limits() {
    let plan = plan_of_size(5, 1.0).unwrap();
    let found = plan.judge(&EXAMPLE, Some(180.0), Some(209.0)).unwrap();
    assert_eq!((found.form, found.accepted), (Form::M, true));
    assert_within(found.q_lower.unwrap(), 1.70, 5e-3);
    assert_within(estimated_share(1.70, 5), 0.0066, 5e-5);
    assert_near(found.p_lower, 0.00616896789681819, 1e-10);
    assert_within(
        estimated_share(1.59, 5) + estimated_share(1.70, 5),
        0.0285,
        5e-5,
    );
    let narrower = plan.judge(&EXAMPLE, Some(183.0), Some(209.0)).unwrap();
    assert!(!narrower.accepted);
}

/// ISO 3951-1:2005, 15.2: U = 60, n = 13, k = 1.405: x̄ 54.615, s 3.330, Q 1.617 ≥ k: accepted (from memory).
#[test]
fn iso_3951_1_example() {
    let values = [
        53.0, 57.0, 49.0, 58.0, 59.0, 54.0, 58.0, 56.0, 50.0, 50.0, 55.0, 54.0, 57.0,
    ];
    let k = 1.405;
    let m = estimated_share(k, 13);
    assert_near(m, 0.075_368_925_662_994_69, 1e-10);
    let found = Plan { n: 13, k, m }
        .judge(&values, None, Some(60.0))
        .unwrap();
    assert!(found.accepted);
    assert_within(found.mean, 54.615, 5e-4);
    assert_within(found.standard_deviation, 3.330, 5e-4);
    assert_within(found.q_upper.unwrap(), 1.617, 5e-4);
    assert_near(found.p_upper, 0.04617045018629871, 1e-10);
}

/// One limit: Form k and Form M agree where M = p(k).
#[test]
fn the_two_forms_agree_for_one_limit() {
    for n in [3_u64, 10, 50] {
        for q in [0.3, 0.9, 1.2, 1.6] {
            let k = 1.0;
            assert_eq!(
                q >= k,
                estimated_share(q, n) <= estimated_share(k, n),
                "{n} {q}"
            );
        }
    }
}

/// P(T ≥ k√n) of the noncentral t, inverted: scipy, spot-checked with mpmath.
#[test]
fn operating_characteristic() {
    for row in rows("s2_oc_noncentral_t.csv").iter() {
        let (n, k, pa) = (row.count("n"), row.number("k"), row.number("Pa"));
        let p = row.number("p_percent") / 100.0;
        assert_near(quality_at(n, k, pa), p, 1e-8);
        assert_near(acceptance_probability(n, k, p), pa, 1e-8);
    }
    assert_eq!(acceptance_probability(10, 1.5, 0.0), 1.0);
    assert_eq!(acceptance_probability(10, 1.5, 1.0), 0.0);
}

/// OIML R 138:2007 Annex A: n = 35, AQL 2.5, k = 1.57 (ISO 3951:1989 letter J).
#[test]
fn plans_of_lots() {
    let plan = |lot, aql, severity| plan_for(lot, InspectionLevel::II, aql, severity);
    let normal = plan(1000, 2.5, Severity::Normal).unwrap();
    assert_eq!((normal.n, normal.k), (35, 1.57));
    let tightened = plan(1000, 2.5, Severity::Tightened).unwrap();
    assert_eq!((tightened.n, tightened.k), (35, 1.76));
    // Letter D has no plan at AQL 0.25; the arrow leads to 7 items.
    let arrow = plan(30, 0.25, Severity::Normal).unwrap();
    assert_eq!((arrow.n, arrow.k), (7, 2.0));
    assert_eq!(plan(1000, 0.010, Severity::Normal), Err(Undefined::NoPlan));
    assert_eq!(
        plan(3, 4.0, Severity::Normal),
        Err(Undefined::WholeLot { sample: 3, lot: 3 })
    );
}

/// Tightened inspection is the column of the next smaller AQL, for every letter and AQL.
#[test]
fn every_tightened_plan_is_the_next_smaller_aql() {
    for letter in &CodeLetter::ALL[..16] {
        for aql in AQL_SERIES.into_iter().filter(|aql| *aql >= 0.040) {
            let tightened = plan_of_letter(*letter, aql, Severity::Tightened);
            let smaller = neighbouring_aqls(aql).0.unwrap();
            let normal = plan_of_letter(*letter, smaller, Severity::Normal);
            assert_eq!(tightened, normal, "{letter} {aql}");
            assert_eq!(
                one_step_tighter(*letter, aql, Severity::Normal),
                normal.ok()
            );
        }
    }
}

/// Reduced inspection is the smaller sample and the next larger AQL of MIL-STD-414 Tables B-1 and B-3;
/// ANSI/ASQ Z1.9 Table B-4, which is made so too, has the same samples, and M within its recalculation.
#[test]
fn every_reduced_plan() {
    let normal = rows("s2_mil414_normal_s_method.csv");
    let of_normal = |n: u64, aql: f64| {
        let mut found = normal.iter();
        found.find(|row| row.count("n") == n && row.number("aql_percent") == aql)
    };
    let (mut cells, mut arrows) = (0, 0);
    for row in rows("s2_z19_reduced_m.csv").iter() {
        // H of ISO 2859-1 stands for H and I of Z1.9; its sample is that of I.
        let letter = match row.text("letter") {
            "H" => continue,
            "I" => "H",
            other => other,
        };
        let aql = row.number("aql_percent");
        let larger = neighbouring_aqls(aql).1.unwrap_or(15.0);
        let plan = plan_of_letter(letter.parse().unwrap(), aql, Severity::Reduced).unwrap();
        let cell = of_normal(plan.n, larger).unwrap();
        assert_eq!(plan.k, cell.number("k_B1"), "{letter} {aql}");
        assert_near(plan.m, cell.number("M_B3_percent") / 100.0, 1e-15);
        if of_normal(row.count("n"), larger).is_none() {
            arrows += 1;
            assert!(plan.n > row.count("n"), "{letter} {aql}: the arrow down");
            continue;
        }
        cells += 1;
        assert_eq!(plan.n, row.count("n"), "{letter} {aql}");
        assert_near(plan.m, row.number("M_percent") / 100.0, 0.04);
    }
    assert_eq!((cells, arrows), (131, 12));
}

/// Reduced inspection never demands more parts, nor a larger k, than normal inspection.
#[test]
fn reduced_is_never_stricter_than_normal() {
    for letter in &CodeLetter::ALL[..16] {
        for aql in AQL_SERIES.into_iter().filter(|aql| *aql >= 0.040) {
            let normal = plan_of_letter(*letter, aql, Severity::Normal).unwrap();
            let reduced = plan_of_letter(*letter, aql, Severity::Reduced).unwrap();
            assert!(
                reduced.n <= normal.n && reduced.k <= normal.k,
                "{letter} {aql}"
            );
        }
    }
}

/// Equal values inside a limit are accepted, outside not; on the limit they are inside.
#[test]
fn zero_spread() {
    let plan = plan_of_size(5, 1.0).unwrap();
    let judge = |x: f64, l, u| plan.judge(&[x; 5], l, u).unwrap();
    assert!(judge(10.0, Some(9.5), Some(10.5)).accepted);
    assert!(judge(9.5, Some(9.5), Some(10.5)).accepted);
    let outside = judge(9.4, Some(9.5), Some(10.5));
    assert_eq!((outside.accepted, outside.p()), (false, 1.0));
    assert!(!judge(9.4, Some(9.5), None).accepted);
}

#[test]
fn what_cannot_be_judged_is_said() {
    let plan = plan_of_size(5, 1.0).unwrap();
    assert!(plan.judge(&EXAMPLE[..4], None, Some(209.0)).is_err());
    assert_eq!(plan.judge(&EXAMPLE, None, None), Err(Undefined::NoLimit));
    assert_eq!(
        plan.judge(&EXAMPLE, Some(2.0), Some(1.0)),
        Err(Undefined::LimitsReversed)
    );
    assert!(estimated_share(1.0, 2).is_nan());
}
