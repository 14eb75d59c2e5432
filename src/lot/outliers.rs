//! Outliers of one characteristic, by the test that a rule names.

use crate::limits::{Bound, Limits, OutlierMethod};
use crate::statistics::Undefined;
use crate::statistics::outliers::{
    MODIFIED_Z_LIMIT, Side, generalized_esd, grubbs, modified_z_scores, part_average_limits,
};

/// Significance of a test where no lot rule names one.
pub(super) const ALPHA: f64 = 0.01;
/// The most outliers looked for in one characteristic.
const OUTLIERS_MAX: usize = 10;

/// Indices of the outliers; by generalized ESD the most extreme first, else in measuring order.
///
/// The joint test is of several characteristics together and finds none in one.
pub(super) fn find(
    method: OutlierMethod,
    values: &[f64],
    alpha: f64,
) -> Result<Vec<usize>, Undefined> {
    let where_beyond = |beyond: &dyn Fn(f64) -> bool, of: &[f64]| {
        let numbered = of.iter().enumerate();
        numbered
            .filter(|(_, v)| beyond(**v))
            .map(|(i, _)| i)
            .collect()
    };
    match method {
        OutlierMethod::GeneralizedEsd => {
            let most = OUTLIERS_MAX.min(values.len() / 4);
            Ok(generalized_esd(values, most, alpha)?.outliers)
        }
        OutlierMethod::Grubbs => {
            let test = grubbs(values, Side::Either, alpha)?;
            Ok(test.outlier.then_some(test.index).into_iter().collect())
        }
        OutlierMethod::ModifiedZ => {
            let scores = modified_z_scores(values)?;
            Ok(where_beyond(&|z| z.abs() > MODIFIED_Z_LIMIT, &scores))
        }
        OutlierMethod::PartAverage => {
            let limits = part_average_limits(values)?;
            Ok(where_beyond(
                &|v| v < limits.lower || v > limits.upper,
                values,
            ))
        }
        OutlierMethod::Joint => Ok(Vec::new()),
    }
}

/// What a test comes to in numbers, so that it can be followed; names are those of the parts.
pub(super) fn numbers(
    method: OutlierMethod,
    values: &[f64],
    names: &[&str],
    alpha: f64,
    show: &dyn Fn(f64) -> String,
) -> String {
    let name = |index: usize| names.get(index).copied().unwrap_or("?");
    let found = match method {
        OutlierMethod::GeneralizedEsd => esd_numbers(values, alpha, &name),
        OutlierMethod::Grubbs => grubbs(values, Side::Either, alpha).map(|test| {
            format!(
                "G {:.3} of part {}, critical {:.3}",
                test.statistic,
                name(test.index),
                test.critical
            )
        }),
        OutlierMethod::ModifiedZ => modified_z_scores(values).map(|scores| {
            let most = scores
                .iter()
                .enumerate()
                .max_by(|a, b| a.1.abs().total_cmp(&b.1.abs()));
            most.map_or(String::new(), |(index, z)| {
                format!("largest score {z:.3} of part {}", name(index))
            })
        }),
        OutlierMethod::PartAverage => part_average_limits(values).map(|limits| {
            format!(
                "median {}, robust σ {}, limits {} and {}",
                show(limits.median),
                show(limits.robust_sigma),
                show(limits.lower),
                show(limits.upper)
            )
        }),
        OutlierMethod::Joint => Ok(String::new()),
    };
    match found {
        Ok(text) if !text.is_empty() => format!("; {text}"),
        _ => String::new(),
    }
}

/// Each step of the generalized ESD test up to the one after the last outlier.
fn esd_numbers<'a>(
    values: &[f64],
    alpha: f64,
    name: &dyn Fn(usize) -> &'a str,
) -> Result<String, Undefined> {
    let test = generalized_esd(values, OUTLIERS_MAX.min(values.len() / 4), alpha)?;
    let each = test.steps.iter().take(test.outliers.len() + 1).map(|step| {
        let sign = if step.statistic > step.critical {
            '>'
        } else {
            '≤'
        };
        format!(
            "R {:.3} of part {} {sign} λ {:.3}",
            step.statistic,
            name(step.index),
            step.critical
        )
    });
    Ok(each.collect::<Vec<_>>().join(", "))
}

/// The outliers by every rule that names the bound, each once; by generalized ESD where none does.
pub(super) fn of_bound(
    bound: &Bound,
    limits: &Limits,
    values: &[f64],
) -> Result<Vec<usize>, Undefined> {
    let mut rules = limits
        .outlier_rules
        .iter()
        .filter(|rule| rule.method != OutlierMethod::Joint && rule.of.contains(&bound.key))
        .peekable();
    if rules.peek().is_none() {
        return find(OutlierMethod::GeneralizedEsd, values, ALPHA);
    }
    let mut all = Vec::new();
    for rule in rules {
        for index in find(rule.method, values, rule.alpha.unwrap_or(ALPHA))? {
            if !all.contains(&index) {
                all.push(index);
            }
        }
    }
    Ok(all)
}
