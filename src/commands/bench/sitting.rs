//! One operator at one bench: brings together what is typed, what is measured, and what is kept.

use super::feed::{self, Opened, Wish};
use super::folder::{Folder, Stuck};
use super::front::{Front, In, Typed};
use super::lot_file::lot_file;
use super::shop::{InForce, Shop};
use crate::bench::desk::{Desk, Told};
use crate::bench::event::{Began, Event, JOURNAL, Question};
use crate::bench::intake::{Identity, Intake, Order, Outcome, Want};
use crate::bench::operate::{self, Act, Pending};
use crate::bench::run::{NoRun, Run, Step, stem};
use crate::bench::scene::{Ending, Page, PlanText, Scene, plan_text, prompt};
use crate::bench::source::{Event as Come, Seen, Taken, Trouble};
use crate::bench::{Message, draw, tag, words};
use crate::certificate::Paper;
use crate::commands::evidence::Evidence;
use crate::commands::keep::{self, NotKept};
use crate::commands::site::{Stop, gather};
use crate::diagnostic::{self, excerpt, printable};
use crate::judgement::PartVerdict;
use crate::lot::LotVerdict;
use crate::record::{self, Refusal};
use crate::sweep::RawFile;
use chrono::NaiveDate;
use std::sync::mpsc::{Receiver, RecvTimeoutError, Sender, channel};
use std::time::Duration;

/// Why the sitting is over.
pub enum Over {
    /// The operator left, or the input ended; verdicts of this sitting.
    Left(Vec<LotVerdict>),
    /// The operator left in the middle of a run.
    Paused(String),
    /// Nothing more can be kept, or shown.
    Failed(String),
}

/// Who measures what with what.
pub struct Wishes {
    #[allow(missing_docs)]
    pub order: Order,
    #[allow(missing_docs)]
    pub operator: Option<String>,
    #[allow(missing_docs)]
    pub station: Option<String>,
    #[allow(missing_docs)]
    pub seed: Option<u64>,
    #[allow(missing_docs)]
    pub paper: Paper,
}

/// One operator at one bench.
pub struct Sitting<'a> {
    #[allow(missing_docs)]
    pub shop: &'a Shop,
    #[allow(missing_docs)]
    pub wishes: Wishes,
    #[allow(missing_docs)]
    pub front: &'a mut dyn Front,
    #[allow(missing_docs)]
    pub come: Receiver<In>,
    #[allow(missing_docs)]
    pub door: Sender<In>,
    #[allow(missing_docs)]
    pub verdicts: Vec<LotVerdict>,
}

/// A run with all that it needs at the bench.
struct Work {
    run: Run,
    folder: Folder,
    desk: Desk,
    positions: Vec<u64>,
    told: Option<Told>,
    said: Vec<Message>,
    /// Messages that are not shown any more.
    dropped: usize,
    activity: String,
    pending: Option<Pending>,
    wish: Sender<Wish>,
    source: String,
    hands_free: bool,
    /// A verdict has come that was not shown yet: whether it is good.
    rings: Option<bool>,
    /// Digests of sweeps that were on the disk already when the run was resumed.
    adopted: Vec<String>,
}

type Done<T> = Result<T, Over>;

fn failed(why: impl ToString) -> Over {
    Over::Failed(why.to_string())
}

impl From<Stuck> for Over {
    fn from(stuck: Stuck) -> Over {
        failed(stuck)
    }
}

impl From<std::io::Error> for Over {
    fn from(error: std::io::Error) -> Over {
        failed(format!("the terminal cannot be written: {error}"))
    }
}

impl Sitting<'_> {
    /// Lot after lot, until the operator leaves.
    pub fn run(&mut self) -> Over {
        let mut first = None;
        loop {
            match self.lot(first.take()) {
                Ok(next) => first = next,
                Err(over) => return over,
            }
        }
    }

    /// The next thing that comes in.
    fn wait(&mut self) -> Option<In> {
        match self.come.recv_timeout(Duration::from_secs(3600)) {
            Ok(come) => Some(come),
            Err(RecvTimeoutError::Timeout) => None,
            Err(RecvTimeoutError::Disconnected) => Some(In::Eof),
        }
    }

    fn left<T>(&mut self) -> Done<T> {
        Err(Over::Left(std::mem::take(&mut self.verdicts)))
    }

    /// A line that is typed while no run goes on.
    fn line(&mut self, scene: &Scene) -> Done<String> {
        self.front.draw(scene)?;
        loop {
            let typed = match self.wait() {
                None => continue,
                Some(In::Line(line)) => Some(Typed::Line(line)),
                Some(In::Eof) => Some(Typed::Leave),
                Some(In::Terminal(event)) => self.front.take(event),
                Some(In::Source(_)) => None,
            };
            match typed {
                None => self.front.draw(scene)?,
                Some(Typed::Leave) => return self.left(),
                Some(Typed::Line(line)) => {
                    self.front.turn();
                    return Ok(line);
                }
            }
        }
    }

    /// One lot from its scan to its label; a line that belongs to the next one.
    fn lot(&mut self, first: Option<String>) -> Done<Option<String>> {
        match self.scan(first)? {
            Scanned::Ready(identity) => self.plan(*identity),
            Scanned::Resume(lot, intake) => {
                let work = match self.resume(&lot, *intake) {
                    Ok(work) => work,
                    Err(Over::Failed(why)) => return self.tell(vec![Message::bad(why)]),
                    Err(over) => return Err(over),
                };
                self.work(work)
            }
        }
    }

    /// Says something that ends the lot before it began, and begins with the next.
    fn tell(&mut self, said: Vec<Message>) -> Done<Option<String>> {
        let fields: Vec<(&'static str, String)> = Vec::new();
        let scene = Scene {
            page: Page::Scan(&fields),
            prompt: words::prompt(Want::Label),
            said: &said,
            said_before: 0,
            activity: "",
            source: "",
        };
        self.line(&scene).map(Some)
    }

    fn scan(&mut self, first: Option<String>) -> Done<Scanned> {
        let w = &self.wishes;
        let mut intake = Intake::new(w.order.clone(), w.operator.clone(), w.station.clone());
        let mut said = Vec::new();
        let mut first = first;
        let waiting = self.shop.waiting();
        if first.is_none() && !waiting.is_empty() {
            let all: Vec<String> = waiting.iter().map(|w| w.words.clone()).collect();
            said.push(Message::plain(words::waiting_runs(&all)));
        }
        loop {
            let (outcome, more) = intake.next(self.shop);
            said.extend(more);
            let want = match outcome {
                Outcome::Ready(identity) => {
                    self.wishes.operator = Some(identity.operator.clone());
                    self.wishes.station = Some(identity.station.clone());
                    return Ok(Scanned::Ready(identity));
                }
                Outcome::Resume(lot) => return Ok(Scanned::Resume(lot, Box::new(intake))),
                Outcome::Want(want) => want,
            };
            let line = match first.take_if(|_| want == Want::Label) {
                Some(line) => line,
                None => {
                    let fields = intake.fields();
                    let scene = Scene {
                        page: Page::Scan(&fields),
                        prompt: words::prompt(want),
                        said: &said,
                        said_before: 0,
                        activity: "",
                        source: "",
                    };
                    self.line(&scene)?
                }
            };
            if is_leave(&line) {
                return self.left();
            }
            said = intake.line(want, &line, self.shop);
        }
    }

    fn plan(&mut self, identity: Identity) -> Done<Option<String>> {
        let supplier = identity.supplier.as_deref();
        let (part, station) = (&identity.part, &identity.station);
        let force = match self
            .shop
            .in_force(part, station, supplier, identity.quantity)
        {
            Ok(force) => force,
            Err(why) => return self.tell(vec![Message::bad(why)]),
        };
        let seed = match self.wishes.seed {
            Some(seed) => seed,
            None => random_seed()?,
        };
        let text = self.plan_of(&identity, &force, seed);
        let scene = Scene {
            page: Page::Plan(&text),
            prompt: words::BEGIN,
            said: &[],
            said_before: 0,
            activity: "",
            source: "",
        };
        let line = self.line(&scene)?;
        if is_leave(&line) {
            return self.left();
        }
        if !line.trim().is_empty() {
            return Ok(Some(line));
        }
        match self.begin(identity, force, seed) {
            Ok(work) => self.work(work),
            Err(Over::Failed(why)) => self.tell(vec![Message::bad(why)]),
            Err(over) => Err(over),
        }
    }

    fn plan_of(&self, identity: &Identity, force: &InForce, seed: u64) -> PlanText {
        plan_text(
            (&force.desk.limits, &force.limits_path.display().to_string()),
            &force.demands.plan,
            force.switching.as_ref(),
            &force.desk.station,
            (&identity.lot, identity.quantity, seed),
            foreseen(self.shop, force),
        )
    }

    fn begin(&mut self, identity: Identity, force: InForce, seed: u64) -> Done<Work> {
        // The source first: without one there is nothing to begin.
        let opened = open(self.shop, &force.desk, None)?;
        let (mut folder, lines) = Folder::hold(&self.shop.folder(&identity.lot))?;
        if !lines.is_empty() {
            return Err(failed(Stuck::Held));
        }
        let began = Began {
            journal: JOURNAL,
            program: keep::PROGRAM.to_owned(),
            lot: identity.lot,
            part: identity.part,
            quantity: identity.quantity,
            supplier: identity.supplier,
            date_code: identity.date_code,
            order: identity.order,
            label: identity.label,
            scans: identity.scans,
            operator: identity.operator,
            station: identity.station,
            seed,
            parts: force.demands.plan.required(),
            limits_sha256: force.limits_sha256.clone(),
            revision: force.desk.limits.revision.clone(),
            baseline: opened.baseline.clone(),
        };
        let at = self.shop.now().to_rfc3339();
        let lines = [folder.record(at, Event::Began(began))?];
        let run = Run::replay(&lines, force.demands).map_err(|why| failed(no_run(&why)))?;
        Ok(self.at_work(run, folder, force.desk, opened))
    }

    fn at_work(&self, run: Run, folder: Folder, desk: Desk, opened: Opened) -> Work {
        let (wish, wishes) = channel();
        let source = opened.source.place();
        feed::sweeps(opened.source, wishes, self.door.clone());
        let positions = positions(&run);
        Work {
            run,
            folder,
            desk,
            positions,
            told: None,
            said: Vec::new(),
            dropped: 0,
            activity: String::new(),
            pending: None,
            wish,
            source,
            hands_free: opened.hands_free,
            rings: None,
            adopted: Vec::new(),
        }
    }

    fn resume(&mut self, lot: &str, intake: Intake) -> Done<Work> {
        let (folder, lines) = Folder::hold(&self.shop.folder(lot))?;
        let Some(Event::Began(began)) = lines.first().map(|l| l.event.clone()) else {
            return Err(failed(no_run(&NoRun::NotBegun)));
        };
        let other = intake
            .fields()
            .into_iter()
            .find(|(name, value)| match *name {
                words::PART => *value != began.part,
                words::QUANTITY => *value != began.quantity.to_string(),
                words::STATION => *value != began.station,
                _ => false,
            });
        if let Some((name, value)) = other {
            return Err(failed(words::begun_otherwise(lot, name, &value)));
        }
        let supplier = began.supplier.as_deref();
        let force = self
            .shop
            .in_force(&began.part, &began.station, supplier, began.quantity)
            .map_err(failed)?;
        let run = Run::replay(&lines, force.demands).map_err(|why| failed(no_run(&why)))?;
        let opened = open(self.shop, &force.desk, run.seen())?;
        let baseline = opened.baseline.clone().filter(|_| run.seen().is_none());
        let mut work = self.at_work(run, folder, force.desk, opened);
        self.record(&mut work, Event::Resumed)?;
        if let Some(seen) = baseline {
            self.record(&mut work, Event::Baseline { seen })?;
        }
        let (done, parts) = (work.run.done(), work.run.parts);
        work.said
            .push(Message::plain(words::resumed(&printable(lot), done, parts)));
        if let Some((_, operator)) = intake
            .fields()
            .into_iter()
            .find(|(n, _)| *n == words::OPERATOR)
            && operator != work.run.operator
        {
            work.said
                .push(Message::plain(words::operator_now(&operator)));
            self.record(&mut work, Event::Operator { operator })?;
        }
        self.judge_again(&mut work, &force.limits_sha256)?;
        self.adopt(&mut work)?;
        Ok(work)
    }

    /// Every sweep is read again: its bytes must be those that were kept, and its verdict that of the limit file in force.
    fn judge_again(&self, work: &mut Work, limits_sha256: &str) -> Done<()> {
        let age = self.age(work);
        let kept: Vec<(String, String, u32, String)> = work
            .run
            .tries
            .iter()
            .map(|t| (t.file.clone(), t.part.clone(), t.attempt, t.sha256.clone()))
            .collect();
        for (index, (name, part, attempt, sha256)) in kept.into_iter().enumerate() {
            let bytes = work.folder.read(&name)?;
            if record::sha256(&bytes) != sha256 {
                return Err(failed(words::changed_file(&name)));
            }
            let file = RawFile { name, bytes };
            if let Ok(told) = work.desk.judge(&file, (&part, attempt), age) {
                work.run
                    .rejudge(index, told.judged.verdict, told.judged.class.clone());
                work.told = Some(told);
            }
        }
        let required = work.run.demands.plan.required();
        let changed = work.run.limits_sha256 != limits_sha256;
        if changed || required > work.run.parts {
            let revision = work.desk.limits.revision.clone();
            let text = if changed {
                words::limits_changed(&work.run.revision, &revision, required)
            } else {
                words::more_parts(required)
            };
            work.said.push(Message::warn(text));
            let event = Event::Demanded {
                parts: required,
                limits_sha256: limits_sha256.to_owned(),
                revision,
            };
            self.record(work, event)?;
            work.positions = positions(&work.run);
        }
        Ok(())
    }

    /// Takes in a sweep that was on the disk and not yet in the journal when the run stopped.
    fn adopt(&self, work: &mut Work) -> Done<()> {
        let mut count = 0;
        loop {
            let found = match work.run.step() {
                Step::Measure { part, attempt, .. } => {
                    work.folder.with_stem("sweeps", &stem(&part, attempt))
                }
                Step::Check { kind, number, .. } => {
                    let stem = format!("{number:03}-{}", kind.name());
                    work.folder.with_stem("checks", &stem)
                }
                _ => None,
            };
            let Some(name) = found else { break };
            let bytes = work.folder.read(&name)?;
            let sha256 = record::sha256(&bytes);
            if work.run.taken(&sha256).is_some() {
                break;
            }
            work.adopted.push(sha256);
            self.take(work, &name, bytes, "", None)?;
            count += 1;
        }
        if count > 0 {
            work.said.push(Message::plain(words::adopted(count)));
        }
        Ok(())
    }

    fn record(&self, work: &mut Work, event: Event) -> Done<()> {
        let line = work.folder.record(self.shop.now().to_rfc3339(), event)?;
        work.run.apply(&line);
        Ok(())
    }

    fn age(&self, work: &Work) -> Option<f64> {
        let text = work.run.answers.get(&Question::LastHeat)?;
        let heated = text
            .parse::<NaiveDate>()
            .ok()?
            .and_time(chrono::NaiveTime::MIN);
        let now = self.shop.now().naive_local();
        Some(now.signed_duration_since(heated).num_milliseconds() as f64 / 3.6e6)
    }

    fn draw(&mut self, work: &Work) -> Done<()> {
        let prompt = prompt(&work.run, &work.desk, &work.positions, work.hands_free);
        let scene = Scene {
            page: Page::Work {
                run: &work.run,
                desk: &work.desk,
                positions: &work.positions,
                told: work.told.as_ref(),
            },
            prompt: &prompt,
            said: &work.said,
            said_before: work.dropped,
            activity: &work.activity,
            source: &work.source,
        };
        Ok(self.front.draw(&scene)?)
    }

    /// The run until it is judged; a line for the next lot.
    fn work(&mut self, mut work: Work) -> Done<Option<String>> {
        if work.run.step() == Step::Closing
            && let Some(ending) = self.end(&mut work)?
        {
            return self.ended(&ending);
        }
        loop {
            self.draw(&work)?;
            if let Some(good) = work.rings.take() {
                self.front.bell(good);
            }
            let typed = match self.wait() {
                None => None,
                Some(In::Line(line)) => Some(Typed::Line(line)),
                Some(In::Eof) => Some(Typed::Leave),
                Some(In::Terminal(event)) => self.front.take(event),
                Some(In::Source(come)) => {
                    self.come(&mut work, come)?;
                    None
                }
            };
            let acts = match typed {
                None => continue,
                Some(Typed::Leave) => vec![Act::Record(Event::Paused), Act::Leave],
                Some(Typed::Line(line)) => {
                    self.front.turn();
                    work.dropped += work.said.len();
                    work.said.clear();
                    operate::line(&work.run, &work.desk, &mut work.pending, &line)
                }
            };
            for act in acts {
                match act {
                    Act::Say(message) => work.said.push(message),
                    Act::Record(event) => {
                        // What the instrument is measuring is not wanted any more.
                        if !work.hands_free {
                            let _ = work.wish.send(Wish::Cancel);
                            work.activity.clear();
                        }
                        self.record(&mut work, event)?;
                        if work.run.last_kept().is_none_or(|t| {
                            work.told.as_ref().is_none_or(|told| told.part != t.part)
                        }) {
                            work.told = None;
                        }
                    }
                    Act::Measure => self.measure(&mut work),
                    Act::Leave => return self.pause(&work),
                    Act::Judge => {
                        if let Some(ending) = self.end(&mut work)? {
                            return self.ended(&ending);
                        }
                    }
                }
            }
        }
    }

    fn pause(&mut self, work: &Work) -> Done<Option<String>> {
        let lot = printable(&work.run.began.lot);
        let text = words::paused(&lot, work.run.done(), work.run.parts);
        let said = [Message::plain(text.clone())];
        let scene = Scene {
            page: Page::Work {
                run: &work.run,
                desk: &work.desk,
                positions: &work.positions,
                told: None,
            },
            prompt: "",
            said: &said,
            said_before: work.dropped + work.said.len(),
            activity: "",
            source: "",
        };
        // Whoever closed the terminal sees nothing any more; the run is kept all the same.
        let _ = self.front.draw(&scene);
        Err(Over::Paused(text))
    }

    /// Starts a measurement where that is the operator's to do.
    fn measure(&self, work: &mut Work) {
        let stem = match work.run.step() {
            Step::Measure { part, attempt, .. } => stem(&part, attempt),
            Step::Check { kind, number, .. } => format!("{number:03}-{}", kind.name()),
            _ => return,
        };
        if !work.hands_free {
            work.activity = words::MEASURING.to_owned();
        }
        let _ = work.wish.send(Wish::Begin(stem));
    }

    fn come(&mut self, work: &mut Work, come: Result<Come, Trouble>) -> Done<()> {
        work.activity.clear();
        match come {
            Ok(Come::Nothing) => {}
            Ok(Come::Arriving { name, bytes }) => {
                work.activity = words::arriving(&excerpt(&name), bytes);
            }
            Ok(Come::Step(text)) => work.activity = printable(&text),
            Ok(Come::Ignored { name, why }) => {
                let text = words::ignored(&excerpt(&name), &why);
                work.said.push(Message::quiet(text));
            }
            Ok(Come::Refused { name, why }) => {
                let text = format!("{}: {why}", excerpt(&name));
                work.said.push(Message::warn(text));
            }
            Ok(Come::Lost(trouble)) | Err(trouble) => {
                work.said.push(Message::warn(trouble.to_string()));
            }
            Ok(Come::Recovered(text)) => work.said.push(Message::good(text)),
            Ok(Come::Sweep(taken)) => self.sweep(work, taken)?,
        }
        Ok(())
    }

    fn sweep(&mut self, work: &mut Work, taken: Taken) -> Done<()> {
        work.dropped += work.said.len();
        work.said.clear();
        let sha256 = record::sha256(&taken.bytes);
        if let Some(file) = work.run.taken(&sha256) {
            let message = if work.adopted.contains(&sha256) {
                Message::quiet(words::known_sweep(file))
            } else {
                Message::warn(words::same_sweep(file))
            };
            work.said.push(message);
            return Ok(());
        }
        if let Some(old) = &taken.replaces {
            let found = work
                .run
                .tries
                .iter()
                .find(|t| t.sha256 == *old && t.aside.is_none());
            if let Some((part, attempt)) = found.map(|t| (t.part.clone(), t.attempt)) {
                work.said.push(Message::warn(words::unfinished(&part)));
                let next = work.run.next_try(&part);
                self.record(
                    work,
                    Event::Unfinished {
                        part: part.clone(),
                        attempt,
                    },
                )?;
                let name = format!("sweeps/{}.{}", stem(&part, next), taken.extension);
                work.folder.keep(&name, &taken.bytes)?;
                return self.take_as(
                    work,
                    (&part, next),
                    &name,
                    taken.bytes,
                    &taken.name,
                    Some(taken.seen),
                );
            }
        }
        let name = match work.run.step() {
            Step::Measure { part, attempt, .. } => {
                format!("sweeps/{}.{}", stem(&part, attempt), taken.extension)
            }
            Step::Check { kind, number, .. } => {
                format!("checks/{number:03}-{}.{}", kind.name(), taken.extension)
            }
            _ => {
                let name = work.folder.free_name("not-used", &taken.name);
                work.folder.keep(&name, &taken.bytes)?;
                work.said
                    .push(Message::warn(words::unexpected(&excerpt(&taken.name))));
                let event = Event::NotUsed {
                    file: name,
                    sha256,
                    from: taken.name,
                    seen: Some(taken.seen),
                };
                return self.record(work, event);
            }
        };
        work.folder.keep(&name, &taken.bytes)?;
        self.take(work, &name, taken.bytes, &taken.name, Some(taken.seen))
    }

    /// Takes a file of the run as what comes next: a part or a check.
    fn take(
        &self,
        work: &mut Work,
        name: &str,
        bytes: Vec<u8>,
        from: &str,
        seen: Option<Seen>,
    ) -> Done<()> {
        match work.run.step() {
            Step::Measure { part, attempt, .. } => {
                self.take_as(work, (&part, attempt), name, bytes, from, seen)
            }
            Step::Check { kind, .. } => {
                let file = RawFile {
                    name: name.to_owned(),
                    bytes,
                };
                let (good, found) = work.desk.check(kind, &file);
                let kept = |run: &Run| run.tries.iter().filter(|t| t.aside.is_none()).count();
                let before = kept(&work.run);
                let event = Event::Checked {
                    check: kind,
                    file: name.to_owned(),
                    sha256: record::sha256(&file.bytes),
                    from: from.to_owned(),
                    good,
                    found: found.clone(),
                    seen,
                };
                self.record(work, event)?;
                let lost = before - kept(&work.run);
                work.told = work.told.take().filter(|_| lost == 0);
                work.said.push(if good {
                    Message::good(words::check_good(kind, &found))
                } else {
                    Message::bad(words::check_bad(kind, &found, lost))
                });
                Ok(())
            }
            _ => Ok(()),
        }
    }

    fn take_as(
        &self,
        work: &mut Work,
        (part, attempt): (&str, u32),
        name: &str,
        bytes: Vec<u8>,
        from: &str,
        seen: Option<Seen>,
    ) -> Done<()> {
        let file = RawFile {
            name: name.to_owned(),
            bytes,
        };
        let age = self.age(work);
        let sha256 = record::sha256(&file.bytes);
        match work.desk.judge(&file, (part, attempt), age) {
            Ok(told) => {
                let event = Event::Swept {
                    part: part.to_owned(),
                    attempt,
                    file: name.to_owned(),
                    sha256,
                    from: from.to_owned(),
                    verdict: told.judged.verdict,
                    class: told.judged.class.clone(),
                    seen,
                };
                self.record(work, event)?;
                work.rings = Some(told.verdict() == PartVerdict::Conforming);
                work.told = Some(told);
                Ok(())
            }
            Err(why) => {
                // Not a sweep of this part: it must not lie among those that are judged.
                let beside = work.folder.free_name("not-used", from);
                work.folder.keep(&beside, &file.bytes)?;
                let _ = std::fs::remove_file(work.folder.path().join(name));
                work.said
                    .push(Message::bad(format!("{}: {why}.", excerpt(from))));
                let event = Event::NotUsed {
                    file: beside,
                    sha256,
                    from: from.to_owned(),
                    seen,
                };
                self.record(work, event)
            }
        }
    }

    /// Writes the lot file and judges the folder, as `reelgate judge` does. Nothing where it cannot be judged; why
    /// is said then.
    fn end(&mut self, work: &mut Work) -> Done<Option<Ending>> {
        self.draw(work)?;
        work.folder
            .keep("lot.yaml", lot_file(&work.run).as_bytes())?;
        match self.judged(work) {
            Ok(ending) => {
                let event = Event::Ended {
                    record: ending.record.record.clone(),
                    verdict: ending.record.verdict,
                };
                work.folder.keep("label.txt", ending.tag.as_bytes())?;
                self.record(work, event)?;
                self.verdicts.push(ending.record.verdict);
                Ok(Some(ending))
            }
            Err(why) => Err(failed(words::not_judged(&why))),
        }
    }

    fn judged(&self, work: &Work) -> Result<Ending, String> {
        let sources = gather(&self.shop.site, work.folder.path()).map_err(|stop| match stop {
            Stop::Unreadable(all) => all
                .iter()
                .map(|u| format!("{}: {}", u.path.display(), u.note.text))
                .collect::<Vec<_>>()
                .join("; "),
            Stop::Faults(faults) => diagnostic::render(&faults, false),
        })?;
        let evidence =
            Evidence::of(&sources).map_err(|faults| diagnostic::render(&faults, false))?;
        let place = self.shop.keeping(sources.site.as_ref())?;
        let kept = keep::judge(&place, &sources, &evidence, self.wishes.paper, &|| ());
        let kept = kept.map_err(|why| match why {
            NotKept::Refused(Refusal::Faults(all)) => {
                all.iter().map(|f| diagnostic::render(f, false)).collect()
            }
            NotKept::Refused(Refusal::Impossible(note)) => note.text,
            NotKept::Ledger(error) => error.to_string(),
            NotKept::Changed(path) => words::changed_file(&path.display().to_string()),
            NotKept::Other(text) => text,
        })?;
        let mut certificate = kept.paths.pdf.display().to_string();
        if let Some(why) = &kept.unwritten {
            certificate = format!("{certificate} ({why})");
        }
        Ok(Ending {
            tag: tag::tag(&kept.record),
            tag_path: work.folder.path().join("label.txt").display().to_string(),
            certificate,
            record: kept.record,
        })
    }

    fn ended(&mut self, ending: &Ending) -> Done<Option<String>> {
        let scene = Scene {
            page: Page::End(ending),
            prompt: words::NEXT_LOT,
            said: &[],
            said_before: 0,
            activity: "",
            source: "",
        };
        self.front.bell(ending.record.verdict == LotVerdict::Accept);
        let line = self.line(&scene)?;
        if is_leave(&line) {
            return self.left();
        }
        Ok(Some(line).filter(|l| !l.trim().is_empty()))
    }
}

enum Scanned {
    Ready(Box<Identity>),
    Resume(String, Box<Intake>),
}

fn is_leave(line: &str) -> bool {
    matches!(line.trim(), "pause" | "p")
}

fn no_run(why: &NoRun) -> String {
    match why {
        NoRun::Empty | NoRun::NotBegun => words::NO_RUN.to_owned(),
        NoRun::Version(n) => words::newer_run(*n),
    }
}

fn positions(run: &Run) -> Vec<u64> {
    draw::positions(run.began.seed, run.began.quantity, run.parts)
}

/// A seed from the randomness of the system.
fn random_seed() -> Done<u64> {
    let mut bytes = [0; 4];
    getrandom::fill(&mut bytes).map_err(failed)?;
    Ok(u64::from(u32::from_le_bytes(bytes)))
}

/// What would hold the lot whatever is measured.
fn foreseen(shop: &Shop, force: &InForce) -> Vec<String> {
    let mut all = force.unapproved.clone();
    let station = &force.desk.station;
    let now = shop.now();
    if let Some(instrument) = &station.instrument
        && instrument.due.is_some_and(|due| now.date_naive() > due)
    {
        all.push(words::calibration_due(&instrument.asset));
    }
    if let Some(jig) = &station.jig
        && let Some(valid_for) = jig.valid_for
        && station.jig_check.is_none()
    {
        let old = jig.checked.is_none_or(|at| {
            now.signed_duration_since(at).num_milliseconds() as f64 / 1e3 > valid_for
        });
        if old {
            all.push(words::jig_check_old(&jig.asset));
        }
    }
    if let Some(due) = station
        .jig_check
        .as_ref()
        .and_then(|c| c.reference_part.as_ref())
        .filter(|p| p.due.is_some_and(|due| now.date_naive() > due))
    {
        all.push(words::reference_due(&due.asset));
    }
    all
}

/// Opens the source that the station file names.
fn open(shop: &Shop, desk: &Desk, known: Option<&[Seen]>) -> Done<Opened> {
    feed::open(&shop.root, &desk.station, known).map_err(failed)
}
