//! The files of a site as approvals see them: under which names they count, and where they stand.

use super::files::Valid;
use crate::commands::approvals::{SITE_FILE, why};
use crate::commands::site::{Site, compensation, meaning};
use crate::ledger::approval::Approved;
use crate::ledger::trust::{Form, Standing, Trust};
use crate::ledger::{Ledger, LedgerError, sha256_hex};
use crate::site::{Approval, SiteFile};
use crate::sweep::RawFile;
use std::path::Path;

/// The site's own say on approvals.
pub struct Desk {
    pub site: Site,
    /// The site file as it is.
    pub rules: Option<SiteFile>,
    pub trust: Trust,
}

/// A file that can be approved.
#[derive(Debug)]
pub struct Subject {
    pub kind: Approved,
    /// `limits/parts/RG-0475-X7R.yaml`
    pub name: String,
    pub revision: Option<String>,
    pub bytes: Vec<u8>,
    /// Sweeps of compensation standards.
    pub with: Vec<RawFile>,
}

impl Subject {
    /// Digest and name of what belongs to the file.
    pub fn belonging(&self) -> Vec<(String, String)> {
        let one = |file: &RawFile| (sha256_hex(&file.bytes), file.name.clone());
        self.with.iter().map(one).collect()
    }
}

impl Desk {
    /// # Errors
    /// In words: a site file or ledger that cannot be read.
    pub fn open(root: &Path) -> Result<Desk, String> {
        let site = Site::new(root);
        let rules = site.rules().map_err(|stop| stop.to_string())?;
        let trust = match Ledger::open(&site.records()) {
            Ok(ledger) => trust_of(&ledger),
            Err(LedgerError::Missing { .. }) => Ok(Trust::default()),
            Err(error) => Err(error),
        };
        Ok(Desk {
            site,
            rules: rules.as_ref().and_then(meaning),
            trust: trust.map_err(|e| e.to_string())?,
        })
    }

    /// The keys that count now.
    pub fn keys(&self) -> Option<&SiteFile> {
        let approved = self.trust.site_file().map(|site| &site.file);
        approved.or(self.rules.as_ref())
    }

    /// Whether lots need approvals.
    pub fn demands(&self) -> bool {
        let approved = self.trust.site_file().map(|site| &site.file);
        [approved, self.rules.as_ref()]
            .into_iter()
            .flatten()
            .any(|site| site.approval == Approval::Required)
    }

    /// The file as one that the site judges by.
    ///
    /// # Errors
    /// In words: another file.
    pub fn subject(&self, path: &Path, valid: &Valid, bytes: Vec<u8>) -> Result<Subject, String> {
        let shown = path.display();
        let (kind, name, revision) = match valid {
            Valid::Limits(limits) => (
                Approved::Limits,
                format!("limits/parts/{}.yaml", limits.part),
                Some(limits.revision.clone()),
            ),
            Valid::Station(station) => (
                Approved::Station,
                format!("limits/stations/{}.yaml", station.name),
                None,
            ),
            Valid::Site(_) => (Approved::Site, SITE_FILE.to_owned(), None),
            Valid::Lot(_) => {
                return Err(format!(
                    "{shown}: is a lot file; limit, station and site files are approved"
                ));
            }
        };
        let own = self.site.resolve(&name);
        let same = match (path.canonicalize(), own.canonicalize()) {
            (Ok(path), Ok(own)) => path == own,
            _ => false,
        };
        if !same {
            return Err(format!(
                "{shown}: is not the file that lots are judged by, which is {}: put it there (`--site` names the site's folder)",
                own.display()
            ));
        }
        let with = match kind {
            Approved::Station => {
                let raw = RawFile {
                    name: name.clone(),
                    bytes: bytes.clone(),
                };
                compensation(&own, &raw).map_err(|all| {
                    let each = all
                        .iter()
                        .map(|u| format!("{}: {}", u.path.display(), u.note.text));
                    each.collect::<Vec<_>>().join("; ")
                })?
            }
            _ => Vec::new(),
        };
        Ok(Subject {
            kind,
            name,
            revision,
            bytes,
            with,
        })
    }

    /// Where the file stands; `None` where the site trusts nobody.
    pub fn standing(&self, subject: &Subject) -> Option<Standing> {
        let sha256 = sha256_hex(&subject.bytes);
        if subject.kind == Approved::Site {
            return Some(match self.trust.site_file().map(|site| &site.granted) {
                Some(granted) if granted.statement.sha256 == sha256 => {
                    Standing::Approved(granted.clone())
                }
                Some(granted) => Standing::Other {
                    in_force: granted.clone(),
                    before: None,
                },
                None => Standing::Never,
            });
        }
        let form = Form {
            kind: subject.kind,
            file: &subject.name,
            sha256: &sha256,
            with: &subject.belonging(),
        };
        Some(self.trust.standing(self.keys()?, &form))
    }

    /// Where a file stands, in words; `None` where the site knows no approvals, or it is no file
    /// that lots are judged by.
    pub fn words(&self, path: &Path, valid: &Valid, bytes: Vec<u8>) -> Option<(bool, String)> {
        self.keys()?;
        let standing = self.standing(&self.subject(path, valid, bytes).ok()?)?;
        let approved = matches!(standing, Standing::Approved(_));
        if !approved && !self.demands() && standing == Standing::Never {
            return None;
        }
        Some((approved, why(&standing)))
    }
}

/// What the ledger says now.
pub fn trust_of(ledger: &Ledger) -> Result<Trust, LedgerError> {
    Trust::read(ledger.store(), ledger.archive(), ledger.size()?)
}
