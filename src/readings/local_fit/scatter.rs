//! The noise of a stretch as its own points show it.

use num_complex::Complex64;

/// Standard deviations of the noise of ln|Z| and of the phase (rad), from third differences of
/// neighbouring points (median of absolute values: neither a smooth course nor a single jump counts
/// as noise). `None` for too few points.
///
/// `square` and `size` are |Z|² and |Z|.
pub(in crate::readings) fn noise(
    impedance: &[Complex64],
    square: &[f64],
    size: &[f64],
) -> Option<[f64; 2]> {
    if impedance.len() < 9 {
        return None;
    }
    // ln|Z₁| − ln|Z₀| = artanh((|Z₁|² − |Z₀|²)/(|Z₁|² + |Z₀|²))
    let mut steps: Vec<f64> = square
        .windows(2)
        .map(|s| (s[1] - s[0]) / (s[1] + s[0]))
        .collect();
    if steps.iter().all(|t| t.abs() < SMALL) {
        steps.iter_mut().for_each(|t| *t = small_artanh(*t));
    } else {
        steps.iter_mut().for_each(|t| *t = t.atanh());
    }
    let magnitude = of_steps(&steps);
    steps.clear();
    // The sine of the step serves for the step: what it lacks is smooth.
    let steps_of_phase = impedance
        .windows(2)
        .zip(size.windows(2))
        .map(|(z, s)| (z[1].im * z[0].re - z[1].re * z[0].im) / (s[0] * s[1]));
    steps.extend(steps_of_phase);
    Some([magnitude, of_steps(&steps)])
}

/// Up to here a step's series is exact to 1e-12, and what it lacks is smooth.
const SMALL: f64 = 0.2;

/// artanh by its series up to t¹³.
fn small_artanh(t: f64) -> f64 {
    let q = t * t;
    let series = [13.0, 11.0, 9.0, 7.0, 5.0, 3.0, 1.0];
    t * series.iter().fold(0.0, |sum, k| sum * q + 1.0 / k)
}

fn of_steps(steps: &[f64]) -> f64 {
    // Numbers that are not negative are in the order of their bits.
    let mut all: Vec<u64> = steps
        .windows(3)
        .map(|s| (s[2] - 2.0 * s[1] + s[0]).abs().to_bits())
        .collect();
    let middle = all.len() / 2;
    // 1.4826: median absolute value to standard deviation; 20 = 1² + 3² + 3² + 1².
    1.4826 / 20f64.sqrt() * f64::from_bits(*all.select_nth_unstable(middle).1)
}

/// The two relative to the larger one, kept between 1:10 and 10:1; 1:1 where nothing is known.
pub(super) fn noise_ratio(impedance: &[Complex64], square: &[f64], size: &[f64]) -> [f64; 2] {
    let [magnitude, phase] = noise(impedance, square, size).unwrap_or([1.0, 1.0]);
    let largest = magnitude.max(phase);
    if !(largest > 0.0 && largest.is_finite()) {
        return [1.0, 1.0];
    }
    [(magnitude / largest).max(0.1), (phase / largest).max(0.1)]
}
