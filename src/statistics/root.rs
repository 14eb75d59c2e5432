//! A root of a continuous function in a bracket.

/// Iterations that bisection alone would need to exhaust double precision, with room to spare.
const ITERATIONS_MAX: usize = 300;

/// Finds x in `[low, high]` with f(x) = 0, to the resolution of double precision, where f changes sign
/// over the bracket; otherwise `None`.
///
/// Method: Brent (1973), Algorithms for Minimization without Derivatives, chapter 4.
pub(crate) fn bracketed(mut f: impl FnMut(f64) -> f64, low: f64, high: f64) -> Option<f64> {
    let (mut a, mut b) = (low, high);
    let (mut fa, mut fb) = (f(a), f(b));
    if fa == 0.0 {
        return Some(a);
    }
    if fb == 0.0 {
        return Some(b);
    }
    if fa.is_nan() || fb.is_nan() || fa.signum() == fb.signum() {
        return None;
    }
    let (mut c, mut fc) = (a, fa);
    let (mut step, mut step_before) = (b - a, b - a);
    for _ in 0..ITERATIONS_MAX {
        if fb.signum() == fc.signum() {
            (c, fc) = (a, fa);
            step = b - a;
            step_before = step;
        }
        if fc.abs() < fb.abs() {
            (a, b, c) = (b, c, b);
            (fa, fb, fc) = (fb, fc, fb);
        }
        let tolerance = 2.0 * f64::EPSILON * b.abs() + f64::MIN_POSITIVE;
        let half = 0.5 * (c - b);
        if half.abs() <= tolerance || fb == 0.0 {
            return Some(b);
        }
        let interpolated = if step_before.abs() >= tolerance && fa.abs() > fb.abs() {
            interpolate((a, fa), (b, fb), (c, fc), half, tolerance, step_before)
        } else {
            None
        };
        (step_before, step) = match interpolated {
            Some(next) => (step, next),
            None => (half, half),
        };
        (a, fa) = (b, fb);
        b += if step.abs() > tolerance {
            step
        } else {
            tolerance.copysign(half)
        };
        fb = f(b);
        if fb.is_nan() {
            return None;
        }
    }
    Some(b)
}

/// The step from `b` by inverse quadratic or linear interpolation, if it is one that Brent's rule trusts.
fn interpolate(
    (a, fa): (f64, f64),
    (b, fb): (f64, f64),
    (c, fc): (f64, f64),
    half: f64,
    tolerance: f64,
    step_before: f64,
) -> Option<f64> {
    // Ratios of infinities would poison the step; bisect instead.
    if !(fa.is_finite() && fb.is_finite() && fc.is_finite()) {
        return None;
    }
    let s = fb / fa;
    let (mut p, mut q) = if a == c {
        (2.0 * half * s, 1.0 - s)
    } else {
        let (q, r) = (fa / fc, fb / fc);
        (
            s * (2.0 * half * q * (q - r) - (b - a) * (r - 1.0)),
            (q - 1.0) * (r - 1.0) * (s - 1.0),
        )
    };
    if p > 0.0 {
        q = -q;
    } else {
        p = -p;
    }
    let within = 2.0 * p < (3.0 * half * q - (tolerance * q).abs()).min((step_before * q).abs());
    (within && q != 0.0).then(|| p / q)
}

#[cfg(test)]
mod tests {
    use super::bracketed;

    #[test]
    fn finds_the_root_of_a_cubic_to_double_precision() {
        let root = bracketed(|x| x * x * x - 2.0, 0.0, 4.0);
        assert!((root.unwrap_or(0.0) - 2.0_f64.cbrt()).abs() < 1e-15);
    }

    #[test]
    fn passes_infinite_ends() {
        let root = bracketed(|x: f64| x.ln() - 1.0, 0.0, 10.0);
        assert!((root.unwrap_or(0.0) - std::f64::consts::E).abs() < 1e-14);
    }

    #[test]
    fn says_so_where_there_is_no_change_of_sign() {
        assert_eq!(bracketed(|x| x * x + 1.0, -1.0, 1.0), None);
        assert_eq!(bracketed(|_| f64::NAN, -1.0, 1.0), None);
    }
}
