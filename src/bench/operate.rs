//! What is typed, made into events, words and wishes. Pure: the caller does what is wished.

use super::Message;
use super::command::{self, Command};
use super::desk::Desk;
use super::event::{Event, Question};
use super::run::{Run, Step};
use super::words;
use crate::diagnostic::file_name::fault_of;
use crate::diagnostic::yaml::parse_date;
use crate::judgement::PartVerdict;
use crate::label;
use crate::quantity::{Dimension, parse, shortest};

/// What is to be done about a line.
///
/// A few are made for a line that is typed and none is kept: their size does not matter.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs, clippy::large_enum_variant)]
pub enum Act {
    /// It happened: write it down, then take it in.
    Record(Event),
    Say(Message),
    /// Start the measurement.
    Measure,
    /// Leave the run as it is.
    Leave,
    /// No more sweeps: judge the lot.
    Judge,
}

/// What the last line left to be said once more.
#[derive(Debug, Clone, PartialEq)]
#[allow(missing_docs)]
pub enum Pending {
    End,
    Answer(Question, String),
}

/// Takes a line that was typed while the run goes on.
pub fn line(run: &Run, desk: &Desk, pending: &mut Option<Pending>, text: &str) -> Vec<Act> {
    let before = pending.take();
    let command = command::read(text);
    match (&command, run.step()) {
        (Command::Pause, _) => vec![Act::Record(Event::Paused), Act::Leave],
        (Command::Help, _) => vec![say(Message::plain(words::HELP))],
        (Command::Operator(code), _) => operator(code),
        (_, Step::Ended | Step::Closing) => Vec::new(),
        (Command::Undo, _) => undo(run),
        (Command::End, _) => end(run, &before, pending),
        (_, Step::Ask(question)) => answer(desk, question, text.trim(), &before, pending),
        (Command::Check, _) if run.demands.checks.is_empty() => {
            vec![say(Message::warn(words::NO_CHECKS))]
        }
        (Command::Check, _) => vec![Act::Record(Event::CheckAsked)],
        (Command::Again, _) => again(run),
        (Command::Skip, step) => skip(run, &step),
        (Command::Enter, Step::Complete) => vec![Act::Record(Event::Closing), Act::Judge],
        (Command::Enter, _) => vec![Act::Measure],
        (Command::Text(text), _) => scanned(run, text),
    }
}

fn say(message: Message) -> Act {
    Act::Say(message)
}

fn operator(code: &str) -> Vec<Act> {
    if let Some(why) = fault_of(code) {
        return vec![say(Message::warn(words::bad_name(words::OPERATOR, &why)))];
    }
    vec![
        Act::Record(Event::Operator {
            operator: code.to_owned(),
        }),
        say(Message::plain(words::operator_now(code))),
    ]
}

fn undo(run: &Run) -> Vec<Act> {
    let Some(last) = run.last_kept() else {
        return vec![say(Message::warn(words::NOTHING_TO_UNDO))];
    };
    let mut acts = vec![
        Act::Record(Event::Misplaced {
            part: last.part.clone(),
            attempt: last.attempt,
        }),
        say(Message::plain(words::misplaced(&last.part, last.attempt))),
    ];
    if matches!(
        last.verdict,
        PartVerdict::Nonconforming | PartVerdict::Undecided
    ) {
        acts.push(say(Message::warn(words::MISPLACED_HELD)));
    }
    acts
}

fn again(run: &Run) -> Vec<Act> {
    let allowed = run.last_kept().filter(|last| {
        last.verdict == PartVerdict::Nonconforming && run.standing(&last.part).may_follow
    });
    match allowed {
        Some(last) => vec![Act::Record(Event::Again {
            part: last.part.clone(),
        })],
        None => vec![say(Message::warn(words::NO_RETEST))],
    }
}

fn skip(run: &Run, step: &Step) -> Vec<Act> {
    match step {
        Step::Measure { part, attempt, .. } if *attempt > 1 && run.counting(part).is_some() => {
            vec![
                Act::Record(Event::GivenUp { part: part.clone() }),
                say(Message::warn(words::given_up(part))),
            ]
        }
        _ => vec![say(Message::warn(words::NOTHING_TO_SKIP))],
    }
}

fn end(run: &Run, before: &Option<Pending>, pending: &mut Option<Pending>) -> Vec<Act> {
    if run.tries.is_empty() {
        return vec![Act::Record(Event::Paused), Act::Leave];
    }
    let missing = run.parts.saturating_sub(run.done());
    if missing > 0 && *before != Some(Pending::End) {
        *pending = Some(Pending::End);
        return vec![say(Message::warn(words::early_end(missing)))];
    }
    vec![Act::Record(Event::Closing), Act::Judge]
}

/// A label that is scanned while its reel is measured, or another's.
fn scanned(run: &Run, text: &str) -> Vec<Act> {
    let lot = label::read(text)
        .ok()
        .and_then(|l| l.lot().one().map(str::to_owned));
    let message = match lot {
        Some(lot) if lot == run.began.lot => Message::good(words::same_reel(&lot)),
        Some(lot) => Message::bad(words::other_reel(&lot, &run.began.lot)),
        None => Message::warn(words::not_understood(text)),
    };
    vec![say(message)]
}

fn answer(
    desk: &Desk,
    question: Question,
    text: &str,
    before: &Option<Pending>,
    pending: &mut Option<Pending>,
) -> Vec<Act> {
    let record = |text: &str| {
        vec![Act::Record(Event::Answered {
            question,
            text: text.to_owned(),
        })]
    };
    let (unit, dimension, example) = match question {
        Question::Temperature => ("°C", Dimension::Temperature, "22.8"),
        Question::Drive => ("V", Dimension::Voltage, "1.0"),
        Question::LastHeat => return last_heat(question, text, before, pending),
    };
    let decimal = text.replace(',', ".");
    let bare = decimal.parse::<f64>().is_ok();
    let with_unit = if bare {
        format!("{decimal} {unit}")
    } else {
        decimal
    };
    let value = match parse(&with_unit, dimension) {
        Ok(value) if dimension != Dimension::Voltage || value > 0.0 => value,
        _ => return vec![say(Message::warn(words::no_answer(example)))],
    };
    let normal = shortest(value, unit);
    let outside = desk
        .window(question)
        .filter(|(window, _)| !window.contains_nearly(value));
    if let Some((window, unit)) = outside {
        let this = Pending::Answer(question, normal.clone());
        if *before != Some(this.clone()) {
            *pending = Some(this);
            let text = words::outside(&normal, &window.words(unit));
            return vec![say(Message::warn(text))];
        }
    }
    record(&normal)
}

fn last_heat(
    question: Question,
    text: &str,
    before: &Option<Pending>,
    pending: &mut Option<Pending>,
) -> Vec<Act> {
    let record = |text: &str| {
        vec![Act::Record(Event::Answered {
            question,
            text: text.to_owned(),
        })]
    };
    if text.is_empty() {
        let this = Pending::Answer(question, String::new());
        if *before == Some(this.clone()) {
            return record("");
        }
        *pending = Some(this);
        return vec![say(Message::warn(words::HEAT_UNKNOWN))];
    }
    match parse_date(text) {
        Some(day) => record(&day.to_string()),
        None => vec![say(Message::warn(words::no_answer("2026-07-01")))],
    }
}
