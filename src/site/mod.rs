//! The site file: what holds for the whole site rather than for one part or one bench.
//!
//! `SiteFile` exists only valid; it is made by parsing `limits/site.yaml`. A site needs none.

mod read;
mod trusted;

pub use read::{SCHEMA, read};

use crate::keys::Verifier;

/// Whether lots are judged by approved limit and station files alone.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Approval {
    /// Approvals are shown where there are any.
    #[default]
    Optional,
    /// A lot whose limit, station or site file is not approved is held.
    Required,
}

impl Approval {
    /// As site files spell it.
    pub fn name(self) -> &'static str {
        match self {
            Approval::Optional => "optional",
            Approval::Required => "required",
        }
    }
}

/// What a key may approve.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Role {
    /// Limit, station and site files.
    QualityEngineer,
    /// Station files.
    Metrologist,
}

impl Role {
    /// In the order of the documentation.
    pub const ALL: [Role; 2] = [Role::QualityEngineer, Role::Metrologist];

    /// As site files spell it.
    pub fn name(self) -> &'static str {
        match self {
            Role::QualityEngineer => "quality_engineer",
            Role::Metrologist => "metrologist",
        }
    }

    /// In words.
    pub fn words(self) -> &'static str {
        match self {
            Role::QualityEngineer => "quality engineer",
            Role::Metrologist => "metrologist",
        }
    }
}

/// A key whose approvals count, and from which to which entry of the ledger.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct TrustedKey {
    /// The public key; its name is the person's code.
    pub key: Verifier,
    #[allow(missing_docs)]
    pub role: Role,
    /// Approvals before this entry do not count.
    pub from_entry: u64,
    /// Approvals from this entry on do not count.
    pub revoked_at_entry: Option<u64>,
}

impl TrustedKey {
    /// Whether an approval in that entry counts. By the entry and not by its time: a clock can be
    /// set back, the order of entries cannot.
    pub fn counts_at(&self, entry: u64) -> bool {
        entry >= self.from_entry && self.revoked_at_entry.is_none_or(|end| entry < end)
    }
}

/// What PDF lot records are signed with: files of the site's, relative to its folder.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Signing {
    /// The certificate of the key, and those that lead from it to a root.
    pub certificate: String,
    /// The private key.
    pub key: String,
}

/// A valid site file.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct SiteFile {
    pub name: String,
    pub approval: Approval,
    /// In file order; names are unique whatever their case.
    pub trusted_keys: Vec<TrustedKey>,
    /// File that gets every new checkpoint of the ledger, relative to the site's folder.
    pub witness: Option<String>,
    pub signing: Option<Signing>,
}

impl SiteFile {
    /// The trusted key of that name.
    pub fn trusted(&self, name: &str) -> Option<&TrustedKey> {
        self.trusted_keys
            .iter()
            .find(|trusted| trusted.key.name() == name)
    }
}
