//! Two populations in one lot: parts of two reels, or of two batches on one.
//!
//! The dip test asks whether a single peak can be; a mixture of two normal populations is compared
//! with one by an information criterion. Each errs where the other does not: the dip test misses
//! unequal shares, the mixture mistakes a skewed lot. Where both speak, the lot is held; the
//! mixture alone is a warning.

use super::{Judged, Ruled, SEED, warnings};
use crate::diagnostic::Note;
use crate::limits::{Bound, MixedRule};
use crate::lot::conditions::some_parts;
use crate::lot::explain::{number, step};
use crate::lot::statistics::values;
use crate::statistics::Undefined;
use crate::statistics::mixture::{Mixture, Spread, dip_test, one_normal_bic, two_normals};
use serde::{Deserialize, Serialize};

/// Uniform samples from which the law of the dip is taken.
const DIP_SAMPLES: u32 = 2000;
/// Two populations are at least this far apart, in root mean square standard deviations (Ashman,
/// Bird & Zepf 1994).
const SEPARATION_MIN: f64 = 2.0;
/// By how much the criterion must be better: very strong evidence (Kass & Raftery 1995).
const BIC_GAIN_MIN: f64 = 10.0;

/// Whether one characteristic has two populations.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct MixedSection {
    /// Key of the bound.
    pub of: String,
    pub n: u64,
    /// Significance level of the dip test.
    pub alpha: f64,
    pub dip: Option<f64>,
    pub dip_p_value: Option<f64>,
    /// Bayesian information criterion of one normal population.
    pub bic_one: Option<f64>,
    /// Of two; null where no two populations can be fitted.
    pub bic_two: Option<f64>,
    /// Distance of the two means in root mean square standard deviations.
    pub separation: Option<f64>,
    /// Both tests speak for two populations.
    pub mixed: bool,
    /// The two groups, that of the lower mean first; empty where the criterion is for one.
    pub groups: Vec<GroupSection>,
}

/// One group of the parts.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct GroupSection {
    /// Of the fitted population in the mixture, a ratio.
    #[serde(default)]
    pub share: f64,
    #[allow(missing_docs)]
    pub mean: f64,
    pub standard_deviation: f64,
    /// Parts that belong here more probably than to the other, in measuring order.
    pub parts: Vec<String>,
}

pub(super) fn evaluate(judged: &Judged, ruled: &mut Ruled) {
    for rule in &judged.limits.mixed_rules {
        for bound in judged
            .limits
            .bounds
            .iter()
            .filter(|b| rule.of.contains(&b.key))
        {
            of_bound(judged, rule, bound, ruled);
        }
    }
}

fn of_bound(judged: &Judged, rule: &MixedRule, bound: &Bound, ruled: &mut Ruled) {
    let (names, values): (Vec<&str>, Vec<f64>) =
        values(&bound.key, judged.parts).into_iter().unzip();
    let mut section = MixedSection {
        of: bound.key.clone(),
        n: values.len() as u64,
        alpha: rule.alpha,
        dip: None,
        dip_p_value: None,
        bic_one: None,
        bic_two: None,
        separation: None,
        mixed: false,
        groups: Vec::new(),
    };
    let result = match test(&mut section, &names, &values) {
        Err(why) => {
            ruled.holds.push(Note::new(
                "mixed_not_available",
                format!(
                    "two populations of {} are to be looked for and cannot be ({}): a quality engineer decides",
                    bound.key,
                    why.text()
                ),
            ));
            format!("cannot be tested ({}): holds the lot", why.text())
        }
        Ok(()) if section.mixed => {
            let words = groups(&section, bound);
            ruled.holds.push(Note::new(
                "mixed_lot",
                format!(
                    "{}: two populations in one lot ({words}): find out whether two reels were mixed",
                    bound.key
                ),
            ));
            format!("two populations ({words}): holds the lot")
        }
        Ok(()) if !section.groups.is_empty() => {
            let words = groups(&section, bound);
            ruled
                .warnings
                .push(warnings::mixed_possible(&section, &words));
            format!("perhaps two populations ({words}): a warning")
        }
        Ok(()) => "one population".to_owned(),
    };
    ruled.steps.push(step(
        &bound.key,
        "two populations where a single peak has a probability below the significance level, and two normal populations at least 2 apart are better by 10 in the information criterion",
        "Hartigan and Hartigan 1985; Schwarz 1978; Kass and Raftery 1995; Ashman, Bird and Zepf 1994",
        numbers(&section),
        result,
    ));
    ruled.findings.mixed.push(section);
}

fn test(section: &mut MixedSection, names: &[&str], values: &[f64]) -> Result<(), Undefined> {
    section.bic_one = Some(one_normal_bic(values)?);
    let dip = dip_test(values, DIP_SAMPLES, SEED)?;
    section.dip = Some(dip.statistic);
    section.dip_p_value = Some(dip.p_value);
    let fits = [Spread::Equal, Spread::Unequal].map(|spread| two_normals(values, spread));
    if let [Err(why @ Undefined::TooFewValues { .. }), _] = &fits {
        return Err(*why);
    }
    // That no two populations can be fitted speaks for one.
    let best = fits
        .into_iter()
        .flatten()
        .min_by(|a, b| a.bic.total_cmp(&b.bic));
    let Some(best) = best else { return Ok(()) };
    section.bic_two = Some(best.bic);
    section.separation = Some(best.separation());
    let gain = section.bic_one.unwrap_or(best.bic) - best.bic;
    if gain > BIC_GAIN_MIN && best.separation() > SEPARATION_MIN {
        section.groups = grouped(&best, names);
        section.mixed = dip.p_value < section.alpha;
    }
    Ok(())
}

fn grouped(mixture: &Mixture, names: &[&str]) -> Vec<GroupSection> {
    let of = |second: bool| {
        let belonging = names.iter().zip(&mixture.second);
        belonging
            .filter(|(_, p)| (**p > 0.5) == second)
            .map(|(name, _)| (*name).to_owned())
            .collect()
    };
    let [low, high] = mixture.components;
    [(low, of(false)), (high, of(true))]
        .map(|(component, parts)| GroupSection {
            share: component.weight,
            mean: component.mean,
            standard_deviation: component.standard_deviation,
            parts,
        })
        .into()
}

/// `12 at 4.60 µF ± 0.03 µF: parts 001, …; 20 at …`
fn groups(section: &MixedSection, bound: &Bound) -> String {
    let each = section.groups.iter().map(|group| {
        let names: Vec<&str> = group.parts.iter().map(String::as_str).collect();
        format!(
            "{} of mean {} and standard deviation {}: {}",
            names.len(),
            number(Some(group.mean), bound),
            number(Some(group.standard_deviation), bound),
            some_parts(&names)
        )
    });
    each.collect::<Vec<_>>().join("; ")
}

fn numbers(section: &MixedSection) -> String {
    let of = |value: Option<f64>, places: usize| {
        value.map_or("–".to_owned(), |v| format!("{v:.places$}"))
    };
    let shares = match section.groups.as_slice() {
        [low, high] => format!(", shares of the two {:.3} and {:.3}", low.share, high.share),
        _ => String::new(),
    };
    format!(
        "{} values, significance {}, dip {} with p {} (from {DIP_SAMPLES} uniform samples, seed {SEED}), BIC of one {}, of two {}, separation {}{shares}",
        section.n,
        section.alpha,
        of(section.dip, 4),
        of(section.dip_p_value, 4),
        of(section.bic_one, 1),
        of(section.bic_two, 1),
        of(section.separation, 2)
    )
}
