//! A small site with invented lots, and a file system that fails on demand.

use chrono::{DateTime, FixedOffset};
use reelgate::ledger::disk::{Disk, System};
use reelgate::ledger::{
    Act, Anchor, Decision, Ledger, LedgerError, Made, Object, Query, Recorded, Report, Signer,
    inputs_digest, verify,
};
use reelgate::record::LotRecord;
use serde_json::json;
use std::fs::File;
use std::io::{self, Write};
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};

pub const ORIGIN: &str = "pumpworks.example/ledger";

/// A folder of its own, in memory where the machine has such a place: most tests are about what is
/// written, not about how long the medium takes.
pub fn scratch() -> tempfile::TempDir {
    let memory = Path::new("/dev/shm");
    let folder = tempfile::tempdir_in(memory).or_else(|_| tempfile::tempdir());
    folder.expect("a folder")
}

pub fn signer() -> Signer {
    Signer::new(ORIGIN, &[7; 32]).expect("a signer")
}

pub fn engineer() -> Signer {
    Signer::new("QE-03", &[9; 32]).expect("a signer")
}

pub fn time(minute: u32) -> DateTime<FixedOffset> {
    let text = format!(
        "2026-10-05T{:02}:{:02}:00+02:00",
        6 + minute / 60,
        minute % 60
    );
    DateTime::parse_from_rfc3339(&text).expect("a time")
}

pub fn made(minute: u32) -> Made<'static> {
    Made {
        by: Some("OP-17"),
        time: time(minute),
        program: "reelgate 0.1.0",
    }
}

pub fn record(lot: &str, verdict: &str) -> LotRecord {
    serde_json::from_value(json!({
        "schema": 1, "record": format!("{lot}-0123456789ab"), "issued": "2026-10-05T09:14:03+02:00",
        "program": {"name": "reelgate", "version": "0.1.0"},
        "lot": {"lot": lot, "part": "RG-0475-X7R", "supplier": "SUP-041", "quantity": 4000,
                "measured": "2026-10-05T09:12:00+02:00", "sweeps": "sweeps", "sha256": ""},
        "limits": {"part": "RG-0475-X7R", "revision": "3", "sha256": "", "decision_rule": "simple_acceptance",
                   "coverage_factor": 2.0, "acceptance": "fixed", "characteristics": [], "conditions": []},
        "station": {"station": "BENCH-2", "sha256": "", "method": "direct", "compensation": [], "uncertainty": []},
        "verdict": verdict, "reasons": [], "warnings": [],
        "sampling": {"scheme": "fixed", "source": "", "required": 1, "presented": 1, "measured": 1,
                     "nonconforming": 0, "undecided": 0, "unmeasured": 0,
                     "nonconforming_beyond_sample": 0, "classes": {}},
        "statistics": {}, "parts": []
    }))
    .expect("a record")
}

/// Judges a lot whose sweep depends on `variant`.
pub fn judge(
    ledger: &mut Ledger,
    lot: &str,
    verdict: &str,
    variant: &str,
    minute: u32,
) -> Result<Recorded, LedgerError> {
    let mut record = record(lot, verdict);
    if !variant.is_empty() {
        record.record.push_str(variant);
    }
    let json = serde_json::to_vec(&record).expect("JSON");
    let sweep = format!("frequency,magnitude,phase\n1000,{lot},{variant}\n");
    let objects = [
        Object {
            role: "lot",
            name: "lot.yaml",
            bytes: lot.as_bytes(),
        },
        Object {
            role: "limits",
            name: "limits/parts/RG-0475-X7R.yaml",
            bytes: b"part: RG-0475-X7R\n",
        },
        Object {
            role: "sweep",
            name: "sweeps/001.csv",
            bytes: sweep.as_bytes(),
        },
    ];
    let inputs = inputs_digest(&objects);
    ledger.judged(&record, &json, &inputs, &objects, &made(minute))
}

pub fn open(records: &Path) -> Ledger {
    Ledger::open_for_writing(records, signer(), time(0)).expect("a ledger")
}

/// Records with every kind of entry; the checkpoint after each.
pub fn site(records: &Path) -> Vec<String> {
    let mut ledger = open(records);
    let mut checkpoints = Vec::new();
    let mut keep = |found: Result<Recorded, LedgerError>| {
        checkpoints.push(found.expect("an entry").checkpoint);
    };
    keep(judge(&mut ledger, "26K-0001", "accept", "", 1));
    keep(judge(&mut ledger, "26K-0002", "reject", "", 2));
    keep(judge(&mut ledger, "26K-0003", "hold", "", 3));
    keep(ledger.dispose(
        "26K-0003-0123456789ab",
        Decision::Sort,
        "one outlier",
        &made(4),
    ));
    keep(approve(&mut ledger, b"part: RG-0475-X7R\n", 5));
    keep(ledger.issued("26K-0001-0123456789ab", b"%PDF first", &made(6)));
    keep(ledger.reissued(
        "26K-0001-0123456789ab",
        b"%PDF copy",
        "the customer asks",
        &made(7),
    ));
    keep(judge(&mut ledger, "26K-0004", "accept", "", 8));
    checkpoints
}

pub const LIMITS: &str = "limits/parts/RG-0475-X7R.yaml";

pub fn approve(ledger: &mut Ledger, bytes: &[u8], minute: u32) -> Result<Recorded, LedgerError> {
    // Signed after the last approval of other bytes.
    let digest = reelgate::ledger::sha256_hex(bytes);
    let approvals = ledger.find(Query::Kind("approval"))?;
    let mut other = approvals
        .iter()
        .filter(|entry| !matches!(&entry.act, Act::Approval { sha256, .. } if *sha256 == digest));
    let statement = reelgate::ledger::approval::Statement {
        withdraws: false,
        ledger: ORIGIN.to_owned(),
        entries: other.next_back().map_or(0, |entry| entry.index + 1),
        kind: reelgate::ledger::approval::Approved::Limits,
        with: Vec::new(),
        file: LIMITS.to_owned(),
        revision: Some("3".to_owned()),
        sha256: reelgate::ledger::sha256_hex(bytes),
        meaning: "approved for use at goods-in".to_owned(),
    };
    let note = statement.sign(&engineer()).expect("a statement");
    let file = Object {
        role: "limits",
        name: LIMITS,
        bytes,
    };
    let by_engineer = Made {
        by: Some("QE-03"),
        ..made(minute)
    };
    ledger.approve(&file, &[], &note, &engineer().verifier(), &by_engineer)
}

pub fn anchor<'a>(name: &'a str, checkpoint: &'a str) -> Anchor<'a> {
    Anchor {
        name,
        checkpoint,
        claim: None,
    }
}

pub fn report(records: &Path, anchors: &[Anchor]) -> Report {
    let ledger = Ledger::open(records).expect("a ledger");
    verify(&ledger, anchors).expect("a report")
}

pub fn codes(report: &Report) -> Vec<&'static str> {
    report.findings.iter().map(|finding| finding.code).collect()
}

pub fn copy(from: &Path, to: &Path) {
    std::fs::create_dir_all(to).expect("a folder");
    for entry in std::fs::read_dir(from).expect("a folder") {
        let path = entry.expect("an entry").path();
        let target = to.join(path.file_name().expect("a name"));
        if path.is_dir() {
            copy(&path, &target);
        } else {
            std::fs::copy(&path, &target).expect("a copy");
        }
    }
}

/// Every file below a folder.
pub fn files(folder: &Path) -> Vec<PathBuf> {
    let mut out = Vec::new();
    for entry in std::fs::read_dir(folder).expect("a folder") {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            out.extend(files(&path));
        } else {
            out.push(path);
        }
    }
    out.sort();
    out
}

/// How the file system fails.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Fault {
    /// The step fails once with this error number.
    Once(i32),
    /// This step and all after it fail.
    Forever(i32),
    /// A write stops half-way, then everything fails, as if the process had ended.
    Short,
}

/// Fails at the n-th step, counted from 1.
pub struct Failing {
    pub at: u64,
    pub fault: Fault,
    pub seen: AtomicU64,
    pub struck: AtomicBool,
}

impl Failing {
    pub fn new(at: u64, fault: Fault) -> Arc<Self> {
        Arc::new(Failing {
            at,
            fault,
            seen: AtomicU64::new(0),
            struck: AtomicBool::new(false),
        })
    }

    fn strike(&self) -> io::Result<()> {
        let n = self.seen.fetch_add(1, Ordering::SeqCst) + 1;
        let (fails, errno) = match self.fault {
            Fault::Once(errno) => (n == self.at, errno),
            Fault::Forever(errno) => (n >= self.at, errno),
            Fault::Short => (n >= self.at, 5),
        };
        if fails {
            self.struck.store(true, Ordering::SeqCst);
            return Err(io::Error::from_raw_os_error(errno));
        }
        Ok(())
    }
}

impl Disk for Failing {
    fn create_folder(&self, path: &Path) -> io::Result<()> {
        self.strike()?;
        System.create_folder(path)
    }
    fn create(&self, path: &Path) -> io::Result<File> {
        self.strike()?;
        System.create(path)
    }
    fn create_private(&self, path: &Path) -> io::Result<File> {
        self.strike()?;
        System.create_private(path)
    }
    fn write(&self, file: &mut File, bytes: &[u8]) -> io::Result<()> {
        if let Err(error) = self.strike() {
            if self.fault == Fault::Short {
                file.write_all(&bytes[..bytes.len() / 2])?;
            }
            return Err(error);
        }
        System.write(file, bytes)
    }
    fn sync(&self, file: &File) -> io::Result<()> {
        self.strike()?;
        System.sync(file)
    }
    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        self.strike()?;
        System.rename(from, to)
    }
    fn sync_folder(&self, path: &Path) -> io::Result<()> {
        self.strike()?;
        System.sync_folder(path)
    }
    fn remove(&self, path: &Path) -> io::Result<()> {
        self.strike()?;
        System.remove(path)
    }
    fn step(&self, _name: &'static str) -> io::Result<()> {
        self.strike()
    }
}
