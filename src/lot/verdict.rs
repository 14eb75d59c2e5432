//! The verdict on the lot and every reason for it.
//!
//! A condition that was not met makes the measurement itself doubtful: it holds the lot whatever
//! the counts say. Otherwise a rejection outweighs a hold, and a lot is accepted only if nothing
//! speaks against it.

use super::conditions::{self, ConditionSection, some_parts};
use super::explain::{Decided, Step, explain};
use super::rules::{self, Findings, Judged};
use super::{ClassSection, LotVerdict::*, Plan, Sampling, Statistics, sampling};
use super::{History, Lot, statistics};
use crate::diagnostic::Note;
use crate::judgement::{AGEING_UNKNOWN, PartRecord, PartVerdict};
use crate::limits::Limits;
use crate::station::Station;
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};
use std::collections::BTreeMap;

/// Verdict on a lot.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
#[allow(missing_docs)]
pub enum LotVerdict {
    Accept,
    Reject,
    Hold,
}

impl LotVerdict {
    /// As the record spells it.
    pub fn name(self) -> &'static str {
        match self {
            Accept => "accept",
            Reject => "reject",
            Hold => "hold",
        }
    }
}

/// Reasons that make the files doubtful which a lot is judged by.
pub const NOT_APPROVED: [&str; 3] = [
    "site_not_approved",
    "limits_not_approved",
    "station_not_approved",
];

/// What a lot comes to.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct LotJudgement {
    pub verdict: LotVerdict,
    /// Why, most important first; never empty.
    pub reasons: Vec<Note>,
    pub warnings: Vec<Note>,
    pub sampling: Sampling,
    pub statistics: IndexMap<String, Statistics>,
    pub findings: Findings,
    pub conditions: Vec<ConditionSection>,
    /// The chain from numbers to verdict.
    pub explanation: Vec<Step>,
}

/// Judges a lot from its parts, in sample order.
///
/// `further` are reasons found on the way here that hold the lot (a retest that the limit file
/// does not allow, files that are not approved). `history` is what the lot rules compare with; the plan has the switching rules
/// behind it.
pub fn judge(
    lot: &Lot,
    limits: &Limits,
    station: &Station,
    plan: &Plan,
    parts: &[PartRecord],
    further: Vec<Note>,
    history: &History,
) -> LotJudgement {
    let checked = conditions::check(lot, limits, station, parts);
    let (sections, unmet): (Vec<_>, Vec<_>) =
        checked.into_iter().map(|c| (c.section, c.reason)).unzip();
    let (unapproved, further): (Vec<Note>, Vec<Note>) = further
        .into_iter()
        .partition(|note| NOT_APPROVED.contains(&note.code.as_str()));
    let mut unmet: Vec<Note> = unmet.into_iter().flatten().collect();
    // Counts by limits that nobody answers for neither accept nor reject.
    unmet.splice(0..0, unapproved);
    let sampling = sampling::count(plan, limits, parts);
    let statistics = statistics(limits, station, parts);
    let rejections = over_ac(&sampling);
    let mut holds = undecided(&sampling, parts);
    holds.extend(short_sample(lot, &sampling));
    holds.extend(unmeasured(parts));
    holds.extend(beyond(&sampling));
    holds.extend(duplicates(parts));
    holds.extend(further);
    holds.extend(discontinued(&sampling));
    let ruled = rules::evaluate(&Judged {
        lot: &lot.lot,
        history,
        limits,
        station,
        parts,
        statistics: &statistics,
    });
    holds.extend(ruled.holds);
    let verdict = if !unmet.is_empty() {
        Hold
    } else if !rejections.is_empty() {
        Reject
    } else if !holds.is_empty() {
        Hold
    } else {
        Accept
    };
    let mut reasons: Vec<Note> = unmet.into_iter().chain(rejections).chain(holds).collect();
    if verdict == Accept {
        reasons.push(Note::new(
            "accepted_by_plan",
            format!("{}, and nothing speaks against the lot", counts(&sampling)),
        ));
    }
    let explanation = explain(&Decided {
        limits,
        plan,
        sampling: &sampling,
        rules: ruled.steps,
        conditions: &sections,
        reasons: reasons.iter().map(|reason| reason.code.clone()).collect(),
        verdict,
    });
    let mut warnings = warnings(limits, station, &sampling);
    warnings.extend(ruled.warnings);
    LotJudgement {
        verdict,
        explanation,
        reasons,
        warnings,
        findings: ruled.findings,
        sampling,
        statistics,
        conditions: sections,
    }
}

/// `class A: 1 nonconforming of 200, Ac 3, Re 4; class B: …`
fn counts(sampling: &Sampling) -> String {
    let each: Vec<String> = sampling
        .classes
        .iter()
        .map(|(name, c)| {
            let class = class_words(name);
            if c.by_variables {
                format!("{class}: {}", by_variables(c))
            } else {
                format!(
                    "{class}: {} nonconforming of {}, Ac {}, Re {}",
                    c.nonconforming, c.n, c.ac, c.re
                )
            }
        })
        .collect();
    each.join("; ")
}

/// Each characteristic of a class by variables, in words.
fn by_variables(class: &ClassSection) -> String {
    let each: Vec<String> = class
        .variables
        .iter()
        .map(|s| format!("{}: {}", s.key, s.why))
        .collect();
    format!("{} parts by variables, {}", class.n, each.join(", "))
}

fn class_words(name: &str) -> String {
    if name == "all" {
        "all characteristics".to_owned()
    } else {
        format!("class {name}")
    }
}

fn over_ac(sampling: &Sampling) -> Vec<Note> {
    sampling
        .classes
        .iter()
        .filter(|(_, c)| c.verdict == Reject)
        .map(|(name, c)| {
            if c.by_variables {
                let text = format!("{}: {}: do not release the reel", class_words(name), by_variables(c));
                return Note::new("variables_not_met", text);
            }
            Note::new(
                "nonconforming_over_ac",
                format!(
                    "{}: {} nonconforming of {}, the plan rejects from {} (Ac {}): do not release the reel",
                    class_words(name),
                    c.nonconforming,
                    c.n,
                    c.re,
                    c.ac
                ),
            )
        })
        .collect()
}

fn undecided(sampling: &Sampling, parts: &[PartRecord]) -> Vec<Note> {
    let names: Vec<&str> = parts
        .iter()
        .filter(|p| p.verdict == PartVerdict::Undecided)
        .map(|p| p.part.as_str())
        .collect();
    sampling
        .classes
        .iter()
        .filter(|(_, c)| c.verdict == Hold)
        .map(|(name, c)| {
            if c.by_variables {
                let text = format!("{}: {}: a quality engineer decides", class_words(name), by_variables(c));
                return Note::new("variables_not_decided", text);
            }
            Note::new(
                "undecided_parts",
                format!(
                    "{}: {} nonconforming and {} undecided of {}, Ac {}: within the measurement uncertainty of a limit the plan can be met \
                     or not; a quality engineer decides ({})",
                    class_words(name),
                    c.nonconforming,
                    c.undecided,
                    c.n,
                    c.ac,
                    some_parts(&names)
                ),
            )
        })
        .collect()
}

fn short_sample(lot: &Lot, sampling: &Sampling) -> Vec<Note> {
    let mut notes = Vec::new();
    if sampling.presented < sampling.required {
        notes.push(Note::new(
            "sample_too_small",
            format!(
                "the plan demands {} parts, {} have a sweep: measure {} more",
                sampling.required,
                sampling.presented,
                sampling.required - sampling.presented
            ),
        ));
    }
    if sampling.presented > lot.quantity {
        notes.push(Note::new(
            "more_parts_than_lot",
            format!(
                "{} parts have a sweep, the lot holds {}: check `quantity` and the sweep files",
                sampling.presented, lot.quantity
            ),
        ));
    }
    notes
}

/// One reason for each cause, so that an operator sees what to do for which parts. A capacitance that
/// could not be referred is a condition's matter: seating the part anew would not help.
fn unmeasured(parts: &[PartRecord]) -> Vec<Note> {
    let by_ageing_alone = |p: &&PartRecord| {
        let mut others = p
            .readings
            .values()
            .filter(|r| r.verdict == PartVerdict::Unmeasured);
        p.faults.is_empty() && others.all(|r| r.warnings.iter().any(|w| w.code == AGEING_UNKNOWN))
    };
    let all: Vec<&PartRecord> = parts
        .iter()
        .filter(|p| p.verdict == PartVerdict::Unmeasured)
        .filter(|p| !by_ageing_alone(p))
        .collect();
    if all.is_empty() {
        return Vec::new();
    }
    let mut by_cause: BTreeMap<&str, Vec<&str>> = BTreeMap::new();
    for part in &all {
        let cause = part
            .faults
            .first()
            .or_else(|| part.warnings.first())
            .map_or("no_reading", |n| n.code.as_str());
        by_cause.entry(cause).or_default().push(&part.part);
    }
    let causes: Vec<String> = by_cause
        .iter()
        .map(|(cause, names)| format!("{}: {}", cause.replace('_', " "), some_parts(names)))
        .collect();
    vec![Note::new(
        "unmeasured_parts",
        format!(
            "{} of {} parts could not be measured ({}): reseat and measure them again",
            all.len(),
            parts.len(),
            causes.join("; ")
        ),
    )]
}

fn beyond(sampling: &Sampling) -> Vec<Note> {
    let n = sampling.nonconforming_beyond_sample;
    (n > 0)
        .then(|| {
            Note::new(
                "nonconforming_beyond_sample",
                format!("{n} nonconforming beyond the sample of {}: the plan does not count them, a quality engineer must", sampling.required),
            )
        })
        .into_iter()
        .collect()
}

/// Until the supplier has acted, no lot is accepted.
fn discontinued(sampling: &Sampling) -> Vec<Note> {
    let classes = sampling.switching.iter().flat_map(|s| &s.classes);
    classes
        .filter(|(_, state)| state.discontinued)
        .map(|(class, state)| {
            Note::new(
                "inspection_discontinued",
                format!(
                    "{}: acceptance inspection is discontinued until the supplier has acted ({}): a quality engineer decides",
                    class_words(class),
                    state.why
                ),
            )
        })
        .collect()
}

/// The bytes of one sweep file cannot be the measurement of two parts.
fn duplicates(parts: &[PartRecord]) -> Vec<Note> {
    let mut files: BTreeMap<&str, Vec<(&str, &str)>> = BTreeMap::new();
    for part in parts {
        for attempt in &part.attempts {
            files
                .entry(&attempt.sha256)
                .or_default()
                .push((&part.part, &attempt.file));
        }
    }
    files
        .values()
        .filter(|uses| uses.iter().any(|(_, file)| *file != uses[0].1))
        .map(|uses| {
            let names: Vec<&str> = uses.iter().map(|(_, file)| *file).collect();
            Note::new(
                "duplicate_sweep",
                format!(
                    "the same sweep was saved as {}: measure these parts again, each by itself",
                    names.join(", ")
                ),
            )
        })
        .collect()
}

fn warnings(limits: &Limits, station: &Station, sampling: &Sampling) -> Vec<Note> {
    let mut notes = Vec::new();
    for (name, class) in &sampling.classes {
        if let Some(why) = &class.no_variables {
            let text = format!(
                "{}: judged by attributes instead: no plan by variables ({why})",
                class_words(name)
            );
            notes.push(Note::new("judged_by_attributes", text));
        }
        if !class.by_variables && !class.variables.is_empty() {
            let text = format!(
                "{}: judged by attributes instead: {}",
                class_words(name),
                by_variables(class)
            );
            notes.push(Note::new("judged_by_attributes", text));
        }
        if class.by_variables && class.nonconforming > 0 {
            let text = format!(
                "{}: {} nonconforming in the sample; sampling by variables judges the lot, take these parts out of it (ISO 3951-1)",
                class_words(name),
                class.nonconforming
            );
            notes.push(Note::new("nonconforming_in_sample", text));
        }
    }
    if station.instrument.as_ref().and_then(|i| i.due).is_none() {
        notes.push(Note::new(
            "calibration_not_stated",
            "the station file states no calibration due date",
        ));
    }
    if station.jig.as_ref().and_then(|j| j.valid_for).is_none() {
        notes.push(Note::new(
            "jig_check_not_stated",
            "the station file states no jig check",
        ));
    }
    if limits.conditions.drive.is_none() {
        notes.push(Note::new(
            "drive_not_demanded",
            "the limit file demands no drive level; class 2 capacitance depends on it",
        ));
    }
    notes
}
