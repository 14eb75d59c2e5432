//! Tests for outliers.

use crate::reference::{assert_near, assert_within, path, rows};
use reelgate::statistics::Undefined;
use reelgate::statistics::outliers::{
    MODIFIED_Z_LIMIT, Side, generalized_esd, grubbs, modified_z_scores, part_average_limits,
};

/// Tietjen & Moore's uranium isotope data, NIST/SEMATECH e-Handbook 1.3.5.17.1.
const URANIUM: [f64; 8] = [
    199.31, 199.53, 200.19, 200.82, 201.92, 201.95, 202.18, 245.57,
];

/// Rosner (1983), 54 values; NIST/SEMATECH e-Handbook 1.3.5.17.3 prints the ten steps (truncated)
/// and finds three outliers, of which the first two mask one another: R1 < λ1 and R2 < λ2.
#[test]
fn rosner_masking_example() {
    let values = rows("s4_rosner_data.csv").column("x");
    let found = generalized_esd(&values, 10, 0.05).unwrap();
    let table = rows("s4_rosner_table.csv");
    assert_eq!(found.steps.len(), table.len());
    for (step, row) in found.steps.iter().zip(table.iter()) {
        assert_near(step.statistic, row.number("R_i"), 1e-12);
        assert_near(step.critical, row.number("lambda_i"), 1e-12);
        assert_within(step.statistic, row.number("R_printed"), 1e-3);
        assert_within(step.critical, row.number("lambda_printed"), 1e-3);
        assert_eq!(step.value, row.number("removed"));
        assert_eq!(step.value, values[step.index]);
    }
    assert!(found.steps[0].statistic < found.steps[0].critical);
    assert!(found.steps[1].statistic < found.steps[1].critical);
    let outliers: Vec<f64> = found.outliers.iter().map(|&i| values[i]).collect();
    assert_eq!(outliers, [6.01, 5.42, 5.34]);
}

/// 30 standard cases; the printed one-sided columns are ASTM E178 Table 1 (from memory), which
/// differs at n = 100.
#[test]
fn every_critical_value_of_grubbs() {
    for row in rows("s4_grubbs_critical.csv").iter() {
        let n = row.count("n") as usize;
        let values: Vec<f64> = (0..n).map(|i| i as f64).collect();
        let critical = |side, alpha| grubbs(&values, side, alpha).unwrap().critical;
        assert_near(critical(Side::Upper, 0.05), row.number("one_5"), 1e-12);
        assert_near(critical(Side::Lower, 0.025), row.number("one_2.5"), 1e-12);
        assert_near(critical(Side::Upper, 0.01), row.number("one_1"), 1e-12);
        assert_near(critical(Side::Either, 0.05), row.number("two_5"), 1e-12);
        assert_near(critical(Side::Either, 0.01), row.number("two_1"), 1e-12);
        if n != 100
            && let Ok(printed) = row.text("E178_5").parse::<f64>()
        {
            assert_within(critical(Side::Upper, 0.05), printed, 1.001e-3);
        }
    }
}

/// The handbook prints G = 2.4687 (truncated) and the one-sided critical value 2.032.
#[test]
fn uranium_example() {
    let found = grubbs(&URANIUM, Side::Upper, 0.05).unwrap();
    assert_eq!(found.index, 7);
    assert!(found.outlier);
    assert_within(found.statistic, 2.4687, 1e-4);
    assert_within(found.critical, 2.032, 5e-4);
    assert_near(found.statistic, 2.46876461121245, 1e-13);
    let other_side = grubbs(&URANIUM, Side::Lower, 0.05).unwrap();
    assert_eq!((other_side.index, other_side.outlier), (0, false));
    let either = grubbs(&URANIUM, Side::Either, 0.05).unwrap();
    assert_near(either.critical, 2.1266450871954685, 1e-12);
}

/// Iglewicz & Hoaglin (1993), labelling example: the two large values are found, by 25.9 and 26.3.
#[test]
fn modified_z_scores_of_the_labelling_example() {
    let values = [2.1, 2.6, 2.4, 2.5, 2.3, 2.1, 2.3, 2.6, 8.2, 8.3];
    let scores = modified_z_scores(&values).unwrap();
    assert_within(scores[8], 25.855833333333266, 1e-10);
    assert_within(scores[9], 26.305499999999938, 1e-10);
    assert_within(scores[0], -1.57383333333333, 1e-10);
    let beyond = scores.iter().filter(|m| m.abs() > MODIFIED_Z_LIMIT).count();
    assert_eq!(beyond, 2);
}

/// The formula of AEC-Q001 on three data sets, quartiles interpolated linearly.
#[test]
fn part_average_limits_of_known_data() {
    let text = std::fs::read_to_string(path("s4_examples.json")).unwrap();
    let examples: Vec<serde_json::Value> = serde_json::from_str(&text).unwrap();
    for (name, file, column) in [
        ("ZARR13", "s4_zarr13_data.csv", "y"),
        ("GEAR", "s3_gear_data.csv", "diameter"),
        ("Rosner", "s4_rosner_data.csv", "x"),
    ] {
        let id = format!("AEC-Q001 style PAT limits, {name}");
        let example = examples.iter().find(|e| e["id"] == id).unwrap();
        let linear = &example["by_quantile_method"]["linear"];
        let found = part_average_limits(&rows(file).column(column)).unwrap();
        assert_near(
            found.robust_sigma,
            linear["robust_sigma"].as_f64().unwrap(),
            1e-11,
        );
        assert_near(found.median, linear["median"].as_f64().unwrap(), 1e-13);
        assert_near(found.lower, linear["lo"].as_f64().unwrap(), 1e-12);
        assert_near(found.upper, linear["hi"].as_f64().unwrap(), 1e-12);
    }
    assert_eq!(part_average_limits(&[1.0; 9]), Err(Undefined::ZeroSpread));
}

#[test]
fn most_values_equal() {
    let mut values = [1.0; 20];
    values[4] = 1.5;
    // Mean absolute deviation 0.025, times √(π/2).
    let scores = modified_z_scores(&values).unwrap();
    assert_near(scores[4], 0.5 / (0.025 * 1.2533141373155001), 1e-13);
    assert_eq!(scores[0], 0.0);
    let esd = generalized_esd(&values, 5, 0.01).unwrap();
    assert_eq!(esd.outliers, [4]);
    assert_eq!(esd.steps.len(), 1);
}

#[test]
fn what_cannot_be_tested_is_said() {
    let few = generalized_esd(&[1.0, 2.0, 3.0], 1, 0.05);
    assert_eq!(
        few,
        Err(Undefined::TooFewValues {
            needed: 15,
            found: 3
        })
    );
    assert_eq!(
        generalized_esd(&[1.0; 20], 3, 0.05),
        Err(Undefined::ZeroSpread)
    );
    let values: Vec<f64> = (0..20).map(f64::from).collect();
    assert!(generalized_esd(&values, 11, 0.05).is_err());
    assert!(generalized_esd(&values, 3, 0.0).is_err());
    assert!(grubbs(&[1.0, 2.0], Side::Either, 0.05).is_err());
    assert_eq!(modified_z_scores(&[2.0; 5]), Err(Undefined::ZeroSpread));
    assert_eq!(
        modified_z_scores(&[2.0, 1.0, f64::INFINITY]),
        Err(Undefined::NotFinite)
    );
}
