//! Capability without normality.

use crate::reference::{assert_near, assert_within, path};
use reelgate::statistics::Undefined;
use reelgate::statistics::percentile::{Quantiles, box_cox};
use serde_json::Value;

fn examples() -> Vec<Value> {
    let text = std::fs::read_to_string(path("s3_examples.json")).unwrap();
    serde_json::from_str(&text).unwrap()
}

/// ISO 22514-2 indices of a lognormal, a Weibull and a normal distribution from exact quantiles.
#[test]
fn indices_from_exact_quantiles() {
    let limits = [(0.4, 2.5), (0.02, 3.2), (6.0, 13.0)];
    let examples = examples();
    let found: Vec<&Value> = examples
        .iter()
        .filter(|e| e["id"].as_str().unwrap().starts_with("ISO 22514-2"))
        .collect();
    assert_eq!(found.len(), limits.len());
    for (example, (lower, upper)) in found.into_iter().zip(limits) {
        let value = |key: &str| example["result"][key].as_f64().unwrap();
        let quantiles = Quantiles {
            low: value("x00135"),
            middle: value("x50"),
            high: value("x99865"),
        };
        let both = quantiles.capability(Some(lower), Some(upper));
        assert_near(both.pp.unwrap(), value("Pp"), 1e-12);
        let nearer = value("Ppk_U").min(value("Ppk_L"));
        assert_near(both.ppk.unwrap(), nearer, 1e-12);
        let above = quantiles.capability(None, Some(upper));
        assert_near(above.ppk.unwrap(), value("Ppk_U"), 1e-12);
        assert_eq!(above.pp, Err(Undefined::OneSided));
    }
}

/// NIST/SEMATECH e-Handbook 6.5.2, microwave oven radiation: λ = 0.28 as printed.
#[test]
fn handbook_microwave_radiation() {
    let examples = examples();
    let example = examples.iter().find(|e| e["n"] == 42).unwrap();
    let data = example["data"].as_array().unwrap();
    let values: Vec<f64> = data.iter().map(|v| v.as_f64().unwrap()).collect();
    let fit = box_cox(&values).unwrap();
    assert_within(fit.exponent, 0.28, 5e-3);
    let exact = example["recomputed"]["lambda_mle"].as_f64().unwrap();
    assert_within(fit.exponent, exact, 1e-6);
}

/// The quantiles go through the power and back: those of x and of x in another unit are the same,
/// and the median of a symmetric sample of logarithms is its centre.
#[test]
fn quantiles_of_a_lognormal_sample() {
    let values: Vec<f64> = (1..200)
        .map(|i| {
            (0.25 * reelgate::statistics::distributions::normal_quantile(f64::from(i) / 200.0))
                .exp()
        })
        .collect();
    let fit = box_cox(&values).unwrap();
    assert_within(fit.exponent, 0.0, 1e-3);
    assert_within(fit.quantiles.middle, 1.0, 1e-3);
    // Exact quantiles 0.4724 and 2.1170; the plotting positions narrow the sample's spread by 2 %.
    assert_within(fit.quantiles.low, 0.4724, 0.01);
    assert_within(fit.quantiles.high, 2.117, 0.04);
    assert!(fit.normality.p_value > 0.5);
    let micro: Vec<f64> = values.iter().map(|x| x * 4.7e-6).collect();
    let scaled = box_cox(&micro).unwrap();
    assert_near(scaled.quantiles.high, fit.quantiles.high * 4.7e-6, 1e-6);
}

#[test]
fn what_does_not_exist_is_said() {
    assert!(box_cox(&[1.0, -1.0, 2.0]).is_err());
    assert_eq!(box_cox(&[2.0; 20]), Err(Undefined::ZeroSpread));
    let flat = Quantiles {
        low: 1.0,
        middle: 1.0,
        high: 1.0,
    };
    let none = flat.capability(Some(0.0), Some(2.0));
    assert_eq!(none.ppk, Err(Undefined::ZeroSpread));
    assert_eq!(flat.capability(None, None).ppk, Err(Undefined::NoLimit));
}
