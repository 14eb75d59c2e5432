//! An instrument on the network that measures when it is told to.
//!
//! The conversation (`session`) runs in a thread of its own, so that the operator's screen never
//! waits for a cable. It is what the station file says, message for message; this program knows no
//! instrument. A measurement comes whole or not at all: after anything that goes wrong the
//! connection is given up and made anew, so that no answer is taken for that of another question.

mod frame;
mod numbers;
mod session;
mod table;
mod wire;

use super::{Event, Proof, Seen, Source, Taken, Trouble};
use crate::ledger::sha256_hex;
use crate::station::{InstrumentLink, Layout, Station};
use session::Session;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::sync::mpsc::{Receiver, RecvTimeoutError, Sender, channel};
use std::thread;
use std::time::{Duration, Instant};
use wire::Stop;

/// Between two attempts at a connection that is lost.
const AGAIN: Duration = Duration::from_secs(1);

/// A measurement that was asked for.
struct Order {
    number: u64,
    stem: String,
}

/// What the thread says: about a measurement (its number), or about the connection (0).
struct Word {
    number: u64,
    what: Result<Event, Trouble>,
}

/// An instrument on the network.
pub struct Instrument {
    place: String,
    orders: Sender<Order>,
    words: Receiver<Word>,
    /// Number of the measurement that is wanted; another one that runs is broken off.
    wanted: Arc<AtomicU64>,
    ended: Arc<AtomicBool>,
    /// The last number that was used.
    last: u64,
    running: bool,
    thread: Option<thread::JoinHandle<()>>,
}

impl Instrument {
    /// Connects in the background; [`Source::next`] tells how that goes.
    ///
    /// # Errors
    /// The station has no layout to write the sweeps in (a station file with a link always has one).
    pub fn open(link: &InstrumentLink, station: &Station) -> Result<Instrument, Trouble> {
        let layout = station.layout.clone().ok_or_else(|| {
            Trouble::new(
                "layout_missing",
                "the station has no layout for the sweeps of its instrument",
                "add `layout` to the station file",
            )
        })?;
        let (orders, inbox) = channel();
        let (outbox, words) = channel();
        let wanted = Arc::new(AtomicU64::new(0));
        let ended = Arc::new(AtomicBool::new(false));
        let worker = Worker {
            link: link.clone(),
            layout,
            orders: inbox,
            words: outbox,
            wanted: Arc::clone(&wanted),
            ended: Arc::clone(&ended),
            session: None,
            lost: false,
        };
        let thread = thread::Builder::new()
            .name("instrument".to_owned())
            .spawn(move || worker.run())
            .map_err(|error| {
                Trouble::new(
                    "no_thread",
                    format!("the conversation with the instrument cannot begin ({error})"),
                    "close other programs and start again",
                )
            })?;
        Ok(Instrument {
            place: wire::place(link),
            orders,
            words,
            wanted,
            ended,
            last: 0,
            running: false,
            thread: Some(thread),
        })
    }
}

impl Source for Instrument {
    fn place(&self) -> String {
        self.place.clone()
    }

    fn begin(&mut self, stem: &str) -> Result<(), Trouble> {
        if self.running {
            return Err(Trouble::new(
                "instrument_busy",
                "the instrument still measures",
                "wait for it, or break the measurement off",
            ));
        }
        self.last += 1;
        self.wanted.store(self.last, Ordering::SeqCst);
        let order = Order {
            number: self.last,
            stem: stem.to_owned(),
        };
        self.orders.send(order).map_err(|_| ended())?;
        self.running = true;
        Ok(())
    }

    fn cancel(&mut self) {
        self.wanted.store(0, Ordering::SeqCst);
        self.running = false;
    }

    fn next(&mut self, wait: Duration) -> Result<Event, Trouble> {
        let deadline = Instant::now() + wait;
        loop {
            let rest = deadline.saturating_duration_since(Instant::now());
            let word = match self.words.recv_timeout(rest) {
                Ok(word) => word,
                Err(RecvTimeoutError::Timeout) => return Ok(Event::Nothing),
                Err(RecvTimeoutError::Disconnected) => return Err(ended()),
            };
            if word.number != 0 && word.number != self.wanted.load(Ordering::SeqCst) {
                // Of a measurement that was broken off.
                continue;
            }
            if matches!(word.what, Err(_) | Ok(Event::Sweep(_))) {
                self.running = false;
            }
            return word.what;
        }
    }
}

impl Drop for Instrument {
    /// Leaves the instrument as after a measurement that is broken off.
    fn drop(&mut self) {
        self.ended.store(true, Ordering::SeqCst);
        self.wanted.store(0, Ordering::SeqCst);
        // It looks at `ended` many times a second. A name that is looked up or a connection that is
        // being made can take long; the run does not wait for that.
        let last = Instant::now() + Duration::from_secs(2);
        if let Some(thread) = self.thread.take() {
            while !thread.is_finished() && Instant::now() < last {
                thread::sleep(Duration::from_millis(5));
            }
        }
    }
}

fn ended() -> Trouble {
    Trouble::new(
        "instrument_given_up",
        "the conversation with the instrument has ended",
        "leave the run and take it up again",
    )
}

/// The thread's side.
struct Worker {
    link: InstrumentLink,
    layout: Layout,
    orders: Receiver<Order>,
    words: Sender<Word>,
    wanted: Arc<AtomicU64>,
    ended: Arc<AtomicBool>,
    session: Option<Session>,
    /// Whether it was said that there is no connection.
    lost: bool,
}

impl Worker {
    fn run(mut self) {
        let mut next = Instant::now();
        while !self.ended.load(Ordering::SeqCst) {
            if self.session.is_none() && Instant::now() >= next {
                let ended = Arc::clone(&self.ended);
                self.connect(0, &|| ended.load(Ordering::SeqCst));
                next = Instant::now() + AGAIN;
            }
            match self.orders.recv_timeout(Duration::from_millis(100)) {
                Ok(order) => self.measure(&order),
                Err(RecvTimeoutError::Timeout) => {}
                Err(RecvTimeoutError::Disconnected) => break,
            }
        }
        if let Some(session) = self.session.take() {
            session.abort(&self.link);
        }
    }

    fn say(&self, number: u64, what: Result<Event, Trouble>) {
        // Nobody listens once the run has ended.
        let _ = self.words.send(Word { number, what });
    }

    /// Makes a connection. What fails is said as the end of measurement `number`, or, for 0, once.
    fn connect(&mut self, number: u64, cancelled: &dyn Fn() -> bool) {
        match Session::open(&self.link, cancelled) {
            Ok(session) => {
                let place = wire::place(&self.link);
                let text = match &session.identity {
                    Some(identity) => format!("connected with {place}: {identity}"),
                    None => format!("connected with {place}"),
                };
                let event = if std::mem::take(&mut self.lost) {
                    Event::Recovered(text)
                } else {
                    Event::Step(text)
                };
                self.session = Some(session);
                self.say(0, Ok(event));
            }
            Err(Stop::Cancelled) => {}
            Err(Stop::Trouble(trouble)) => {
                let first = !std::mem::replace(&mut self.lost, true);
                if number != 0 {
                    self.say(number, Err(trouble));
                } else if first {
                    self.say(0, Ok(Event::Lost(trouble)));
                }
            }
        }
    }

    fn measure(&mut self, order: &Order) {
        let (wanted, ended) = (Arc::clone(&self.wanted), Arc::clone(&self.ended));
        let number = order.number;
        let cancelled = || ended.load(Ordering::SeqCst) || wanted.load(Ordering::SeqCst) != number;
        if cancelled() {
            return;
        }
        // A connection that was closed meanwhile, or on which something came unasked, is made anew
        // before anything is triggered.
        if self
            .session
            .as_mut()
            .is_some_and(|session| !session.is_clean())
        {
            self.session = None;
        }
        if self.session.is_none() {
            self.connect(number, &cancelled);
        }
        let Some(mut session) = self.session.take() else {
            return;
        };
        let step = |text: &str| self.say(number, Ok(Event::Step(text.to_owned())));
        let measured = session.measure(&self.link, &self.layout, &step, &cancelled);
        match measured {
            Ok(bytes) => {
                self.session = Some(session);
                self.say(number, Ok(Event::Sweep(taken(&order.stem, bytes))));
            }
            Err(stop) => {
                session.abort(&self.link);
                if let Stop::Trouble(trouble) = stop {
                    self.say(number, Err(trouble));
                }
            }
        }
    }
}

fn taken(stem: &str, bytes: Vec<u8>) -> Taken {
    let name = format!("{stem}.csv");
    Taken {
        extension: "csv".to_owned(),
        proof: Proof::Answered,
        seen: Seen {
            name: name.clone(),
            bytes: bytes.len() as u64,
            modified: 0,
            sha256: Some(sha256_hex(&bytes)),
        },
        name,
        bytes,
        replaces: None,
    }
}
