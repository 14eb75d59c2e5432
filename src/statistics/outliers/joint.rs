//! Outliers by several characteristics together.

use super::mcd::minimum_covariance_determinant;
use crate::statistics::Undefined;
use crate::statistics::distributions::{chi_squared_cdf, chi_squared_quantile, f_upper_quantile};

/// Points needed for each characteristic.
pub const JOINT_SIZE_PER_CHARACTERISTIC: u64 = 10;

/// Share of the points in the core from which distances are taken: 0.75, which withstands a quarter
/// of outliers. (Rousseeuw & Van Driessen 1999; with one half, the distances of good points scatter
/// far more.)
const CORE: f64 = 0.75;

/// The outcome of the joint test.
#[derive(Debug, Clone, PartialEq)]
pub struct Joint {
    /// Robust squared distances of all points from the core, consistent for a normal population.
    pub squared_distances: Vec<f64>,
    /// A squared distance above this is an outlier.
    pub critical: f64,
    /// Indices, farthest first.
    pub outliers: Vec<usize>,
    /// Mean of the core.
    pub centre: Vec<f64>,
    /// Covariance of the core, consistent for a normal population, row after row.
    pub covariance: Vec<Vec<f64>>,
}

/// Tests points of p characteristics for outliers at an overall significance level alpha: in a
/// normal lot the chance of finding any is about alpha.
///
/// Distances by the minimum covariance determinant (Rousseeuw 1985), made consistent by
/// (h/n)/P(χ²_{p+2} ≤ χ²_{p, h/n}). Each is held against p m/(m − p + 1) times the F quantile of p
/// and m − p + 1 degrees of freedom at alpha/n, with the m of Hardin & Rocke (2005): the
/// chi-squared quantile would call good points of a small lot outliers. The seed is that of the
/// random starts.
///
/// # Errors
/// [`Undefined::TooFewValues`] below ten points a characteristic, [`Undefined::Collinear`],
/// [`Undefined::NotFinite`], [`Undefined::OutOfRange`].
pub fn joint_outliers(points: &[Vec<f64>], alpha: f64, seed: u64) -> Result<Joint, Undefined> {
    let p = points.first().map_or(0, Vec::len);
    let needed = JOINT_SIZE_PER_CHARACTERISTIC * (p.max(1) as u64);
    if (points.len() as u64) < needed {
        return Err(Undefined::TooFewValues {
            needed,
            found: points.len() as u64,
        });
    }
    if !(alpha > 0.0 && alpha < 1.0) {
        return Err(Undefined::OutOfRange {
            argument: "significance level",
            expected: "a ratio above 0 and below 1",
        });
    }
    let n = points.len();
    let h = ((n as f64 * CORE).ceil() as usize).max((n + p).div_ceil(2));
    let core = minimum_covariance_determinant(points, h, seed)?;
    let law = DistanceLaw::new(n as f64, p as f64, h as f64);
    let squared_distances: Vec<f64> = core
        .squared_distances
        .iter()
        .map(|d| d / law.consistency)
        .collect();
    let critical = law.critical(alpha / n as f64);
    let mut outliers: Vec<(f64, usize)> = squared_distances
        .iter()
        .enumerate()
        .filter(|(_, d)| **d > critical)
        .map(|(i, d)| (*d, i))
        .collect();
    outliers.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
    Ok(Joint {
        squared_distances,
        critical,
        outliers: outliers.into_iter().map(|(_, i)| i).collect(),
        centre: core.centre,
        covariance: core
            .covariance
            .iter()
            .map(|row| row.iter().map(|v| v * law.consistency).collect())
            .collect(),
    })
}

/// The law of the distances of a normal sample from its core.
struct DistanceLaw {
    p: f64,
    /// The core's covariance times this is that of the population.
    consistency: f64,
    /// Degrees of freedom of the core's covariance as a Wishart matrix.
    m: f64,
}

impl DistanceLaw {
    /// Asymptotic variance of the core's covariance: Croux & Haesbroeck (1999); its correction for
    /// the sample size: Hardin & Rocke (2005), The distribution of robust distances, equations 6
    /// and 7.
    fn new(n: f64, p: f64, h: f64) -> Self {
        let inside = h / n;
        let outside = 1.0 - inside;
        let q = chi_squared_quantile(inside, p);
        let second = chi_squared_cdf(q, p + 2.0);
        let c = inside / second;
        let c2 = -0.5 * second;
        let c3 = -0.5 * chi_squared_cdf(q, p + 4.0);
        let c4 = 3.0 * c3;
        let b1 = c * (c3 - c4) / inside;
        let b2 = 0.5 + c / inside * (c3 - q / p * (c2 + 0.5 * inside));
        let off = b1 - p * b2;
        let v1 = inside * b1 * b1 * (outside * (c * q / p - 1.0).powi(2) - 1.0)
            - 2.0 * c3 * c * c * (3.0 * off * off + (p + 2.0) * b2 * (2.0 * b1 - p * b2));
        let v2 = n * (b1 * off * inside).powi(2) * c * c;
        let asymptotic = 2.0 / (c * c * (v1 / v2));
        let m = asymptotic * (0.725 - 0.00663 * p - 0.0780 * n.ln()).exp();
        Self {
            p,
            consistency: c,
            m: m.max(p + 1.0),
        }
    }

    fn critical(&self, tail: f64) -> f64 {
        let nu = self.m - self.p + 1.0;
        self.p * self.m / nu * f_upper_quantile(tail, self.p, nu)
    }
}
