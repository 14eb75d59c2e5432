//! Sums in lanes, so that they are not bound by the latency of one running sum.
//!
//! Each lane adds its own numbers in their order, and the lanes are added up in one order: the sums are
//! the same bits whatever width the processor works at.

use pulp::{Arch, Simd, WithSimd};
use std::sync::LazyLock;

/// Numbers that are worked on at once; vectors are filled up with zeros to a multiple.
pub(crate) const LANES: usize = 8;

static PROCESSOR: LazyLock<Arch> = LazyLock::new(Arch::new);

/// Work for [`wide`]. `run` must be `#[inline(always)]`, and so must be what it calls: only what is
/// inlined is made for wide registers. A closure is not, once it is longer than a few lines.
pub(crate) trait Kernel {
    type Output;
    fn run(self) -> Self::Output;
}

impl<T, F: FnOnce() -> T> Kernel for F {
    type Output = T;

    #[inline(always)]
    fn run(self) -> T {
        self()
    }
}

/// Does the work with the widest registers that the processor has. Products are rounded before they
/// are added, here as anywhere.
#[inline]
pub(crate) fn wide<K: Kernel>(kernel: K) -> K::Output {
    PROCESSOR.dispatch(Dispatched(kernel))
}

struct Dispatched<K>(K);

impl<K: Kernel> WithSimd for Dispatched<K> {
    type Output = K::Output;

    #[inline(always)]
    fn with_simd<S: Simd>(self, _: S) -> K::Output {
        self.0.run()
    }
}

/// The values, and zeros after them up to a whole number of lanes.
pub(crate) fn filled(values: impl Iterator<Item = f64>) -> Vec<f64> {
    let mut all = Vec::with_capacity(values.size_hint().0.next_multiple_of(LANES));
    all.extend(values);
    all.resize(all.len().next_multiple_of(LANES), 0.0);
    all
}

/// The sum of the lanes, in the order that leaves them where they are.
#[inline(always)]
pub(crate) fn sum(lanes: [f64; LANES]) -> f64 {
    let [a, b, c, d, e, f, g, h] = lanes;
    ((a + e) + (c + g)) + ((b + f) + (d + h))
}

/// Adds a·b to each lane. A plain loop: what `std::array::from_fn` is given is not inlined into a
/// [`Kernel`].
#[inline(always)]
pub(crate) fn add_product(lanes: &mut [f64; LANES], a: &[f64; LANES], b: &[f64; LANES]) {
    for k in 0..LANES {
        lanes[k] += a[k] * b[k];
    }
}

/// a·b of the whole lanes of two vectors; what is left over does not count.
#[inline(always)]
pub(crate) fn product(a: &[f64], b: &[f64]) -> f64 {
    let mut lanes = [0.0; LANES];
    for (a, b) in a
        .as_chunks::<LANES>()
        .0
        .iter()
        .zip(b.as_chunks::<LANES>().0)
    {
        add_product(&mut lanes, a, b);
    }
    sum(lanes)
}

/// Products of `N` vectors with one, each as [`product`] has it; `v` is read once for all.
///
/// All must be as long as `v`; what is left over of whole lanes does not count.
#[inline(always)]
pub(crate) fn products<const N: usize>(all: [&[f64]; N], v: &[f64]) -> [f64; N] {
    let v = v.as_chunks::<LANES>().0;
    let mut chunks: [&[[f64; LANES]]; N] = [&[]; N];
    for (chunks, a) in chunks.iter_mut().zip(&all) {
        *chunks = &a.as_chunks::<LANES>().0[..v.len()];
    }
    let mut lanes = [[0.0; LANES]; N];
    for (i, v) in v.iter().enumerate() {
        for n in 0..N {
            add_product(&mut lanes[n], &chunks[n][i], v);
        }
    }
    let mut sums = [0.0; N];
    for n in 0..N {
        sums[n] = sum(lanes[n]);
    }
    sums
}

/// a·b of vectors of any length.
#[inline(always)]
pub(crate) fn dot(a: &[f64], b: &[f64]) -> f64 {
    let (a_rest, b_rest) = (a.as_chunks::<LANES>().1, b.as_chunks::<LANES>().1);
    let rest: f64 = a_rest.iter().zip(b_rest).map(|(a, b)| a * b).sum();
    product(a, b) + rest
}

/// The sum of any number of values.
#[inline(always)]
pub(crate) fn total(values: &[f64]) -> f64 {
    let (whole, rest) = values.as_chunks::<LANES>();
    let mut lanes = [0.0; LANES];
    for values in whole {
        for k in 0..LANES {
            lanes[k] += values[k];
        }
    }
    sum(lanes) + rest.iter().sum::<f64>()
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::array::from_fn;

    #[test]
    fn sums_have_every_term() {
        for n in [0usize, 1, 7, 8, 9, 16, 31] {
            let a: Vec<f64> = (0..n).map(|i| i as f64 + 1.0).collect();
            let b: Vec<f64> = a.iter().map(|a| a * a).collect();
            // Sums of the first n integers and of their cubes.
            let triangle = (n * (n + 1) / 2) as f64;
            assert_eq!(total(&a), triangle);
            assert_eq!(dot(&a, &b), triangle * triangle);
        }
    }

    #[test]
    fn products_are_sums_of_all_terms() {
        let [a, b] = [1.0, 2.0].map(|step| filled((0..13).map(|i| f64::from(i) * step)));
        assert_eq!(a.len(), 16);
        // 2 Σ i² to 12
        assert_eq!(product(&a, &b), 2.0 * 650.0);
    }

    #[test]
    fn many_products_at_any_width_are_the_same_bits_as_one() {
        let vector =
            |k: usize| filled((0..75).map(move |i| (((i * 37 + k * 11) % 101) as f64).sqrt()));
        let all: [Vec<f64>; 5] = from_fn(vector);
        let v = vector(9);
        let alone: [f64; 5] = from_fn(|k| product(&all[k], &v));
        assert!(alone[0] > 0.0 && alone[0] != alone[1]);
        let borrowed: [&[f64]; 5] = from_fn(|k| all[k].as_slice());
        assert_eq!(products(borrowed, &v), alone);
        assert_eq!(wide(|| products(borrowed, &v)), alone);
    }
}
