//! A site with an invented part of five, an invented station that watches a folder, and sweeps of a sample lot.

use serde_json::Value;
use std::fs;
use std::io::{Read, Write};
use std::path::{Path, PathBuf};
use std::process::{Child, Command, ExitStatus, Stdio};
use std::sync::{Arc, Mutex};
use std::thread;
use std::time::{Duration, Instant};

/// As long as a test waits for what it wants to see.
pub const PATIENCE: Duration = Duration::from_secs(120);
/// Now, as the program is told.
pub const NOW: &str = "2026-10-05T09:12:00+02:00";
/// The label of the reel, as a scanner types it.
pub const LABEL: &str = "[)>\u{1e}06\u{1d}PRG-9475-X7R\u{1d}Q400\u{1d}1T26K-9001\u{1d}10D2638\u{1d}KPO-9\u{1d}VSUP-041\u{1e}\u{4}";

const PART: &str = "part: RG-9475-X7R
revision: 2
description: 4.7 µF ±10 % 25 V X7R 0805 multilayer ceramic
conditions:
  temperature: 18 °C .. 28 °C
  date_code_age: 52 weeks
characteristics:
  capacitance: {at: 1 kHz, nominal: 4.7 µF, tolerance: ±10 %}
  esr_minimum: {max: 6 mΩ}
  srf:         {min: 2.6 MHz, max: 4.4 MHz}
acceptance:
  fixed: {sample: 5, accept: 0}
retest: {unmeasured: 1, nonconforming: 0}
";

const STATION: &str = "station: BENCH-9
instrument: {asset: FA-0101, calibrated: 2026-02-16, due: 2027-02-16}
method: direct
layout:
  columns: {frequency: \"Frequency (Hz)\", magnitude: \"|Z| (mOhm)\", phase: \"Phase (deg)\"}
uncertainty: {magnitude: 0.2 %, phase: 0.05 °, repeatability: {capacitance: 0.2 %, esr_minimum: 0.2 mΩ, srf: 0.3 %}}
watch: {folder: incoming, settle: 0.1 s}
";

pub struct Site {
    folder: tempfile::TempDir,
}

impl Site {
    pub fn new() -> Site {
        Site::with("")
    }

    /// With further keys in the station file.
    pub fn with(station: &str) -> Site {
        let site = Site {
            folder: tempfile::tempdir().expect("a folder"),
        };
        for folder in ["limits/parts", "limits/stations", "incoming"] {
            fs::create_dir_all(site.file(folder)).expect("a folder");
        }
        fs::write(site.file("limits/parts/RG-9475-X7R.yaml"), PART).expect("a limit file");
        fs::write(
            site.file("limits/stations/BENCH-9.yaml"),
            format!("{STATION}{station}"),
        )
        .expect("a station file");
        site
    }

    pub fn file(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    pub fn text(&self, name: &str) -> String {
        fs::read_to_string(self.file(name)).unwrap_or_else(|e| panic!("{name}: {e}"))
    }

    /// Files of a folder, sorted.
    pub fn list(&self, folder: &str) -> Vec<String> {
        let mut all: Vec<String> = fs::read_dir(self.file(folder))
            .unwrap_or_else(|e| panic!("{folder}: {e}"))
            .map(|e| {
                e.expect("an entry")
                    .file_name()
                    .to_string_lossy()
                    .into_owned()
            })
            .collect();
        all.sort();
        all
    }

    /// The analyser's software saves the sweep of a part of sample lot 26K-0457.
    pub fn save(&self, part: &str) {
        self.save_as(part, part);
    }

    pub fn save_as(&self, part: &str, name: &str) {
        let bytes = fs::read(format!("sample-lots/26K-0457/sweeps/{part}.csv")).expect("a sweep");
        self.put(name, &bytes);
    }

    /// A sweep of the empty jig: 2 pF.
    pub fn save_open(&self, name: &str) {
        self.put(name, open().as_bytes());
    }

    /// A sweep of a part of the lot, every |Z| by a factor.
    pub fn save_scaled(&self, part: &str, name: &str, factor: f64) {
        let path = format!("sample-lots/26K-0457/sweeps/{part}.csv");
        let text = fs::read_to_string(path).expect("a sweep");
        let scaled: String = text
            .lines()
            .map(|line| scale(line, factor) + "\n")
            .collect();
        self.put(name, scaled.as_bytes());
    }

    fn put(&self, name: &str, bytes: &[u8]) {
        let beside = self.file(&format!("{name}.tmp"));
        fs::write(&beside, bytes).expect("a sweep");
        fs::rename(beside, self.file("incoming").join(format!("{name}.csv"))).expect("a sweep");
    }

    pub fn command(&self, args: &[&str]) -> Command {
        let mut command = Command::new(env!("CARGO_BIN_EXE_reelgate"));
        command
            .args(args)
            .current_dir(self.folder.path())
            .env("REELGATE_NOW", NOW)
            .env_remove("REELGATE_SITE")
            .env_remove("REELGATE_STATION")
            .env_remove("NO_COLOR");
        command
    }

    /// Runs a command to its end: exit status and standard output.
    pub fn run(&self, args: &[&str]) -> (Option<i32>, String) {
        let output = self.command(args).output().expect("reelgate runs");
        let text = String::from_utf8_lossy(&output.stdout).into_owned();
        (output.status.code(), text)
    }

    /// The record of a lot folder, by judging it again.
    pub fn judge(&self, lot: &str) -> (Option<i32>, Value) {
        let (status, text) = self.run(&["judge", "--format", "json", &format!("lots/{lot}")]);
        (status, serde_json::from_str(&text).expect("a record"))
    }

    /// Events of a run, by name.
    pub fn events(&self, lot: &str) -> Vec<String> {
        self.text(&format!("lots/{lot}/run.jsonl"))
            .lines()
            .map(|line| {
                let line: Value = serde_json::from_str(line).expect("JSON");
                line["event"].as_str().expect("an event").to_owned()
            })
            .collect()
    }
}

fn scale(line: &str, factor: f64) -> String {
    let cells: Vec<&str> = line.split(',').collect();
    match cells.as_slice() {
        [f, z, phase] if f.parse::<f64>().is_ok() => {
            let z: f64 = z.parse().expect("a magnitude");
            format!("{f},{:e},{phase}", z * factor)
        }
        _ => line.to_owned(),
    }
}

fn open() -> String {
    let text = fs::read_to_string("sample-lots/26K-0457/sweeps/001.csv").expect("a sweep");
    let of = |line: &str| -> String {
        let cells: Vec<&str> = line.split(',').collect();
        match (cells.len(), cells[0].parse::<f64>()) {
            (3, Ok(f)) => {
                let z = 1e3 / (std::f64::consts::TAU * f * 2e-12);
                format!("{f},{z:e},-89.9")
            }
            _ => line.to_owned(),
        }
    };
    text.lines().map(|line| of(line) + "\n").collect()
}

/// The program with pipes, as a screen reader has it.
pub struct Bench {
    child: Child,
    seen: Arc<Mutex<String>>,
    /// Up to here it was looked at.
    at: usize,
}

impl Bench {
    pub fn start(site: &Site, args: &[&str]) -> Bench {
        let all = [&["bench", "--plain", "--seed", "7"], args].concat();
        let mut child = site
            .command(&all)
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("reelgate starts");
        let seen = Arc::new(Mutex::new(String::new()));
        listen(child.stdout.take().expect("a pipe"), seen.clone());
        listen(child.stderr.take().expect("a pipe"), seen.clone());
        Bench { child, seen, at: 0 }
    }

    /// A line is typed or scanned.
    pub fn line(&mut self, text: &str) {
        let pipe = self.child.stdin.as_mut().expect("a pipe");
        pipe.write_all(format!("{text}\n").as_bytes())
            .expect("a line");
        pipe.flush().expect("a line");
    }

    /// Waits until a text comes after what was seen before.
    pub fn see(&mut self, text: &str) {
        let end = Instant::now() + PATIENCE;
        loop {
            {
                let seen = self.seen.lock().expect("text");
                if let Some(found) = seen[self.at..].find(text) {
                    self.at += found + text.len();
                    return;
                }
                assert!(
                    Instant::now() < end,
                    "`{text}` did not come after:\n{}\n--- but:\n{}",
                    &seen[..self.at],
                    &seen[self.at..]
                );
            }
            thread::sleep(Duration::from_millis(10));
        }
    }

    pub fn all(&self) -> String {
        self.seen.lock().expect("text").clone()
    }

    pub fn kill(mut self) {
        self.child.kill().expect("killed");
        self.child.wait().expect("an end");
    }

    /// Closes the input and waits for the end.
    pub fn close(mut self) -> ExitStatus {
        drop(self.child.stdin.take());
        self.child.wait().expect("an end")
    }
}

fn listen(mut from: impl Read + Send + 'static, to: Arc<Mutex<String>>) {
    thread::spawn(move || {
        let mut rest: Vec<u8> = Vec::new();
        let mut buffer = [0; 4096];
        while let Ok(n) = from.read(&mut buffer) {
            if n == 0 {
                return;
            }
            rest.extend_from_slice(&buffer[..n]);
            let whole = match std::str::from_utf8(&rest) {
                Ok(_) => rest.len(),
                Err(e) => e.valid_up_to(),
            };
            let text: Vec<u8> = rest.drain(..whole).collect();
            to.lock()
                .expect("text")
                .push_str(&String::from_utf8_lossy(&text));
        }
    });
}

/// Brings a run to its first part.
pub fn go_to_first_part(bench: &mut Bench) {
    bench.see("Scan the label");
    bench.line(LABEL);
    bench.see("Enter to begin");
    bench.line("");
    bench.see("Temperature at the bench");
    bench.line("22,8");
}

pub const WHO: [&str; 4] = ["--operator", "OP-17", "--station", "BENCH-9"];

pub fn exists(path: &Path) -> bool {
    path.exists()
}
