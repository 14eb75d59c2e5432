//! Threads that bring in what comes from outside: lines, keys, sweeps.

use super::front::In;
use crate::bench::source::{Event, Folder, Instrument, Seen, Source, Trouble};
use crate::station::Station;
use std::io::BufRead;
use std::path::Path;
use std::sync::mpsc::{Receiver, Sender, TryRecvError};
use std::thread;
use std::time::Duration;

/// The longest line that is taken whole; a label is far shorter.
const LONGEST_LINE: u64 = 64 * 1024;
/// So long a source waits before it looks whether it is wanted for something else.
const PATIENCE: Duration = Duration::from_millis(50);

/// Lines of standard input, until it ends.
pub fn lines(to: Sender<In>) {
    thread::spawn(move || {
        let mut input = std::io::BufReader::new(std::io::stdin());
        loop {
            let mut bytes = Vec::new();
            let mut one = std::io::Read::take(&mut input, LONGEST_LINE);
            match one.read_until(b'\n', &mut bytes) {
                Ok(0) | Err(_) => break,
                Ok(_) => {}
            }
            // The last line without its end was cut off with the input.
            if !bytes.ends_with(b"\n") && (bytes.len() as u64) < LONGEST_LINE {
                break;
            }
            let line = String::from_utf8_lossy(&bytes);
            let line = line.trim_end_matches(['\r', '\n']).to_owned();
            if to.send(In::Line(line)).is_err() {
                return;
            }
        }
        let _ = to.send(In::Eof);
    });
}

/// Events of the terminal.
pub fn terminal(to: Sender<In>) {
    thread::spawn(move || {
        while let Ok(event) = ratatui::crossterm::event::read() {
            if to.send(In::Terminal(event)).is_err() {
                return;
            }
        }
        let _ = to.send(In::Eof);
    });
}

/// What a source is told to do.
pub enum Wish {
    /// Measure what is in the jig, under this name.
    Begin(String),
    #[allow(missing_docs)]
    Cancel,
}

/// What comes from a source, until nobody listens any more.
pub fn sweeps(mut source: Box<dyn Source + Send>, wishes: Receiver<Wish>, to: Sender<In>) {
    thread::spawn(move || {
        loop {
            let begun = match wishes.try_recv() {
                Ok(Wish::Begin(stem)) => source.begin(&stem),
                Ok(Wish::Cancel) => {
                    source.cancel();
                    Ok(())
                }
                Err(TryRecvError::Empty) => Ok(()),
                Err(TryRecvError::Disconnected) => return,
            };
            let come = match begun {
                Ok(()) => source.next(PATIENCE),
                Err(trouble) => Err(trouble),
            };
            let quiet = matches!(come, Ok(Event::Nothing));
            let failed = come.is_err();
            if !quiet && to.send(In::Source(come)).is_err() {
                return;
            }
            if failed {
                thread::sleep(PATIENCE);
            }
        }
    });
}

/// A source that is open.
pub struct Opened {
    #[allow(missing_docs)]
    pub source: Box<dyn Source + Send>,
    /// Sweeps come without being asked for.
    pub hands_free: bool,
    /// What lay in the folder before.
    pub baseline: Option<Vec<Seen>>,
}

/// The trouble of a station without a source.
pub fn no_source(station: &str) -> Trouble {
    Trouble::new(
        "no_source",
        format!("the station file {station} does not say where sweeps come from"),
        "the quality engineer adds `watch` or `instrument_link` to it",
    )
}

/// Opens what the station file names: the instrument, or else the watched folder.
///
/// `known` is what a run that is resumed has seen.
///
/// # Errors
/// What is wrong with it; a station that names neither.
pub fn open(root: &Path, station: &Station, known: Option<&[Seen]>) -> Result<Opened, Trouble> {
    if let Some(link) = &station.instrument_link {
        return Ok(Opened {
            source: Box::new(Instrument::open(link, station)?),
            hands_free: false,
            baseline: None,
        });
    }
    let Some(watch) = &station.watch else {
        return Err(no_source(&station.name));
    };
    let folder = Folder::open(&root.join(&watch.folder), watch, station, known)?;
    let baseline = known.is_none().then(|| folder.baseline().to_vec());
    Ok(Opened {
        source: Box::new(folder),
        hands_free: true,
        baseline,
    })
}
