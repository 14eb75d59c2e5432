//! The tables of the ledger, as statements that are compared with what the database says of itself.

/// `application_id` of a ledger file: "RLGT".
pub(super) const APPLICATION_ID: i32 = 0x524C_4754;

/// The version of the tables: the number of [`MIGRATIONS`].
pub(super) const VERSION: i32 = MIGRATIONS.len() as i32;

/// What each version adds to the one before. Never changed, only added to.
pub(super) const MIGRATIONS: &[&[&str]] = &[&[
    IDENTITY,
    ENTRY,
    OBJECT,
    "CREATE UNIQUE INDEX entry_inputs ON entry(inputs)",
    "CREATE INDEX entry_record ON entry(record)",
    "CREATE INDEX entry_lot ON entry(lot)",
    "CREATE INDEX entry_part_supplier ON entry(part, supplier)",
    "CREATE INDEX entry_kind ON entry(kind)",
    "CREATE INDEX object_sha256 ON object(sha256)",
    "CREATE TRIGGER identity_once BEFORE INSERT ON identity WHEN (SELECT count(*) FROM identity) > 0 \
     BEGIN SELECT RAISE(ABORT, 'a ledger has one identity'); END",
    "CREATE TRIGGER identity_no_update BEFORE UPDATE ON identity \
     BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER identity_no_delete BEFORE DELETE ON identity \
     BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER entry_in_order BEFORE INSERT ON entry \
     WHEN NEW.position <> (SELECT ifnull(max(position) + 1, 0) FROM entry) \
     BEGIN SELECT RAISE(ABORT, 'entries are appended in order'); END",
    "CREATE TRIGGER entry_no_update BEFORE UPDATE ON entry \
     BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER entry_no_delete BEFORE DELETE ON entry \
     BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER object_of_last BEFORE INSERT ON object \
     WHEN NEW.position <> (SELECT max(position) FROM entry) \
     BEGIN SELECT RAISE(ABORT, 'objects are appended with their entry'); END",
    "CREATE TRIGGER object_no_update BEFORE UPDATE ON object \
     BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
    "CREATE TRIGGER object_no_delete BEFORE DELETE ON object \
     BEGIN SELECT RAISE(ABORT, 'the ledger is append-only'); END",
]];

const IDENTITY: &str = "CREATE TABLE identity (\
     one INTEGER PRIMARY KEY CHECK (one = 1), \
     origin TEXT NOT NULL, \
     public_key BLOB NOT NULL CHECK (length(public_key) = 32), \
     created TEXT NOT NULL\
     ) STRICT";

/// The columns to look up by are computed from the body, so that they cannot say anything else.
const ENTRY: &str = "CREATE TABLE entry (\
     position INTEGER PRIMARY KEY CHECK (position >= 0), \
     body TEXT NOT NULL CHECK (json_valid(body)), \
     peaks BLOB NOT NULL, \
     checkpoint TEXT NOT NULL, \
     kind TEXT GENERATED ALWAYS AS (json_extract(body, '$.act.kind')) VIRTUAL, \
     record TEXT GENERATED ALWAYS AS (json_extract(body, '$.act.record')) VIRTUAL, \
     inputs TEXT GENERATED ALWAYS AS (json_extract(body, '$.act.inputs')) VIRTUAL, \
     lot TEXT GENERATED ALWAYS AS (json_extract(body, '$.act.lot')) VIRTUAL, \
     part TEXT GENERATED ALWAYS AS (json_extract(body, '$.act.part')) VIRTUAL, \
     supplier TEXT GENERATED ALWAYS AS (json_extract(body, '$.act.supplier')) VIRTUAL\
     ) STRICT";

const OBJECT: &str = "CREATE TABLE object (\
     position INTEGER NOT NULL REFERENCES entry(position), \
     ordinal INTEGER NOT NULL CHECK (ordinal >= 0), \
     role TEXT NOT NULL, \
     name TEXT NOT NULL, \
     sha256 TEXT NOT NULL CHECK (length(sha256) = 64), \
     bytes INTEGER NOT NULL CHECK (bytes >= 0), \
     PRIMARY KEY (position, ordinal)\
     ) STRICT, WITHOUT ROWID";
