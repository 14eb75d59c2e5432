//! Which approvals are in force at a place in the ledger.
//!
//! The first approved site file is signed by a key that it lists itself; each later one by a key
//! that the one before it trusts. So nobody without a trusted key can drop the demand for
//! approvals, or add a key, once a site file is approved. Limit and station files count as approved
//! in the form of the newest statement about them that such a key has signed.
//!
//! Everything here follows from the entries before that place, so that it can be looked at again.

use super::approval::{Approved, Statement};
use super::{Act, Archive, Entry, LedgerError, Query, Reader};
use crate::site::{self, Role, SiteFile, TrustedKey};
use std::collections::BTreeMap;

/// The approvals before a place in the ledger.
#[derive(Debug, Default)]
pub struct Trust {
    claims: Vec<Claim>,
    chain: Vec<ApprovedSite>,
    problems: Vec<(u64, String)>,
}

/// A statement in the ledger, whoever signed it.
#[derive(Debug)]
struct Claim {
    entry: u64,
    time: String,
    statement: Statement,
    note: String,
}

/// A site file that was approved by who may.
#[derive(Debug)]
#[allow(missing_docs)]
pub struct ApprovedSite {
    pub granted: Granted,
    pub file: SiteFile,
}

/// A statement by a key that was trusted with it.
#[derive(Debug, Clone, PartialEq, Eq)]
#[allow(missing_docs)]
pub struct Granted {
    /// Name of the key: the code of the person.
    pub by: String,
    pub role: Role,
    pub entry: u64,
    /// Of the entry, RFC 3339.
    pub time: String,
    pub statement: Statement,
    /// As it was signed.
    pub note: String,
}

/// Where a file stands.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Standing {
    /// Approved in this very form.
    Approved(Granted),
    /// Another form of it is approved.
    Other {
        /// That approval.
        in_force: Granted,
        /// The approval of this form, which the other one ended.
        before: Option<Box<Granted>>,
    },
    /// Its approval was taken back by this statement.
    Withdrawn(Granted),
    /// There is a statement about this form that does not count: its entry, and why.
    NotCounted(u64, String),
    /// There is none.
    Never,
}

impl Standing {
    /// The statement that decides.
    pub fn deciding(&self) -> Option<&Granted> {
        match self {
            Standing::Approved(granted) | Standing::Withdrawn(granted) => Some(granted),
            Standing::Other { in_force, .. } => Some(in_force),
            Standing::NotCounted(..) | Standing::Never => None,
        }
    }
}

/// The form of a file: what an approval must be of.
#[derive(Debug, Clone, Copy)]
#[allow(missing_docs)]
pub struct Form<'a> {
    pub kind: Approved,
    pub file: &'a str,
    pub sha256: &'a str,
    /// Digest and name of the files that belong to it.
    pub with: &'a [(String, String)],
}

impl Form<'_> {
    fn is_of(&self, statement: &Statement) -> bool {
        statement.sha256 == self.sha256 && statement.with == self.with
    }
}

impl Trust {
    /// What the entries before one say.
    ///
    /// # Errors
    /// Entries or approved site files that cannot be read.
    pub fn read(reader: &dyn Reader, archive: &Archive, before: u64) -> Result<Self, LedgerError> {
        let mut found = reader.find(Query::Kind("approval"))?;
        found.extend(reader.find(Query::Kind("withdrawal"))?);
        found.retain(|index| *index < before);
        found.sort_unstable();
        let mut trust = Trust::default();
        for index in found {
            let Some(row) = reader.row(index)? else {
                continue;
            };
            let entry = Entry::read(index, &row.body)?;
            match claim(&entry) {
                Ok(claim) if claim.statement.kind == Approved::Site => {
                    trust.site(claim, archive)?;
                }
                Ok(claim) => trust.claims.push(claim),
                Err(why) => trust.problems.push((index, why)),
            }
        }
        Ok(trust)
    }

    /// The site file that was approved last.
    pub fn site_file(&self) -> Option<&ApprovedSite> {
        self.chain.last()
    }

    /// Every site file that was approved, oldest first.
    pub fn site_files(&self) -> &[ApprovedSite] {
        &self.chain
    }

    /// Statements that count for nothing whoever is trusted, by entry.
    pub fn problems(&self) -> &[(u64, String)] {
        &self.problems
    }

    /// Statements about limit and station files that none of these keys has signed, or that are
    /// copies of earlier ones: entry, and what is wrong.
    pub fn doubtful(&self, keys: &[&TrustedKey]) -> Vec<(u64, String)> {
        let mut last: BTreeMap<&str, u64> = BTreeMap::new();
        let mut found = Vec::new();
        for claim in &self.claims {
            let signs = |key: &&TrustedKey| Statement::open(&claim.note, &key.key).is_ok();
            let file = claim.statement.file.as_str();
            let wrong = if keys.iter().any(signs) {
                fresh(claim, last.get(file).copied()).err()
            } else {
                Some("is not signed by a key that a site file lists".to_owned())
            };
            match wrong {
                Some(why) => found.push((claim.entry, why)),
                None => {
                    last.insert(file, claim.entry);
                }
            }
        }
        found
    }

    /// Where a limit or station file stands by the keys of a site file.
    pub fn standing(&self, keys: &SiteFile, form: &Form) -> Standing {
        let mut now: Option<Granted> = None;
        let mut withdrawn = None;
        let mut before = None;
        let mut not_counted = None;
        let mut last = None;
        let about =
            |claim: &&Claim| claim.statement.file == form.file && claim.statement.kind == form.kind;
        for claim in self.claims.iter().filter(about) {
            let granted = fresh(claim, last).and_then(|()| granted(keys, claim));
            let granted = match granted {
                Ok(granted) => granted,
                Err(why) => {
                    if form.is_of(&claim.statement) && !claim.statement.withdraws {
                        not_counted = Some((claim.entry, why));
                    }
                    continue;
                }
            };
            last = Some(claim.entry);
            if granted.statement.withdraws {
                now = None;
                withdrawn = Some(granted);
                continue;
            }
            let same = now.as_ref().is_some_and(|now| {
                now.statement.sha256 == granted.statement.sha256
                    && now.statement.with == granted.statement.with
            });
            // A second signature under the same form changes nothing.
            if !same {
                if form.is_of(&granted.statement) {
                    before = Some(Box::new(granted.clone()));
                }
                now = Some(granted);
            }
        }
        match (now, withdrawn, not_counted) {
            (Some(now), ..) if form.is_of(&now.statement) => Standing::Approved(now),
            (Some(in_force), _, None) => Standing::Other { in_force, before },
            (_, _, Some((entry, why))) => Standing::NotCounted(entry, why),
            (None, Some(withdrawn), None) => Standing::Withdrawn(withdrawn),
            (None, None, None) => Standing::Never,
        }
    }

    /// The next site file, where who signed it may.
    fn site(&mut self, claim: Claim, archive: &Archive) -> Result<(), LedgerError> {
        let (entry, name) = (claim.entry, claim.statement.file.clone());
        let bytes = archive.get(&claim.statement.sha256)?;
        let Ok(file) = site::read(&name, &bytes) else {
            let why = "approves a site file that has faults".to_owned();
            self.problems.push((entry, why));
            return Ok(());
        };
        let last = self.chain.last();
        let keys = last.map_or(&file, |last| &last.file);
        let granted =
            fresh(&claim, last.map(|last| last.granted.entry)).and_then(|()| granted(keys, &claim));
        match granted {
            Ok(granted) => self.chain.push(ApprovedSite { granted, file }),
            Err(why) => self.problems.push((entry, why)),
        }
        Ok(())
    }
}

/// The statement of an entry, where the entry says the same.
fn claim(entry: &Entry) -> Result<Claim, String> {
    let (file, sha256, note) = match &entry.act {
        Act::Approval {
            file,
            sha256,
            statement,
            ..
        }
        | Act::Withdrawal {
            file,
            sha256,
            statement,
            ..
        } => (file, sha256, statement),
        _ => return Err("is no approval".to_owned()),
    };
    let statement = Statement::unproven(note).map_err(|e| e.to_string())?;
    let withdrawal = matches!(entry.act, Act::Withdrawal { .. });
    let objects = entry.objects_of(statement.kind.role());
    let has_object = objects.into_iter().any(|o| o.sha256 == statement.sha256);
    let same = statement.file == *file
        && statement.sha256 == *sha256
        && statement.ledger == entry.ledger
        && statement.withdraws == withdrawal
        && statement.entries <= entry.index
        && (withdrawal || has_object);
    if !same {
        return Err("says something else than the statement that it carries".to_owned());
    }
    Ok(Claim {
        entry: entry.index,
        time: entry.time.clone(),
        statement,
        note: note.clone(),
    })
}

/// A statement must have been signed after the one about the same file before it.
fn fresh(claim: &Claim, last: Option<u64>) -> Result<(), String> {
    match last {
        Some(last) if last >= claim.statement.entries => Err(format!(
            "was signed before entry {last}, which is about the same file: a copy of an earlier approval does not count"
        )),
        _ => Ok(()),
    }
}

/// The statement as one by a key that is trusted with it.
fn granted(keys: &SiteFile, claim: &Claim) -> Result<Granted, String> {
    let signed = |key: &&TrustedKey| Statement::open(&claim.note, &key.key).is_ok();
    let Some(key) = keys.trusted_keys.iter().find(signed) else {
        return Err("is not signed by a key that the site trusts".to_owned());
    };
    let by = key.key.name();
    let may = match claim.statement.kind {
        Approved::Limits | Approved::Site => key.role == Role::QualityEngineer,
        Approved::Station => true,
    };
    if !may {
        let role = key.role.words();
        return Err(format!(
            "is signed by {by}, and a {role} does not approve such a file"
        ));
    }
    if !key.counts_at(claim.entry) {
        return Err(
            match key.revoked_at_entry.filter(|end| claim.entry >= *end) {
                Some(end) => format!("is signed by {by}, whose key was revoked at entry {end}"),
                None => format!(
                    "is signed by {by}, whose key counts from entry {} on",
                    key.from_entry
                ),
            },
        );
    }
    Ok(Granted {
        by: by.to_owned(),
        role: key.role,
        entry: claim.entry,
        time: claim.time.clone(),
        statement: claim.statement.clone(),
        note: claim.note.clone(),
    })
}
