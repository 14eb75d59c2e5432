//! The embedded store: SQLite, one file, rollback journal.
//!
//! `journal_mode=DELETE` with `synchronous=EXTRA`: an acknowledged row survives a power cut (SQLite
//! documentation, PRAGMA synchronous: with FULL the removal of the journal may be lost, and the
//! last transaction with it). The SQLite compiled in must not be older than 3.51.3.

mod check;
mod connection;
mod rows;

use self::check::{integrity, schema_differences};
use self::connection::{
    connect, database, expect_version, migrate, missing, read_identity, refuse_unfit,
    schema_version, uncertain,
};
use self::rows::{View, insert};
use super::disk::Disk;
use super::error::LedgerError;
use super::schema::{APPLICATION_ID, VERSION};
use super::store::{Decided, Identity, Query, Reader, Row, Store};
use rusqlite::{Connection, TransactionBehavior};
use std::fs::{File, TryLockError};
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// The oldest SQLite that may write a ledger (3.51.3).
const OLDEST: i32 = 3_051_003;

/// How often and how long the second lock is tried: two seconds in all.
const SECOND_LOCK_TRIES: u32 = 100;
const SECOND_LOCK_PAUSE: std::time::Duration = std::time::Duration::from_millis(20);

/// A ledger in an SQLite file.
pub struct SqliteStore {
    connection: Connection,
    path: PathBuf,
    disk: Arc<dyn Disk>,
    identity: Identity,
}

/// Whether a store may be written.
#[derive(Debug, Clone)]
pub(super) enum Access<'a> {
    /// For looking only; the file is not touched.
    Read,
    /// For appending; where there is no ledger yet, one of this identity is made.
    Write(&'a Identity),
}

impl SqliteStore {
    /// Opens `records/ledger.sqlite`.
    pub(super) fn open(
        records: &Path,
        access: &Access,
        disk: Arc<dyn Disk>,
    ) -> Result<Self, LedgerError> {
        let path = records.join(FILE);
        if rusqlite::version_number() < OLDEST {
            return Err(LedgerError::Refused(format!(
                "the SQLite in this program is {}, older than 3.51.3",
                rusqlite::version()
            )));
        }
        let mut connection = connect(&path, access)?;
        let empty = schema_version(&connection, &path)? == (0, 0);
        match access {
            Access::Read if empty => return Err(missing(&path)),
            Access::Write(identity) => {
                refuse_unfit(records)?;
                migrate(&mut connection, &path, identity)?;
            }
            Access::Read => {}
        }
        expect_version(&connection, &path)?;
        let identity = read_identity(&connection, &path)?;
        Ok(SqliteStore {
            connection,
            path,
            disk,
            identity,
        })
    }

    fn step(&self, name: &'static str) -> Result<(), LedgerError> {
        self.disk
            .step(name)
            .map_err(|e| LedgerError::io(name, &self.path, e))
    }

    /// The second lock, which must be free while the database is held: where it is not, one of the
    /// two locks does not keep processes apart.
    fn second_lock(&self) -> Result<File, LedgerError> {
        let path = self.path.with_file_name("ledger.lock");
        let file = File::options()
            .create(true)
            .truncate(false)
            .write(true)
            .open(&path)
            .map_err(|e| LedgerError::io("opening the lock file", &path, e))?;
        // A process started by another thread holds a copy of every lock from its birth until it
        // runs its own program: a lock that is taken for a moment says nothing yet.
        for _ in 0..SECOND_LOCK_TRIES {
            match file.try_lock() {
                Ok(()) => return Ok(file),
                Err(TryLockError::WouldBlock) => std::thread::sleep(SECOND_LOCK_PAUSE),
                Err(TryLockError::Error(error)) => {
                    return Err(LedgerError::Locks {
                        path: self.path.clone(),
                        why: format!("this file system gives no locks ({error})"),
                    });
                }
            }
        }
        Err(LedgerError::Locks {
            path: self.path.clone(),
            why: "two processes hold the ledger at the same time on this file system".to_owned(),
        })
    }

    /// Reads the row from the file through a connection of its own and compares.
    fn read_back(&self, row: &Row) -> Result<(), LedgerError> {
        let connection = connect(&self.path, &Access::Read)?;
        let found = View {
            connection: &connection,
            path: &self.path,
        }
        .row(row.index)?;
        if found.as_ref() == Some(row) {
            return Ok(());
        }
        Err(LedgerError::damaged(
            format!("{}: entry {}", self.path.display(), row.index),
            "what was written is not what is read back",
        ))
    }
}

/// The ledger's file in the records folder.
pub const FILE: &str = "ledger.sqlite";

impl Reader for SqliteStore {
    fn size(&self) -> Result<u64, LedgerError> {
        self.view().size()
    }

    fn row(&self, index: u64) -> Result<Option<Row>, LedgerError> {
        self.view().row(index)
    }

    fn find(&self, query: Query) -> Result<Vec<u64>, LedgerError> {
        self.view().find(query)
    }

    fn each(
        &self,
        from: u64,
        visit: &mut dyn FnMut(Result<Row, LedgerError>) -> Result<(), LedgerError>,
    ) -> Result<(), LedgerError> {
        self.view().each(from, visit)
    }
}

impl SqliteStore {
    fn view(&self) -> View<'_> {
        View {
            connection: &self.connection,
            path: &self.path,
        }
    }
}

impl Store for SqliteStore {
    fn identity(&self) -> &Identity {
        &self.identity
    }

    fn append(
        &mut self,
        decide: &mut dyn FnMut(&dyn Reader) -> Result<Decided, LedgerError>,
    ) -> Result<Row, LedgerError> {
        self.step("beginning the act")?;
        let path = self.path.clone();
        let at = |doing| move |e| database(doing, &path, &e);
        let held =
            rusqlite::Transaction::new_unchecked(&self.connection, TransactionBehavior::Immediate)
                .map_err(at.clone()("holding the ledger"))?;
        let lock = self.second_lock()?;
        let row = match decide(&self.view())? {
            Decided::Before(index) => {
                let row = self.view().row(index)?;
                return row.ok_or_else(|| gone(index));
            }
            Decided::New(row) => row,
        };
        self.step("inserting the entry")?;
        insert(&held, &row).map_err(at.clone()("inserting the entry"))?;
        self.step("committing the entry")?;
        // Given up before the commit: until then nobody else can hold the ledger.
        drop(lock);
        held.commit().map_err(|e| uncertain(&self.path, &e))?;
        self.step("reading the entry back")?;
        self.read_back(&row)
            .map_err(LedgerError::after_the_commit)?;
        Ok(row)
    }

    fn check(&self) -> Result<Vec<String>, LedgerError> {
        let mut wrong = Vec::new();
        let (application, version) = schema_version(&self.connection, &self.path)?;
        if application != APPLICATION_ID || version != VERSION {
            wrong.push(format!(
                "application {application:#x} and version {version} instead of \
                 {APPLICATION_ID:#x} and {VERSION}"
            ));
        }
        wrong.extend(schema_differences(&self.connection).map_err(|e| self.reading(&e))?);
        wrong.extend(integrity(&self.connection).unwrap_or_else(|e| vec![e.to_string()]));
        Ok(wrong)
    }
}

impl SqliteStore {
    fn reading(&self, error: &rusqlite::Error) -> LedgerError {
        database("reading the ledger", &self.path, error)
    }
}

fn gone(index: u64) -> LedgerError {
    LedgerError::damaged(
        format!("entry {index}"),
        "an index names it, but it is not there",
    )
}
