//! The exponential function where it is wanted of many numbers.

/// 1/k! for k from 13 to 1: what the series of (eˣ − 1)/x is made of, and its last ones for small x.
pub(super) const SERIES: [f64; 13] = [
    1.0 / 6_227_020_800.0,
    1.0 / 479_001_600.0,
    1.0 / 39_916_800.0,
    1.0 / 3_628_800.0,
    1.0 / 362_880.0,
    1.0 / 40_320.0,
    1.0 / 5_040.0,
    1.0 / 720.0,
    1.0 / 120.0,
    1.0 / 24.0,
    1.0 / 6.0,
    0.5,
    1.0,
];

/// eˣ for |x| < 700, to two units in the last place, without branches: `2^k e^r` with `k` the nearest
/// whole number to x/ln 2 and the series of `e^r` to r¹³. (W. J. Cody and W. Waite, Software Manual
/// for the Elementary Functions, 1980, chapter 6: ln 2 in two parts.)
#[inline(always)]
pub(super) fn exp(x: f64) -> f64 {
    /// Added to a small number leaves its nearest whole number in the lowest bits.
    const ROUND: f64 = 6_755_399_441_055_744.0;
    /// ln 2 to 33 bits, and the rest of it.
    const HIGH: f64 = 0.693_147_180_369_123_8;
    const LOW: f64 = 1.908_214_929_270_587_7e-10;
    let shifted = x * std::f64::consts::LOG2_E + ROUND;
    let k = shifted - ROUND;
    let r = (x - k * HIGH) - k * LOW;
    let series = SERIES.iter().fold(0.0, |sum, c| sum * r + c);
    // The exponent's bits are those of k, shifted to their place, and the bias.
    let power = f64::from_bits((shifted.to_bits() << 52).wrapping_add(1.0f64.to_bits()));
    power + power * (r * series)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn powers_are_those_of_the_standard_library() {
        assert_eq!(exp(0.0), 1.0);
        for i in -70_000..=70_000 {
            let x = f64::from(i) * 0.009_999_3;
            let exact = x.exp();
            assert!(
                (exp(x) - exact).abs() <= 2.0 * f64::EPSILON * exact,
                "{x}: {:e} {exact:e}",
                exp(x)
            );
        }
    }
}
