//! Which parts of the reel are the sample.

use crate::statistics::random::Random;

/// Positions along the reel, from 1, of a sample of `parts` out of `quantity`: random, each set of positions as
/// probable as any other, in ascending order. All positions where the sample is the whole lot.
///
/// Floyd's method (Bentley & Floyd 1987): one random number a part. ISO 2859-1, 10.1: parts are drawn at random.
pub fn positions(seed: u64, quantity: u64, parts: u64) -> Vec<u64> {
    let parts = parts.min(quantity);
    let mut random = Random::seeded(seed);
    let mut drawn = std::collections::BTreeSet::new();
    for last in (quantity - parts)..quantity {
        let any = random.below(usize::try_from(last + 1).unwrap_or(usize::MAX)) as u64 + 1;
        if !drawn.insert(any) {
            drawn.insert(last + 1);
        }
    }
    drawn.into_iter().collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn positions_are_distinct_and_on_the_reel() {
        for (quantity, parts) in [
            (1, 1),
            (5, 5),
            (5, 9),
            (4000, 200),
            (1_000_000, 1250),
            (3, 0),
        ] {
            let drawn = positions(7, quantity, parts);
            assert_eq!(drawn.len() as u64, parts.min(quantity));
            assert!(drawn.windows(2).all(|w| w[0] < w[1]));
            assert!(drawn.iter().all(|p| (1..=quantity).contains(p)));
            assert_eq!(
                drawn,
                positions(7, quantity, parts),
                "the same seed, the same sample"
            );
        }
        assert_ne!(positions(7, 4000, 200), positions(8, 4000, 200));
    }

    /// Each of the 10 pairs out of 5 as often as the others: chi-squared with 9 degrees of freedom stays below its
    /// 99.9 % point, 27.88 (table of the distribution, from memory; scipy.stats.chi2.ppf(0.999, 9) = 27.877).
    #[test]
    fn every_sample_is_as_probable_as_any_other() {
        let mut counts = std::collections::BTreeMap::new();
        let draws = 10_000;
        for seed in 0..draws {
            *counts.entry(positions(seed, 5, 2)).or_insert(0_u32) += 1;
        }
        assert_eq!(counts.len(), 10);
        let expected = draws as f64 / 10.0;
        let chi: f64 = counts
            .values()
            .map(|n| (f64::from(*n) - expected).powi(2) / expected)
            .sum();
        assert!(chi < 27.88, "{chi}");
    }
}
