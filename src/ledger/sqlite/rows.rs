//! Rows and look-ups, as one connection sees them.

use super::connection::database;
use crate::ledger::entry::ObjectRef;
use crate::ledger::error::LedgerError;
use crate::ledger::store::{Query, Reader, Row};
use rusqlite::{Connection, Statement, params};
use std::path::Path;

/// The rows as one connection sees them.
pub(super) struct View<'a> {
    pub(super) connection: &'a Connection,
    pub(super) path: &'a Path,
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

pub(super) const ROW: &str = "SELECT position, body, peaks, checkpoint FROM entry";

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
pub(super) fn signed(index: u64) -> i64 {
    i64::try_from(index).unwrap_or(i64::MAX)
}

pub(super) fn insert(connection: &Connection, row: &Row) -> Result<(), rusqlite::Error> {
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
