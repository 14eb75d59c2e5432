//! The sampling plan in force and the counts against it.

use super::variables::{self as by_variables, VariablesSection};
use super::{LotVerdict, OperatingCharacteristic, Switching};
use crate::judgement::{PartRecord, PartVerdict};
use crate::limits::{Acceptance, Limits, NotNormal};
use crate::statistics::Undefined;
use crate::statistics::operating_characteristic::zero_acceptance_sample;
use crate::statistics::sampling::{InspectionLevel, Severity, code_letter, plan_for};
use crate::statistics::share::{lot_lower_bound, lot_upper_bound};
use crate::statistics::variables;
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};

/// The class that stands for all bounds together where a scheme has no classes.
const ALL: &str = "all";
/// The published source of plans by variables.
const VARIABLES: &str = "ISO 3951-1, s-method (tables of MIL-STD-414)";

/// The sampling plan and the counts against it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct Sampling {
    /// `attributes`, `variables`, `zero_acceptance`, `fixed`.
    pub scheme: String,
    pub level: Option<String>,
    /// Of the lot size and level, before arrows.
    pub code_letter: Option<String>,
    pub severity: Option<String>,
    /// Source of the plan, with table or clause.
    pub source: String,
    /// Parts the plan demands: the largest n of its classes.
    pub required: u64,
    /// Parts with a sweep file.
    pub presented: u64,
    /// Parts with a verdict other than `unmeasured`.
    pub measured: u64,
    pub nonconforming: u64,
    pub undecided: u64,
    pub unmeasured: u64,
    /// Nonconforming parts beyond the sample of their class.
    pub nonconforming_beyond_sample: u64,
    /// By class; for schemes without classes the class `all`.
    pub classes: IndexMap<String, ClassSection>,
    /// Where the switching rules stand, and why; `null` for schemes without severities.
    #[serde(default)]
    pub switching: Option<Switching>,
}

/// One class of nonconformity against its plan.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ClassSection {
    /// Percent; `null` where the plan has none.
    pub aql: Option<f64>,
    /// After arrows.
    pub code_letter: Option<String>,
    /// `null` where the scheme has none, or in records that know one for all classes.
    #[serde(default)]
    pub severity: Option<String>,
    pub n: u64,
    pub ac: u64,
    pub re: u64,
    /// Nonconforming parts within the first n.
    pub nonconforming: u64,
    /// Undecided parts within the first n.
    pub undecided: u64,
    /// `accept`, `reject` or `hold` by this class alone.
    pub verdict: LotVerdict,
    /// Share of such parts in the measured sample, a ratio; undecided parts count as nonconforming.
    #[serde(default)]
    pub share_nonconforming: Option<f64>,
    /// Lower and upper 95 % confidence bounds (one-sided each) of the share of such parts in the lot, ratios:
    /// exact for its size. Undecided parts count as conforming in the lower, as nonconforming in the upper.
    #[serde(default)]
    pub share_nonconforming_lower_95: Option<f64>,
    #[allow(missing_docs)]
    #[serde(default)]
    pub share_nonconforming_upper_95: Option<f64>,
    /// `null` where the whole lot is inspected.
    #[serde(default)]
    pub operating_characteristic: Option<OperatingCharacteristic>,
    /// Each characteristic by variables; empty where the class is judged by attributes alone.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub variables: Vec<VariablesSection>,
    /// True where `n`, `ac` and `re` did not decide, but `variables`.
    #[serde(default)]
    pub by_variables: bool,
    /// Why there is no plan by variables though the scheme is by variables.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub no_variables: Option<String>,
}

/// A sampling plan for a lot size.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Plan {
    pub scheme: &'static str,
    pub level: Option<String>,
    pub code_letter: Option<String>,
    /// The most severe of the classes.
    pub severity: Option<Severity>,
    pub source: String,
    pub lot_size: u64,
    pub classes: IndexMap<String, PlanClass>,
    /// What the severities come from.
    pub switching: Option<Switching>,
    /// Quality limit and consumer's risk of zero acceptance, ratios.
    pub quality_limit: Option<(f64, f64)>,
}

/// The plan of one class: n parts, at most Ac nonconforming.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct PlanClass {
    pub aql: Option<f64>,
    pub code_letter: Option<String>,
    pub severity: Option<Severity>,
    /// By attributes.
    pub n: u64,
    pub ac: u64,
    pub re: u64,
    /// Where the class is judged by variables.
    pub variables: Option<variables::Plan>,
    /// The constants one step tighter, which the switching rules ask for.
    pub tighter: Option<variables::Plan>,
    /// Why a class that is to be judged by variables has no plan for it.
    pub no_variables: Option<String>,
    /// What is done where a characteristic is not normal.
    pub not_normal: NotNormal,
}

impl PlanClass {
    /// By attributes.
    fn new(aql: Option<f64>, code_letter: Option<String>, n: u64, ac: u64) -> PlanClass {
        PlanClass {
            aql,
            code_letter,
            severity: None,
            n,
            ac,
            re: ac.saturating_add(1),
            variables: None,
            tighter: None,
            no_variables: None,
            not_normal: NotNormal::Hold,
        }
    }

    /// Parts this class needs at first: by variables where it is judged so.
    pub fn sample(&self) -> u64 {
        self.variables.map_or(self.n, |plan| plan.n)
    }
}

impl Plan {
    /// Parts the plan demands: the largest n of its classes.
    pub fn required(&self) -> u64 {
        self.classes
            .values()
            .map(PlanClass::sample)
            .max()
            .unwrap_or(0)
    }

    /// The operating characteristic of one class.
    pub fn curve(&self, class: &PlanClass) -> Option<OperatingCharacteristic> {
        if let Some(plan) = class.variables {
            return Some(OperatingCharacteristic::variables(plan.n, plan.k));
        }
        match self.scheme {
            "zero_acceptance" => {
                OperatingCharacteristic::hypergeometric(class.n, class.ac, self.lot_size)
            }
            _ => OperatingCharacteristic::binomial(class.n, class.ac, self.lot_size),
        }
    }
}

/// The plan that the acceptance section of a limit file gives for a lot size, or why there is none.
///
/// `attributes`: ISO 2859-1:1999 single sampling, tables 1 and 2-A to 2-C; a sample that is at
/// least the lot is the whole lot (10.3, note on 100 % inspection). `zero_acceptance`: the smallest n with Ac = 0 that
/// accepts a lot at the quality limit with at most the consumer's risk, by the hypergeometric law.
///
/// # Errors
/// A sentence for people where the lot size or the scheme allows no plan.
pub fn plan(acceptance: &Acceptance, lot_size: u64, severity: Severity) -> Result<Plan, String> {
    of_severities(acceptance, lot_size, &|_| severity)
}

/// The plan with the severity of each class by the switching rules.
///
/// # Errors
/// As [`plan`].
pub fn plan_in_state(
    acceptance: &Acceptance,
    lot_size: u64,
    switching: Option<Switching>,
) -> Result<Plan, String> {
    let severity = |class: &str| {
        switching
            .as_ref()
            .map_or(Severity::Normal, |s| s.severity(class))
    };
    let plan = of_severities(acceptance, lot_size, &severity)?;
    Ok(Plan { switching, ..plan })
}

/// The severity of each class.
type Severities<'a> = &'a dyn Fn(&str) -> Severity;

fn of_severities(
    acceptance: &Acceptance,
    lot_size: u64,
    severity: Severities,
) -> Result<Plan, String> {
    match acceptance {
        Acceptance::Attributes { level, aql } => attributes(level, aql, lot_size, severity),
        Acceptance::Fixed { sample, accept } => Ok(Plan {
            scheme: "fixed",
            level: None,
            code_letter: None,
            severity: None,
            lot_size,
            source: "fixed sample and acceptance number of the limit file".to_owned(),
            classes: single((*sample).min(lot_size), *accept),
            switching: None,
            quality_limit: None,
        }),
        Acceptance::ZeroAcceptance {
            quality_limit,
            consumers_risk,
        } => {
            let n = zero_acceptance_sample(lot_size, *quality_limit, *consumers_risk).map_err(
                |why| {
                    format!(
                        "no zero-acceptance sample for a lot of {lot_size}: {}",
                        why.text()
                    )
                },
            )?;
            Ok(Plan {
                scheme: "zero_acceptance",
                level: None,
                code_letter: None,
                severity: None,
                lot_size,
                source: "hypergeometric law, exact for the lot size".to_owned(),
                classes: single(n, 0),
                switching: None,
                quality_limit: Some((*quality_limit, *consumers_risk)),
            })
        }
        Acceptance::Variables {
            level,
            aql,
            not_normal,
        } => with_variables(level, aql, *not_normal, lot_size, severity),
    }
}

fn single(n: u64, ac: u64) -> IndexMap<String, PlanClass> {
    let class = PlanClass::new(None, None, n, ac);
    IndexMap::from([(ALL.to_owned(), class)])
}

fn attributes(
    level: &str,
    aql: &[(String, f64)],
    lot_size: u64,
    severity: Severities,
) -> Result<Plan, String> {
    let parsed: InspectionLevel = level
        .parse()
        .map_err(|_| format!("`{level}` is not an inspection level"))?;
    if lot_size == 1 {
        return Ok(single_part(level, aql, severity));
    }
    let letter = code_letter(lot_size, parsed).map_err(|why| no_plan(lot_size, why))?;
    let mut classes = IndexMap::new();
    for (class, aql) in aql {
        let severity = severity(class);
        let plan =
            plan_for(lot_size, parsed, *aql, severity).map_err(|why| no_plan(lot_size, why))?;
        let letter = Some(plan.letter.to_string());
        let of = PlanClass {
            severity: Some(severity),
            ..PlanClass::new(Some(*aql), letter, plan.n, plan.ac)
        };
        classes.insert(class.clone(), of);
    }
    Ok(Plan {
        scheme: "attributes",
        level: Some(level.to_owned()),
        code_letter: Some(letter.to_string()),
        severity: most_severe(&classes),
        lot_size,
        source: format!(
            "{}, code letter by Table 1, single sampling",
            tables(&classes)
        ),
        classes,
        switching: None,
        quality_limit: None,
    })
}

/// The plan by attributes, and beside it that by variables for each class that has one.
fn with_variables(
    level: &str,
    aql: &[(String, f64)],
    not_normal: NotNormal,
    lot_size: u64,
    severity: Severities,
) -> Result<Plan, String> {
    let mut plan = attributes(level, aql, lot_size, severity)?;
    let level: InspectionLevel = level
        .parse()
        .map_err(|_| format!("`{level}` is not an inspection level"))?;
    for (name, class) in &mut plan.classes {
        let Some(aql) = class.aql else { continue };
        let severity = severity(name);
        match variables::plan_for(lot_size, level, aql, severity) {
            Ok(plan) => class.variables = Some(plan),
            Err(why) => class.no_variables = Some(why.text()),
        }
        class.tighter = code_letter(lot_size, level)
            .ok()
            .and_then(|letter| variables::one_step_tighter(letter, aql, severity));
        class.not_normal = not_normal;
    }
    plan.scheme = "variables";
    plan.source = format!(
        "{VARIABLES}; where a class cannot be judged so: {}",
        plan.source
    );
    Ok(plan)
}

fn no_plan(lot_size: u64, why: Undefined) -> String {
    format!("no sampling plan for a lot of {lot_size}: {}", why.text())
}

/// The tables of ISO 2859-1 begin with lots of two: a single part is inspected itself.
fn single_part(level: &str, aql: &[(String, f64)], severity: Severities) -> Plan {
    let lot_size = 1;
    let class = |name: &str, aql: f64| PlanClass {
        severity: Some(severity(name)),
        ..PlanClass::new(Some(aql), None, 1, 0)
    };
    let classes = aql
        .iter()
        .map(|(name, aql)| (name.clone(), class(name, *aql)))
        .collect();
    Plan {
        scheme: "attributes",
        level: Some(level.to_owned()),
        code_letter: None,
        severity: most_severe(&classes),
        lot_size,
        source: "100 % inspection of a lot of one".to_owned(),
        classes,
        switching: None,
        quality_limit: None,
    }
}

fn most_severe(classes: &IndexMap<String, PlanClass>) -> Option<Severity> {
    let any = |severity| classes.values().any(|c| c.severity == Some(severity));
    [Severity::Tightened, Severity::Normal, Severity::Reduced]
        .into_iter()
        .find(|severity| any(*severity))
}

/// The tables of the severities in force, each once.
fn tables(classes: &IndexMap<String, PlanClass>) -> String {
    let mut tables: Vec<&str> = Vec::new();
    for table in classes
        .values()
        .filter_map(|c| c.severity.map(Severity::table))
    {
        if !tables.contains(&table) {
            tables.push(table);
        }
    }
    tables.join(" and ")
}

/// Counts the parts, in sample order, against the plan.
///
/// A part counts in the class of its most serious nonconformity (ISO 2859-1, 3.1.7 to 3.1.9), in
/// `all` where the plan has no classes. A nonconforming part beyond the sample of its class is
/// counted apart, never ignored.
pub(super) fn count(plan: &Plan, limits: &Limits, parts: &[PartRecord]) -> Sampling {
    let of = |verdict| parts.iter().filter(|p| p.verdict == verdict).count() as u64;
    let unmeasured = unmeasured_of(parts);
    let mut beyond = 0;
    let mut required = 0;
    let mut classes = IndexMap::new();
    for (name, class) in &plan.classes {
        let sections = by_variables::judge(name, class, limits, parts);
        let falls_back =
            class.not_normal == NotNormal::Attributes && by_variables::not_normal(&sections);
        let by_variables = class.variables.is_some() && !falls_back;
        let n = if by_variables {
            class.sample()
        } else {
            class.n
        };
        required = required.max(n);
        let counts_here = |part: &&PartRecord| name == ALL || part.class.as_deref() == Some(name);
        let inside = usize::try_from(n).unwrap_or(usize::MAX).min(parts.len());
        let with = |parts: &[PartRecord], verdict| {
            parts
                .iter()
                .filter(|p| p.verdict == verdict)
                .filter(counts_here)
                .count() as u64
        };
        beyond += with(&parts[inside..], PartVerdict::Nonconforming);
        let nonconforming = with(&parts[..inside], PartVerdict::Nonconforming);
        let undecided = with(&parts[..inside], PartVerdict::Undecided);
        let measured = inside as u64 - unmeasured_of(&parts[..inside]);
        let verdict = if by_variables {
            by_variables::verdict(&sections)
        } else {
            class_verdict(class, nonconforming, undecided)
        };
        classes.insert(
            name.clone(),
            ClassSection {
                aql: class.aql,
                code_letter: class.code_letter.clone(),
                severity: class.severity.map(|s| s.to_string()),
                n,
                ac: class.ac,
                re: class.re,
                nonconforming,
                undecided,
                verdict,
                share_nonconforming: share(measured, nonconforming + undecided),
                share_nonconforming_lower_95: share_lower(plan.lot_size, measured, nonconforming),
                share_nonconforming_upper_95: share_upper(
                    plan.lot_size,
                    measured,
                    nonconforming + undecided,
                ),
                operating_characteristic: plan.curve(class),
                variables: sections,
                by_variables,
                no_variables: class.no_variables.clone(),
            },
        );
    }
    debug_assert!(
        limits
            .bounds
            .iter()
            .all(|b| plan.classes.contains_key(ALL) || plan.classes.contains_key(&b.class))
    );
    Sampling {
        scheme: plan.scheme.to_owned(),
        level: plan.level.clone(),
        code_letter: plan.code_letter.clone(),
        severity: plan.severity.map(|s| s.to_string()),
        source: plan.source.clone(),
        required,
        presented: parts.len() as u64,
        measured: parts.len() as u64 - unmeasured,
        nonconforming: of(PartVerdict::Nonconforming),
        undecided: of(PartVerdict::Undecided),
        unmeasured,
        nonconforming_beyond_sample: beyond,
        classes,
        switching: plan.switching.clone(),
    }
}

fn unmeasured_of(parts: &[PartRecord]) -> u64 {
    let unmeasured = |p: &&PartRecord| p.verdict == PartVerdict::Unmeasured;
    parts.iter().filter(unmeasured).count() as u64
}

fn share(measured: u64, nonconforming: u64) -> Option<f64> {
    (measured > 0).then(|| nonconforming as f64 / measured as f64)
}

/// The smallest share that a sample as bad as this leaves possible with 95 % confidence.
fn share_lower(lot: u64, measured: u64, nonconforming: u64) -> Option<f64> {
    let least = lot_lower_bound(lot, measured, nonconforming, 0.95).ok()?;
    Some(least as f64 / lot as f64)
}

/// The largest share that a sample as good as this leaves possible with 95 % confidence.
fn share_upper(lot: u64, measured: u64, nonconforming: u64) -> Option<f64> {
    let most = lot_upper_bound(lot, measured, nonconforming, 0.95).ok()?;
    Some(most as f64 / lot as f64)
}

/// Undecided parts are counted both ways: the class accepts only if it would with all of them
/// nonconforming, and rejects only if it would with all of them conforming.
fn class_verdict(class: &PlanClass, nonconforming: u64, undecided: u64) -> LotVerdict {
    if nonconforming >= class.re {
        LotVerdict::Reject
    } else if nonconforming + undecided <= class.ac {
        LotVerdict::Accept
    } else {
        LotVerdict::Hold
    }
}
