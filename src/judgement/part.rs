//! One part from its tries: which try counts, its verdict, its readings.

use super::tries::{TryOutcome, nothing_left, standing};
use super::{PartVerdict, ReadingRecord, judge_reading};
use crate::diagnostic::Note;
use crate::limits::{Bound, Limits, Retest, Window};
use crate::quantity::engineering;
use crate::readings::{
    self, Budget, Characteristic, Extremes, Place, Reader, Reading, Referral, Request,
    SeriesCircuit,
};
use crate::sweep::{Attempt, Sweep};
use indexmap::IndexMap;
use serde::{Deserialize, Serialize};

/// Code of a capacitance that cannot be referred, and of the reason that holds the lot.
pub(crate) const AGEING_UNKNOWN: &str = "ageing_unknown";

/// One part.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct PartRecord {
    pub part: String,
    pub verdict: PartVerdict,
    /// Of the most serious nonconformity, where nonconforming (ISO 2859-1: an item with a class A
    /// nonconformity is a class A nonconforming item, whatever else it has). Of the most serious
    /// undecided characteristic, where undecided.
    pub class: Option<String>,
    /// V rms across the part at the test frequency, where the sweep carries it.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub drive: Option<f64>,
    /// Where the sweep holds it: what a shift common to the whole lot is looked for in.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub series: Option<SeriesCircuit>,
    /// Every try in order; the part's verdict and readings are of the try marked `counts`.
    pub attempts: Vec<AttemptRecord>,
    pub readings: IndexMap<String, ReadingRecord>,
    pub faults: Vec<Note>,
    pub warnings: Vec<Note>,
}

/// One try at a part.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct AttemptRecord {
    pub attempt: u32,
    pub file: String,
    pub sha256: String,
    pub verdict: PartVerdict,
    pub counts: bool,
    /// Why it was set aside, so that it never counts: `misplaced`, `jig_check`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub set_aside: Option<String>,
    /// What was found out on reading the file.
    pub notes: Vec<Note>,
    pub faults: Vec<Note>,
}

/// A try and what came of it.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct JudgedTry {
    pub verdict: PartVerdict,
    pub drive: Option<f64>,
    pub series: Option<SeriesCircuit>,
    pub class: Option<String>,
    pub readings: IndexMap<String, ReadingRecord>,
    pub faults: Vec<Note>,
    pub warnings: Vec<Note>,
}

/// Judges one sweep against every bound.
///
/// `age` is the hours since last heat, where known; without it a capacitance that the limit file
/// wants referred is not judged.
pub fn judge_try(
    attempt: &Attempt,
    limits: &Limits,
    budget: &Budget,
    age: Option<f64>,
) -> JudgedTry {
    let sweep = match &attempt.sweep {
        Ok(sweep) => sweep,
        Err(faults) => {
            return JudgedTry {
                verdict: PartVerdict::Unmeasured,
                drive: None,
                series: None,
                class: None,
                readings: IndexMap::new(),
                faults: faults.clone(),
                warnings: Vec::new(),
            };
        }
    };
    let drive = drive_of(sweep, limits);
    let faults: Vec<Note> = drive
        .and_then(|drive| drive_fault(drive, limits))
        .into_iter()
        .collect();
    let of_part = budget
        .clone()
        .with_temperature_coefficients(&limits.conditions.temperature_coefficients);
    let reader = Reader::new(sweep, &of_part);
    let mut readings = IndexMap::new();
    for bound in &limits.bounds {
        let request = Request {
            characteristic: bound.characteristic,
            place: bound.place,
            equivalent: limits.conditions.equivalent,
        };
        let mut extremes = reader.read(&request);
        let mut measured = None;
        if bound.characteristic == Characteristic::Capacitance {
            (extremes, measured) = referred(extremes, limits, age);
        }
        let mut record = judge_reading(&extremes, bound, &limits.decision_rule);
        record.as_measured = measured;
        if !faults.is_empty() {
            record.verdict = PartVerdict::Unmeasured;
        }
        readings.insert(bound.key.clone(), record);
    }
    let series = capacitance_request(limits).and_then(|request| reader.series(&request));
    let verdict = PartVerdict::of_all(readings.values().map(|r| r.verdict));
    let class = limits
        .bounds
        .iter()
        .filter(|b| {
            matches!(verdict, PartVerdict::Nonconforming | PartVerdict::Undecided)
                && readings[&b.key].verdict == verdict
        })
        .map(|b| b.class.clone())
        .min();
    let warnings = readings
        .iter()
        .flat_map(|(key, r): (&String, &ReadingRecord)| {
            r.warnings
                .iter()
                .filter(|w| w.code != "referred_to_referee_time")
                .map(move |w| Note::new(&w.code, format!("{key}: {}", w.text)))
        })
        .collect();
    JudgedTry {
        verdict,
        drive,
        series,
        class,
        readings,
        faults,
        warnings,
    }
}

/// The capacitance that the limit file bounds first.
fn capacitance_request(limits: &Limits) -> Option<Request> {
    let of_capacitance = |b: &&Bound| b.characteristic == Characteristic::Capacitance;
    limits
        .bounds
        .iter()
        .find(of_capacitance)
        .map(|bound| Request {
            characteristic: bound.characteristic,
            place: bound.place,
            equivalent: limits.conditions.equivalent,
        })
}

/// The capacitance at the referee time, and the value as measured beside it. Where the limit file
/// demands it and it cannot be had there is no value to judge.
fn referred(extremes: Extremes, limits: &Limits, age: Option<f64>) -> (Extremes, Option<f64>) {
    let Some(ageing) = limits.conditions.ageing else {
        return (extremes, None);
    };
    let one = |reading: Reading| Extremes {
        lowest: reading.clone(),
        highest: reading,
    };
    let refer = |age| {
        let referral = Referral {
            per_decade: ageing.per_decade,
            age,
            refer_to: ageing.refer_to / 3600.0,
        };
        readings::refer(&extremes.lowest, &referral).ok()
    };
    match age.and_then(refer) {
        Some((reading, measured)) => (one(reading), measured),
        None => {
            let text = "the time since last heat is not known, or outside the law of ageing: there is no value at the referee time";
            let measured = extremes.lowest.known_value();
            (one(Reading::missing(AGEING_UNKNOWN, text)), measured)
        }
    }
}

/// The frequency at which the drive is looked at: that of the first capacitance bound, or else of
/// the first bound that has one.
fn drive_frequency(limits: &Limits) -> Option<f64> {
    let at = |b: &Bound| match b.place {
        Place::At(f) => Some(f),
        _ => None,
    };
    limits
        .bounds
        .iter()
        .find(|b| b.characteristic == Characteristic::Capacitance)
        .and_then(at)
        .or_else(|| limits.bounds.iter().find_map(at))
}

/// The true voltage across the part at the test frequency, where the sweep carries it: V rms.
fn drive_of(sweep: &Sweep, limits: &Limits) -> Option<f64> {
    let level = sweep.level.as_ref()?;
    let frequency = drive_frequency(limits)?;
    let i = sweep
        .frequency
        .partition_point(|f| *f < frequency)
        .clamp(1, sweep.frequency.len() - 1);
    let (f0, f1) = (sweep.frequency[i - 1], sweep.frequency[i]);
    let share = ((frequency / f0).ln() / (f1 / f0).ln()).clamp(0.0, 1.0);
    Some(level[i - 1] + share * (level[i] - level[i - 1]))
}

fn drive_fault(drive: f64, limits: &Limits) -> Option<Note> {
    let window: Window = limits.conditions.drive?;
    (!window.contains_nearly(drive)).then(|| {
        Note::new(
            "drive_out_of_range",
            format!(
                "the sweep shows {} across the part at the test frequency, {} demanded: set the drive and measure again",
                engineering(drive, "V", 3),
                window.words("V"),
            ),
        )
    })
}

/// Judges one part from its tries, in order of their number; of each, why it was set aside, if it was.
///
/// Which try counts is said by [`standing`]. A try that is not allowed is kept and answered with the reason
/// `retest_not_allowed`; one that was set aside as misplaced and had not come out conforming or unmeasured, with
/// `misplaced_not_conforming`.
pub fn judge_part(
    tries: &[(&Attempt, JudgedTry, Option<&str>)],
    retest: &Retest,
) -> (PartRecord, Vec<Note>) {
    let outcomes: Vec<TryOutcome> = tries
        .iter()
        .map(|(_, judged, set_aside)| TryOutcome {
            verdict: judged.verdict,
            set_aside: *set_aside,
        })
        .collect();
    let standing = standing(&outcomes, retest);
    let mut reasons = misplaced(tries);
    let counted = standing.counts.map(|index| &tries[index].1);
    if let (Some(refused), Some(counted)) = (standing.refused, counted) {
        let attempt = tries[refused].0;
        reasons.push(Note::new(
            "retest_not_allowed",
            format!(
                "part {}: try {} ({}) follows a try that came out {}; the limit file allows no such retest, so it does not count: \
                 a quality engineer decides",
                attempt.part,
                attempt.attempt,
                attempt.file,
                counted.verdict.name(),
            ),
        ));
    }
    let attempts = tries
        .iter()
        .enumerate()
        .map(|(index, (attempt, judged, set_aside))| AttemptRecord {
            attempt: attempt.attempt,
            file: attempt.file.clone(),
            sha256: attempt.sha256.clone(),
            verdict: judged.verdict,
            counts: standing.counts == Some(index),
            set_aside: set_aside.map(str::to_owned),
            notes: attempt.notes.clone(),
            faults: judged.faults.clone(),
        })
        .collect();
    let none = JudgedTry {
        verdict: PartVerdict::Unmeasured,
        drive: None,
        series: None,
        class: None,
        readings: IndexMap::new(),
        faults: vec![nothing_left()],
        warnings: Vec::new(),
    };
    let counted = counted.unwrap_or(&none);
    let record = PartRecord {
        part: tries
            .first()
            .map_or(String::new(), |(attempt, ..)| attempt.part.clone()),
        verdict: counted.verdict,
        drive: counted.drive,
        series: counted.series,
        class: counted.class.clone(),
        attempts,
        readings: counted.readings.clone(),
        faults: counted.faults.clone(),
        warnings: counted.warnings.clone(),
    };
    (record, reasons)
}

/// A person's word that the part lay wrong must not turn a nonconforming part into a conforming one unseen.
fn misplaced(tries: &[(&Attempt, JudgedTry, Option<&str>)]) -> Vec<Note> {
    let doubtful = |verdict| matches!(verdict, PartVerdict::Nonconforming | PartVerdict::Undecided);
    tries
        .iter()
        .filter(|(_, judged, aside)| *aside == Some("misplaced") && doubtful(judged.verdict))
        .map(|(attempt, judged, _)| {
            Note::new(
                "misplaced_not_conforming",
                format!(
                    "part {}: try {} ({}) came out {} and was then set aside as misplaced: a quality engineer decides",
                    attempt.part,
                    attempt.attempt,
                    attempt.file,
                    judged.verdict.name()
                ),
            )
        })
        .collect()
}
