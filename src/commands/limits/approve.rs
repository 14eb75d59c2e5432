//! `limits approve`, `limits withdraw`: a signed statement about a file, as an entry of the ledger.

use super::desk::{Desk, Subject, trust_of};
use super::files;
use crate::commands::keep::{self, Place};
use crate::commands::passphrase;
use crate::diagnostic::printable;
use crate::keys::{Signer, decrypt};
use crate::ledger::approval::{Approved, Statement};
use crate::ledger::trust::Standing;
use crate::ledger::{LedgerError, Object, Recorded, sha256_hex};
use crate::site::{Role, SiteFile, TrustedKey};
use chrono::{DateTime, FixedOffset};
use serde_json::json;
use std::path::{Path, PathBuf};

/// Statements about the same file at the same moment are rare.
const TRIES: usize = 5;
/// A key file is some 400 bytes.
const KEY_BYTES_MAX: u64 = 16 * 1024;

#[derive(Debug, clap::Args)]
pub struct Approve {
    /// A limit, station or site file
    file: PathBuf,
    #[command(flatten)]
    by: By,
    /// What the signature means, such as "checked against the drawing, released for goods-in"
    #[arg(long, value_name = "TEXT")]
    meaning: String,
}

#[derive(Debug, clap::Args)]
pub struct Withdraw {
    /// A limit or station file that is approved
    file: PathBuf,
    #[command(flatten)]
    by: By,
    /// Why
    #[arg(long, value_name = "TEXT")]
    reason: String,
}

#[derive(Debug, clap::Args)]
struct By {
    /// Your private key
    #[arg(long, value_name = "KEY")]
    key: PathBuf,
    /// File whose first line is the passphrase (`-`: standard input) [default: it is asked for]
    #[arg(long, value_name = "FILE")]
    passphrase_file: Option<PathBuf>,
    /// The time, RFC 3339 with offset [default: now]
    #[arg(long, env = "REELGATE_NOW", value_name = "TIME", value_parser = DateTime::parse_from_rfc3339)]
    now: Option<DateTime<FixedOffset>>,
    /// File on another machine or share that gets each new checkpoint [default: the site file's]
    #[arg(long, env = "REELGATE_WITNESS", value_name = "FILE")]
    witness: Option<PathBuf>,
    /// Key that a new ledger begins with [default: one is made]
    #[arg(long, env = "REELGATE_LEDGER_KEY", value_name = "FILE")]
    ledger_key: Option<PathBuf>,
}

/// Approves a file that has no faults; what is to be printed, and a warning.
///
/// # Errors
/// In words; nothing is then recorded, but where it says otherwise.
pub fn approve(
    args: &Approve,
    site: &Path,
    as_json: bool,
) -> Result<(String, Option<String>), String> {
    let bytes = files::bytes(&args.file).map_err(|faults| faults.to_string())?;
    let valid = files::parse(&args.file, &bytes)
        .map_err(|faults| format!("a file with faults cannot be approved\n{faults}"))?;
    let desk = Desk::open(site)?;
    let subject = desk.subject(&args.file, &valid, bytes)?;
    let own = match &valid {
        files::Valid::Site(file) => Some(file.as_ref()),
        _ => None,
    };
    act(
        &desk,
        &subject,
        own,
        &args.by,
        (false, &args.meaning),
        as_json,
    )
}

/// Takes the approval back that is in force for a file.
///
/// # Errors
/// As [`approve`].
pub fn withdraw(
    args: &Withdraw,
    site: &Path,
    as_json: bool,
) -> Result<(String, Option<String>), String> {
    let bytes = files::bytes(&args.file).map_err(|faults| faults.to_string())?;
    let valid = files::parse(&args.file, &bytes).map_err(|faults| faults.to_string())?;
    let desk = Desk::open(site)?;
    let subject = desk.subject(&args.file, &valid, bytes)?;
    if subject.kind == Approved::Site {
        return Err(format!(
            "{}: the approval of a site file is not withdrawn: change the file and approve it anew",
            args.file.display()
        ));
    }
    act(
        &desk,
        &subject,
        None,
        &args.by,
        (true, &args.reason),
        as_json,
    )
}

fn act(
    desk: &Desk,
    subject: &Subject,
    own: Option<&SiteFile>,
    by: &By,
    (withdraws, meaning): (bool, &str),
    as_json: bool,
) -> Result<(String, Option<String>), String> {
    if meaning.trim().is_empty() {
        return Err(format!(
            "{}: say what the signature means (`--meaning`), or why the approval is withdrawn (`--reason`)",
            subject.name
        ));
    }
    let keys = desk
        .trust
        .site_file()
        .map(|site| &site.file)
        .or(own)
        .or(desk.rules.as_ref());
    let keys = keys.ok_or_else(|| {
        "the site has no limits/site.yaml, so that nobody is trusted: write one with your key under `trusted_keys:` \
         (`reelgate limits key` makes a key and prints the line)"
            .to_owned()
    })?;
    let signer = signer(by, keys, subject)?;
    let place = place(desk, by);
    for _ in 0..TRIES {
        match enter(&place, desk, subject, keys, &signer, (withdraws, meaning)) {
            Err(Stop::Overtaken) => {}
            Err(Stop::Words(text)) => return Err(text),
            Ok((recorded, warning)) => return Ok((said(&recorded, &signer, as_json)?, warning)),
        }
    }
    Err(LedgerError::Overtaken.to_string())
}

enum Stop {
    Overtaken,
    Words(String),
}

impl From<LedgerError> for Stop {
    fn from(error: LedgerError) -> Stop {
        match error {
            LedgerError::Overtaken => Stop::Overtaken,
            error => Stop::Words(error.to_string()),
        }
    }
}

fn enter(
    place: &Place,
    desk: &Desk,
    subject: &Subject,
    keys: &SiteFile,
    signer: &Signer,
    (withdraws, meaning): (bool, &str),
) -> Result<(Recorded, Option<String>), Stop> {
    let mut ledger = place.open()?;
    let trust = trust_of(&ledger)?;
    // Which keys count may have changed since they were looked at.
    let sites = (trust.site_files().len(), desk.trust.site_files().len());
    if sites.0 != sites.1 {
        let text = "another site file was approved meanwhile: do it again";
        return Err(Stop::Words(text.to_owned()));
    }
    let size = ledger.size()?;
    let by = trusted(keys, signer)?;
    if !by.counts_at(size) {
        return Err(Stop::Words(format!(
            "the key {} does not count at entry {size}: `from_entry` and `revoked_at_entry` in limits/site.yaml say when it does",
            signer.verifier().name()
        )));
    }
    let now = Desk {
        site: desk.site.clone(),
        rules: desk.rules.clone(),
        trust,
    };
    match now.standing(subject) {
        Some(Standing::Approved(granted)) if !withdraws && granted.by == by.key.name() => {
            return Ok((ledger.entry(granted.entry)?, None));
        }
        Some(Standing::Approved(_)) => {}
        Some(standing) if withdraws => {
            return Err(Stop::Words(format!(
                "{} {}: there is nothing to withdraw",
                subject.name,
                crate::commands::approvals::why(&standing)
            )));
        }
        _ => {}
    }
    let statement = Statement {
        withdraws,
        ledger: ledger.verifier().name().to_owned(),
        entries: size,
        kind: subject.kind,
        file: subject.name.clone(),
        revision: subject.revision.clone(),
        sha256: sha256_hex(&subject.bytes),
        with: subject.belonging(),
        meaning: meaning.to_owned(),
    };
    let note = statement
        .sign(signer)
        .map_err(|e| Stop::Words(e.to_string()))?;
    let file = Object {
        role: subject.kind.role(),
        name: &subject.name,
        bytes: &subject.bytes,
    };
    let with: Vec<Object> = subject
        .with
        .iter()
        .map(|sweep| Object {
            role: "compensation",
            name: &sweep.name,
            bytes: &sweep.bytes,
        })
        .collect();
    let verifier = signer.verifier();
    let made = place.by(Some(verifier.name()));
    let recorded = ledger.approve(&file, &with, &note, &verifier, &made)?;
    Ok((recorded, place.tell_witness(&ledger).err()))
}

fn place(desk: &Desk, by: &By) -> Place {
    let rules = desk.site.rules().ok().flatten();
    Place {
        records: desk.site.records(),
        certificates: desk.site.certificates(),
        key: by.ledger_key.clone(),
        witness: desk.site.witness(by.witness.as_deref(), rules.as_ref()),
        now: keep::now(by.now),
        signer: None,
    }
}

/// The person's key, as one that the site trusts with such a file.
fn signer(by: &By, keys: &SiteFile, subject: &Subject) -> Result<Signer, String> {
    let shown = by.key.display();
    let length = std::fs::metadata(&by.key)
        .map_err(|e| format!("{shown}: cannot be read: {e}"))?
        .len();
    if length > KEY_BYTES_MAX {
        return Err(format!("{shown}: is too large for a private key"));
    }
    let pem =
        std::fs::read_to_string(&by.key).map_err(|e| format!("{shown}: cannot be read: {e}"))?;
    let whose = by.key.file_name().unwrap_or_default().to_string_lossy();
    let passphrase = passphrase::get(by.passphrase_file.as_deref(), &printable(&whose), false)?;
    let secret = decrypt(&pem, &passphrase).map_err(|e| format!("{shown}: {e}"))?;
    // The name is that under which the site trusts the key.
    let unnamed = Signer::new("key", &secret).map_err(|e| e.to_string())?;
    let public = unnamed.verifier().public();
    let known = keys
        .trusted_keys
        .iter()
        .find(|key| key.key.public() == public);
    let Some(key) = known else {
        return Err(format!(
            "{shown}: is not a key that the site trusts: its line must stand under `trusted_keys:` in the site file that is in force"
        ));
    };
    if subject.kind != Approved::Station && key.role != Role::QualityEngineer {
        return Err(format!(
            "{}: the key {} is that of a {}, and this file is approved by a quality engineer",
            subject.name,
            key.key.name(),
            key.role.words()
        ));
    }
    Signer::new(key.key.name(), &secret).map_err(|e| e.to_string())
}

fn trusted<'k>(keys: &'k SiteFile, signer: &Signer) -> Result<&'k TrustedKey, Stop> {
    keys.trusted(signer.verifier().name())
        .ok_or_else(|| Stop::Words("the key is not one that the site trusts".to_owned()))
}

fn said(recorded: &Recorded, signer: &Signer, as_json: bool) -> Result<String, String> {
    let entry = &recorded.entry;
    if as_json {
        let value = json!({"new": recorded.new, "entry": entry});
        return Ok(format!("{value:#}\n"));
    }
    let again = if recorded.new { "" } else { " (as before)" };
    let (what, file, sha256) = match &entry.act {
        crate::ledger::Act::Approval { file, sha256, .. } => ("approved by", file, sha256),
        crate::ledger::Act::Withdrawal { file, sha256, .. } => {
            ("approval withdrawn by", file, sha256)
        }
        _ => return Err("the entry is not an approval".to_owned()),
    };
    Ok(format!(
        "Entry {}{again}: {file}\n  {what} {}, {}\n  SHA-256 {sha256}\n",
        entry.index,
        printable(signer.verifier().name()),
        entry.time
    ))
}
