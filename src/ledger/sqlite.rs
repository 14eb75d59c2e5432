//! The embedded store: SQLite, one file, rollback journal.
//!
//! `journal_mode=DELETE` with `synchronous=EXTRA`: an acknowledged row survives a power cut (SQLite
//! documentation, PRAGMA synchronous: with FULL the removal of the journal may be lost, and the
//! last transaction with it). The SQLite compiled in must not be older than 3.51.3.

use super::disk::{self, Disk};
use super::entry::ObjectRef;
use super::error::LedgerError;
use super::schema::{APPLICATION_ID, MIGRATIONS, VERSION};
use super::store::{Decided, Identity, Query, Reader, Row, Store};
use rusqlite::config::DbConfig;
use rusqlite::{Connection, ErrorCode, OpenFlags, Statement, TransactionBehavior, params};
use std::fs::{File, TryLockError};
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::Duration;

/// The oldest SQLite that may write a ledger (3.51.3).
const OLDEST: i32 = 3_051_003;
/// How long to wait for another process.
const PATIENCE: Duration = Duration::from_secs(60);

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
        match file.try_lock() {
            Ok(()) => Ok(file),
            Err(TryLockError::WouldBlock) => Err(LedgerError::Locks {
                path: self.path.clone(),
                why: "two processes hold the ledger at the same time on this file system"
                    .to_owned(),
            }),
            Err(TryLockError::Error(error)) => Err(LedgerError::Locks {
                path: self.path.clone(),
                why: format!("this file system gives no locks ({error})"),
            }),
        }
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
        self.read_back(&row)?;
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

/// The rows as one connection sees them.
struct View<'a> {
    connection: &'a Connection,
    path: &'a Path,
}

impl View<'_> {
    fn at(&self, error: &rusqlite::Error) -> LedgerError {
        database("reading the ledger", self.path, error)
    }

    fn objects(&self, index: u64) -> Result<Vec<ObjectRef>, rusqlite::Error> {
        let mut statement = self.connection.prepare_cached(
            "SELECT role, name, sha256, bytes FROM object WHERE position = ?1 ORDER BY ordinal",
        )?;
        let rows = statement.query_map([signed(index)], |row| {
            Ok(ObjectRef {
                role: row.get(0)?,
                name: row.get(1)?,
                sha256: row.get(2)?,
                bytes: row.get::<_, i64>(3)?.unsigned_abs(),
            })
        })?;
        rows.collect()
    }

    fn row_at(&self, row: &rusqlite::Row) -> Result<Row, rusqlite::Error> {
        let index = row.get::<_, i64>(0)?.unsigned_abs();
        Ok(Row {
            index,
            body: row.get(1)?,
            peaks: row.get(2)?,
            checkpoint: row.get(3)?,
            objects: self.objects(index)?,
        })
    }

    fn indices(
        &self,
        statement: &mut Statement,
        values: &[&dyn rusqlite::ToSql],
    ) -> Result<Vec<u64>, rusqlite::Error> {
        let rows = statement.query_map(values, |row| row.get::<_, i64>(0))?;
        rows.map(|index| index.map(i64::unsigned_abs)).collect()
    }
}

const ROW: &str = "SELECT position, body, peaks, checkpoint FROM entry";

impl Reader for View<'_> {
    fn size(&self) -> Result<u64, LedgerError> {
        self.connection
            .query_row(
                "SELECT ifnull(max(position) + 1, 0) FROM entry",
                [],
                |row| row.get::<_, i64>(0),
            )
            .map(i64::unsigned_abs)
            .map_err(|e| self.at(&e))
    }

    fn row(&self, index: u64) -> Result<Option<Row>, LedgerError> {
        let mut statement = self
            .connection
            .prepare_cached(&format!("{ROW} WHERE position = ?1"))
            .map_err(|e| self.at(&e))?;
        let mut rows = statement.query([signed(index)]).map_err(|e| self.at(&e))?;
        match rows.next().map_err(|e| self.at(&e))? {
            Some(row) => self.row_at(row).map(Some).map_err(|e| self.at(&e)),
            None => Ok(None),
        }
    }

    fn find(&self, query: Query) -> Result<Vec<u64>, LedgerError> {
        let by = |column: &str| {
            format!("SELECT position FROM entry WHERE {column} IS ?1 ORDER BY position")
        };
        let (sql, values): (String, Vec<&dyn rusqlite::ToSql>) = match &query {
            Query::Inputs(text) => (by("inputs"), vec![text]),
            Query::Record(text) => (by("record"), vec![text]),
            Query::Lot(text) => (by("lot"), vec![text]),
            Query::Kind(text) => (by("kind"), vec![text]),
            Query::PartSupplier { part, supplier } => (
                "SELECT position FROM entry WHERE part IS ?1 AND supplier IS ?2 ORDER BY position"
                    .to_owned(),
                vec![part, supplier],
            ),
            Query::Object(text) => (
                "SELECT DISTINCT position FROM object WHERE sha256 = ?1 ORDER BY position"
                    .to_owned(),
                vec![text],
            ),
        };
        let mut statement = self
            .connection
            .prepare_cached(&sql)
            .map_err(|e| self.at(&e))?;
        self.indices(&mut statement, &values)
            .map_err(|e| self.at(&e))
    }

    fn each(
        &self,
        from: u64,
        visit: &mut dyn FnMut(Result<Row, LedgerError>) -> Result<(), LedgerError>,
    ) -> Result<(), LedgerError> {
        let mut statement = self
            .connection
            .prepare_cached(&format!("{ROW} WHERE position >= ?1 ORDER BY position"))
            .map_err(|e| self.at(&e))?;
        let mut rows = statement.query([signed(from)]).map_err(|e| self.at(&e))?;
        while let Some(row) = rows.next().map_err(|e| self.at(&e))? {
            visit(self.row_at(row).map_err(|e| self.at(&e)))?;
        }
        Ok(())
    }
}

/// No ledger has 2^63 entries.
fn signed(index: u64) -> i64 {
    i64::try_from(index).unwrap_or(i64::MAX)
}

fn insert(connection: &Connection, row: &Row) -> Result<(), rusqlite::Error> {
    let index = signed(row.index);
    connection.execute(
        "INSERT INTO entry (position, body, peaks, checkpoint) VALUES (?1, ?2, ?3, ?4)",
        params![index, row.body, row.peaks, row.checkpoint],
    )?;
    let mut statement = connection.prepare_cached(
        "INSERT INTO object (position, ordinal, role, name, sha256, bytes) \
         VALUES (?1, ?2, ?3, ?4, ?5, ?6)",
    )?;
    for (ordinal, object) in (0_i64..).zip(&row.objects) {
        statement.execute(params![
            index,
            ordinal,
            object.role,
            object.name,
            object.sha256,
            signed(object.bytes)
        ])?;
    }
    Ok(())
}

fn connect(path: &Path, access: &Access) -> Result<Connection, LedgerError> {
    let common = OpenFlags::SQLITE_OPEN_NO_MUTEX | OpenFlags::SQLITE_OPEN_NOFOLLOW;
    let flags = match access {
        Access::Read => OpenFlags::SQLITE_OPEN_READ_ONLY,
        Access::Write(_) => OpenFlags::SQLITE_OPEN_READ_WRITE | OpenFlags::SQLITE_OPEN_CREATE,
    };
    if matches!(access, Access::Read) && !path.is_file() {
        return Err(missing(path));
    }
    let absolute = std::path::absolute(path).unwrap_or_else(|_| path.to_owned());
    let absolute = resolve_folder(&absolute);
    let connection = Connection::open_with_flags(absolute, flags | common)
        .map_err(|e| database("opening the ledger", path, &e))?;
    configure(&connection, access).map_err(|e| database("opening the ledger", path, &e))?;
    Ok(connection)
}

/// A folder may be reached through a link; the ledger's file itself may not be one.
fn resolve_folder(path: &Path) -> PathBuf {
    match (path.parent().map(Path::canonicalize), path.file_name()) {
        (Some(Ok(folder)), Some(name)) => folder.join(name),
        _ => path.to_owned(),
    }
}

/// Sets what a ledger needs, and asserts what was set.
fn configure(connection: &Connection, access: &Access) -> Result<(), rusqlite::Error> {
    connection.busy_timeout(PATIENCE)?;
    connection.set_db_config(DbConfig::SQLITE_DBCONFIG_DEFENSIVE, true)?;
    connection.set_db_config(DbConfig::SQLITE_DBCONFIG_TRUSTED_SCHEMA, false)?;
    let mut settings = vec![
        ("foreign_keys", "ON", "1"),
        ("recursive_triggers", "ON", "1"),
        ("cell_size_check", "ON", "1"),
        ("mmap_size", "0", "0"),
        ("synchronous", "EXTRA", "3"),
    ];
    if matches!(access, Access::Write(_)) {
        settings.insert(0, ("journal_mode", "DELETE", "delete"));
    }
    for (name, value, expected) in settings {
        connection.pragma_update(None, name, value)?;
        let found = connection.pragma_query_value(None, name, |row| {
            row.get_ref(0).map(|value| match value {
                rusqlite::types::ValueRef::Integer(number) => number.to_string(),
                other => other.as_str().unwrap_or("").to_owned(),
            })
        })?;
        if found != expected {
            return Err(rusqlite::Error::InvalidParameterName(format!(
                "{name} is {found} and cannot be made {value}"
            )));
        }
    }
    Ok(())
}

/// `application_id` and `user_version`; (0, 0) for a file without tables.
fn schema_version(connection: &Connection, path: &Path) -> Result<(i32, i32), LedgerError> {
    let get = |name| connection.pragma_query_value(None, name, |row| row.get::<_, i32>(0));
    let at = |e| database("opening the ledger", path, &e);
    Ok((
        get("application_id").map_err(at)?,
        get("user_version").map_err(at)?,
    ))
}

/// Makes the tables that are missing, in one transaction; the first process does it.
fn migrate(
    connection: &mut Connection,
    path: &Path,
    identity: &Identity,
) -> Result<(), LedgerError> {
    let at = |e| database("making the tables", path, &e);
    if schema_version(connection, path)? == (APPLICATION_ID, VERSION) {
        return Ok(());
    }
    let held = connection
        .transaction_with_behavior(TransactionBehavior::Immediate)
        .map_err(at)?;
    let (application, version) = schema_version(&held, path)?;
    let tables: i64 = held
        .query_row("SELECT count(*) FROM sqlite_schema", [], |row| row.get(0))
        .map_err(at)?;
    let new = (application, version, tables) == (0, 0, 0);
    if !new {
        expect_known(application, version, path)?;
    }
    let done = usize::try_from(version).unwrap_or(0);
    for statement in MIGRATIONS.iter().skip(done).flat_map(|list| list.iter()) {
        held.execute(statement, []).map_err(at)?;
    }
    held.pragma_update(None, "application_id", APPLICATION_ID)
        .map_err(at)?;
    held.pragma_update(None, "user_version", VERSION)
        .map_err(at)?;
    if new {
        held.execute(
            "INSERT INTO identity (one, origin, public_key, created) VALUES (1, ?1, ?2, ?3)",
            params![identity.origin, identity.public_key, identity.created],
        )
        .map_err(at)?;
    }
    held.commit().map_err(at)
}

fn expect_version(connection: &Connection, path: &Path) -> Result<(), LedgerError> {
    let (application, version) = schema_version(connection, path)?;
    expect_known(application, version, path)?;
    if version < VERSION {
        return Err(LedgerError::Foreign {
            path: path.to_owned(),
            why: format!(
                "a ledger of version {version}, this program reads {VERSION}: run a command that \
                 writes, which brings it up to date"
            ),
        });
    }
    Ok(())
}

fn expect_known(application: i32, version: i32, path: &Path) -> Result<(), LedgerError> {
    let why = if application != APPLICATION_ID {
        "an SQLite file, but not a ledger of this program".to_owned()
    } else if version > VERSION {
        format!(
            "a ledger of version {version}, made by a later version of this program than the one \
             running (which knows {VERSION}): use the later one"
        )
    } else {
        return Ok(());
    };
    Err(LedgerError::Foreign {
        path: path.to_owned(),
        why,
    })
}

fn read_identity(connection: &Connection, path: &Path) -> Result<Identity, LedgerError> {
    connection
        .query_row(
            "SELECT origin, public_key, created FROM identity",
            [],
            |row| {
                Ok(Identity {
                    origin: row.get(0)?,
                    public_key: row.get(1)?,
                    created: row.get(2)?,
                })
            },
        )
        .map_err(|e| database("reading the ledger's identity", path, &e))
}

/// What the database says its tables are, against what they were made as.
fn schema_differences(connection: &Connection) -> Result<Vec<String>, rusqlite::Error> {
    let mut statement =
        connection.prepare("SELECT name, sql FROM sqlite_schema WHERE sql IS NOT NULL")?;
    let rows = statement.query_map([], |row| {
        Ok((row.get::<_, String>(0)?, row.get::<_, String>(1)?))
    })?;
    let found = rows.collect::<Result<Vec<_>, _>>()?;
    let made: Vec<&str> = MIGRATIONS
        .iter()
        .flat_map(|list| list.iter().copied())
        .collect();
    let mut wrong = Vec::new();
    for (name, sql) in &found {
        if !made.contains(&sql.as_str()) {
            wrong.push(format!(
                "the schema holds {name}, which is not of the ledger"
            ));
        }
    }
    for sql in made {
        if !found.iter().any(|(_, have)| have == sql) {
            let name: Vec<&str> = sql.split(' ').take(4).collect();
            wrong.push(format!("the schema lacks `{} …`", name.join(" ")));
        }
    }
    Ok(wrong)
}

fn integrity(connection: &Connection) -> Result<Vec<String>, rusqlite::Error> {
    let mut wrong = Vec::new();
    for pragma in ["integrity_check", "foreign_key_check"] {
        let mut statement = connection.prepare(&format!("PRAGMA {pragma}"))?;
        let rows = statement.query_map([], |row| {
            row.get_ref(0)
                .map(|value| value.as_str().unwrap_or("a row").to_owned())
        })?;
        for line in rows {
            let line = line?;
            if line != "ok" {
                wrong.push(format!("{pragma}: {line}"));
            }
        }
    }
    Ok(wrong)
}

fn refuse_unfit(records: &Path) -> Result<(), LedgerError> {
    let unfit = disk::unfit_for_locks(records)
        .map_err(|e| LedgerError::io("looking at the file system", records, e))?;
    match unfit {
        None => Ok(()),
        Some(kind) => Err(LedgerError::Locks {
            path: records.to_owned(),
            why: format!("this folder is on {kind}"),
        }),
    }
}

fn missing(path: &Path) -> LedgerError {
    LedgerError::Missing {
        path: path.to_owned(),
        why: "judging a lot makes one".to_owned(),
    }
}

fn gone(index: u64) -> LedgerError {
    LedgerError::damaged(
        format!("entry {index}"),
        "an index names it, but it is not there",
    )
}

fn database(doing: &'static str, path: &Path, error: &rusqlite::Error) -> LedgerError {
    let busy = [ErrorCode::DatabaseBusy, ErrorCode::DatabaseLocked];
    if error
        .sqlite_error_code()
        .is_some_and(|code| busy.contains(&code))
    {
        return LedgerError::Busy {
            path: path.to_owned(),
        };
    }
    LedgerError::Database {
        doing,
        path: path.to_owned(),
        text: error.to_string(),
        outcome_unknown: false,
    }
}

fn uncertain(path: &Path, error: &rusqlite::Error) -> LedgerError {
    match database("committing the entry", path, error) {
        LedgerError::Database {
            doing, path, text, ..
        } => LedgerError::Database {
            doing,
            path,
            text,
            outcome_unknown: true,
        },
        other => other,
    }
}
