//! The noise of a stretch as its own points show it.

use crate::statistics::lanes::{Kernel, LANES, Lanes, Simd, chunks, chunks_mut, wide};
use std::cell::RefCell;

/// Impedances of neighbouring points: real and imaginary parts, |Z|² and |Z|.
#[derive(Debug, Clone, Copy)]
pub(in crate::readings) struct Points<'a> {
    pub(in crate::readings) re: &'a [f64],
    pub(in crate::readings) im: &'a [f64],
    pub(in crate::readings) square: &'a [f64],
    pub(in crate::readings) size: &'a [f64],
}

thread_local! {
    /// Steps of ln|Z| and of the phase, and differences of steps, in room that is kept.
    static ROOM: RefCell<([Vec<f64>; 2], Vec<u64>)> =
        const { RefCell::new(([const { Vec::new() }; 2], Vec::new())) };
}

/// Standard deviations of the noise of ln|Z| and of the phase (rad), from third differences of
/// neighbouring points (median of absolute values: neither a smooth course nor a single jump counts
/// as noise). `None` for too few points.
pub(in crate::readings) fn noise(points: Points) -> Option<[f64; 2]> {
    let n = points.size.len();
    if n < 9 {
        return None;
    }
    ROOM.with_borrow_mut(|([magnitude, phase], differences)| {
        magnitude.resize(n - 1, 0.0);
        phase.resize(n - 1, 0.0);
        differences.resize(n - 3, 0);
        wide(Steps {
            points,
            magnitude,
            phase,
        });
        // ln|Z₁| − ln|Z₀| = artanh((|Z₁|² − |Z₀|²)/(|Z₁|² + |Z₀|²))
        if magnitude.iter().all(|t| t.abs() < SMALL) {
            wide(SmallArtanh(magnitude));
        } else {
            magnitude.iter_mut().for_each(|t| *t = t.atanh());
        }
        Some([magnitude, phase].map(|steps| of_steps(steps, differences)))
    })
}

/// Up to here a step's series is exact to 1e-12, and what it lacks is smooth.
const SMALL: f64 = 0.2;

/// Writes `(|Z₁|² − |Z₀|²)/(|Z₁|² + |Z₀|²)` and the sine of the step of the phase, which serves for
/// the step: what it lacks is smooth.
struct Steps<'a> {
    points: Points<'a>,
    magnitude: &'a mut [f64],
    phase: &'a mut [f64],
}

impl Kernel for Steps<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) {
        let Points {
            re,
            im,
            square,
            size,
        } = self.points;
        let n = self.magnitude.len();
        let squares = chunks(square).iter().zip(chunks(&square[1..]));
        for (to, (s0, s1)) in chunks_mut(self.magnitude).iter_mut().zip(squares) {
            let (s0, s1) = (Lanes::of(simd, s0), Lanes::of(simd, s1));
            s1.minus(s0).over(s1.plus(s0)).store(to);
        }
        let sizes = chunks(size).iter().zip(chunks(&size[1..]));
        let before = chunks(re).iter().zip(chunks(im));
        let after = chunks(&re[1..]).iter().zip(chunks(&im[1..]));
        let points = before.zip(after).zip(sizes);
        for (to, (((r0, i0), (r1, i1)), (s0, s1))) in chunks_mut(self.phase).iter_mut().zip(points)
        {
            let across = Lanes::of(simd, i1).times(Lanes::of(simd, r0));
            let across = across.minus(Lanes::of(simd, r1).times(Lanes::of(simd, i0)));
            let sizes = Lanes::of(simd, s0).times(Lanes::of(simd, s1));
            across.over(sizes).store(to);
        }
        for i in n - n % LANES..n {
            self.magnitude[i] = (square[i + 1] - square[i]) / (square[i + 1] + square[i]);
            let across = im[i + 1] * re[i] - re[i + 1] * im[i];
            self.phase[i] = across / (size[i] * size[i + 1]);
        }
    }
}

/// artanh by its series up to t¹³, in place.
struct SmallArtanh<'a>(&'a mut [f64]);

impl Kernel for SmallArtanh<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self, simd: S) {
        const SERIES: [f64; 7] = [
            1.0 / 13.0,
            1.0 / 11.0,
            1.0 / 9.0,
            1.0 / 7.0,
            1.0 / 5.0,
            1.0 / 3.0,
            1.0,
        ];
        let whole = self.0.len() - self.0.len() % LANES;
        for t in chunks_mut(self.0) {
            let at = Lanes::of(simd, t);
            let q = at.times(at);
            let mut sum = Lanes::all(simd, 0.0);
            for c in SERIES {
                sum = sum.times(q).plus(Lanes::all(simd, c));
            }
            at.times(sum).store(t);
        }
        for t in &mut self.0[whole..] {
            let q = *t * *t;
            let mut sum = 0.0;
            for c in SERIES {
                sum = sum * q + c;
            }
            *t *= sum;
        }
    }
}

/// Standard deviation of a point from the differences of differences of steps, for which there is room.
fn of_steps(steps: &[f64], differences: &mut [u64]) -> f64 {
    // Numbers that are not negative are in the order of their bits.
    for (d, s) in differences.iter_mut().zip(steps.windows(3)) {
        *d = (s[2] - 2.0 * s[1] + s[0]).abs().to_bits();
    }
    let middle = differences.len() / 2;
    // 1.4826: median absolute value to standard deviation; 20 = 1² + 3² + 3² + 1².
    1.4826 / 20f64.sqrt() * f64::from_bits(*differences.select_nth_unstable(middle).1)
}

/// The two relative to the larger one, kept between 1:10 and 10:1; 1:1 where nothing is known.
pub(super) fn noise_ratio(points: Points) -> [f64; 2] {
    let [magnitude, phase] = noise(points).unwrap_or([1.0, 1.0]);
    let largest = magnitude.max(phase);
    if !(largest > 0.0 && largest.is_finite()) {
        return [1.0, 1.0];
    }
    [(magnitude / largest).max(0.1), (phase / largest).max(0.1)]
}
