//! `reelgate judge LOT…`: lot folders in; verdict, JSON and PDF lot record out.

use super::evidence::{self, Evidence};
use super::keep::{self, Kept, NotKept, Place};
use super::signing::SigningArgs;
use super::site::{Site, Stop, Unreadable, gather};
use super::{Context, Format, budget, exit, explain, present};
use crate::certificate::Paper;
use crate::diagnostic::{self, Faults, printable};
use crate::record::{self, LotRecord, LotVerdict, Refusal, Sources};
use chrono::{DateTime, FixedOffset};
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::io::IsTerminal;
use std::path::{Path, PathBuf};

/// Work on fewer sweep files than this needs no progress bar.
const BAR_FROM: usize = 200;

/// Judge lot folders: the main job
#[derive(Debug, clap::Args)]
pub struct Args {
    /// Lot folders, each with lot.yaml and its sweeps
    #[arg(required = true, value_name = "LOT")]
    lots: Vec<PathBuf>,
    /// Time of issue of new records, RFC 3339 with offset [default: now]
    #[arg(long, env = "REELGATE_NOW", value_name = "TIME", value_parser = DateTime::parse_from_rfc3339)]
    now: Option<DateTime<FixedOffset>>,
    /// Print the chain from numbers to verdict; with =PART that of one part too
    #[arg(long, value_name = "PART", num_args = 0..=1, require_equals = true, default_missing_value = "")]
    explain: Option<String>,
    /// Print the uncertainty budget of one part's readings
    #[arg(long, value_name = "PART")]
    budget: Option<String>,
    /// Paper of the PDF lot record
    #[arg(long, value_enum, default_value = "a4")]
    paper: PaperArg,
    /// Key that a new ledger begins with [default: one is made]
    #[arg(long, env = "REELGATE_LEDGER_KEY", value_name = "FILE")]
    ledger_key: Option<PathBuf>,
    /// File on another machine or share that gets each new checkpoint [default: the site file's]
    #[arg(long, env = "REELGATE_WITNESS", value_name = "FILE")]
    witness: Option<PathBuf>,
    #[command(flatten)]
    signing: SigningArgs,
}

/// Paper, as the command line spells it.
#[derive(Debug, Clone, Copy, clap::ValueEnum)]
#[allow(missing_docs)]
pub enum PaperArg {
    A4,
    Letter,
}

impl From<PaperArg> for Paper {
    fn from(paper: PaperArg) -> Self {
        match paper {
            PaperArg::A4 => Paper::A4,
            PaperArg::Letter => Paper::Letter,
        }
    }
}

/// Judges every lot; one that cannot be judged does not keep the others from it.
pub fn run(args: &Args, context: &mut Context) -> u8 {
    let mut records = Vec::new();
    let mut failed = false;
    let mut printed = true;
    for folder in &args.lots {
        match judge(args, folder, context) {
            Ok((kept, budget)) => {
                if context.format == Format::Text {
                    printed &= print(args, context, &kept, &budget, records.is_empty()).is_ok();
                }
                printed &= kept.unwritten.is_none();
                records.push(kept.record);
            }
            Err(()) => failed = true,
        }
    }
    if context.format == Format::Json && !records.is_empty() {
        printed &= print_json(context, args, &records).is_ok();
    }
    status(&records, failed, printed)
}

fn status(records: &[LotRecord], failed: bool, printed: bool) -> u8 {
    let any = |verdict| records.iter().any(|r| r.verdict == verdict);
    if !records.is_empty() && !printed {
        exit::NOT_PRINTED
    } else if any(LotVerdict::Reject) {
        exit::REJECT
    } else if any(LotVerdict::Hold) {
        exit::HOLD
    } else if failed || records.is_empty() {
        exit::FAILED
    } else {
        exit::OK
    }
}

/// One lot from its folder to its record; what went wrong is on standard error.
fn judge(args: &Args, folder: &Path, context: &mut Context) -> Result<(Kept, String), ()> {
    let site = Site::new(&context.site);
    let sources = gather(&site, folder).map_err(|stop| say_stop(context, stop))?;
    let evidence = Evidence::of(&sources).map_err(|faults| say_faults(context, &faults))?;
    let now = keep::now(args.now);
    // Before anything is judged: a record that cannot be signed is not begun.
    let signer = args
        .signing
        .signer(&site, sources.site.as_ref(), now)
        .map_err(|why| {
            let _ = writeln!(context.err, "error: {}", printable(&why));
        })?;
    let place = Place {
        records: site.records(),
        certificates: site.certificates(),
        key: args.ledger_key.clone(),
        witness: site.witness(args.witness.as_deref(), sources.site.as_ref()),
        now,
        signer,
    };
    let bar = bar(sources.sweeps.len());
    let kept = keep::judge(&place, &sources, &evidence, args.paper.into(), &|| {
        bar.inc(1)
    });
    bar.finish_and_clear();
    let kept = kept.map_err(|why| say_not_kept(context, folder, why))?;
    if let Some(why) = &kept.unwritten {
        say(
            context,
            &kept.record.record,
            &format!("recorded, but {why}"),
        );
    }
    for why in &kept.warnings {
        let _ = writeln!(context.err, "warning: {}", printable(why));
    }
    let budget = match &args.budget {
        None => String::new(),
        Some(part) => budget_of(&sources, &kept, part),
    };
    Ok((kept, budget))
}

/// The uncertainty budget, from the judgement made now or made again.
fn budget_of(sources: &Sources, kept: &Kept, part: &str) -> String {
    let again;
    let made = match &kept.made {
        Some(made) => made,
        None => match record::make(
            sources,
            &evidence::first_occasion(&kept.record.issued),
            &|| (),
        ) {
            Ok(made) => {
                again = made;
                &again
            }
            Err(_) => return String::new(),
        },
    };
    budget::screen(sources, made, part)
}

fn say_not_kept(context: &mut Context, folder: &Path, why: NotKept) {
    let folder = folder.display().to_string();
    match why {
        NotKept::Refused(Refusal::Faults(all)) => {
            all.iter().for_each(|faults| say_faults(context, faults));
        }
        NotKept::Refused(Refusal::Impossible(note)) => say(context, &folder, &note.text),
        NotKept::Ledger(error) => say(context, &folder, &error.to_string()),
        NotKept::Changed(path) => say(
            context,
            &path.display().to_string(),
            "was changed after it was issued: keep it as evidence in another place, run `reelgate records verify`, \
             and judge again, which makes it as it was",
        ),
        NotKept::Other(text) => say(context, &folder, &text),
    }
}

fn bar(files: usize) -> ProgressBar {
    if files < BAR_FROM || !std::io::stderr().is_terminal() {
        return ProgressBar::hidden();
    }
    let bar = ProgressBar::with_draw_target(Some(files as u64), ProgressDrawTarget::stderr());
    if let Ok(style) = ProgressStyle::with_template("  reading sweeps {bar:40} {pos} of {len}") {
        bar.set_style(style);
    }
    bar
}

fn print(
    args: &Args,
    context: &mut Context,
    kept: &Kept,
    budget: &str,
    first: bool,
) -> std::io::Result<()> {
    let Kept { record, paths, .. } = kept;
    let gap = if first { "" } else { "\n" };
    let pdf = printable(&paths.pdf.display().to_string());
    let chain = args
        .explain
        .as_ref()
        .map_or(String::new(), |part| explain::screen(record, part));
    let screen = present::screen(record);
    let before = record.supersedes.as_ref().map_or(String::new(), |name| {
        format!("Instead of  {}\n", printable(name))
    });
    write!(
        context.out,
        "{gap}{screen}{chain}{budget}
Record  {pdf}
{before}"
    )?;
    context.out.flush()
}

/// One lot is an object, several are an array.
fn print_json(context: &mut Context, args: &Args, records: &[LotRecord]) -> std::io::Result<()> {
    let bytes = match records {
        [one] if args.lots.len() == 1 => record::to_bytes(one),
        many => serde_json::to_vec_pretty(many).map(|mut bytes| {
            bytes.push(b'\n');
            bytes
        }),
    }?;
    context.out.write_all(&bytes)?;
    context.out.flush()
}

fn say(context: &mut Context, path: &str, text: &str) {
    let _ = writeln!(
        context.err,
        "error: {}: {}",
        printable(path),
        printable(text)
    );
}

fn say_stop(context: &mut Context, stop: Stop) {
    match stop {
        Stop::Unreadable(all) => say_unreadable(context, &all),
        Stop::Faults(faults) => say_faults(context, &faults),
    }
}

fn say_unreadable(context: &mut Context, all: &[Unreadable]) {
    for one in all {
        say(context, &one.path.display().to_string(), &one.note.text);
    }
}

fn say_faults(context: &mut Context, faults: &Faults) {
    let _ = write!(context.err, "{}", diagnostic::render(faults, true));
}
