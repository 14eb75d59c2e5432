//! What can go wrong with the records, in words that say what to do.

use std::fmt;
use std::io;
use std::path::{Path, PathBuf};

/// A failure of ledger or archive.
#[derive(Debug)]
#[allow(missing_docs)]
pub enum LedgerError {
    /// A file operation failed.
    Io {
        doing: &'static str,
        path: PathBuf,
        source: io::Error,
    },
    /// The database reported an error; no entry was made, unless `outcome_unknown`.
    Database {
        doing: &'static str,
        path: PathBuf,
        text: String,
        /// The error came at a point where the entry may or may not be in the ledger. Doing the
        /// same again is safe: it answers with the entry where there is one.
        outcome_unknown: bool,
    },
    /// Another process held the ledger for too long.
    Busy { path: PathBuf },
    /// Two processes were given the same lock, or the file system is known not to keep locks.
    Locks { path: PathBuf, why: String },
    /// There is no ledger, though there should be one.
    Missing { path: PathBuf, why: String },
    /// The file is not a ledger of this program, or of a later version.
    Foreign { path: PathBuf, why: String },
    /// What is there is not what was written.
    Damaged { what: String, why: String },
    /// The key is not the one of this ledger.
    Key(String),
    /// What was to be recorded rested on what the ledger said, and it has grown meanwhile.
    Overtaken,
    /// What was to be recorded cannot be.
    Refused(String),
}

impl LedgerError {
    pub(super) fn io(doing: &'static str, path: &Path, source: io::Error) -> Self {
        LedgerError::Io {
            doing,
            path: path.to_owned(),
            source,
        }
    }

    /// The same error where it came when the entry had been made: nobody may be told that none was.
    pub(super) fn after_the_commit(mut self) -> Self {
        if let LedgerError::Database {
            outcome_unknown, ..
        } = &mut self
        {
            *outcome_unknown = true;
        }
        self
    }

    pub(super) fn damaged(what: impl Into<String>, why: impl Into<String>) -> Self {
        LedgerError::Damaged {
            what: what.into(),
            why: why.into(),
        }
    }
}

impl fmt::Display for LedgerError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            LedgerError::Io {
                doing,
                path,
                source,
            } => write!(f, "{}: {doing} failed: {source}", path.display()),
            LedgerError::Database {
                doing,
                path,
                text,
                outcome_unknown,
            } => {
                write!(f, "{}: {doing} failed: {text}", path.display())?;
                let hint = if *outcome_unknown {
                    "; whether the entry was made is not known: do the same again, it answers with \
                     the entry that is there"
                } else {
                    "; no entry was made"
                };
                f.write_str(hint)
            }
            LedgerError::Busy { path } => write!(
                f,
                "{}: another process has held the ledger for too long: wait for it, or end it, and \
                 try again",
                path.display()
            ),
            LedgerError::Locks { path, why } => write!(
                f,
                "{}: {why}, where the locks that keep two writers apart cannot be relied on: keep \
                 the records on a local disk (certificates and witness files may go to a share)",
                path.display()
            ),
            LedgerError::Missing { path, why } => {
                write!(f, "{}: no ledger: {why}", path.display())
            }
            LedgerError::Foreign { path, why } => write!(f, "{}: {why}", path.display()),
            LedgerError::Damaged { what, why } => {
                write!(f, "{what}: {why}: verify the records before going on")
            }
            LedgerError::Overtaken => f.write_str(
                "something else was recorded at the same moment: nothing was recorded; do the same again",
            ),
            LedgerError::Key(why) | LedgerError::Refused(why) => f.write_str(why),
        }
    }
}

impl std::error::Error for LedgerError {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        match self {
            LedgerError::Io { source, .. } => Some(source),
            _ => None,
        }
    }
}
