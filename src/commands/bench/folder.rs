//! A run on the disk: the lot folder with its journal, sweeps and checks.

use crate::bench::event::{Event, Line, decode, encode};
use crate::commands::store::write_whole;
use std::fs::{self, File, OpenOptions, TryLockError};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// The journal's name in the lot folder.
pub const JOURNAL: &str = "run.jsonl";

/// A run that is held by this process.
#[derive(Debug)]
pub struct Folder {
    path: PathBuf,
    journal: File,
}

/// Why a run cannot be held or written.
#[derive(Debug)]
pub enum Stuck {
    #[allow(missing_docs)]
    Io(PathBuf, io::Error),
    /// Another process holds it.
    Held,
    /// A line that is none: its number and why.
    Damaged(PathBuf, usize, String),
}

impl std::fmt::Display for Stuck {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Stuck::Io(path, error) => write!(
                f,
                "{}: {error}. Nothing more can be kept: make room or mend the folder, then run the same command again",
                path.display()
            ),
            Stuck::Held => f.write_str(
                "this lot is being measured at another place: finish it there, or end that program",
            ),
            Stuck::Damaged(path, line, why) => write!(
                f,
                "{}: line {line} is damaged ({why}): call the quality engineer; the sweeps beside it are whole",
                path.display()
            ),
        }
    }
}

impl Folder {
    /// Opens the journal of a lot, makes it where there is none, and keeps others away from it.
    ///
    /// # Errors
    /// Those of the disk, another process that holds it, a line that is none.
    pub fn hold(path: &Path) -> Result<(Folder, Vec<Line>), Stuck> {
        let wrong = |e| Stuck::Io(path.to_owned(), e);
        let new = !path.join(JOURNAL).exists();
        fs::create_dir_all(path.join("sweeps")).map_err(wrong)?;
        let name = path.join(JOURNAL);
        let journal = OpenOptions::new()
            .create(true)
            .read(true)
            .append(true)
            .open(&name)
            .map_err(wrong)?;
        match journal.try_lock() {
            Ok(()) => {}
            Err(TryLockError::WouldBlock) => return Err(Stuck::Held),
            Err(TryLockError::Error(error)) => return Err(wrong(error)),
        }
        let bytes = fs::read(&name).map_err(wrong)?;
        let (lines, whole) = decode(&bytes).map_err(|(n, why)| Stuck::Damaged(name, n, why))?;
        if whole < bytes.len() {
            journal.set_len(whole as u64).map_err(wrong)?;
            journal.sync_all().map_err(wrong)?;
        }
        if new {
            crate::commands::store::sync_folder(path).map_err(wrong)?;
            if let Some(above) = path.parent() {
                crate::commands::store::sync_folder(above).map_err(wrong)?;
            }
        }
        let folder = Folder {
            path: path.to_owned(),
            journal,
        };
        folder.sweep_up();
        Ok((folder, lines))
    }

    /// Removes what a write that was cut off has left.
    fn sweep_up(&self) {
        for below in ["sweeps", "checks"] {
            let entries = fs::read_dir(self.path.join(below)).into_iter().flatten();
            for path in entries.flatten().map(|e| e.path()) {
                if path.extension().is_some_and(|e| e == "part") {
                    let _ = fs::remove_file(path);
                }
            }
        }
    }

    #[allow(missing_docs)]
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Adds a line; it is on the disk when this returns.
    ///
    /// # Errors
    /// Those of the disk.
    pub fn record(&mut self, at: String, event: Event) -> Result<Line, Stuck> {
        let line = Line { at, event };
        let wrong = |e| Stuck::Io(self.path.join(JOURNAL), e);
        let bytes = encode(&line).map_err(|e| wrong(io::Error::other(e)))?;
        self.journal.write_all(&bytes).map_err(wrong)?;
        self.journal.sync_data().map_err(wrong)?;
        Ok(line)
    }

    /// Keeps a file whole; it is on the disk when this returns.
    ///
    /// # Errors
    /// Those of the disk.
    pub fn keep(&self, name: &str, bytes: &[u8]) -> Result<(), Stuck> {
        let path = self.path.join(name);
        write_whole(&path, bytes).map_err(|e| Stuck::Io(path, e))
    }

    /// A file of the run.
    ///
    /// # Errors
    /// Those of the disk.
    pub fn read(&self, name: &str) -> Result<Vec<u8>, Stuck> {
        let path = self.path.join(name);
        fs::read(&path).map_err(|e| Stuck::Io(path, e))
    }

    /// The file with this stem in a folder of the run, whatever its extension: its name in the run.
    pub fn with_stem(&self, below: &str, stem: &str) -> Option<String> {
        let entries = fs::read_dir(self.path.join(below)).ok()?;
        entries
            .flatten()
            .map(|e| e.file_name().to_string_lossy().into_owned())
            .find(|name| {
                name.rsplit_once('.')
                    .is_some_and(|(s, e)| s == stem && e != "part")
            })
            .map(|name| format!("{below}/{name}"))
    }

    /// A name in a folder of the run that is not taken.
    pub fn free_name(&self, below: &str, name: &str) -> String {
        let mut safe: String = name
            .chars()
            .map(|c| {
                if c.is_ascii_alphanumeric() || "-_.+~".contains(c) {
                    c
                } else {
                    '-'
                }
            })
            .collect();
        safe = safe.trim_start_matches('.').chars().take(80).collect();
        (1..)
            .map(|n| format!("{below}/{n:03}-{safe}"))
            .find(|name| !self.path.join(name).exists())
            .unwrap_or_default()
    }
}

/// The lines of a journal, read without holding it; `None` where there is none that can be read.
pub fn peek(path: &Path) -> Option<Vec<Line>> {
    let bytes = fs::read(path.join(JOURNAL)).ok()?;
    decode(&bytes).ok().map(|(lines, _)| lines)
}
