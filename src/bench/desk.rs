//! Judging one sweep as it comes: what the part is, and whether the jig is good.
//!
//! The verdict is the one that the record will have, made by the same functions; the record is made anew at the
//! end from all files, and only that counts.

use super::event::{CheckKind, Question};
use crate::judgement::{JudgedTry, PartVerdict, judge_try};
use crate::limits::{Limits, Window};
use crate::quantity::{engineering, shortest};
use crate::readings::{Budget, Characteristic, Place, Reader, Request};
use crate::station::{Method, Station};
use crate::sweep::{self, Attempt, RawFile, Standards, Sweep, validity};
use std::collections::VecDeque;

/// So many of the last sweeps say how long a whole one is.
const RECENT: usize = 8;

/// What the verdicts of a run are made with.
#[derive(Debug)]
pub struct Desk {
    #[allow(missing_docs)]
    pub limits: Limits,
    #[allow(missing_docs)]
    pub station: Station,
    standards: Option<Standards>,
    budget: Budget,
    recent: VecDeque<Attempt>,
}

/// What came of one sweep.
#[derive(Debug, Clone)]
#[allow(missing_docs)]
pub struct Told {
    pub part: String,
    pub attempt: u32,
    pub judged: JudgedTry,
    /// Where there is a sweep of a capacitor.
    pub sweep: Option<Sweep>,
}

impl Desk {
    #[allow(missing_docs)]
    pub fn new(limits: Limits, station: Station, standards: Option<Standards>) -> Desk {
        Desk {
            budget: Budget::of(&station),
            limits,
            station,
            standards,
            recent: VecDeque::new(),
        }
    }

    /// Judges the sweep of a try; `age` is the hours since last heat, where known.
    ///
    /// # Errors
    /// In words: a file that is not the sweep of one part alone.
    pub fn judge(
        &mut self,
        file: &RawFile,
        (part, attempt): (&str, u32),
        age: Option<f64>,
    ) -> Result<Told, String> {
        let mut found = sweep::read_file(file, &self.station, self.standards.as_ref());
        let one = match (found.pop(), found.is_empty()) {
            (Some(one), true) => one,
            _ => return Err("the file holds several parts; save one file a part".to_owned()),
        };
        if (one.part.as_str(), one.attempt) != (part, attempt) {
            return Err(format!(
                "the file says of itself that it is part {}; save it without a part column",
                crate::diagnostic::excerpt(&one.part)
            ));
        }
        let mut window: Vec<Attempt> = self.recent.iter().cloned().collect();
        self.recent.push_back(one.clone());
        if self.recent.len() > RECENT {
            self.recent.pop_front();
        }
        window.push(one);
        validity::complete(&mut window);
        if let Some(nominal) = nominal(&self.limits) {
            validity::expect_capacitance(&mut window, nominal);
        }
        let Some(one) = window.pop() else {
            return Err("the file holds no sweep".to_owned());
        };
        let judged = judge_try(&one, &self.limits, &self.budget, age);
        Ok(Told {
            part: part.to_owned(),
            attempt,
            judged,
            sweep: one.sweep.ok(),
        })
    }

    /// Measures the jig against the station file: whether it is good, and what was found.
    pub fn check(&self, kind: CheckKind, file: &RawFile) -> (bool, String) {
        let Some(demanded) = &self.station.jig_check else {
            return (false, "the station file demands no check.".to_owned());
        };
        match kind {
            CheckKind::Open | CheckKind::Short => {
                let standing = match kind {
                    CheckKind::Open => &demanded.open,
                    _ => &demanded.short,
                };
                let Some(standing) = standing else {
                    return (false, "the station file demands no such check.".to_owned());
                };
                self.standing(kind, file, standing.at, standing.impedance)
            }
            CheckKind::Reference => self.reference(file),
        }
    }

    /// |Z| of the jig itself at a frequency, without compensation, which would make it ideal.
    fn standing(&self, kind: CheckKind, file: &RawFile, at: f64, limit: f64) -> (bool, String) {
        let sweep = match sweep::read_standard(file, &self.station) {
            Ok(sweep) => sweep,
            Err(notes) => return (false, words(&notes)),
        };
        let ohm = |z: f64| engineering(z, "Ω", 3);
        let Some(z) = magnitude_at(&sweep, at) else {
            return (
                false,
                format!("the sweep does not reach {}.", shortest(at, "Hz")),
            );
        };
        let (good, sign) = match kind {
            CheckKind::Open => (z >= limit, "at least"),
            _ => (z <= limit, "at most"),
        };
        let text = format!(
            "|Z| at {} is {}, {sign} {} is demanded.",
            shortest(at, "Hz"),
            ohm(z),
            shortest(limit, "Ω")
        );
        (good, text)
    }

    fn reference(&self, file: &RawFile) -> (bool, String) {
        let Some(part) = self
            .station
            .jig_check
            .as_ref()
            .and_then(|c| c.reference_part.as_ref())
        else {
            return (
                false,
                "the station file names no reference part.".to_owned(),
            );
        };
        let mut found = sweep::read_file(file, &self.station, self.standards.as_ref());
        let sweep = match found.pop().map(|one| one.sweep) {
            Some(Ok(sweep)) => sweep,
            Some(Err(notes)) => return (false, words(&notes)),
            None => return (false, "the file holds no sweep.".to_owned()),
        };
        let reader = Reader::new(&sweep, &self.budget);
        let mut good = true;
        let mut texts = Vec::new();
        for known in &part.characteristics {
            let characteristic = Characteristic::ALL
                .into_iter()
                .find(|c| c.name() == known.characteristic);
            let Some(characteristic) = characteristic else {
                continue;
            };
            let request = Request {
                characteristic,
                place: known.at.map_or(Place::Anywhere, Place::At),
                equivalent: self.limits.conditions.equivalent,
            };
            let value = reader.read(&request).lowest.known_value();
            let unit = characteristic.unit();
            let inside = value.is_some_and(|v| (known.lower..=known.upper).contains(&v));
            good &= inside;
            let at = known
                .at
                .map_or(String::new(), |f| format!(" at {}", shortest(f, "Hz")));
            texts.push(format!(
                "{}{at} {} ({} to {}){}",
                characteristic.title(),
                value.map_or("not to be had".to_owned(), |v| engineering(v, unit, 4)),
                engineering(known.lower, unit, 4),
                engineering(known.upper, unit, 4),
                if inside { "" } else { " OUTSIDE" },
            ));
        }
        (good, format!("{}.", texts.join("; ")))
    }

    /// What the limit file demands to be asked, where the sweeps do not show it.
    pub fn questions(&self) -> Vec<Question> {
        let conditions = &self.limits.conditions;
        let shown = self.station.method == Method::SeriesReference;
        [
            (conditions.temperature.is_some(), Question::Temperature),
            (conditions.drive.is_some() && !shown, Question::Drive),
            (conditions.ageing.is_some(), Question::LastHeat),
        ]
        .into_iter()
        .filter_map(|(asked, question)| asked.then_some(question))
        .collect()
    }

    /// The window that an answer should lie in.
    pub fn window(&self, question: Question) -> Option<(Window, &'static str)> {
        match question {
            Question::Temperature => self.limits.conditions.temperature.map(|w| (w, "°C")),
            Question::Drive => self.limits.conditions.drive.map(|w| (w, "V")),
            Question::LastHeat => None,
        }
    }

    /// What a check of the jig consists of.
    pub fn checks(&self) -> Vec<CheckKind> {
        let Some(check) = &self.station.jig_check else {
            return Vec::new();
        };
        [
            (check.open.is_some(), CheckKind::Open),
            (check.short.is_some(), CheckKind::Short),
            (check.reference_part.is_some(), CheckKind::Reference),
        ]
        .into_iter()
        .filter_map(|(there, kind)| there.then_some(kind))
        .collect()
    }

    /// The asset number of the reference part.
    pub fn reference_asset(&self) -> &str {
        let check = self.station.jig_check.as_ref();
        check
            .and_then(|c| c.reference_part.as_ref())
            .map_or("", |p| p.asset.as_str())
    }
}

impl Told {
    #[allow(missing_docs)]
    pub fn verdict(&self) -> PartVerdict {
        self.judged.verdict
    }
}

fn words(notes: &[crate::diagnostic::Note]) -> String {
    let all: Vec<&str> = notes.iter().map(|n| n.text.as_str()).collect();
    format!("{}.", all.join("; "))
}

fn nominal(limits: &Limits) -> Option<f64> {
    limits
        .bounds
        .iter()
        .filter(|b| b.characteristic == Characteristic::Capacitance)
        .find_map(|b| b.nominal)
}

/// |Z| by straight line between logarithms; `None` outside the sweep.
fn magnitude_at(sweep: &Sweep, at: f64) -> Option<f64> {
    let list = &sweep.frequency;
    let (first, last) = (*list.first()?, *list.last()?);
    if at < first * (1.0 - 1e-6) || at > last * (1.0 + 1e-6) {
        return None;
    }
    let i = list.partition_point(|f| *f < at).clamp(1, list.len() - 1);
    let (f0, f1) = (list[i - 1], list[i]);
    let share = ((at / f0).ln() / (f1 / f0).ln()).clamp(0.0, 1.0);
    let z = |i: usize| sweep.impedance[i].norm().max(f64::MIN_POSITIVE).ln();
    Some((z(i - 1) + share * (z(i) - z(i - 1))).exp())
}
