//! Two populations in one sample.

use crate::reference::{assert_near, assert_within, path};
use reelgate::statistics::Undefined;
use reelgate::statistics::mixture::{Spread, dip_statistic, dip_test, one_normal_bic, two_normals};
use reelgate::statistics::random::Random;
use serde_json::Value;

fn file(name: &str) -> Value {
    serde_json::from_str(&std::fs::read_to_string(path(name)).unwrap()).unwrap()
}

fn data(id: &str) -> Vec<f64> {
    let file = file("s10_dip_examples.json");
    let examples = file["examples"].as_array().unwrap();
    let example = examples.iter().find(|e| e["id"] == id).unwrap();
    let values = example["data_sorted"].as_array().unwrap();
    values.iter().map(|x| x.as_f64().unwrap()).collect()
}

/// R diptest 0.76-0; twelve of the values were also found as linear programmes. Hartigan (1985)
/// prints 0.0595 for the faculty ratings.
#[test]
fn every_dip() {
    let file = file("s10_dip_examples.json");
    let mut checked = 0;
    for example in file["examples"].as_array().unwrap() {
        let id = example["id"].as_str().unwrap();
        let values = data(id);
        if values.len() < 4 {
            continue;
        }
        let expected = example["dip"].as_f64().unwrap();
        let found = dip_statistic(&values).unwrap();
        assert!((found - expected).abs() < 1e-12, "{id}: {found} {expected}");
        checked += 1;
    }
    assert_eq!(checked, 14);
    assert_within(dip_statistic(&data("statfaculty")).unwrap(), 0.0595, 5e-5);
}

/// The simulated p-values against the interpolated table of R diptest, within four standard errors
/// of 2000 samples.
#[test]
fn p_values() {
    for (id, expected) in [
        ("statfaculty", 0.0867),
        ("galaxies", 0.670),
        ("chickwts", 0.207),
        ("nile", 0.904),
    ] {
        let found = dip_test(&data(id), 2000, 1).unwrap();
        let error = (expected * (1.0 - expected) / 2000.0_f64).sqrt();
        assert_within(found.p_value, expected, 4.0 * error + 0.005);
    }
    let eruptions = dip_test(&data("eruptions"), 2000, 1).unwrap();
    assert!(eruptions.p_value < 0.002);
    assert_eq!(eruptions, dip_test(&data("eruptions"), 2000, 1).unwrap());
}

/// The dip cannot be below 1/2n nor above 1/4, and does not care for units, sign or order.
#[test]
fn dips_of_random_samples() {
    let mut random = Random::seeded(5);
    for n in [4_usize, 5, 17, 100] {
        for _ in 0..50 {
            let values: Vec<f64> = (0..n)
                .map(|_| (random.normal() * 4.0).round() / 4.0)
                .collect();
            let dip = dip_statistic(&values).unwrap();
            assert!(dip >= 0.5 / n as f64 - 1e-15 && dip <= 0.25);
            let mirrored: Vec<f64> = values.iter().rev().map(|x| 7.0 - 3.0 * x).collect();
            assert_near(dip_statistic(&mirrored).unwrap(), dip, 1e-9);
        }
    }
}

/// R mclust 6.0.0 and scikit-learn 1.9.1 on five data sets. EM ends in local optima: the better of
/// the two is to be reached or passed. mclust writes the criterion with the other sign.
#[test]
fn every_mixture() {
    let file = file("s10_gmm_bic.json");
    let results = file["results"].as_array().unwrap();
    assert_eq!(results.len(), 5);
    for result in results {
        let id = result["id"].as_str().unwrap();
        let values = data(id);
        let one = -result["bic_mclust"]["1"]["E"].as_f64().unwrap();
        assert_near(one_normal_bic(&values).unwrap(), one, 1e-12);
        for (key, spread) in [("E", Spread::Equal), ("V", Spread::Unequal)] {
            let mclust = -result["bic_mclust"]["2"][key].as_f64().unwrap();
            let other = result["sklearn_check"][key]["bic_standard"]
                .as_f64()
                .unwrap();
            let best = mclust.min(other);
            let found = two_normals(&values, spread).unwrap();
            assert!(found.bic <= best + 1e-3, "{id} {key}: {} {best}", found.bic);
            assert!(found.bic >= best - 8.0, "{id} {key}: {} {best}", found.bic);
        }
    }
}

/// The eruptions of a geyser: 35 % about 2.02 min, 65 % about 4.27 min (mclust, unequal variances).
#[test]
fn eruptions() {
    let values = data("eruptions");
    let found = two_normals(&values, Spread::Unequal).unwrap();
    let [short, long] = found.components;
    assert_within(short.weight, 0.3486, 5e-4);
    assert_within(short.mean, 2.0190, 1e-3);
    assert_within(long.mean, 4.2737, 1e-3);
    assert_within(short.standard_deviation.powi(2), 0.0558, 5e-4);
    assert!(found.separation() > 6.0 && found.overlap() < 0.01);
    let of_second = found.second.iter().filter(|p| **p > 0.5).count();
    assert_eq!(of_second, values.iter().filter(|x| **x > 2.8).count());
}

/// A mixed reel in SI units: a tenth of the parts 8 % lower. And a reel of one kind: one population
/// is better by the criterion.
#[test]
fn mixed_and_unmixed_reels() {
    let mut random = Random::seeded(10);
    let reel = |random: &mut Random, low: usize| -> Vec<f64> {
        (0..200)
            .map(|i| 4.7e-6 * (1.0 + 0.008 * random.normal() - if i < low { 0.08 } else { 0.0 }))
            .collect()
    };
    let mixed = reel(&mut random, 20);
    let found = two_normals(&mixed, Spread::Equal).unwrap();
    assert!(found.bic < one_normal_bic(&mixed).unwrap() - 10.0);
    assert_within(found.components[0].weight, 0.1, 0.01);
    let wrong = found
        .second
        .iter()
        .enumerate()
        .filter(|(i, p)| (*i < 20) == (**p > 0.5));
    assert_eq!(wrong.count(), 0);
    for _ in 0..20 {
        let one = reel(&mut random, 0);
        let better = one_normal_bic(&one).unwrap();
        assert!(two_normals(&one, Spread::Equal).map_or(true, |m| m.bic > better - 6.0));
        assert!(dip_test(&one, 200, 1).unwrap().p_value > 0.05);
    }
}

#[test]
fn what_does_not_exist_is_said() {
    assert!(dip_statistic(&[1.0, 2.0, 3.0]).is_err());
    assert_eq!(dip_statistic(&[1.0; 5]), Ok(0.1));
    assert!(two_normals(&[1.0, 2.0], Spread::Equal).is_err());
    assert_eq!(
        two_normals(&[1.0; 20], Spread::Equal),
        Err(Undefined::ZeroSpread)
    );
    assert_eq!(one_normal_bic(&[1.0; 20]), Err(Undefined::ZeroSpread));
    // One value apart from nineteen equal ones is an outlier, not a population.
    let mut apart = vec![1.0; 19];
    apart.push(2.0);
    assert_eq!(
        two_normals(&apart, Spread::Unequal),
        Err(Undefined::NoSolution)
    );
}
