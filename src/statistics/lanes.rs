//! Sums in lanes, so that they are not bound by the latency of one running sum.
//!
//! Each lane adds its own numbers in their order, products are rounded before they are added, and the
//! lanes are added up in one order: the sums are the same bits whatever width the processor works at.

use pulp::{Arch, WithSimd};
use std::sync::LazyLock;

pub(crate) use pulp::{Scalar256b as Plain, Simd};

static PROCESSOR: LazyLock<Arch> = LazyLock::new(Arch::new);

/// Work for [`wide`].
pub(crate) trait Kernel {
    type Output;

    /// Must be `#[inline(always)]`, and so must be all that it calls, with no closure longer than a
    /// line: only what is inlined is made for the processor's registers.
    fn run<S: Simd>(self, simd: S) -> Self::Output;
}

/// Does the work with the widest registers that the processor has.
#[inline]
pub(crate) fn wide<K: Kernel>(kernel: K) -> K::Output {
    PROCESSOR.dispatch(Dispatched(kernel))
}

struct Dispatched<K>(K);

impl<K: Kernel> WithSimd for Dispatched<K> {
    type Output = K::Output;

    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) -> K::Output {
        if S::F64_LANES == HALF {
            self.0.run(simd)
        } else {
            // Four at once as the compiler finds registers for them.
            self.0.run(Plain)
        }
    }
}

/// Eight numbers that are worked on at once, in two registers of four.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Lanes<S: Simd> {
    simd: S,
    low: S::f64s,
    high: S::f64s,
}

impl<S: Simd> Lanes<S> {
    /// The same number in every lane.
    #[inline(always)]
    pub(crate) fn all(simd: S, value: f64) -> Self {
        let all = simd.splat_f64s(value);
        Lanes {
            simd,
            low: all,
            high: all,
        }
    }

    #[inline(always)]
    pub(crate) fn of(simd: S, values: &[f64; LANES]) -> Self {
        match S::as_simd_f64s(values).0 {
            [low, high] => Lanes {
                simd,
                low: *low,
                high: *high,
            },
            // Not on this processor: `wide` sees to it.
            _ => Lanes::all(simd, f64::NAN),
        }
    }

    #[inline(always)]
    pub(crate) fn store(self, to: &mut [f64; LANES]) {
        if let [low, high] = S::as_mut_simd_f64s(to).0 {
            (*low, *high) = (self.low, self.high);
        }
    }

    #[inline(always)]
    pub(crate) fn plus(self, other: Self) -> Self {
        Lanes {
            simd: self.simd,
            low: self.simd.add_f64s(self.low, other.low),
            high: self.simd.add_f64s(self.high, other.high),
        }
    }

    #[inline(always)]
    pub(crate) fn minus(self, other: Self) -> Self {
        Lanes {
            simd: self.simd,
            low: self.simd.sub_f64s(self.low, other.low),
            high: self.simd.sub_f64s(self.high, other.high),
        }
    }

    #[inline(always)]
    pub(crate) fn times(self, other: Self) -> Self {
        Lanes {
            simd: self.simd,
            low: self.simd.mul_f64s(self.low, other.low),
            high: self.simd.mul_f64s(self.high, other.high),
        }
    }

    #[inline(always)]
    pub(crate) fn over(self, other: Self) -> Self {
        Lanes {
            simd: self.simd,
            low: self.simd.div_f64s(self.low, other.low),
            high: self.simd.div_f64s(self.high, other.high),
        }
    }

    /// The sum of the lanes.
    #[inline(always)]
    pub(crate) fn sum(self) -> f64 {
        let mut values = [0.0; LANES];
        self.store(&mut values);
        sum(values)
    }
}

/// Eight numbers of half the width in one register, for what seven digits are plenty for.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Singles<S: Simd> {
    simd: S,
    register: S::f32s,
}

impl<S: Simd> Singles<S> {
    /// The same number in every lane.
    #[inline(always)]
    pub(crate) fn all(simd: S, value: f32) -> Self {
        let register = simd.splat_f32s(value);
        Singles { simd, register }
    }

    #[inline(always)]
    pub(crate) fn of(simd: S, values: &[f32; LANES]) -> Self {
        match S::as_simd_f32s(values).0 {
            [register] => Singles {
                simd,
                register: *register,
            },
            // Not on this processor: `wide` sees to it.
            _ => Singles::all(simd, f32::NAN),
        }
    }

    #[inline(always)]
    pub(crate) fn values(self) -> [f32; LANES] {
        let mut values = [f32::NAN; LANES];
        if let [register] = S::as_mut_simd_f32s(&mut values).0 {
            *register = self.register;
        }
        values
    }

    #[inline(always)]
    pub(crate) fn plus(self, other: Self) -> Self {
        let register = self.simd.add_f32s(self.register, other.register);
        Singles { register, ..self }
    }

    #[inline(always)]
    pub(crate) fn times(self, other: Self) -> Self {
        let register = self.simd.mul_f32s(self.register, other.register);
        Singles { register, ..self }
    }

    #[inline(always)]
    pub(crate) fn over(self, other: Self) -> Self {
        let register = self.simd.div_f32s(self.register, other.register);
        Singles { register, ..self }
    }

    /// Its own numbers where they are less than the other's, and the other's elsewhere.
    #[inline(always)]
    pub(crate) fn at_most(self, other: Self) -> Self {
        let less = self.simd.less_than_f32s(self.register, other.register);
        let register = (self.simd).select_f32s(less, self.register, other.register);
        Singles { register, ..self }
    }

    /// 1 where its own numbers are less than the other's, and 0 elsewhere.
    #[inline(always)]
    pub(crate) fn is_less(self, other: Self) -> Self {
        let (one, zero) = (self.simd.splat_f32s(1.0), self.simd.splat_f32s(0.0));
        let less = self.simd.less_than_f32s(self.register, other.register);
        let register = self.simd.select_f32s(less, one, zero);
        Singles { register, ..self }
    }

    /// The sum of the lanes, in the order of [`sum`].
    #[inline(always)]
    pub(crate) fn sum(self) -> f32 {
        let [a, b, c, d, e, f, g, h] = self.values();
        ((a + e) + (c + g)) + ((b + f) + (d + h))
    }
}

/// Numbers that are worked on at once; vectors are filled up with zeros to a multiple.
pub(crate) const LANES: usize = 8;
const HALF: usize = LANES / 2;

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

/// a·b of the whole lanes of two vectors; what is left over does not count.
#[inline(always)]
pub(crate) fn product(a: &[f64], b: &[f64]) -> f64 {
    one_product(Plain, a, b)
}

/// Products of four vectors with one, each as [`product`] has it; `v` is read once for all.
///
/// What is left over of whole lanes, or of the shortest, does not count.
#[inline(always)]
pub(crate) fn four_products<S: Simd>(simd: S, [a, b, c, d]: [&[f64]; 4], v: &[f64]) -> [f64; 4] {
    let zero = Lanes::all(simd, 0.0);
    let (mut of_a, mut of_b, mut of_c, mut of_d) = (zero, zero, zero, zero);
    let others = chunks(a)
        .iter()
        .zip(chunks(b))
        .zip(chunks(c))
        .zip(chunks(d));
    for (v, (((a, b), c), d)) in chunks(v).iter().zip(others) {
        let v = Lanes::of(simd, v);
        of_a = of_a.plus(Lanes::of(simd, a).times(v));
        of_b = of_b.plus(Lanes::of(simd, b).times(v));
        of_c = of_c.plus(Lanes::of(simd, c).times(v));
        of_d = of_d.plus(Lanes::of(simd, d).times(v));
    }
    [of_a.sum(), of_b.sum(), of_c.sum(), of_d.sum()]
}

/// As [`product`], in the registers of a kernel.
#[inline(always)]
pub(crate) fn one_product<S: Simd>(simd: S, a: &[f64], b: &[f64]) -> f64 {
    let mut lanes = Lanes::all(simd, 0.0);
    for (a, b) in chunks(a).iter().zip(chunks(b)) {
        lanes = lanes.plus(Lanes::of(simd, a).times(Lanes::of(simd, b)));
    }
    lanes.sum()
}

/// The whole lanes of a vector.
#[inline(always)]
pub(crate) fn chunks(v: &[f64]) -> &[[f64; LANES]] {
    v.as_chunks().0
}

/// Likewise, to be written to.
#[inline(always)]
pub(crate) fn chunks_mut(v: &mut [f64]) -> &mut [[f64; LANES]] {
    v.as_chunks_mut().0
}

/// a·b of vectors of any length.
#[inline(always)]
pub(crate) fn dot(a: &[f64], b: &[f64]) -> f64 {
    let (a_rest, b_rest) = (a.as_chunks::<LANES>().1, b.as_chunks::<LANES>().1);
    let rest: f64 = a_rest.iter().zip(b_rest).map(|(a, b)| a * b).sum();
    product(a, b) + rest
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::array::from_fn;

    struct Products<'a>([&'a [f64]; 4], &'a [f64]);

    impl Kernel for Products<'_> {
        type Output = [[f64; 4]; 2];

        #[inline(always)]
        fn run<S: Simd>(self, simd: S) -> [[f64; 4]; 2] {
            let Products(all, v) = self;
            let [a, b, c, d] = all;
            let one = |a| one_product(simd, a, v);
            [
                four_products(simd, all, v),
                [one(a), one(b), one(c), one(d)],
            ]
        }
    }

    #[test]
    fn sums_have_every_term() {
        for n in [0usize, 1, 7, 8, 9, 16, 31] {
            let a: Vec<f64> = (0..n).map(|i| i as f64 + 1.0).collect();
            let b: Vec<f64> = a.iter().map(|a| a * a).collect();
            // The sum of the first n cubes.
            let triangle = (n * (n + 1) / 2) as f64;
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
        let all: [Vec<f64>; 4] = from_fn(vector);
        let v = vector(9);
        let alone: [f64; 4] = from_fn(|k| product(&all[k], &v));
        assert!(alone[0] > 0.0 && alone[0] != alone[1]);
        let borrowed: [&[f64]; 4] = from_fn(|k| all[k].as_slice());
        assert_eq!(wide(Products(borrowed, &v)), [alone; 2]);
        assert_eq!(four_products(Plain, borrowed, &v), alone);
    }
    struct Of<'a>(&'a [f32; LANES], &'a [f32; LANES]);

    impl Kernel for Of<'_> {
        type Output = ([[f32; LANES]; 5], f32);

        #[inline(always)]
        fn run<S: Simd>(self, simd: S) -> Self::Output {
            let [a, b] = [Singles::of(simd, self.0), Singles::of(simd, self.1)];
            let all = [a.plus(b), a.times(b), a.over(b), a.at_most(b), a.is_less(b)];
            (all.map(Singles::values), a.sum())
        }
    }

    #[test]
    fn singles_are_what_each_number_alone_gives() {
        let a: [f32; LANES] = from_fn(|i| ((i * 37 + 11) % 19) as f32 * 0.3);
        let mut b: [f32; LANES] = from_fn(|i| ((i * 23 + 5) % 17) as f32 * 0.7);
        b[6] = f32::NAN;
        let alone =
            |of: fn(f32, f32) -> f32| -> [u32; LANES] { from_fn(|i| of(a[i], b[i]).to_bits()) };
        let alone = [
            alone(|a, b| a + b),
            alone(|a, b| a * b),
            alone(|a, b| a / b),
            alone(|a, b| if a < b { a } else { b }),
            alone(|a, b| if a < b { 1.0 } else { 0.0 }),
        ];
        let total = ((a[0] + a[4]) + (a[2] + a[6])) + ((a[1] + a[5]) + (a[3] + a[7]));
        for (found, sum) in [wide(Of(&a, &b)), Of(&a, &b).run(Plain)] {
            assert_eq!(found.map(|lanes| lanes.map(f32::to_bits)), alone);
            assert_eq!(sum.to_bits(), total.to_bits());
        }
    }
}
