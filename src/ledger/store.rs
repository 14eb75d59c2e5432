//! What a ledger needs of a database: one order of rows that are only ever appended.
//!
//! The embedded database is [`super::sqlite`]; a server database for a site with many benches would
//! implement the same two traits.

use super::entry::ObjectRef;
use super::error::LedgerError;

/// One row: an entry and the head of the ledger that it made.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Row {
    /// From 0 without a gap.
    pub index: u64,
    /// The entry's bytes.
    pub body: String,
    /// Peaks of the Merkle tree with this entry, 32 bytes each.
    pub peaks: Vec<u8>,
    /// Signed checkpoint of the ledger with this entry.
    pub checkpoint: String,
    /// The entry's objects, as the database finds records by them.
    pub objects: Vec<ObjectRef>,
}

/// What identifies a ledger.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Identity {
    /// Name of the ledger in its checkpoints; no spaces, no plus signs.
    pub origin: String,
    /// Public key of its checkpoints.
    pub public_key: [u8; 32],
    /// When it was made, RFC 3339.
    pub created: String,
}

/// What to look entries up by; answers are in entry order.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Query<'a> {
    /// The lot judged from these inputs (at most one).
    Inputs(&'a str),
    /// Everything that happened to a record.
    Record(&'a str),
    /// Lots judged under a lot number.
    Lot(&'a str),
    /// Lots judged of a part from a supplier (`None`: the lots that name no supplier), and severities set for it.
    #[allow(missing_docs)]
    PartSupplier {
        part: &'a str,
        supplier: Option<&'a str>,
    },
    /// Entries that rest on an object of the archive, in any role.
    Object(&'a str),
    /// Entries of one kind.
    Kind(&'a str),
}

/// Reading rows.
pub trait Reader {
    /// Number of rows, as the highest index says.
    fn size(&self) -> Result<u64, LedgerError>;
    /// One row; `None` where it is not there.
    fn row(&self, index: u64) -> Result<Option<Row>, LedgerError>;
    /// Indices of the entries that a query finds, ascending.
    fn find(&self, query: Query) -> Result<Vec<u64>, LedgerError>;
    /// Every row from an index on, ascending; a row that cannot be read is passed on as its error.
    fn each(
        &self,
        from: u64,
        visit: &mut dyn FnMut(Result<Row, LedgerError>) -> Result<(), LedgerError>,
    ) -> Result<(), LedgerError>;
}

/// What an act comes to, once the ledger is held.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Decided {
    /// It was done before: the entry that says so.
    Before(u64),
    /// This row is to be appended.
    New(Row),
}

/// A store of rows.
pub trait Store: Reader {
    /// Which ledger it is.
    fn identity(&self) -> &Identity;

    /// One act, one transaction: holds the ledger, lets `decide` look at it and say what is to be
    /// appended, appends, and returns when the row is durable and has been read back.
    fn append(
        &mut self,
        decide: &mut dyn FnMut(&dyn Reader) -> Result<Decided, LedgerError>,
    ) -> Result<Row, LedgerError>;

    /// What the database itself finds wrong: structure, schema, settings. Empty where nothing is.
    fn check(&self) -> Result<Vec<String>, LedgerError>;
}
