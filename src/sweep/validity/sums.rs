//! Sums, medians and the like of many numbers, quickly.

/// Running sums, so that a sum is not bound by the latency of one.
const LANES: usize = 8;

/// Sum of products.
pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    let mut sums = [0.0; LANES];
    let (a, rest_a) = a.as_chunks::<LANES>();
    let (b, rest_b) = b.as_chunks::<LANES>();
    for (a, b) in a.iter().zip(b) {
        for ((sum, a), b) in sums.iter_mut().zip(a).zip(b) {
            *sum += a * b;
        }
    }
    let rest: f64 = rest_a.iter().zip(rest_b).map(|(a, b)| a * b).sum();
    sums.iter().sum::<f64>() + rest
}

pub(super) fn sum(values: &[f64]) -> f64 {
    let mut sums = [0.0; LANES];
    let (values, rest) = values.as_chunks::<LANES>();
    for values in values {
        for (sum, value) in sums.iter_mut().zip(values) {
            *sum += value;
        }
    }
    sums.iter().sum::<f64>() + rest.iter().sum::<f64>()
}

/// The upper median of values that are not negative; NaN where there is none.
pub(super) fn median(values: impl Iterator<Item = f64>) -> f64 {
    let bits = bits(values);
    let middle = bits.len() / 2;
    select(bits, middle)
}

/// The value that stands at a place when values that are not negative are sorted; NaN where there
/// is none.
pub(super) fn order_statistic(values: impl Iterator<Item = f64>, at: usize) -> f64 {
    select(bits(values), at)
}

/// Numbers that are not negative are in the order of their bits, which are quicker to compare.
fn bits(values: impl Iterator<Item = f64>) -> Vec<u64> {
    let mut bits = Vec::with_capacity(values.size_hint().1.unwrap_or(0));
    bits.extend(values.map(f64::to_bits));
    bits
}

fn select(mut bits: Vec<u64>, at: usize) -> f64 {
    if at >= bits.len() {
        return f64::NAN;
    }
    f64::from_bits(*bits.select_nth_unstable(at).1)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sums_have_every_term() {
        for n in [0usize, 1, 7, 8, 9, 16, 31] {
            let a: Vec<f64> = (0..n).map(|i| i as f64 + 1.0).collect();
            let b: Vec<f64> = a.iter().map(|a| a * a).collect();
            // Sums of the first n integers and of their cubes.
            let triangle = (n * (n + 1) / 2) as f64;
            assert_eq!(sum(&a), triangle);
            assert_eq!(dot(&a, &b), triangle * triangle);
        }
    }

    #[test]
    fn order_statistics_are_those_of_the_sorted_values() {
        let values = [3.5, 0.0, 1e-300, 7.0, f64::INFINITY, 2.0, 2.0];
        let mut sorted = values;
        sorted.sort_by(f64::total_cmp);
        for (at, value) in sorted.iter().enumerate() {
            assert_eq!(order_statistic(values.iter().copied(), at), *value);
        }
        assert_eq!(median(values.iter().copied()), 2.0);
        assert_eq!(median([1.0, 2.0].into_iter()), 2.0);
        assert!(median(std::iter::empty()).is_nan());
        assert!(order_statistic([1.0].into_iter(), 1).is_nan());
    }
}
