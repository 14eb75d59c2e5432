//! Whatever goes in, nothing panics, and what comes out as a value is a number.

use proptest::prelude::*;
use reelgate::statistics::capability::{Capability, cpk_lower_bound, one_sided_lower_bound};
use reelgate::statistics::lot_to_lot::{RunRule, control_limits, ewma, mean_shift, run_signals};
use reelgate::statistics::mixture::{Spread, dip_test, two_normals};
use reelgate::statistics::normality::anderson_darling;
use reelgate::statistics::operating_characteristic::{quality_at, zero_acceptance_sample};
use reelgate::statistics::outliers::{
    Side, generalized_esd, grubbs, joint_outliers, modified_z_scores, part_average_limits,
};
use reelgate::statistics::percentile::box_cox;
use reelgate::statistics::sampling::{InspectionLevel, Severity, plan_for};
use reelgate::statistics::share::{lot_lower_bound, lot_upper_bound};
use reelgate::statistics::summary::Summary;
use reelgate::statistics::tolerance::{one_sided_factor, two_sided_factor};
use reelgate::statistics::variables;

/// Ordinary, equal, tiny, huge and impossible values.
fn value() -> impl Strategy<Value = f64> {
    prop_oneof![
        6 => -10.0..10.0_f64,
        3 => (0..4_i32).prop_map(f64::from),
        1 => prop::num::f64::ANY,
    ]
}

fn ratio() -> impl Strategy<Value = f64> {
    prop_oneof![4 => 0.0..=1.0_f64, 1 => prop::num::f64::ANY]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(300))]

    #[test]
    fn samples(values in prop::collection::vec(value(), 0..40), alpha in ratio()) {
        if let Ok(summary) = Summary::of(&values) {
            prop_assert!(summary.mean.is_finite() && summary.median.is_finite());
            prop_assert!(summary.minimum <= summary.median && summary.median <= summary.maximum);
            if let Ok(s) = summary.standard_deviation {
                prop_assert!(s.is_finite() && s >= 0.0);
            }
        }
        let capability = Capability::of(&values, values.first().copied(), values.last().copied());
        for index in [capability.cp, capability.cpk, capability.pp, capability.ppk] {
            prop_assert!(index.map_or(true, f64::is_finite));
        }
        if let Ok(found) = generalized_esd(&values, 5, alpha) {
            prop_assert!(found.outliers.iter().all(|i| *i < values.len()));
        }
        let _ = grubbs(&values, Side::Either, alpha);
        if let Ok(scores) = modified_z_scores(&values) {
            prop_assert_eq!(scores.len(), values.len());
        }
        let _ = part_average_limits(&values);
        if let Ok(found) = anderson_darling(&values) {
            prop_assert!((0.0..=1.0).contains(&found.p_value), "{}", found.p_value);
        }
        let _ = box_cox(&values);
        if let Ok(dip) = dip_test(&values, 10, 1) {
            prop_assert!(dip.statistic > 0.0 && dip.statistic <= 0.25 + 1e-12);
        }
        if let Ok(mixture) = two_normals(&values, Spread::Unequal) {
            prop_assert!(mixture.bic.is_finite());
        }
        let _ = ewma(&values, 0.0, 1.0, alpha, 3.0);
        let _ = (control_limits(&values), mean_shift(alpha, &values));
        let _ = run_signals(&values, 0.0, 1.0, &RunRule::NELSON);
    }

    #[test]
    fn points(
        points in prop::collection::vec((value(), value()).prop_map(|(a, b)| vec![a, b]), 0..40),
        alpha in ratio(),
    ) {
        if let Ok(found) = joint_outliers(&points, alpha, 1) {
            prop_assert_eq!(found.squared_distances.len(), points.len());
        }
    }

    #[test]
    fn plans(lot in any::<u64>(), small in 0..3000_u64, column in 0..16_usize, aql in value()) {
        let known = reelgate::statistics::sampling::AQL_SERIES[column];
        for lot in [lot, small] {
            for level in InspectionLevel::ALL {
                for severity in Severity::ALL {
                    let _ = plan_for(lot, level, aql, severity);
                    let _ = variables::plan_for(lot, level, known, severity);
                    if lot >= 2 {
                        let plan = plan_for(lot, level, known, severity).unwrap();
                        prop_assert!(plan.n <= lot && plan.n > 0 && plan.re == plan.ac + 1);
                    }
                }
            }
        }
    }

    #[test]
    fn bounds(
        lot in 1..100_000_u64,
        n in 0..500_u64,
        count in 0..20_u64,
        share in ratio(),
        risk in ratio(),
    ) {
        if let Ok(found) = zero_acceptance_sample(lot, share, risk) {
            prop_assert!(found > 0 && found <= lot);
        }
        let bounds = (lot_lower_bound(lot, n, count, risk), lot_upper_bound(lot, n, count, risk));
        if let (Ok(lower), Ok(upper)) = bounds {
            prop_assert!(upper >= count && upper <= lot && lower <= lot);
        }
        let _ = quality_at(n, count, risk);
        for factor in [one_sided_factor(n, share, risk), two_sided_factor(n, share, risk)] {
            prop_assert!(factor.map_or(true, f64::is_finite));
        }
        let _ = (cpk_lower_bound(share, n, n as f64, risk), one_sided_lower_bound(share, n, risk));
    }
}
