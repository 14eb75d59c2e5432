//! The run as a state: what happened makes it, and it says what comes next. No file, no clock, no terminal.

use super::event::{Began, CheckKind, Event, Line, Question};
use super::source::Seen;
use crate::judgement::{PartVerdict, Standing, TryOutcome, standing};
use crate::limits::Retest;
use crate::lot::{Aside, LotVerdict, Plan};
use std::collections::{BTreeMap, BTreeSet};

/// What limit file and station file demand of a run; read anew whenever it is resumed.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Demands {
    pub plan: Plan,
    pub retest: Retest,
    pub questions: Vec<Question>,
    /// What a check of the jig consists of, in order; empty where the station demands none.
    pub checks: Vec<CheckKind>,
    /// A check is due after so many sweeps.
    pub check_every: Option<u64>,
}

/// One sweep of a part.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Try {
    /// From 0, in the order of the sample.
    pub index: u64,
    pub part: String,
    pub attempt: u32,
    pub file: String,
    pub sha256: String,
    pub verdict: PartVerdict,
    pub class: Option<String>,
    pub aside: Option<(Aside, String)>,
    pub at: String,
}

impl Try {
    /// The stem of its file: `017`, `017~2`.
    pub fn stem(&self) -> String {
        stem(&self.part, self.attempt)
    }
}

/// `017`, `017~2`.
pub fn stem(part: &str, attempt: u32) -> String {
    match attempt {
        1 => part.to_owned(),
        n => format!("{part}~{n}"),
    }
}

/// One sweep of a check.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub struct Check {
    pub kind: CheckKind,
    pub file: String,
    pub sha256: String,
    pub good: bool,
    pub found: String,
    pub at: String,
}

/// Why a check is due.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[allow(missing_docs)]
pub enum CheckReason {
    Before,
    Every,
    After,
    Asked,
    Failed,
}

/// What comes next.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub enum Step {
    Ask(Question),
    Check {
        kind: CheckKind,
        reason: CheckReason,
        /// From 1 over the whole run: names its file.
        number: usize,
    },
    Measure {
        index: u64,
        part: String,
        attempt: u32,
    },
    /// Everything is measured.
    Complete,
    Closing,
    Ended,
}

/// A run.
#[derive(Debug, Clone)]
#[allow(missing_docs)]
pub struct Run {
    pub began: Began,
    pub began_at: String,
    pub demands: Demands,
    pub operator: String,
    pub operators: Vec<String>,
    pub answers: BTreeMap<Question, String>,
    pub tries: Vec<Try>,
    pub checks: Vec<Check>,
    /// Parts that the plan demands now.
    pub parts: u64,
    pub limits_sha256: String,
    pub revision: String,
    pub closed: Option<String>,
    pub ended: Option<(String, LotVerdict)>,
    /// Next of the checks in a round that has begun.
    round: usize,
    /// When the last round was good, and how many sweeps there were then.
    good: Option<(String, usize)>,
    /// The last good check before the last sweep.
    good_before: Option<String>,
    failed: bool,
    asked: bool,
    again: BTreeSet<String>,
    given_up: BTreeSet<String>,
    /// Places in `tries` of each part.
    by_part: BTreeMap<u64, Vec<usize>>,
    /// Files of the watched folder that are old or taken.
    seen: Vec<Seen>,
    baseline: bool,
}

/// Why lines are no run.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum NoRun {
    /// There is no line.
    Empty,
    /// The first line does not begin a run, or a later one does.
    NotBegun,
    /// A version that this program does not know.
    Version(u32),
}

impl Run {
    /// The run that lines make.
    ///
    /// # Errors
    /// Lines that are none of a run.
    pub fn replay(lines: &[Line], demands: Demands) -> Result<Run, NoRun> {
        let (first, rest) = lines.split_first().ok_or(NoRun::Empty)?;
        let Event::Began(began) = &first.event else {
            return Err(NoRun::NotBegun);
        };
        if began.journal != super::event::JOURNAL {
            return Err(NoRun::Version(began.journal));
        }
        let mut run = Run {
            operator: began.operator.clone(),
            operators: vec![began.operator.clone()],
            began_at: first.at.clone(),
            demands,
            answers: BTreeMap::new(),
            tries: Vec::new(),
            checks: Vec::new(),
            parts: began.parts,
            limits_sha256: began.limits_sha256.clone(),
            revision: began.revision.clone(),
            closed: None,
            ended: None,
            round: 0,
            good: None,
            good_before: None,
            failed: false,
            asked: false,
            again: BTreeSet::new(),
            given_up: BTreeSet::new(),
            by_part: BTreeMap::new(),
            seen: began.baseline.clone().unwrap_or_default(),
            baseline: began.baseline.is_some(),
            began: began.clone(),
        };
        for line in rest {
            if matches!(line.event, Event::Began(_)) {
                return Err(NoRun::NotBegun);
            }
            run.apply(line);
        }
        Ok(run)
    }

    /// Takes an event in.
    pub fn apply(&mut self, line: &Line) {
        match &line.event {
            Event::Began(_) | Event::Paused | Event::Resumed => {}
            Event::Baseline { seen } => {
                self.baseline = true;
                self.seen.extend(seen.iter().cloned());
            }
            Event::NotUsed { seen, .. } => self.seen.extend(seen.clone()),
            Event::Answered { question, text } => {
                self.answers.insert(*question, text.clone());
            }
            Event::Swept {
                part,
                attempt,
                file,
                sha256,
                verdict,
                class,
                seen,
                ..
            } => {
                self.seen.extend(seen.clone());
                self.again.remove(part);
                self.good_before = self.good.as_ref().map(|(at, _)| at.clone());
                let index = self.index_of(part);
                self.by_part
                    .entry(index)
                    .or_default()
                    .push(self.tries.len());
                self.tries.push(Try {
                    index,
                    part: part.clone(),
                    attempt: *attempt,
                    file: file.clone(),
                    sha256: sha256.clone(),
                    verdict: *verdict,
                    class: class.clone(),
                    aside: None,
                    at: line.at.clone(),
                });
            }
            Event::Checked {
                check,
                file,
                sha256,
                good,
                found,
                seen,
                ..
            } => {
                self.seen.extend(seen.clone());
                self.checks.push(Check {
                    kind: *check,
                    file: file.clone(),
                    sha256: sha256.clone(),
                    good: *good,
                    found: found.clone(),
                    at: line.at.clone(),
                });
                self.checked(*good, &line.at);
            }
            Event::CheckAsked => self.asked = true,
            Event::Misplaced { part, attempt } => self.put_aside(part, *attempt, Aside::Misplaced),
            Event::Unfinished { part, attempt } => {
                self.put_aside(part, *attempt, Aside::Unfinished);
            }
            Event::Again { part } => {
                self.again.insert(part.clone());
            }
            Event::GivenUp { part } => {
                self.given_up.insert(part.clone());
            }
            Event::Operator { operator } => {
                self.operator = operator.clone();
                if !self.operators.contains(operator) {
                    self.operators.push(operator.clone());
                }
            }
            Event::Demanded {
                parts,
                limits_sha256,
                revision,
            } => {
                self.parts = *parts;
                self.limits_sha256 = limits_sha256.clone();
                self.revision = revision.clone();
            }
            Event::Closing => self.closed = Some(line.at.clone()),
            Event::Ended { record, verdict } => self.ended = Some((record.clone(), *verdict)),
        }
    }

    fn put_aside(&mut self, part: &str, attempt: u32, why: Aside) {
        let by = self.operator.clone();
        let is = |t: &&mut Try| t.part == part && t.attempt == attempt && t.aside.is_none();
        if let Some(found) = self.tries.iter_mut().find(is) {
            found.aside = Some((why, by));
        }
        self.given_up.remove(part);
        self.again.remove(part);
    }

    fn checked(&mut self, good: bool, at: &str) {
        if !good {
            self.round = 0;
            self.failed = true;
            let from = self.good.as_ref().map_or(0, |(_, tries)| *tries);
            let by = self.operator.clone();
            let since = self.tries.iter_mut().skip(from);
            for one in since.filter(|t| t.aside.is_none()) {
                one.aside = Some((Aside::JigCheck, by.clone()));
                self.given_up.remove(&one.part);
            }
            return;
        }
        self.round += 1;
        if self.round >= self.demands.checks.len() {
            self.round = 0;
            self.failed = false;
            self.asked = false;
            self.good = Some((at.to_owned(), self.tries.len()));
        }
    }

    /// The verdict on a try by the limit file in force now.
    pub fn rejudge(&mut self, index: usize, verdict: PartVerdict, class: Option<String>) {
        if let Some(one) = self.tries.get_mut(index) {
            one.verdict = verdict;
            one.class = class;
        }
    }

    /// The name of a part of the sample, from 0.
    pub fn part_name(&self, index: u64) -> String {
        let width = self.began.parts.to_string().len().max(3);
        format!("{:0width$}", index + 1)
    }

    fn index_of(&self, part: &str) -> u64 {
        part.parse::<u64>().unwrap_or(1).saturating_sub(1)
    }

    /// Which try of a part counts.
    pub fn standing(&self, part: &str) -> Standing {
        let tries: Vec<TryOutcome> = self.tries_of(part).map(outcome).collect();
        standing(&tries, &self.demands.retest)
    }

    /// The tries of a part, in order.
    pub fn tries_of(&self, part: &str) -> impl Iterator<Item = &Try> + use<'_> {
        let of_part = self.by_part.get(&self.index_of(part));
        let all = of_part.map_or(&[][..], Vec::as_slice);
        all.iter().filter_map(|i| self.tries.get(*i))
    }

    /// The try of a part that counts.
    pub fn counting(&self, part: &str) -> Option<&Try> {
        let index = self.standing(part).counts?;
        self.tries_of(part).nth(index)
    }

    /// Whether a part of the sample is to be measured, or measured again.
    fn wanted(&self, part: &str) -> bool {
        let standing = self.standing(part);
        let Some(counts) = standing.counts.and_then(|i| self.tries_of(part).nth(i)) else {
            return true;
        };
        let reseat = counts.verdict == PartVerdict::Unmeasured && !self.given_up.contains(part);
        standing.may_follow && (reseat || self.again.contains(part))
    }

    /// What comes next.
    pub fn step(&self) -> Step {
        if self.ended.is_some() {
            return Step::Ended;
        }
        if self.closed.is_some() {
            return Step::Closing;
        }
        let open = |q: &&Question| !self.answers.contains_key(q);
        if let Some(question) = self.demands.questions.iter().find(open) {
            return Step::Ask(*question);
        }
        let next = (0..self.parts)
            .map(|index| (index, self.part_name(index)))
            .find(|(_, part)| self.wanted(part));
        if let (Some(reason), Some(kind)) = (
            self.check_due(next.is_some()),
            self.demands.checks.get(self.round),
        ) {
            return Step::Check {
                kind: *kind,
                reason,
                number: self.checks.len() + 1,
            };
        }
        match next {
            None => Step::Complete,
            Some((index, part)) => Step::Measure {
                index,
                attempt: self.next_attempt(&part),
                part,
            },
        }
    }

    fn next_attempt(&self, part: &str) -> u32 {
        self.tries_of(part).map(|t| t.attempt).max().unwrap_or(0) + 1
    }

    fn check_due(&self, more: bool) -> Option<CheckReason> {
        if self.demands.checks.is_empty() {
            return None;
        }
        if self.failed {
            return Some(CheckReason::Failed);
        }
        let Some((_, then)) = &self.good else {
            return Some(CheckReason::Before);
        };
        if self.asked {
            return Some(CheckReason::Asked);
        }
        let since = self.tries.len().saturating_sub(*then) as u64;
        let every = self.demands.check_every;
        if !more && since > 0 {
            Some(CheckReason::After)
        } else if more && every.is_some_and(|every| since >= every.max(1)) {
            Some(CheckReason::Every)
        } else {
            (self.round > 0).then_some(CheckReason::Every)
        }
    }

    /// Files of the watched folder that are old or taken; `None` where it was not looked at yet.
    pub fn seen(&self) -> Option<&[Seen]> {
        self.baseline.then_some(self.seen.as_slice())
    }

    /// The next try at a part.
    pub fn next_try(&self, part: &str) -> u32 {
        self.next_attempt(part)
    }

    /// When the jig was last found good before the last sweep.
    pub fn jig_good_at(&self) -> Option<&str> {
        self.good_before.as_deref()
    }

    /// The last sweep that was not set aside: what `undo` is about.
    pub fn last_kept(&self) -> Option<&Try> {
        self.tries.iter().rev().find(|t| t.aside.is_none())
    }

    /// Parts of the sample that need no more sweeps.
    pub fn done(&self) -> u64 {
        let done = |index: &u64| !self.wanted(&self.part_name(*index));
        (0..self.parts).filter(done).count() as u64
    }

    /// The file with these bytes that the run has already, as a part's or a check's.
    pub fn taken(&self, sha256: &str) -> Option<&str> {
        let of_part = self.tries.iter().find(|t| t.sha256 == sha256);
        let of_check = self.checks.iter().find(|c| c.sha256 == sha256);
        of_part
            .map(|t| t.file.as_str())
            .or(of_check.map(|c| c.file.as_str()))
    }

    /// Parts with a verdict, among those that count.
    pub fn count(&self, verdict: PartVerdict) -> u64 {
        let is = |index: &u64| {
            self.counting(&self.part_name(*index))
                .is_some_and(|t| t.verdict == verdict)
        };
        (0..self.parts).filter(is).count() as u64
    }

    /// Each class of the plan against what was found so far.
    pub fn chances(&self) -> Vec<Chance> {
        self.demands
            .plan
            .classes
            .iter()
            .map(|(name, class)| {
                let with = |verdict| {
                    let inside = class.sample().min(self.parts);
                    (0..inside)
                        .filter_map(|index| self.counting(&self.part_name(index)))
                        .filter(|t| t.verdict == verdict)
                        .filter(|t| name == "all" || t.class.as_deref() == Some(name))
                        .count() as u64
                };
                Chance {
                    class: name.clone(),
                    n: class.sample(),
                    ac: class.ac,
                    re: class.re,
                    nonconforming: with(PartVerdict::Nonconforming),
                    undecided: with(PartVerdict::Undecided),
                    by_variables: class.variables.is_some(),
                }
            })
            .collect()
    }

    /// Whether the lot can still be accepted by the counts; what lot rules say comes at the end.
    pub fn acceptable(&self) -> bool {
        self.chances().iter().all(Chance::open)
    }
}

fn outcome(one: &Try) -> TryOutcome<'_> {
    TryOutcome {
        verdict: one.verdict,
        set_aside: one.aside.as_ref().map(|(why, _)| why.name()),
    }
}

/// A class of the plan in the middle of a run.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Chance {
    pub class: String,
    pub n: u64,
    pub ac: u64,
    pub re: u64,
    pub nonconforming: u64,
    pub undecided: u64,
    pub by_variables: bool,
}

impl Chance {
    /// Whether the class can still be accepted; by variables that is known at the end only.
    pub fn open(&self) -> bool {
        self.by_variables || self.nonconforming < self.re
    }
}
