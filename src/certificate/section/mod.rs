//! The sections of the document, one file each, in reading order.

pub(super) mod answer;
pub(super) mod curves;
pub(super) mod distributions;
pub(super) mod files;
pub(super) mod integrity;
pub(super) mod lots;
pub(super) mod order;
pub(super) mod parts;
pub(super) mod plan;
pub(super) mod populations;
pub(super) mod reasons;
pub(super) mod scatter;
pub(super) mod signatures;
pub(super) mod sources;
pub(super) mod station;
pub(super) mod statistics;

use super::canvas::Mark;
use super::figures::Scale;
use super::ink::{ACCEPT, Ink, NONCONFORMING, TEXT, UNDECIDED, UNMEASURED};
use crate::record::{BoundSection, LotRecord, LotVerdict, MixedSection, PartVerdict, Statistics};

/// One value of a characteristic.
#[derive(Debug, Clone, Copy)]
pub(super) struct Value<'a> {
    /// Index of the part in measuring order.
    pub order: usize,
    pub part: &'a str,
    /// SI.
    pub value: f64,
    pub verdict: PartVerdict,
}

/// One bounded characteristic with what the record holds about it.
#[derive(Debug, Clone)]
pub(super) struct Characteristic<'a> {
    pub bound: &'a BoundSection,
    pub scale: Scale,
    pub values: Vec<Value<'a>>,
    pub statistics: Option<&'a Statistics>,
    /// Two populations, where they were looked for and found at least possible.
    pub mixed: Option<&'a MixedSection>,
}

impl Characteristic<'_> {
    /// The limits and the nominal value that there are.
    pub fn marks(&self) -> Vec<f64> {
        [self.bound.lower, self.bound.nominal, self.bound.upper]
            .into_iter()
            .flatten()
            .collect()
    }

    /// Whether the test of Anderson and Darling was made and does not speak against a normal
    /// distribution.
    pub fn normal(&self) -> bool {
        self.statistics.is_some_and(|s| {
            s.normality_p_value.is_some() && s.warnings.iter().all(|w| w.code != "not_normal")
        })
    }

    /// Whether a part belongs to the second of two populations.
    pub fn in_second_group(&self, part: &str) -> bool {
        let second = self.mixed.and_then(|m| m.groups.get(1));
        second.is_some_and(|g| g.parts.iter().any(|p| p == part))
    }

    /// Name, with a number and its unit kept on one line.
    pub fn name(&self) -> String {
        let mut out = String::new();
        for c in self.bound.name.chars() {
            let digit = out.ends_with(|d: char| d.is_ascii_digit());
            out.push(if c == ' ' && digit { '\u{a0}' } else { c });
        }
        out
    }

    /// What a drawing of the values shows, for whoever cannot see it.
    pub fn in_words(&self) -> String {
        let unit = &self.scale.unit;
        let mut words = vec![format!("{}: {} values", self.bound.name, self.values.len())];
        if let Some((low, high)) = self.statistics.and_then(|s| Some((s.minimum?, s.maximum?))) {
            let (low, high) = (self.scale.figure(low), self.scale.figure(high));
            words.push(format!("from {low} to {high} {unit}"));
        }
        for (word, limit) in [("lower", self.bound.lower), ("upper", self.bound.upper)] {
            words.extend(limit.map(|l| format!("{word} limit {} {unit}", self.scale.exact(l))));
        }
        words.join(", ")
    }

    /// Name with unit: `capacitance at 1 kHz, µF`.
    pub fn title(&self) -> String {
        format!("{},\u{a0}{}", self.name(), self.scale.unit)
    }
}

/// The characteristics of a record in the order of its limit file.
pub(super) fn characteristics(record: &LotRecord) -> Vec<Characteristic<'_>> {
    record
        .limits
        .characteristics
        .iter()
        .map(|bound| Characteristic {
            bound,
            scale: Scale::of(record, bound),
            values: values(record, &bound.key),
            statistics: record.statistics.get(&bound.key),
            mixed: record
                .findings
                .mixed
                .iter()
                .find(|m| m.of == bound.key && m.groups.len() > 1),
        })
        .collect()
}

fn values<'a>(record: &'a LotRecord, key: &str) -> Vec<Value<'a>> {
    record
        .parts
        .iter()
        .enumerate()
        .filter_map(|(order, part)| {
            let reading = part.readings.get(key)?;
            if reading.verdict == PartVerdict::Unmeasured {
                return None;
            }
            let value = reading.value.filter(|v| v.is_finite())?;
            Some(Value {
                order,
                part: &part.part,
                value,
                verdict: reading.verdict,
            })
        })
        .collect()
}

pub(super) fn lot_word(verdict: LotVerdict) -> &'static str {
    match verdict {
        LotVerdict::Accept => "accept",
        LotVerdict::Reject => "reject",
        LotVerdict::Hold => "hold",
    }
}

pub(super) fn lot_mark(verdict: LotVerdict) -> Mark {
    match verdict {
        LotVerdict::Accept => Mark::Good,
        LotVerdict::Reject => Mark::Bad,
        LotVerdict::Hold => Mark::Doubt,
    }
}

pub(super) fn lot_ink(verdict: LotVerdict) -> Ink {
    match verdict {
        LotVerdict::Accept => ACCEPT,
        LotVerdict::Reject => NONCONFORMING,
        LotVerdict::Hold => UNDECIDED,
    }
}

pub(super) fn part_word(verdict: PartVerdict) -> &'static str {
    match verdict {
        PartVerdict::Conforming => "conforming",
        PartVerdict::Nonconforming => "nonconforming",
        PartVerdict::Undecided => "undecided",
        PartVerdict::Unmeasured => "unmeasured",
    }
}

/// The mark beside a part's verdict; conforming parts stay quiet.
pub(super) fn part_mark(verdict: PartVerdict) -> Option<Mark> {
    match verdict {
        PartVerdict::Conforming => None,
        PartVerdict::Nonconforming => Some(Mark::Bad),
        PartVerdict::Undecided => Some(Mark::Doubt),
        PartVerdict::Unmeasured => Some(Mark::None),
    }
}

pub(super) fn part_ink(verdict: PartVerdict) -> Ink {
    match verdict {
        PartVerdict::Conforming => TEXT,
        PartVerdict::Nonconforming => NONCONFORMING,
        PartVerdict::Undecided => UNDECIDED,
        PartVerdict::Unmeasured => UNMEASURED,
    }
}

/// Name of the place where a part stands in the parts table.
pub(super) fn part_anchor(part: &str) -> String {
    format!("part:{part}")
}
