//! The steps of a measurement, as the station file has them.

use super::frame;
use super::numbers::{self, Columns};
use super::table;
use super::wire::{Stop, Wire, place};
use crate::bench::source::Trouble;
use crate::diagnostic::printable;
use crate::station::{Answer, Form, InstrumentLink, Layout};
use crate::sweep;
use std::thread;
use std::time::{Duration, Instant};

/// At most so many errors are read from a queue: one that never empties is no queue.
const MOST_ERRORS: usize = 20;

/// A connection that has been set up.
pub struct Session {
    wire: Wire,
    /// What the instrument says it is.
    pub identity: Option<String>,
}

impl Session {
    /// Connects, asks who is there, sends the set-up.
    ///
    /// # Errors
    /// Nobody there, somebody else, or an error that the instrument reports.
    pub fn open(link: &InstrumentLink, cancelled: &dyn Fn() -> bool) -> Result<Session, Stop> {
        let mut wire = Wire::connect(link)?;
        let mut identity = None;
        if let Some(asked) = &link.identity {
            let answer = printable(&wire.ask(&asked.query, None, cancelled)?);
            if !answer.contains(&asked.contains) {
                return Err(Trouble::new(
                    "wrong_instrument",
                    format!(
                        "{} says it is `{answer}`, and `{}` was expected in that",
                        place(link),
                        asked.contains
                    ),
                    "connect the instrument of this station, or correct `identity` in its file",
                )
                .into());
            }
            identity = Some(answer);
        }
        let mut session = Session { wire, identity };
        for order in &link.setup {
            session.wire.send(order)?;
        }
        session.errors(link, "the set-up", cancelled)?;
        Ok(session)
    }

    /// Whether nothing has happened to the connection since the last measurement.
    pub fn is_clean(&mut self) -> bool {
        self.wire.is_clean()
    }

    /// Measures once: the bytes of a table in `layout`.
    ///
    /// # Errors
    /// Any step fails; then there is nothing of the sweep.
    pub fn measure(
        &mut self,
        link: &InstrumentLink,
        layout: &Layout,
        step: &dyn Fn(&str),
        cancelled: &dyn Fn() -> bool,
    ) -> Result<Vec<u8>, Stop> {
        step("triggered");
        for order in &link.trigger {
            self.wire.send(order)?;
        }
        step("measuring");
        self.wait(link, cancelled)?;
        self.errors(link, "the measurement", cancelled)?;
        step("reading the sweep");
        let mut columns: Columns = Vec::new();
        let mut points = link.points.map(|n| n as usize);
        for answer in &link.read {
            let read = self.read(answer, layout, points, cancelled)?;
            let count = read.first().map_or(0, |(_, values)| values.len());
            same_length(answer, count, &columns, link)?;
            points = points.or(Some(count));
            columns.extend(read);
        }
        for order in &link.finish {
            self.wire.send(order)?;
        }
        self.errors(link, "the reading", cancelled)?;
        Ok(table::write(&columns, layout, self.identity.as_deref()))
    }

    /// Breaks a measurement off. What is sent may not arrive; there is nothing to be done about that.
    pub fn abort(mut self, link: &InstrumentLink) {
        for order in &link.abort {
            if self.wire.send(order).is_err() {
                return;
            }
        }
    }

    fn wait(&mut self, link: &InstrumentLink, cancelled: &dyn Fn() -> bool) -> Result<(), Stop> {
        let Some(wait) = &link.wait else {
            return Ok(());
        };
        let longest = Duration::from_secs_f64(wait.longest);
        let began = Instant::now();
        loop {
            let rest = longest.saturating_sub(began.elapsed());
            let answer = self.wire.ask(&wait.query, Some(rest), cancelled)?;
            if is_same(&answer, &wait.until) {
                return Ok(());
            }
            if began.elapsed() >= longest {
                return Err(Trouble::new(
                    "measurement_too_long",
                    format!(
                        "not finished after {} s: `{}` answers `{}`, not `{}`",
                        wait.longest,
                        wait.query,
                        printable(&answer),
                        wait.until
                    ),
                    "see what the instrument waits for; a slower sweep needs a longer `longest` in \
                     the station file",
                )
                .into());
            }
            let next = Instant::now() + Duration::from_secs_f64(wait.every);
            while Instant::now() < next {
                if cancelled() {
                    return Err(Stop::Cancelled);
                }
                let rest = next.saturating_duration_since(Instant::now());
                thread::sleep(rest.min(Duration::from_millis(20)));
            }
        }
    }

    fn read(
        &mut self,
        answer: &Answer,
        layout: &Layout,
        points: Option<usize>,
        cancelled: &dyn Fn() -> bool,
    ) -> Result<Columns, Stop> {
        let item = numbers::item(answer);
        let expected = points.map(|points| points.saturating_mul(item));
        let border = |bytes: &[u8]| match answer.form {
            Form::Ascii => Ok(frame::line(bytes)),
            Form::Real32(_) | Form::Real64(_) => frame::block(bytes, item, expected),
        };
        let contents = self.wire.fetch(&answer.query, &border, cancelled)?;
        let scale = |column| {
            let heading = layout.columns.iter().find(|(c, _)| *c == column);
            heading.map_or(1.0, |(_, text)| sweep::heading_scale(text, column))
        };
        Ok(numbers::read(answer, &contents, scale)?)
    }

    /// Reads the instrument's errors until there is none.
    fn errors(
        &mut self,
        link: &InstrumentLink,
        after: &str,
        cancelled: &dyn Fn() -> bool,
    ) -> Result<(), Stop> {
        let Some(queue) = &link.errors else {
            return Ok(());
        };
        let mut found: Vec<String> = Vec::new();
        while found.len() < MOST_ERRORS {
            let answer = self.wire.ask(&queue.query, None, cancelled)?;
            let code = answer.split(',').next().unwrap_or_default();
            if is_same(code, &queue.none) || is_same(&answer, &queue.none) {
                break;
            }
            found.push(format!("`{}`", printable(answer.trim())));
        }
        if found.is_empty() {
            return Ok(());
        }
        Err(Trouble::new(
            "instrument_error",
            format!("the instrument reports after {after}: {}", found.join(", ")),
            "measure again; if it stays so, show this to the quality engineer",
        )
        .into())
    }
}

/// Whether two answers say the same: as text, or as numbers (`+0` and `0`).
fn is_same(answer: &str, wanted: &str) -> bool {
    let (answer, wanted) = (answer.trim(), wanted.trim());
    let number = |text: &str| text.parse::<f64>().ok();
    answer == wanted || number(answer).is_some_and(|a| number(wanted) == Some(a))
}

fn same_length(
    answer: &Answer,
    count: usize,
    before: &Columns,
    link: &InstrumentLink,
) -> Result<(), Trouble> {
    let wanted = match (link.points, before.first()) {
        (Some(points), _) => Some((points as usize, "the station file says".to_owned())),
        (None, Some((_, values))) => Some((values.len(), "the answer before has".to_owned())),
        (None, None) => None,
    };
    match wanted {
        Some((wanted, who)) if wanted != count => Err(Trouble::new(
            "answer_wrong",
            format!(
                "`{}` gives {count} points, and {who} {wanted}",
                answer.query
            ),
            "the sweep was stopped or set otherwise: measure again; if it stays so, check the \
             instrument's settings and `read` in the station file",
        )),
        None if count < 2 => Err(Trouble::new(
            "answer_wrong",
            format!("`{}` gives {count} points", answer.query),
            "a sweep has at least two: check the instrument's settings and `read` in the station file",
        )),
        _ => Ok(()),
    }
}
