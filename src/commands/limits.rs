//! `limits`: check limit, station, lot and site files, show what a limit file resolves to, print schemas.

mod check;
mod files;
mod show;

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
    };
    match done.and_then(|status| out.flush().map(|()| status)) {
        Ok(status) => status,
        Err(_) => NOT_PRINTED,
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
