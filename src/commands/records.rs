//! `records`: list, show, export, re-issue, dispose of and verify what was judged.

mod document;
mod list;
mod severities;
mod severity;
mod show;
mod verify;

use super::keep::{self, PROGRAM, Place, certificates_of};
use super::signing::SigningArgs;
use super::site::Site;
use super::store::Paths;
use super::{Context, Format, exit};
use crate::certificate::as_issued;
use crate::diagnostic::printable;
use crate::ledger::bag::{Export, export};
use crate::ledger::disk::System;
use crate::ledger::{Decision, Ledger, LedgerError, sha256_hex};
use chrono::{DateTime, FixedOffset};
use clap::{Subcommand, ValueEnum};
use serde_json::json;
use std::path::{Path, PathBuf};

/// List, show, verify and export records; dispose of lots
#[derive(Debug, clap::Args)]
pub struct Args {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// List judged lots, in the order of the ledger
    List(list::Args),
    /// Show a whole record as plain text, with every part and what happened to it since
    Show {
        /// A record, or a lot that has one record
        record: String,
    },
    /// Check database, log, archive and certificates; judge every record again and compare
    ///
    /// Exit status 0: all proven; 1: something is wrong; 2: could not look.
    Verify(verify::Args),
    /// Write a record with all that it rests on as a BagIt package (RFC 8493)
    Export {
        /// A record, or a lot that has one record
        record: String,
        /// A folder that does not exist yet
        folder: PathBuf,
        #[command(flatten)]
        with: Circumstances,
    },
    /// Make the PDF of a record again, marked as a copy
    Reissue {
        /// A record, or a lot that has one record
        record: String,
        /// Why
        #[arg(long, value_name = "TEXT")]
        reason: String,
        /// For whom or by whom: the code that the site uses for a person
        #[arg(long, value_name = "PERSON")]
        by: Option<String>,
        #[command(flatten)]
        signing: SigningArgs,
        #[command(flatten)]
        with: Circumstances,
    },
    /// Show the severity of inspection of a part from a supplier, or set it
    Severity(severity::Args),
    /// Record what becomes of a held or rejected lot
    Dispose {
        /// A record, or a lot that has one record
        record: String,
        /// What becomes of the lot
        #[arg(long, value_enum)]
        decision: DecisionArg,
        /// Why
        #[arg(long, value_name = "TEXT")]
        reason: String,
        /// Who decided: the code that the site uses for a person
        #[arg(long, value_name = "PERSON")]
        by: String,
        #[command(flatten)]
        with: Circumstances,
    },
}

#[derive(Debug, clap::Args)]
struct Circumstances {
    /// The time, RFC 3339 with offset [default: now]
    #[arg(long, env = "REELGATE_NOW", value_name = "TIME", value_parser = DateTime::parse_from_rfc3339)]
    now: Option<DateTime<FixedOffset>>,
    /// File on another machine or share that gets each new checkpoint [default: the site file's]
    #[arg(long, env = "REELGATE_WITNESS", value_name = "FILE")]
    witness: Option<PathBuf>,
}

#[derive(Debug, Clone, Copy, ValueEnum)]
enum DecisionArg {
    /// Used as it is
    Concession,
    /// Sent back to the supplier
    Return,
    /// Inspected part by part
    Sort,
    /// Made unusable
    Scrap,
    /// To be measured again
    Retest,
}

impl From<DecisionArg> for Decision {
    fn from(decision: DecisionArg) -> Self {
        match decision {
            DecisionArg::Concession => Decision::Concession,
            DecisionArg::Return => Decision::Return,
            DecisionArg::Sort => Decision::Sort,
            DecisionArg::Scrap => Decision::Scrap,
            DecisionArg::Retest => Decision::Retest,
        }
    }
}

/// What a command comes to: its exit status and output, or why it could not be done.
type Done = Result<(u8, Vec<u8>), String>;

/// What an act came to, for people and for programs.
struct Act {
    text: String,
    value: serde_json::Value,
    /// What should be known though the act is done.
    warning: Option<String>,
}

impl Act {
    fn done(self, context: &mut Context) -> Done {
        if let Some(warning) = &self.warning {
            let _ = writeln!(context.err, "warning: {}", printable(warning));
        }
        let text = match context.format {
            Format::Text => format!("{}\n", self.text),
            Format::Json => format!("{:#}\n", self.value),
        };
        Ok((exit::OK, text.into_bytes()))
    }
}

/// Runs the command.
pub fn run(args: &Args, context: &mut Context) -> u8 {
    let site = Site::new(&context.site);
    let done = match &args.command {
        Command::List(args) => list::run(args, &site, context.format),
        Command::Show { record } => show::run(record, &site, context.format),
        Command::Severity(args) => severity::run(args, &site, context),
        Command::Verify(args) => verify::run(args, &site, context.format),
        Command::Export {
            record,
            folder,
            with,
        } => export_record(record, folder, with, &site).and_then(|act| act.done(context)),
        Command::Reissue {
            record,
            reason,
            by,
            signing,
            with,
        } => signed_place(&site, with, signing)
            .and_then(|place| reissue(record, reason, by.as_deref(), &place))
            .and_then(|act| act.done(context)),
        Command::Dispose {
            record,
            decision,
            reason,
            by,
            with,
        } => place(&site, with)
            .and_then(|place| dispose(record, *decision, reason, by, &place))
            .and_then(|act| act.done(context)),
    };
    match done {
        Ok((status, text)) => {
            let printed = context
                .out
                .write_all(&text)
                .and_then(|()| context.out.flush());
            printed.map_or(exit::NOT_PRINTED, |()| status)
        }
        Err(text) => {
            let _ = writeln!(context.err, "error: {}", printable(&text));
            exit::FAILED
        }
    }
}

fn place(site: &Site, with: &Circumstances) -> Result<Place, String> {
    let rules = site.rules().map_err(|stop| stop.to_string())?;
    Ok(Place {
        records: site.records(),
        certificates: site.certificates(),
        key: None,
        witness: site.witness(with.witness.as_deref(), rules.as_ref()),
        now: keep::now(with.now),
        signer: None,
    })
}

fn signed_place(site: &Site, with: &Circumstances, signing: &SigningArgs) -> Result<Place, String> {
    let place = place(site, with)?;
    // Its faults were found above.
    let rules = site.rules().ok().flatten();
    Ok(Place {
        signer: signing.signer(site, rules.as_ref(), place.now)?,
        ..place
    })
}

fn open(site: &Site) -> Result<Ledger, String> {
    Ledger::open(&site.records()).map_err(|e| e.to_string())
}

/// The record of that name, or the only one of that lot.
fn resolve(ledger: &Ledger, name: &str) -> Result<String, String> {
    use crate::ledger::Query;
    let text = |e: LedgerError| e.to_string();
    if !ledger.find(Query::Record(name)).map_err(text)?.is_empty() {
        return Ok(name.to_owned());
    }
    let of_lot = ledger.find(Query::Lot(name)).map_err(text)?;
    let records: Vec<&str> = of_lot.iter().filter_map(|e| e.act.record()).collect();
    match records.as_slice() {
        [one] => Ok((*one).to_owned()),
        [] => Err(format!(
            "there is no record and no lot `{name}`: `reelgate records list` shows what there is"
        )),
        several => Err(format!(
            "lot {name} has {} records: name one of {}",
            several.len(),
            several.join(", ")
        )),
    }
}

fn export_record(
    name: &str,
    folder: &Path,
    with: &Circumstances,
    site: &Site,
) -> Result<Act, String> {
    let ledger = open(site)?;
    let record = resolve(&ledger, name)?;
    let known = certificates_of(&ledger, &record).map_err(|e| e.to_string())?;
    let pdf = std::fs::read(Paths::of(&site.certificates(), &record).pdf)
        .ok()
        .filter(|bytes| known.contains(&sha256_hex(as_issued(bytes))));
    let what = Export {
        record: &record,
        certificate: pdf.as_deref(),
        time: keep::now(with.now),
        program: PROGRAM,
    };
    export(&ledger, &what, folder, &System).map_err(|e| e.to_string())?;
    let folder = printable(&folder.display().to_string());
    let warning = pdf
        .is_none()
        .then(|| "without its PDF, which is not there as it was issued".to_owned());
    Ok(Act {
        text: format!("Record {record} is in {folder}"),
        value: json!({"record": record, "package": folder, "certificate": pdf.is_some()}),
        warning,
    })
}

fn reissue(name: &str, reason: &str, by: Option<&str>, place: &Place) -> Result<Act, String> {
    let ledger = Ledger::open(&place.records).map_err(|e| e.to_string())?;
    let record = resolve(&ledger, name)?;
    drop(ledger);
    let (path, warning) = keep::reissue(place, &record, by, reason)?;
    let path = printable(&path.display().to_string());
    Ok(Act {
        text: format!("Copy  {path}"),
        value: json!({"record": record, "copy": path}),
        warning,
    })
}

fn dispose(
    name: &str,
    decision: DecisionArg,
    reason: &str,
    by: &str,
    place: &Place,
) -> Result<Act, String> {
    let text = |e: LedgerError| e.to_string();
    // Looked for before anything is opened for writing, which would make a ledger.
    let record = resolve(&Ledger::open(&place.records).map_err(text)?, name)?;
    let mut ledger = place.open().map_err(text)?;
    let recorded = ledger
        .dispose(&record, decision.into(), reason, &place.by(Some(by)))
        .map_err(text)?;
    let again = if recorded.new { "" } else { " (as before)" };
    let entry = &recorded.entry;
    Ok(Act {
        text: format!("Entry {}{again}: {}", entry.index, show::words(entry)),
        value: serde_json::to_value(entry).map_err(|e| e.to_string())?,
        warning: place.tell_witness(&ledger).err(),
    })
}
