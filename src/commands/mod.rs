//! Subcommands: arguments, wiring, what is printed. The only place with files and clock.

mod approvals;
mod bench;
mod budget;
mod evidence;
mod explain;
mod judge;
mod keep;
mod limits;
mod passphrase;
mod plan;
mod present;
mod records;
mod signing;
mod site;
mod store;
mod switching;
mod text;

use clap::{Parser, Subcommand, ValueEnum};
use std::ffi::OsString;
use std::io::Write;
use std::path::PathBuf;

/// Exit status (see `docs/operator.md`).
pub mod exit {
    /// Every lot accepted; the command did what was asked.
    pub const OK: u8 = 0;
    /// A lot is rejected.
    pub const REJECT: u8 = 1;
    /// Nothing could be judged, or the input is invalid.
    pub const FAILED: u8 = 2;
    /// A lot is held and none rejected.
    pub const HOLD: u8 = 3;
    /// A run at the bench waits to be gone on with.
    pub const PAUSED: u8 = 5;
    /// Judged and recorded, but the output could not be written.
    pub const NOT_PRINTED: u8 = 4;
}

/// How results are printed on standard output.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Format {
    /// For people
    Text,
    /// For programs
    Json,
}

/// Incoming inspection of capacitor reels from impedance sweeps
///
/// Acceptance is not a safety certification of safety-class parts. Capacitors hold charge:
/// discharge and handle them as local rules and qualified staff say.
#[derive(Debug, Parser)]
#[command(
    name = "reelgate",
    version,
    disable_help_subcommand = true,
    max_term_width = 80
)]
struct Cli {
    /// Folder with limits/ and records/
    #[arg(
        long,
        global = true,
        env = "REELGATE_SITE",
        default_value = ".",
        value_name = "DIR"
    )]
    site: PathBuf,
    /// Text for people or JSON for programs
    ///
    /// [default: text; `plan` by its own figures: json where there is no terminal]
    #[arg(long, global = true, value_enum)]
    format: Option<Format>,
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    Judge(judge::Args),
    Bench(bench::Args),
    Plan(plan::Args),
    Limits(limits::Args),
    Records(records::Args),
}

/// What every command gets.
pub struct Context<'a> {
    #[allow(missing_docs)]
    pub site: PathBuf,
    #[allow(missing_docs)]
    pub format: Format,
    /// The format that was asked for.
    pub format_given: Option<Format>,
    /// Results, and nothing else.
    pub out: &'a mut dyn Write,
    /// Diagnostics.
    pub err: &'a mut dyn Write,
}

/// Runs one command line and returns its exit status.
pub fn run(
    args: impl IntoIterator<Item = OsString>,
    out: &mut dyn Write,
    err: &mut dyn Write,
) -> u8 {
    let cli = match Cli::try_parse_from(args) {
        Ok(cli) => cli,
        Err(answer) => return usage(&answer, out, err),
    };
    let mut context = Context {
        site: cli.site,
        format: cli.format.unwrap_or(Format::Text),
        format_given: cli.format,
        out,
        err,
    };
    match cli.command {
        Command::Judge(args) => judge::run(&args, &mut context),
        Command::Bench(args) => bench::run(&args, &mut context),
        Command::Plan(args) => plan::run(&args, &mut context),
        Command::Records(args) => records::run(&args, &mut context),
        Command::Limits(args) => {
            let json = context.format == Format::Json;
            limits::run(&args, &context.site, json, context.out, context.err)
        }
    }
}

/// Help and version go to standard output and are no failure; anything else is.
fn usage(answer: &clap::Error, out: &mut dyn Write, err: &mut dyn Write) -> u8 {
    let text = answer.render();
    if answer.use_stderr() {
        let _ = write!(err, "{}", text.ansi());
        exit::FAILED
    } else {
        match write!(out, "{}", text.ansi()).and_then(|()| out.flush()) {
            Ok(()) => exit::OK,
            Err(_) => exit::NOT_PRINTED,
        }
    }
}
