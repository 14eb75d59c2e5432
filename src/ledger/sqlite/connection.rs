//! Opening the file: settings that are asserted, tables that are made, what is refused.

use super::Access;
use crate::ledger::disk;
use crate::ledger::error::LedgerError;
use crate::ledger::schema::{APPLICATION_ID, MIGRATIONS, VERSION};
use crate::ledger::store::Identity;
use rusqlite::config::DbConfig;
use rusqlite::{Connection, ErrorCode, OpenFlags, TransactionBehavior, params};
use std::path::{Path, PathBuf};
use std::time::Duration;

/// How long to wait for another process.
const PATIENCE: Duration = Duration::from_secs(60);

pub(super) fn connect(path: &Path, access: &Access) -> Result<Connection, LedgerError> {
    let common = OpenFlags::SQLITE_OPEN_NO_MUTEX | OpenFlags::SQLITE_OPEN_NOFOLLOW;
    let flags = match access {
        // Not read-only to SQLite: a journal that a killed process left has to be rolled back
        // first. Where the file may not be written, SQLite opens it for reading by itself.
        Access::Read => OpenFlags::SQLITE_OPEN_READ_WRITE,
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
pub(super) fn resolve_folder(path: &Path) -> PathBuf {
    match (path.parent().map(Path::canonicalize), path.file_name()) {
        (Some(Ok(folder)), Some(name)) => folder.join(name),
        _ => path.to_owned(),
    }
}

/// Sets what a ledger needs, and asserts what was set.
pub(super) fn configure(connection: &Connection, access: &Access) -> Result<(), rusqlite::Error> {
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
    settings.push(match access {
        Access::Read => ("query_only", "ON", "1"),
        Access::Write(_) => ("journal_mode", "DELETE", "delete"),
    });
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
pub(super) fn schema_version(
    connection: &Connection,
    path: &Path,
) -> Result<(i32, i32), LedgerError> {
    let get = |name| connection.pragma_query_value(None, name, |row| row.get::<_, i32>(0));
    let at = |e| database("opening the ledger", path, &e);
    // Both from one moment: another process may be making the tables.
    let _moment = match connection.is_autocommit() {
        true => Some(connection.unchecked_transaction().map_err(at)?),
        false => None,
    };
    Ok((
        get("application_id").map_err(at)?,
        get("user_version").map_err(at)?,
    ))
}

/// Makes the tables that are missing, in one transaction; the first process does it.
pub(super) fn migrate(
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

pub(super) fn expect_version(connection: &Connection, path: &Path) -> Result<(), LedgerError> {
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

pub(super) fn expect_known(application: i32, version: i32, path: &Path) -> Result<(), LedgerError> {
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

pub(super) fn read_identity(connection: &Connection, path: &Path) -> Result<Identity, LedgerError> {
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

pub(super) fn refuse_unfit(records: &Path) -> Result<(), LedgerError> {
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

pub(super) fn missing(path: &Path) -> LedgerError {
    LedgerError::Missing {
        path: path.to_owned(),
        why: "judging a lot makes one".to_owned(),
    }
}

pub(super) fn database(doing: &'static str, path: &Path, error: &rusqlite::Error) -> LedgerError {
    let hint = match error.sqlite_error_code() {
        Some(ErrorCode::DatabaseBusy | ErrorCode::DatabaseLocked) => {
            return LedgerError::Busy {
                path: path.to_owned(),
            };
        }
        Some(ErrorCode::ReadOnly) => {
            " (a run may have been interrupted, and what it left cannot be cleared up where nothing \
             may be written: open the records once where it may)"
        }
        Some(ErrorCode::DiskFull) => " (make room on the disk)",
        _ => "",
    };
    LedgerError::Database {
        doing,
        path: path.to_owned(),
        text: format!("{error}{hint}"),
        outcome_unknown: false,
    }
}

pub(super) fn uncertain(path: &Path, error: &rusqlite::Error) -> LedgerError {
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
