//! The impedances of points, one vector for each of what is needed of them.

use num_complex::Complex64;

/// Writes real and imaginary parts, |Z|² and |Z| of as many points as there are impedances; whether no
/// |Z|² is zero and all are numbers. Plain loops, to be inlined into a kernel.
#[inline(always)]
pub(super) fn sizes(
    impedance: &[Complex64],
    re: &mut [f64],
    im: &mut [f64],
    square: &mut [f64],
    size: &mut [f64],
) -> bool {
    for ((re, im), z) in re.iter_mut().zip(&mut *im).zip(impedance) {
        (*re, *im) = (z.re, z.im);
    }
    let sizes = square.iter_mut().zip(size);
    for ((square, size), (re, im)) in sizes.zip(re.iter().zip(&*im)) {
        *square = re * re + im * im;
        *size = square.sqrt();
    }
    // All are looked at, which is quicker than to stop at one.
    let mut sound = 0;
    for square in &square[..impedance.len()] {
        sound += u64::from((*square > 0.0) & (*square < f64::INFINITY));
    }
    sound == impedance.len() as u64
}
