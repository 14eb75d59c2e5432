//! The connection: orders out, answers in, each within its time.

use super::frame::{self, Frame};
use crate::bench::source::Trouble;
use crate::station::InstrumentLink;
use std::io::{self, Read, Write};
use std::net::{TcpStream, ToSocketAddrs};
use std::time::{Duration, Instant};

/// Between two looks at whether the operator has changed their mind.
const SLICE: Duration = Duration::from_millis(50);

/// How long more could come after an answer that may be whole.
const GRACE: Duration = Duration::from_millis(300);

/// An answer that flows may take longer than `timeout`, as long as it flows this fast, in bytes a
/// second: a slow trickle ends.
const FLOW: f64 = 1000.0;

/// Why a step ended.
#[derive(Debug)]
pub enum Stop {
    /// The operator has changed their mind, or the run has ended.
    Cancelled,
    /// What went wrong.
    Trouble(Trouble),
}

impl From<Trouble> for Stop {
    fn from(trouble: Trouble) -> Self {
        Stop::Trouble(trouble)
    }
}

/// A connection with an instrument.
pub struct Wire {
    stream: TcpStream,
    /// Bytes that came and belong to no answer yet.
    buffer: Vec<u8>,
    timeout: Duration,
    end: &'static str,
}

impl Wire {
    /// Connects.
    ///
    /// # Errors
    /// Nobody answers there.
    pub fn connect(link: &InstrumentLink) -> Result<Wire, Trouble> {
        let timeout = Duration::from_secs_f64(link.timeout);
        let failed = |error: io::Error| {
            let why = match error.kind() {
                io::ErrorKind::ConnectionRefused => "it refuses".to_owned(),
                io::ErrorKind::TimedOut => "nobody answers".to_owned(),
                _ => error.to_string(),
            };
            Trouble::new(
                "instrument_not_reached",
                format!("no connection with {} ({why})", place(link)),
                "see that the instrument is switched on and its cable in, and that no other program \
                 holds it; then check `tcp` in the station file",
            )
        };
        let addresses = (link.host.as_str(), link.port)
            .to_socket_addrs()
            .map_err(failed)?;
        let mut last = io::Error::new(io::ErrorKind::NotFound, "the name leads nowhere");
        for address in addresses {
            match TcpStream::connect_timeout(&address, timeout) {
                Ok(stream) => {
                    let set = stream
                        .set_nodelay(true)
                        .and_then(|()| stream.set_write_timeout(Some(timeout)))
                        .and_then(|()| stream.set_read_timeout(Some(SLICE)));
                    set.map_err(failed)?;
                    return Ok(Wire {
                        stream,
                        buffer: Vec::new(),
                        timeout,
                        end: if link.carriage_return { "\r\n" } else { "\n" },
                    });
                }
                Err(error) => last = error,
            }
        }
        Err(failed(last))
    }

    /// Whether the connection stands and is quiet: nothing came that was not asked for.
    pub fn is_clean(&mut self) -> bool {
        if !self.buffer.is_empty() || self.stream.set_nonblocking(true).is_err() {
            return false;
        }
        let mut byte = [0];
        let quiet =
            matches!(self.stream.peek(&mut byte), Err(e) if e.kind() == io::ErrorKind::WouldBlock);
        quiet && self.stream.set_nonblocking(false).is_ok()
    }

    /// Sends a message.
    ///
    /// # Errors
    /// The connection is broken.
    pub fn send(&mut self, message: &str) -> Result<(), Trouble> {
        let text = format!("{message}{}", self.end);
        self.stream
            .write_all(text.as_bytes())
            .map_err(|error| broken(&format!("`{message}` could not be sent ({error})")))
    }

    /// Asks a question whose answer is a line of text.
    ///
    /// # Errors
    /// No answer within `longest` (`None`: the usual time), or more than one.
    pub fn ask(
        &mut self,
        query: &str,
        longest: Option<Duration>,
        cancelled: &dyn Fn() -> bool,
    ) -> Result<String, Stop> {
        self.send(query)?;
        let longest = longest.unwrap_or(self.timeout);
        let bytes = self.answer(query, longest, &|bytes| Ok(frame::line(bytes)), cancelled)?;
        Ok(String::from_utf8_lossy(&bytes).into_owned())
    }

    /// Asks a question and takes the answer as `border` finds it.
    ///
    /// # Errors
    /// No answer within the usual time, or a wrong one.
    pub fn fetch(
        &mut self,
        query: &str,
        border: &dyn Fn(&[u8]) -> Result<Frame, Trouble>,
        cancelled: &dyn Fn() -> bool,
    ) -> Result<Vec<u8>, Stop> {
        self.send(query)?;
        self.answer(query, self.timeout, border, cancelled)
    }

    fn answer(
        &mut self,
        query: &str,
        longest: Duration,
        border: &dyn Fn(&[u8]) -> Result<Frame, Trouble>,
        cancelled: &dyn Fn() -> bool,
    ) -> Result<Vec<u8>, Stop> {
        let named = |trouble: Trouble| Trouble {
            text: format!("the answer to `{query}`: {}", trouble.text),
            ..trouble
        };
        let began = Instant::now();
        let mut came = began;
        let mut piece = vec![0; 64 << 10];
        loop {
            let whole = match border(&self.buffer).map_err(named)? {
                Frame::Whole { contents, end } => Some((contents, end)),
                Frame::Perhaps { contents, end } if came.elapsed() >= GRACE => {
                    Some((contents, end))
                }
                Frame::Perhaps { .. } | Frame::Open => None,
            };
            if let Some((contents, end)) = whole {
                if end < self.buffer.len() {
                    let more = self.buffer.len() - end;
                    return Err(named(Trouble::new(
                        "answer_wrong",
                        format!("{more} bytes more than one answer"),
                        "something was asked twice, or another program uses the instrument too: \
                         measure again",
                    ))
                    .into());
                }
                let bytes = self.buffer.get(contents).unwrap_or_default().to_vec();
                self.buffer.clear();
                return Ok(bytes);
            }
            if cancelled() {
                return Err(Stop::Cancelled);
            }
            if self.buffer.len() > frame::LONGEST {
                return Err(named(Trouble::new(
                    "answer_wrong",
                    format!("more than {} bytes and no end", frame::LONGEST),
                    "a sweep is smaller: check the question in the station file",
                ))
                .into());
            }
            let flowing = Duration::from_secs_f64(self.buffer.len() as f64 / FLOW);
            if began.elapsed() > longest + flowing {
                return Err(silent(query, longest, self.buffer.len()).into());
            }
            match self.stream.read(&mut piece) {
                Ok(0) => {
                    return Err(
                        broken(&format!("it was closed while `{query}` was answered")).into(),
                    );
                }
                Ok(count) => {
                    came = Instant::now();
                    self.buffer
                        .extend_from_slice(piece.get(..count).unwrap_or_default());
                }
                Err(error) if is_only_slow(&error) => {}
                Err(error) => {
                    return Err(broken(&format!("`{query}` was not answered ({error})")).into());
                }
            }
        }
    }
}

fn is_only_slow(error: &io::Error) -> bool {
    use io::ErrorKind::{Interrupted, TimedOut, WouldBlock};
    matches!(error.kind(), WouldBlock | TimedOut | Interrupted)
}

fn silent(query: &str, longest: Duration, bytes: usize) -> Trouble {
    let seconds = longest.as_secs_f64();
    let text = match bytes {
        0 => format!("no answer to `{query}` within {seconds} s"),
        _ => format!("the answer to `{query}` stops after {bytes} bytes"),
    };
    Trouble::new(
        "instrument_silent",
        text,
        "see whether the instrument shows an error, and its cable; then measure again",
    )
}

fn broken(what: &str) -> Trouble {
    Trouble::new(
        "connection_broken",
        format!("the connection with the instrument is broken: {what}"),
        "check cable and instrument, then measure this part again: nothing of the broken sweep is kept",
    )
}

/// The instrument, to stand in a sentence.
pub fn place(link: &InstrumentLink) -> String {
    let host = &link.host;
    match host.contains(':') {
        true => format!("the instrument at [{host}]:{}", link.port),
        false => format!("the instrument at {host}:{}", link.port),
    }
}
