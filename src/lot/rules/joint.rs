//! Parts unlike their lot by several characteristics together, though perhaps inside every limit.

use super::{Judged, Ruled, SEED};
use crate::diagnostic::Note;
use crate::limits::OutlierRule;
use crate::lot::conditions::some_parts;
use crate::lot::explain::step;
use crate::lot::outliers::ALPHA;
use crate::lot::statistics::values;
use crate::readings::Characteristic;
use crate::statistics::Undefined;
use crate::statistics::outliers::joint_outliers;
use serde::{Deserialize, Serialize};
use std::collections::BTreeMap;

/// The joint test of one rule.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct JointSection {
    /// Keys of the bounds.
    pub of: Vec<String>,
    /// Parts that have a value of each.
    pub n: u64,
    /// Overall significance level.
    pub alpha: f64,
    /// A squared distance above this is an outlier; null where the test could not be made.
    pub critical: Option<f64>,
    /// Farthest first.
    pub outliers: Vec<JointOutlier>,
    /// Mean of the core of the parts, in the order of `of`; empty where the test could not be made.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub centre: Vec<f64>,
    /// Covariance of the core, consistent for a normal population, row after row. A part lies at
    /// the critical distance where (x − centre)ᵀ covariance⁻¹ (x − centre) = critical.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub covariance: Vec<Vec<f64>>,
}

/// A part and its robust squared distance from its lot.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct JointOutlier {
    pub part: String,
    pub squared_distance: f64,
}

pub(super) fn evaluate(judged: &Judged, rule: &OutlierRule, ruled: &mut Ruled) {
    let (names, points) = points(judged, &rule.of);
    let of = rule.of.join(", ");
    let (section, tested) = of_points(rule.of.clone(), rule.alpha, &names, &points);
    let result = match tested {
        Ok(()) => {
            let parts: Vec<&str> = section.outliers.iter().map(|o| o.part.as_str()).collect();
            let mut result = if parts.is_empty() {
                "none".to_owned()
            } else {
                distances(&section)
            };
            if parts.len() as u64 > rule.allowed {
                ruled.holds.push(Note::new(
                    "joint_outliers_found",
                    format!(
                        "{of} together: {} unlike the rest of the lot ({}, significance {}), {} allowed, whether or not inside every single limit: look at these parts",
                        parts.len(),
                        some_parts(&parts),
                        section.alpha,
                        rule.allowed
                    ),
                ));
                result += ": holds the lot";
            }
            result
        }
        Err(why) => {
            ruled.holds.push(Note::new(
                "outliers_not_available",
                format!(
                    "outliers of {of} together are to be looked for and cannot be ({}): a quality engineer decides",
                    why.text()
                ),
            ));
            format!("cannot be tested ({}): holds the lot", why.text())
        }
    };
    let critical = section.critical.map_or(String::new(), |c| {
        format!(", critical squared distance {c:.2}")
    });
    ruled.steps.push(step(
        &of,
        &format!(
            "at most {} outliers by the robust squared Mahalanobis distance (minimum covariance determinant of three quarters of the parts)",
            rule.allowed
        ),
        "Rousseeuw 1985; Rousseeuw and Van Driessen 1999; critical value by Hardin and Rocke 2005",
        format!(
            "{} parts with a value of each, significance {}{critical}, seed {SEED}",
            section.n, section.alpha
        ),
        result,
    ));
    ruled.findings.joint.push(section);
}

/// Capacitance and self-resonant frequency together, where no rule does it: the core is needed to
/// draw one against the other. `None` where a limit file does not bound both, or the parts are too
/// few.
pub(super) fn beside(judged: &Judged, ruled: &[JointSection]) -> Option<JointSection> {
    let key = |wanted: Characteristic| {
        let mut of_kind = judged
            .limits
            .bounds
            .iter()
            .filter(|b| b.characteristic == wanted);
        of_kind.next().map(|b| b.key.clone())
    };
    let of = vec![key(Characteristic::Capacitance)?, key(Characteristic::Srf)?];
    if ruled.iter().any(|s| of.iter().all(|k| s.of.contains(k))) {
        return None;
    }
    let (names, points) = points(judged, &of);
    let (section, tested) = of_points(of, None, &names, &points);
    tested.ok().map(|()| section)
}

/// `019 (38.1), 044 (31.7)`
fn distances(section: &JointSection) -> String {
    let each = section
        .outliers
        .iter()
        .map(|o| format!("{} ({:.1})", o.part, o.squared_distance));
    each.collect::<Vec<_>>().join(", ")
}

/// Every part that has a value of each key, with its values in the order of the keys.
fn points<'a>(judged: &Judged<'a>, keys: &[String]) -> (Vec<&'a str>, Vec<Vec<f64>>) {
    let columns: Vec<BTreeMap<&str, f64>> = keys
        .iter()
        .map(|key| values(key, judged.parts).into_iter().collect())
        .collect();
    judged
        .parts
        .iter()
        .filter_map(|part| {
            let name = part.part.as_str();
            let point: Option<Vec<f64>> = columns.iter().map(|c| c.get(name).copied()).collect();
            Some((name, point?))
        })
        .unzip()
}

fn of_points(
    of: Vec<String>,
    alpha: Option<f64>,
    names: &[&str],
    points: &[Vec<f64>],
) -> (JointSection, Result<(), Undefined>) {
    let mut section = JointSection {
        of,
        n: points.len() as u64,
        alpha: alpha.unwrap_or(ALPHA),
        critical: None,
        outliers: Vec::new(),
        centre: Vec::new(),
        covariance: Vec::new(),
    };
    match joint_outliers(points, section.alpha, SEED) {
        Ok(test) => {
            section.critical = Some(test.critical);
            section.centre.clone_from(&test.centre);
            section.covariance.clone_from(&test.covariance);
            let outlier = |i: &usize| {
                Some(JointOutlier {
                    part: (*names.get(*i)?).to_owned(),
                    squared_distance: *test.squared_distances.get(*i)?,
                })
            };
            section.outliers = test.outliers.iter().filter_map(outlier).collect();
            (section, Ok(()))
        }
        Err(why) => (section, Err(why)),
    }
}
