//! Medians and the like of many numbers, quickly.

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
