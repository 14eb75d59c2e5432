//! What the database says of itself.

use crate::ledger::schema::MIGRATIONS;
use rusqlite::Connection;

/// What the database says its tables are, against what they were made as.
pub(super) fn schema_differences(connection: &Connection) -> Result<Vec<String>, rusqlite::Error> {
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

pub(super) fn integrity(connection: &Connection) -> Result<Vec<String>, rusqlite::Error> {
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
