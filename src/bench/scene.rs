//! What there is to see at one moment, and how it reads as text.

use super::Message;
use super::desk::{Desk, Told};
use super::event::{CheckKind, Question};
use super::run::{Run, Step};
use super::words;
use crate::diagnostic::printable;
use crate::limits::Limits;
use crate::lot::{Plan, Switching};
use crate::quantity::{NO_VALUE, engineering, shortest, with_uncertainty};
use crate::readings::Characteristic;
use crate::record::{BoundSection, LotRecord, ReadingRecord};
use crate::station::{Method, Station};

/// A line of a plan: heading and text.
pub type Row = (&'static str, String);

/// The plan of a lot before it is begun.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct PlanText {
    pub title: String,
    pub rows: Vec<Row>,
    pub cautions: Vec<String>,
    /// What would hold the lot as things stand.
    pub foreseen: Vec<String>,
}

/// How a lot ended.
#[derive(Debug, Clone)]
#[allow(missing_docs)]
pub struct Ending {
    pub record: LotRecord,
    pub certificate: String,
    pub tag: String,
    pub tag_path: String,
}

/// What the screen is about.
#[derive(Clone, Copy)]
#[allow(missing_docs)]
pub enum Page<'a> {
    /// The scan, with what is understood so far.
    Scan(&'a [(&'static str, String)]),
    Plan(&'a PlanText),
    Work {
        run: &'a Run,
        desk: &'a Desk,
        positions: &'a [u64],
        told: Option<&'a Told>,
    },
    End(&'a Ending),
}

/// One moment.
#[derive(Clone, Copy)]
#[allow(missing_docs)]
pub struct Scene<'a> {
    pub page: Page<'a>,
    /// What the operator is to do.
    pub prompt: &'a str,
    /// Said since the last line was typed.
    pub said: &'a [Message],
    /// How many messages of the same run were said before these.
    pub said_before: usize,
    /// What the source is doing.
    pub activity: &'a str,
    /// Where the sweeps come from.
    pub source: &'a str,
}

/// The plan in words.
pub fn plan_text(
    (limits, path): (&Limits, &str),
    plan: &Plan,
    switching: Option<&Switching>,
    station: &Station,
    (lot, quantity, seed): (&str, u64, u64),
    foreseen: Vec<String>,
) -> PlanText {
    let mut rows: Vec<Row> = Vec::new();
    let about = limits
        .description
        .as_ref()
        .map_or(String::new(), |d| format!(": {d}"));
    rows.push(("Part", format!("{}{about}", limits.part)));
    rows.push((
        "Limit file",
        format!("revision {}, {path}", limits.revision),
    ));
    rows.push(("Sample", words::sample(plan.required(), quantity, seed)));
    let classes: Vec<String> = plan
        .classes
        .iter()
        .map(|(name, c)| match c.variables {
            Some(v) => format!("class {name}: n {}, by variables, k {:.3}", v.n, v.k),
            None => format!("class {name}: n {}, Ac {}, Re {}", c.n, c.ac, c.re),
        })
        .collect();
    rows.push(("Plan", classes.join("; ")));
    if let Some(severity) = plan.severity {
        let why = switching.and_then(|s| {
            let of = |(_, state): (&String, &crate::lot::ClassState)| {
                (state.severity == severity.to_string()).then(|| state.why.clone())
            };
            s.classes.iter().find_map(of)
        });
        let why = why.map_or(String::new(), |w| format!(": {w}"));
        rows.push(("Inspection", format!("{severity}{why}")));
    }
    rows.push(("Station", station_words(station)));
    let conditions = conditions(limits);
    if !conditions.is_empty() {
        rows.push(("Settings", conditions));
    }
    if let Some(check) = &station.jig_check {
        rows.push(("Jig check", check_words(check)));
    }
    PlanText {
        title: format!("lot {lot}, {quantity} parts"),
        rows,
        cautions: super::cautions::cautions(limits),
        foreseen,
    }
}

fn station_words(station: &Station) -> String {
    let method = match station.method {
        Method::Direct => "direct",
        Method::SeriesReference => "two channels across a series reference",
        Method::ShuntThrough => "shunt-through",
        Method::SeriesThrough => "series-through",
        Method::Reflection => "reflection",
    };
    let mut words = format!("{}, {method}", station.name);
    if let Some(instrument) = &station.instrument {
        words += &format!(", instrument {}", instrument.asset);
    }
    if let Some(jig) = &station.jig {
        words += &format!(", jig {}", jig.asset);
    }
    words
}

fn conditions(limits: &Limits) -> String {
    let c = &limits.conditions;
    let mut all = Vec::new();
    if let Some(drive) = c.drive {
        all.push(format!("drive {}", drive.words("V")));
    }
    if let Some(temperature) = c.temperature {
        all.push(format!("ambient {}", temperature.words("°C")));
    }
    let mut at: Vec<f64> = limits
        .bounds
        .iter()
        .flat_map(|b| match b.place {
            crate::readings::Place::At(f) => vec![f],
            crate::readings::Place::Between(f, g) => vec![f, g],
            crate::readings::Place::Anywhere if b.characteristic == Characteristic::Srf => {
                b.lower.into_iter().chain(b.upper).collect()
            }
            crate::readings::Place::Anywhere => vec![],
        })
        .collect();
    at.sort_by(f64::total_cmp);
    if let (Some(first), Some(last)) = (at.first(), at.last()) {
        let (first, last) = (shortest(*first, "Hz"), shortest(*last, "Hz"));
        all.push(if first == last {
            format!("sweep across {first}")
        } else {
            format!("sweep {first} to {last} at least")
        });
    }
    all.join("; ")
}

fn check_words(check: &crate::station::JigCheck) -> String {
    let mut what = Vec::new();
    if check.open.is_some() {
        what.push("open".to_owned());
    }
    if check.short.is_some() {
        what.push("short".to_owned());
    }
    if let Some(part) = &check.reference_part {
        what.push(format!("reference part {}", part.asset));
    }
    let every = check
        .every
        .map_or(String::new(), |n| format!(", every {n} parts"));
    format!(
        "{}: before the lot{every} and after the last part",
        what.join(", ")
    )
}

/// What the operator is to do now.
pub fn prompt(run: &Run, desk: &Desk, positions: &[u64], hands_free: bool) -> String {
    let how = if hands_free {
        words::WAITING
    } else {
        words::ENTER_MEASURES
    };
    match run.step() {
        Step::Ask(question) => {
            let demanded = match question {
                Question::LastHeat => String::new(),
                q => desk
                    .window(q)
                    .map_or(String::new(), |(w, unit)| w.words(unit)),
            };
            words::question(question, &demanded)
        }
        Step::Check { kind, reason, .. } => {
            let asset = if kind == CheckKind::Reference {
                desk.reference_asset()
            } else {
                ""
            };
            format!("{} [{how}]", words::place_check(kind, reason, asset))
        }
        Step::Measure {
            index,
            part,
            attempt,
        } => {
            let text = if attempt > 1 && run.counting(&part).is_some() {
                words::reseat(&part, attempt)
            } else {
                let position = positions.get(index as usize).copied().unwrap_or(index + 1);
                words::place_part(
                    &part,
                    run.parts,
                    &words::place(position, run.began.quantity),
                )
            };
            format!("{text} [{how}]")
        }
        Step::Complete => format!("{}. {}", words::COMPLETE, words::ENTER_JUDGES),
        Step::Closing => words::JUDGING.to_owned(),
        Step::Ended => words::NEXT_LOT.to_owned(),
    }
}

/// One reading in columns: mark, name, value, limits.
pub fn reading_row(bound: &BoundSection, reading: &ReadingRecord) -> [String; 4] {
    let value = match (reading.value, reading.above, reading.below) {
        (Some(v), ..) => reading
            .standard_uncertainty
            .filter(|u| *u > 0.0)
            .map_or_else(
                || engineering(v, &bound.unit, 4),
                |u| with_uncertainty(v, u, &bound.unit),
            ),
        (None, Some(above), _) => format!("> {}", engineering(above, &bound.unit, 3)),
        (None, None, Some(below)) => format!("< {}", engineering(below, &bound.unit, 3)),
        (None, None, None) => NO_VALUE.to_owned(),
    };
    [
        words::mark(reading.verdict).to_owned(),
        printable(&bound.name),
        value,
        limits_words(bound),
    ]
}

/// `4.23 to 5.17 µF`, `at most 6 mΩ`.
fn limits_words(bound: &BoundSection) -> String {
    let text = |v: f64| engineering(v, &bound.unit, 3);
    match (bound.lower, bound.upper) {
        (Some(l), Some(u)) => format!("{} to {}", text(l), text(u)),
        (Some(l), None) => format!("at least {}", text(l)),
        (None, Some(u)) => format!("at most {}", text(u)),
        (None, None) => String::new(),
    }
}

/// The readings of a try in the order of the limit file.
pub fn reading_rows(limits: &Limits, told: &Told) -> Vec<[String; 4]> {
    let bounds = limits.bounds.iter().map(BoundSection::of);
    bounds
        .filter_map(|bound| {
            let reading = told.judged.readings.get(&bound.key)?;
            Some(reading_row(&bound, reading))
        })
        .collect()
}
