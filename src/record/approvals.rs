//! Approvals of the files that a lot is judged by, as its record shows them.

use super::LotRecord;
use crate::diagnostic::Note;
use crate::lot::Step;
use serde::{Deserialize, Serialize};

/// An approval in force.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ApprovalSection {
    /// `limits/parts/RG-0475-X7R.yaml`
    pub file: String,
    pub revision: Option<String>,
    pub sha256: String,
    /// The code of the person: the name of the key.
    pub by: String,
    /// In words.
    pub role: String,
    /// Entry of the ledger, and its time (RFC 3339).
    pub entry: u64,
    pub time: String,
    /// What the signature means, in the words of the person.
    pub meaning: String,
}

/// A signed statement that a record rests on.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SignedNote {
    /// `approval` or `withdrawal`: its role among the objects of the entry.
    pub role: &'static str,
    /// The file that it is about.
    pub file: String,
    /// As it was signed.
    pub text: String,
}

/// What the ledger says of the files that a lot is judged by.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Approvals {
    /// The site demands approvals.
    pub demanded: bool,
    #[allow(missing_docs)]
    pub in_force: Vec<ApprovalSection>,
    /// A reason for each approval that is demanded and not there.
    pub missing: Vec<Note>,
    /// The statements that decided.
    pub notes: Vec<SignedNote>,
}

impl ApprovalSection {
    /// In one line: `revision 3, by QE-02 (quality engineer), entry 4 of 2026-…: approved for …`
    pub fn words(&self) -> String {
        let revision = self
            .revision
            .as_ref()
            .map_or(String::new(), |r| format!("revision {r}, "));
        format!(
            "{revision}by {} ({}), entry {} of {}: {}",
            self.by, self.role, self.entry, self.time, self.meaning
        )
    }
}

impl LotRecord {
    /// What there is to say of the approval of a file under that folder (`limits/parts/`); nothing
    /// where the site neither demands approvals nor has one.
    pub fn approval_words(&self, folder: &str) -> Option<String> {
        let found = self.approvals.iter().find(|a| a.file.starts_with(folder));
        let demanded = self
            .site
            .as_ref()
            .is_some_and(|site| site.approval == "required");
        match found {
            Some(approval) => Some(format!("Approved: {}", approval.words())),
            None => {
                demanded.then(|| "Not approved in this form when the lot was judged".to_owned())
            }
        }
    }
}

impl Approvals {
    /// The step of the chain from numbers to verdict; none where nothing is demanded or approved.
    pub fn step(&self) -> Option<Step> {
        if !self.demanded && self.in_force.is_empty() {
            return None;
        }
        let there = self.in_force.iter();
        let numbers: Vec<String> = there
            .map(|a| format!("{}: {}", a.file, a.words()))
            .collect();
        let missing: Vec<&str> = self.missing.iter().map(|n| n.text.as_str()).collect();
        Some(Step {
            about: "approvals".to_owned(),
            rule: if self.demanded {
                "the files that the lot is judged by are approved in this very form".to_owned()
            } else {
                "approvals are shown where there are any".to_owned()
            },
            source: "site file".to_owned(),
            numbers: if numbers.is_empty() {
                "none".to_owned()
            } else {
                numbers.join("; ")
            },
            result: if missing.is_empty() {
                "approved".to_owned()
            } else {
                format!("hold: {}", missing.join("; "))
            },
        })
    }
}
