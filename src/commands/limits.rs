//! `limits`: check limit, station, lot and site files, show what a limit file resolves to, print schemas.

mod approve;
mod check;
mod desk;
mod files;
mod key;
mod show;

use crate::diagnostic::printable;
use clap::{Subcommand, ValueEnum};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// Exit status: done, everything valid.
const OK: u8 = 0;
/// Exit status: a file is invalid or cannot be read.
const INVALID: u8 = 2;
/// Exit status: the output could not be written.
const NOT_PRINTED: u8 = 4;

/// Check, show and describe limit files
#[derive(Debug, clap::Args)]
pub struct Args {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// List every fault of limit, station, lot and site files
    Check {
        /// Files and folders; without any, the limits/ of the site
        paths: Vec<PathBuf>,
        /// Say too whether this station can decide each limit
        #[arg(long, value_name = "FILE")]
        station: Option<PathBuf>,
    },
    /// Show the limits of a part as absolute values
    Show {
        /// A limit file, or the number of a part of the site
        file: PathBuf,
    },
    /// Make a key pair for a person who approves files
    ///
    /// The private key is encrypted under a passphrase (PKCS#8). Prints the line by which the site
    /// file trusts it.
    Key(key::Args),
    /// Approve a limit, station or site file in its very form, with your key
    ///
    /// The file is checked first. With a station file the sweeps of its compensation standards
    /// are approved.
    Approve(approve::Approve),
    /// Take the approval of a limit or station file back
    Withdraw(approve::Withdraw),
    /// Print the JSON Schema of a kind of file, for editors
    Schema {
        /// The kind of file
        #[arg(value_enum, default_value = "limits")]
        kind: Kind,
    },
}

/// The kinds of file that people write.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Kind {
    /// A limit file
    Limits,
    /// A station file
    Station,
    /// A lot file
    Lot,
    /// The site file
    Site,
}

/// Runs the command: 0 all valid, 2 anything invalid or unreadable, 4 output failed.
///
/// Results go to `out`; faults as text go to `err`, styled.
pub fn run(args: &Args, site: &Path, json: bool, out: &mut dyn Write, err: &mut dyn Write) -> u8 {
    let done = match &args.command {
        Command::Check { paths, station } => {
            check::run(paths, station.as_deref(), site, json, out, err)
        }
        Command::Show { file } => show::run(file, site, json, out, err),
        Command::Schema { kind } => schema(*kind, out).map(|()| OK),
        Command::Key(args) => said(key::run(args, json).map(|text| (text, None)), out, err),
        Command::Approve(args) => said(approve::approve(args, site, json), out, err),
        Command::Withdraw(args) => said(approve::withdraw(args, site, json), out, err),
    };
    match done.and_then(|status| out.flush().map(|()| status)) {
        Ok(status) => status,
        Err(_) => NOT_PRINTED,
    }
}

fn said(
    done: Result<(String, Option<String>), String>,
    out: &mut dyn Write,
    err: &mut dyn Write,
) -> io::Result<u8> {
    match done {
        Ok((text, warning)) => {
            if let Some(warning) = warning {
                let _ = writeln!(err, "warning: {}", printable(&warning));
            }
            out.write_all(text.as_bytes())?;
            Ok(OK)
        }
        Err(text) => {
            // Lines of faults stay lines; nothing in them steers the terminal.
            let lines: Vec<String> = text.lines().map(printable).collect();
            let _ = writeln!(err, "error: {}", lines.join("\n"));
            Ok(INVALID)
        }
    }
}

fn schema(kind: Kind, out: &mut dyn Write) -> io::Result<()> {
    out.write_all(match kind {
        Kind::Limits => crate::limits::SCHEMA.as_bytes(),
        Kind::Station => crate::station::SCHEMA.as_bytes(),
        Kind::Lot => crate::lot::SCHEMA.as_bytes(),
        Kind::Site => crate::site::SCHEMA.as_bytes(),
    })
}
