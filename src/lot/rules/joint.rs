//! Parts unlike their lot by several characteristics together, though perhaps inside every limit.

use super::{Judged, Ruled, SEED};
use crate::diagnostic::Note;
use crate::limits::OutlierRule;
use crate::lot::conditions::some_parts;
use crate::lot::explain::step;
use crate::lot::outliers::ALPHA;
use crate::lot::statistics::values;
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
    let found = of_points(rule, &names, &points);
    let (section, result) = match found {
        Ok(section) => {
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
            (section, result)
        }
        Err((section, why)) => {
            ruled.holds.push(Note::new(
                "outliers_not_available",
                format!(
                    "outliers of {of} together are to be looked for and cannot be ({}): a quality engineer decides",
                    why.text()
                ),
            ));
            let result = format!("cannot be tested ({}): holds the lot", why.text());
            (section, result)
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
    rule: &OutlierRule,
    names: &[&str],
    points: &[Vec<f64>],
) -> Result<JointSection, (JointSection, Undefined)> {
    let mut section = JointSection {
        of: rule.of.clone(),
        n: points.len() as u64,
        alpha: rule.alpha.unwrap_or(ALPHA),
        critical: None,
        outliers: Vec::new(),
    };
    match joint_outliers(points, section.alpha, SEED) {
        Ok(test) => {
            section.critical = Some(test.critical);
            let outlier = |i: &usize| {
                Some(JointOutlier {
                    part: (*names.get(*i)?).to_owned(),
                    squared_distance: *test.squared_distances.get(*i)?,
                })
            };
            section.outliers = test.outliers.iter().filter_map(outlier).collect();
            Ok(section)
        }
        Err(why) => Err((section, why)),
    }
}
