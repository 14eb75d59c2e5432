//! Medians and the like of many numbers, quickly.

use crate::statistics::lanes::{LANES, Simd, Singles};

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

/// As many values are few.
pub(super) const FEW: usize = 32;

/// The value that stands at a place when the first `count` of a few values are sorted; the others must be
/// infinite. By counting how many are below each, without a branch.
#[inline(always)]
pub(super) fn at_place_of_few<S: Simd>(
    simd: S,
    values: &[f32; FEW],
    count: usize,
    at: usize,
) -> f32 {
    let mut lanes = [Singles::all(simd, 0.0); FEW / LANES];
    for (lanes, values) in lanes.iter_mut().zip(values.as_chunks().0) {
        *lanes = Singles::of(simd, values);
    }
    let mut below = [Singles::all(simd, 0.0); FEW / LANES];
    for value in values.iter().take(count) {
        let value = Singles::all(simd, *value);
        for (below, others) in below.iter_mut().zip(&lanes) {
            *below = below.plus(value.is_less(*others));
        }
    }
    // The largest of those that have no more below them.
    let (at, mut found) = (at as f32, f32::NEG_INFINITY);
    for (below, values) in below.iter().zip(values.as_chunks::<LANES>().0) {
        for (below, value) in below.values().iter().zip(values) {
            let value = if *below <= at {
                *value
            } else {
                f32::NEG_INFINITY
            };
            found = if value > found { value } else { found };
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::statistics::lanes::{Kernel, wide};

    #[test]
    fn few_values_are_in_their_places() {
        let mut values = [f32::INFINITY; FEW];
        for (i, value) in values.iter_mut().take(19).enumerate() {
            *value = ((i * 7) % 17) as f32;
        }
        let mut sorted = values;
        sorted.sort_by(f32::total_cmp);
        struct AtPlace([f32; FEW], usize);
        impl Kernel for AtPlace {
            type Output = f32;
            #[inline(always)]
            fn run<S: Simd>(self, simd: S) -> f32 {
                at_place_of_few(simd, &self.0, 19, self.1)
            }
        }
        for (at, value) in (0..).zip(sorted) {
            assert_eq!(wide(AtPlace(values, at)), value);
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
