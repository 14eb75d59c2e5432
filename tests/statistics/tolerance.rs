//! Tolerance factors.

use crate::reference::{assert_near, assert_within, path, rows};
use reelgate::statistics::tolerance::{distribution_free_size, one_sided_factor, two_sided_factor};

/// 630 cases, n = 2 to 1000; the file's two-sided factors have 10 digits, as the one-sided ones.
/// Printed columns: Odeh & Owen (1980) and NBS Handbook 91 Table A-7 (from memory).
#[test]
fn every_factor() {
    let table = rows("s6_tolerance_factors.csv");
    assert_eq!(table.len(), 630);
    for row in table.iter() {
        let (n, content, confidence) = (row.count("n"), row.number("p"), row.number("gamma"));
        let two = two_sided_factor(n, content, confidence).unwrap();
        assert_near(two, row.number("k2_exact"), 2e-9);
        let one = one_sided_factor(n, content, confidence).unwrap();
        assert_near(one, row.number("k1_exact"), 2e-9);
        if let Ok(printed) = row.text("printed_exact").parse::<f64>() {
            assert_within(two, printed, 1.001e-3);
        }
        if let Ok(printed) = row.text("printed_k1").parse::<f64>() {
            assert_within(one, printed, 5.1e-3);
        }
    }
}

/// NIST/SEMATECH e-Handbook 7.2.6.3, n = 43, content 0.90, confidence 0.99: one-sided 1.8740 as
/// printed; the printed two-sided 2.217 is Howe's approximation of the exact 2.2228.
#[test]
fn handbook_example() {
    let one = one_sided_factor(43, 0.90, 0.99).unwrap();
    assert_within(one, 1.8740, 5e-5);
    assert_near(one, 1.8739536058511987, 1e-9);
    let two = two_sided_factor(43, 0.90, 0.99).unwrap();
    assert_near(two, 2.2228251737913634, 1e-9);
    assert_within(two, 2.217, 6e-3);
}

/// Wilks (1941): 95/95 needs 59 values one-sided and 93 two-sided, as printed everywhere.
#[test]
fn sizes_without_a_distribution() {
    let text = std::fs::read_to_string(path("s6_examples.json")).unwrap();
    let file: serde_json::Value = serde_json::from_str(&text).unwrap();
    let values = file[1]["values"].as_object().unwrap();
    assert_eq!(values.len(), 9);
    for (key, sizes) in values {
        let number = |name: &str| -> f64 {
            let field = key.split(',').find_map(|f| f.strip_prefix(name));
            field.unwrap().parse().unwrap()
        };
        let size = |two_sided| distribution_free_size(number("p="), number("g="), two_sided);
        assert_eq!(size(false).unwrap(), sizes["one"], "{key}");
        assert_eq!(size(true).unwrap(), sizes["two"], "{key}");
    }
    assert_eq!(distribution_free_size(0.95, 0.95, false), Ok(59));
    assert_eq!(distribution_free_size(0.95, 0.95, true), Ok(93));
}

#[test]
fn what_does_not_exist_is_said() {
    assert!(two_sided_factor(1, 0.95, 0.95).is_err());
    assert!(two_sided_factor(10, 1.0, 0.95).is_err());
    assert!(one_sided_factor(10, 0.95, f64::NAN).is_err());
    assert!(distribution_free_size(0.0, 0.95, true).is_err());
}
