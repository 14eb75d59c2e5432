//! Normal scores: where the values of a sample stand on a normal probability plot.

use super::distributions::normal_quantile;

/// Medians of the order statistics of n values of the standard normal distribution, ascending.
///
/// Filliben (1975), The probability plot correlation coefficient test for normality; NIST/SEMATECH
/// e-Handbook 1.3.3.21: the normal quantile at (i − 0.3175)/(n + 0.365), at 0.5^(1/n) for the last
/// and its mirror for the first. They depend on n alone. Empty for none, zero for one.
pub fn normal_scores(n: usize) -> Vec<f64> {
    let count = n as f64;
    // The upper half; the lower is its mirror.
    let upper = |i: usize| {
        let position = if i == n {
            0.5_f64.powf(count.recip())
        } else {
            (i as f64 - 0.3175) / (count + 0.365)
        };
        normal_quantile(position)
    };
    (1..=n)
        .map(|i| {
            let mirror = n + 1 - i;
            match i.cmp(&mirror) {
                std::cmp::Ordering::Less => -upper(mirror),
                std::cmp::Ordering::Equal => 0.0,
                std::cmp::Ordering::Greater => upper(i),
            }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn scores_of_five_and_of_four() {
        // scipy 1.17.1: probplot([…], fit=False)[0].
        let five = [
            -1.1289975352961017,
            -0.4856527065756922,
            0.0,
            0.48565270657569204,
            1.1289975352961017,
        ];
        for (found, expected) in normal_scores(5).iter().zip(five) {
            assert!((found - expected).abs() < 1e-12, "{found} {expected}");
        }
        let four = [
            -0.9981488825015566,
            -0.29119141829755274,
            0.2911914182975529,
            0.9981488825015566,
        ];
        for (found, expected) in normal_scores(4).iter().zip(four) {
            assert!((found - expected).abs() < 1e-12, "{found} {expected}");
        }
        assert_eq!(normal_scores(1), [0.0]);
        assert!(normal_scores(0).is_empty());
    }
}
