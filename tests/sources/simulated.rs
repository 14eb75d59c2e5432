//! An instrument that is none: a server that speaks as IEEE 488.2 says, and makes mistakes when told.

use std::collections::VecDeque;
use std::io::{BufRead, BufReader, Write};
use std::net::{TcpListener, TcpStream};
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex};
use std::thread;
use std::time::Duration;

/// Points of its sweep.
pub const POINTS: usize = 60;

/// What goes wrong at the next question of that kind.
#[derive(Debug, Clone)]
pub enum Fault {
    /// No answer.
    Silent,
    /// The connection ends before the answer.
    Close,
    /// The connection ends within the answer.
    CloseWithin,
    /// Half of the answer, and no more.
    Half,
    /// One byte now and then.
    Trickle,
    /// These bytes in place of the answer.
    Instead(Vec<u8>),
    /// These bytes after the answer.
    Then(Vec<u8>),
    /// The answer in pieces with pauses.
    Pieces,
}

/// What it shares with its threads.
#[derive(Default)]
struct Shared {
    faults: Mutex<VecDeque<(String, Fault)>>,
    heard: Mutex<Vec<String>>,
    errors: Mutex<VecDeque<String>>,
    ended: AtomicBool,
}

/// The server; it ends with the value.
pub struct Simulated {
    shared: Arc<Shared>,
    /// Where it listens.
    pub port: u16,
    thread: Option<thread::JoinHandle<()>>,
}

impl Simulated {
    pub fn new() -> Simulated {
        Simulated::at(0)
    }

    /// At a port that was used before, or, for 0, at any.
    pub fn at(port: u16) -> Simulated {
        let mut last = None;
        let listener = (0..100)
            .find_map(|_| match TcpListener::bind(("127.0.0.1", port)) {
                Ok(listener) => Some(listener),
                Err(error) => {
                    last = Some(error);
                    thread::sleep(Duration::from_millis(50));
                    None
                }
            })
            .unwrap_or_else(|| panic!("port {port}: {last:?}"));
        let port = listener.local_addr().expect("an address").port();
        listener.set_nonblocking(true).expect("set");
        let shared = Arc::new(Shared::default());
        let inner = Arc::clone(&shared);
        let thread = thread::spawn(move || {
            let mut connections = Vec::new();
            while !inner.ended.load(Ordering::SeqCst) {
                match listener.accept() {
                    Ok((stream, _)) => {
                        let shared = Arc::clone(&inner);
                        connections.push(thread::spawn(move || serve(&stream, &shared)));
                    }
                    Err(_) => thread::sleep(Duration::from_millis(5)),
                }
            }
            // It is off when every connection has ended.
            for connection in connections {
                connection.join().expect("a connection");
            }
        });
        Simulated {
            shared,
            port,
            thread: Some(thread),
        }
    }

    /// Something goes wrong at the next `query`.
    pub fn fault(&self, query: &str, fault: Fault) {
        let mut faults = self.shared.faults.lock().expect("the faults");
        faults.push_back((query.to_owned(), fault));
    }

    /// An error stands in the queue.
    pub fn error(&self, text: &str) {
        let mut errors = self.shared.errors.lock().expect("the errors");
        errors.push_back(text.to_owned());
    }

    /// What was sent to it since the last call.
    pub fn heard(&self) -> Vec<String> {
        std::mem::take(&mut *self.shared.heard.lock().expect("what it heard"))
    }
}

impl Drop for Simulated {
    fn drop(&mut self) {
        self.shared.ended.store(true, Ordering::SeqCst);
        if let Some(thread) = self.thread.take() {
            thread.join().expect("the listener");
        }
    }
}

fn serve(stream: &TcpStream, shared: &Shared) {
    // A question every 50 ms whether the test has ended.
    stream
        .set_read_timeout(Some(Duration::from_millis(50)))
        .expect("set");
    let mut lines = BufReader::new(stream);
    let mut line = String::new();
    while !shared.ended.load(Ordering::SeqCst) {
        match lines.read_line(&mut line) {
            Ok(0) => return,
            Ok(_) => {}
            Err(e)
                if matches!(
                    e.kind(),
                    std::io::ErrorKind::WouldBlock | std::io::ErrorKind::TimedOut
                ) =>
            {
                continue;
            }
            Err(_) => return,
        }
        let message = std::mem::take(&mut line).trim_end().to_owned();
        shared
            .heard
            .lock()
            .expect("what it heard")
            .push(message.clone());
        let Some(answer) = answer(&message, shared) else {
            continue;
        };
        let fault = {
            let mut faults = shared.faults.lock().expect("the faults");
            let matches = faults.front().is_some_and(|(query, _)| *query == message);
            if matches {
                faults.pop_front().map(|(_, fault)| fault)
            } else {
                None
            }
        };
        if !reply(stream, shared, &answer, fault) {
            let _ = stream.shutdown(std::net::Shutdown::Both);
            return;
        }
    }
}

/// False where the connection ends.
fn reply(mut stream: &TcpStream, shared: &Shared, answer: &[u8], fault: Option<Fault>) -> bool {
    let pause = || thread::sleep(Duration::from_millis(30));
    let half = &answer[..answer.len() / 2];
    match fault {
        None => stream.write_all(answer).is_ok(),
        Some(Fault::Silent) => true,
        Some(Fault::Close) => false,
        Some(Fault::CloseWithin) => {
            let _ = stream.write_all(half);
            false
        }
        Some(Fault::Half) => stream.write_all(half).is_ok(),
        Some(Fault::Trickle) => {
            for byte in answer {
                if shared.ended.load(Ordering::SeqCst) || stream.write_all(&[*byte]).is_err() {
                    return false;
                }
                pause();
            }
            true
        }
        Some(Fault::Instead(bytes)) => stream.write_all(&bytes).is_ok(),
        Some(Fault::Then(bytes)) => stream.write_all(&[answer, &bytes].concat()).is_ok(),
        Some(Fault::Pieces) => answer.chunks(answer.len() / 3 + 1).all(|piece| {
            pause();
            stream.write_all(piece).is_ok()
        }),
    }
}

/// Frequencies of its sweep, Hz; every one is a number of 32 bits.
pub fn frequencies() -> Vec<f64> {
    (0..POINTS).map(|i| 1000.0 * (i + 1) as f64).collect()
}

/// Resistance and reactance of its part at each of them, Ω; all of them numbers of 32 bits.
pub fn impedances() -> Vec<(f64, f64)> {
    let reactance = |f: f64| f64::from((-1.0 / (std::f64::consts::TAU * f * 100e-9)) as f32);
    let frequencies = frequencies();
    frequencies
        .iter()
        .map(|f| (0.03125, reactance(*f)))
        .collect()
}

fn answer(message: &str, shared: &Shared) -> Option<Vec<u8>> {
    let text = |values: &[f64]| {
        let words: Vec<String> = values.iter().map(|v| format!("{v:+E}")).collect();
        format!("{}\n", words.join(",")).into_bytes()
    };
    let block = |bytes: Vec<u8>| {
        let length = bytes.len().to_string();
        let mut all = format!("#{}{length}", length.len()).into_bytes();
        all.extend(bytes);
        all.push(b'\n');
        all
    };
    let turns: Vec<f64> = impedances().iter().flat_map(|(r, x)| [*r, *x]).collect();
    Some(match message {
        "*IDN?" => b"made up,no model,FA-0112,1\n".to_vec(),
        "*OPC?" => b"+1\n".to_vec(),
        "ERR?" => {
            let next = shared.errors.lock().expect("the errors").pop_front();
            format!("{}\n", next.unwrap_or_else(|| "+0,\"No error\"".to_owned())).into_bytes()
        }
        "F:ASC?" => text(&frequencies()),
        "F:HZ?" => {
            let words: Vec<String> = frequencies()
                .iter()
                .map(|f| format!("{} kHz", f / 1e3))
                .collect();
            format!("{}\n", words.join(", ")).into_bytes()
        }
        "Z:ASC?" => text(&turns),
        "F:R64L?" => block(frequencies().iter().flat_map(|v| v.to_le_bytes()).collect()),
        "Z:R32B?" => block(
            turns
                .iter()
                .flat_map(|v| (*v as f32).to_be_bytes())
                .collect(),
        ),
        "Z:R32L?" => block(
            turns
                .iter()
                .flat_map(|v| (*v as f32).to_le_bytes())
                .collect(),
        ),
        "Z:R64B?" => block(turns.iter().flat_map(|v| v.to_be_bytes()).collect()),
        "Z:R64L?" => block(turns.iter().flat_map(|v| v.to_le_bytes()).collect()),
        "Z:UNTIL?" => {
            let mut all = b"#0".to_vec();
            all.extend(turns.iter().flat_map(|v| v.to_be_bytes()));
            all.push(b'\n');
            all
        }
        // Resistance, a flag of no use, reactance.
        "Z:FLAG?" => {
            let words: Vec<String> = impedances()
                .iter()
                .map(|(r, x)| format!("{r},OK,{x}"))
                .collect();
            format!("{}\r\n", words.join(",")).into_bytes()
        }
        _ if message.ends_with('?') => return None,
        _ => return None,
    })
}
