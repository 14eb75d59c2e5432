//! Whether the files that a lot is judged by are approved, by what the ledger says.

use crate::diagnostic::Note;
use crate::ledger::approval::Approved;
use crate::ledger::trust::{Form, Granted, Standing, Trust};
use crate::record::{ApprovalSection, Approvals, SignedNote, Sources, sha256};
use crate::site::{self, Approval, SiteFile};

/// What the ledger calls the site file.
pub const SITE_FILE: &str = "limits/site.yaml";

/// Looks at site, limit and station file. Where there is no site file and none was ever approved,
/// nothing is demanded and nobody is trusted.
pub fn look(trust: &Trust, sources: &Sources, limits: &str, station: &str) -> Approvals {
    let site = Site::of(sources);
    let Some(keys) = site.keys(trust) else {
        return Approvals::default();
    };
    let mut found = Approvals {
        demanded: site.demands(trust),
        ..Approvals::default()
    };
    site.check(trust, &mut found);
    let with: Vec<(String, String)> = sources
        .compensation
        .iter()
        .map(|file| (sha256(&file.bytes), file.name.clone()))
        .collect();
    let files = [
        (Approved::Limits, limits, &sources.limits, &[][..]),
        (Approved::Station, station, &sources.station, &with[..]),
    ];
    for (kind, file, raw, with) in files {
        let form = Form {
            kind,
            file,
            sha256: &sha256(&raw.bytes),
            with,
        };
        let standing = trust.standing(keys, &form);
        found.notes.extend(standing.deciding().map(note));
        match standing {
            Standing::Approved(granted) => found.in_force.push(section(&granted)),
            standing if found.demanded => found.missing.push(reason(kind, file, &standing)),
            _ => {}
        }
    }
    found
}

/// The site file as it is, and as it was approved.
struct Site {
    file: Option<SiteFile>,
    sha256: Option<String>,
}

impl Site {
    fn of(sources: &Sources) -> Site {
        let raw = sources.site.as_ref();
        Site {
            file: raw.and_then(|raw| site::read(&raw.name, &raw.bytes).ok()),
            sha256: raw.map(|raw| sha256(&raw.bytes)),
        }
    }

    /// The keys that count: those of the site file that was approved last, else those of the one
    /// that is there.
    fn keys<'a>(&'a self, trust: &'a Trust) -> Option<&'a SiteFile> {
        let approved = trust.site_file().map(|site| &site.file);
        approved.or(self.file.as_ref())
    }

    /// Either of the two demands it: dropping the demand needs an approval too.
    fn demands(&self, trust: &Trust) -> bool {
        let approved = trust.site_file().map(|site| &site.file);
        [approved, self.file.as_ref()]
            .into_iter()
            .flatten()
            .any(|site| site.approval == Approval::Required)
    }

    fn check(&self, trust: &Trust, found: &mut Approvals) {
        let approved = trust.site_file().map(|site| &site.granted);
        found.notes.extend(approved.map(note));
        let as_it_was =
            |granted: &&Granted| Some(&granted.statement.sha256) == self.sha256.as_ref();
        if let Some(granted) = approved.filter(as_it_was) {
            return found.in_force.push(section(granted));
        }
        if !found.demanded {
            return;
        }
        let text = match (approved, &self.file) {
            (Some(granted), Some(_)) => format!(
                "{SITE_FILE} is not the one that {} approved in entry {}: put that one back, or a person whose key that \
                 one trusts approves this one (`reelgate limits approve`), then judge again",
                granted.by, granted.entry
            ),
            (Some(granted), None) => format!(
                "{SITE_FILE}, which {} approved in entry {}, is gone: put it back, then judge again",
                granted.by, granted.entry
            ),
            (None, _) => format!(
                "{SITE_FILE} demands approvals and is not approved itself: a quality engineer whose key it lists \
                 approves it (`reelgate limits approve`), then judge again"
            ),
        };
        found.missing.push(Note::new("site_not_approved", text));
    }
}

fn note(granted: &Granted) -> SignedNote {
    SignedNote {
        role: if granted.statement.withdraws {
            "withdrawal"
        } else {
            "approval"
        },
        file: granted.statement.file.clone(),
        text: granted.note.clone(),
    }
}

fn section(granted: &Granted) -> ApprovalSection {
    let statement = &granted.statement;
    ApprovalSection {
        file: statement.file.clone(),
        revision: statement.revision.clone(),
        sha256: statement.sha256.clone(),
        by: granted.by.clone(),
        role: granted.role.words().to_owned(),
        entry: granted.entry,
        time: granted.time.clone(),
        meaning: statement.meaning.clone(),
    }
}

fn reason(kind: Approved, file: &str, standing: &Standing) -> Note {
    let code = match kind {
        Approved::Limits => "limits_not_approved",
        Approved::Station => "station_not_approved",
        Approved::Site => "site_not_approved",
    };
    let what = why(standing);
    let text = format!(
        "{file} {what}: do not use the reel; a quality engineer checks the file and approves it (`reelgate limits approve`), then \
         judge again"
    );
    Note::new(code, text)
}

/// How a file stands, to follow its name in a sentence.
pub fn why(standing: &Standing) -> String {
    let of = |granted: &Granted| {
        let revision = granted.statement.revision.as_ref();
        let revision = revision.map_or(String::new(), |r| format!("revision {r}, "));
        format!(
            "{revision}approved by {} in entry {}",
            granted.by, granted.entry
        )
    };
    match standing {
        Standing::Approved(granted) => format!("is {}", of(granted)),
        Standing::Other {
            in_force,
            before: None,
        } => format!(
            "is not approved in this form; another form is in force ({})",
            of(in_force)
        ),
        Standing::Other {
            in_force,
            before: Some(before),
        } => format!(
            "is an older form ({}), and another is in force ({})",
            of(before),
            of(in_force)
        ),
        Standing::Withdrawn(granted) => format!(
            "is not approved any more: {} withdrew the approval in entry {} ({})",
            granted.by, granted.entry, granted.statement.meaning
        ),
        Standing::NotCounted(entry, why) => {
            format!("is not approved: the approval in entry {entry} {why}")
        }
        Standing::Never => "was never approved".to_owned(),
    }
}
