//! The Anderson-Darling test.

use crate::reference::{assert_near, assert_within, path, rows};
use reelgate::statistics::Undefined;
use reelgate::statistics::distributions::normal_quantile;
use reelgate::statistics::normality::anderson_darling;
use serde_json::Value;

/// Samples that the grid's header defines by formula.
fn sample(name: &str, n: usize) -> Option<Vec<f64>> {
    let u = (1..=n).map(|i| (i as f64 - 0.5) / n as f64);
    Some(match name {
        "uniform" => u.collect(),
        "exponential" => u.map(|u| -(-u).ln_1p()).collect(),
        "logistic" => u.map(|u| (u / (1.0 - u)).ln()).collect(),
        "square" => u.map(|u| u * u).collect(),
        "lognormal" => u.map(|u| normal_quantile(u).exp()).collect(),
        "normalscores" => u.map(normal_quantile).collect(),
        "twocluster" => u
            .enumerate()
            .map(|(i, u)| if i < n / 2 { u } else { u + 1.0 })
            .collect(),
        "GEAR" => rows("s3_gear_data.csv").column("diameter"),
        "Rosner" => rows("s4_rosner_data.csv").column("x"),
        "ZARR13" => rows("s4_zarr13_data.csv").column("y"),
        _ => return None,
    })
}

/// A² agrees with R's nortest to its digits; p by the formulas of D'Agostino & Stephens (1986) Table 4.9.
#[test]
fn every_sample_of_the_grid() {
    let mut checked = 0;
    for row in rows("s5_normality_grid.csv").iter() {
        let n = row.count("n") as usize;
        let Some(values) = sample(row.text("sample"), n).filter(|_| n >= 8) else {
            continue;
        };
        let found = anderson_darling(&values).unwrap();
        assert_near(found.statistic, row.number("A2"), 1e-9);
        assert_near(found.adjusted, row.number("A2star"), 1e-9);
        assert_near(found.p_value, row.number("p_stephens"), 1e-7);
        checked += 1;
    }
    assert!(checked > 100, "{checked}");
}

/// Weights of 11 men (Shapiro & Wilk 1965) and of 20 chicks (D'Agostino & Stephens 1986, chapter 4:
/// A² = 0.214 as printed).
#[test]
fn published_examples() {
    let text = std::fs::read_to_string(path("s5_published.json")).unwrap();
    let examples: Vec<Value> = serde_json::from_str(&text).unwrap();
    for id in ["men11", "chicks20"] {
        let example = examples.iter().find(|e| e["id"] == id).unwrap();
        let data = example["data"].as_array().unwrap();
        let values: Vec<f64> = data.iter().map(|v| v.as_f64().unwrap()).collect();
        let found = anderson_darling(&values).unwrap();
        let expected = |key: &str| example["recomputed"][key].as_f64().unwrap();
        assert_near(found.statistic, expected("A2"), 1e-11);
        assert_near(found.p_value, expected("A2_p"), 1e-9);
        if let Some(printed) = example["printed"]["A2"].as_f64() {
            assert_within(found.statistic, printed, 5e-4);
        }
    }
}

/// NIST/SEMATECH e-Handbook 1.4.2.8, heat flow meter: prints 0.129, which is A² (1 + 4/n − 25/n²)
/// of Stephens (1974).
#[test]
fn handbook_heat_flow_meter() {
    let values = rows("s4_zarr13_data.csv").column("y");
    let found = anderson_darling(&values).unwrap();
    let n = values.len() as f64;
    assert_within(
        found.statistic * (1.0 + 4.0 / n - 25.0 / (n * n)),
        0.129,
        5e-4,
    );
    assert!(found.p_value > 0.9);
}

/// Far from normal the p-value is tiny and stays a number.
#[test]
fn two_distant_clusters() {
    let mut values = vec![0.0; 1000];
    values.extend((0..1000).map(|i| 1e6 + f64::from(i) * 1e-3));
    let found = anderson_darling(&values).unwrap();
    assert!(found.p_value > 0.0 && found.p_value < 1e-29);
}

#[test]
fn what_cannot_be_tested_is_said() {
    assert!(anderson_darling(&[1.0; 7]).is_err());
    assert_eq!(anderson_darling(&[1.0; 8]), Err(Undefined::ZeroSpread));
}
