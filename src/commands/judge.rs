//! `reelgate judge LOT…`: lot folders in; verdict, JSON and PDF lot record out.

use super::site::{Site, Stop, Unreadable, gather};
use super::store::{Paths, write_whole};
use super::{Context, Format, budget, exit, explain, present};
use crate::certificate::{self, Curve, Paper};
use crate::diagnostic::{self, Faults, printable};
use crate::record::{self, LotRecord, LotVerdict, Made, Refusal, Sources};
use crate::statistics::sampling::Severity;
use chrono::{DateTime, FixedOffset};
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::fs;
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
}

#[derive(Debug, Clone, Copy, clap::ValueEnum)]
enum PaperArg {
    A4,
    Letter,
}

/// Judges every lot; one that cannot be judged does not keep the others from it.
pub fn run(args: &Args, context: &mut Context) -> u8 {
    let mut records = Vec::new();
    let mut failed = false;
    let mut printed = true;
    for folder in &args.lots {
        match judge(args, folder, context) {
            Ok((record, paths, budget)) => {
                if context.format == Format::Text {
                    printed &=
                        print(args, context, &record, &paths, &budget, records.is_empty()).is_ok();
                }
                records.push(record);
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

/// One lot from its folder to its record on the disk; what went wrong is on standard error.
fn judge(
    args: &Args,
    folder: &Path,
    context: &mut Context,
) -> Result<(LotRecord, Paths, String), ()> {
    let site = Site::new(&context.site);
    let sources = gather(&site, folder).map_err(|stop| match stop {
        Stop::Unreadable(all) => say_unreadable(context, &all),
        Stop::Faults(faults) => say_faults(context, &faults),
    })?;
    let bar = bar(sources.sweeps.len());
    let now = args
        .now
        .unwrap_or_else(|| chrono::Local::now().fixed_offset());
    let issued = now.to_rfc3339_opts(chrono::SecondsFormat::Secs, false);
    let made = record::make(&sources, Severity::Normal, &issued, &|| bar.inc(1));
    bar.finish_and_clear();
    let mut made = made.map_err(|refusal| match refusal {
        Refusal::Faults(all) => all.iter().for_each(|faults| say_faults(context, faults)),
        Refusal::Impossible(note) => say(context, &folder.display().to_string(), &note.text),
    })?;
    let paths = Paths::of(&site.certificates(), &made.record.record);
    keep(args, &sources, &mut made, &paths)
        .map_err(|text| say(context, &paths.json.display().to_string(), &text))?;
    let budget = args
        .budget
        .as_ref()
        .map_or(String::new(), |part| budget::screen(&sources, &made, part));
    Ok((made.record, paths, budget))
}

/// Writes PDF and JSON. A record that exists already keeps its time of issue, and must then come
/// out the same byte for byte.
fn keep(args: &Args, sources: &Sources, made: &mut Made, paths: &Paths) -> Result<(), String> {
    let existing = match fs::read(&paths.json) {
        Ok(bytes) => Some(bytes),
        Err(e) if e.kind() == std::io::ErrorKind::NotFound => None,
        Err(e) => return Err(format!("cannot be read: {e}")),
    };
    if let Some(old) = existing
        .as_deref()
        .and_then(|bytes| record::from_bytes(bytes).ok())
    {
        made.record.issued = old.issued;
    }
    let json = record::to_bytes(&made.record).map_err(|e| e.to_string())?;
    if existing.is_some_and(|old| old != json) {
        return Err("exists and is not what these inputs give: the record was changed after it was issued, or another build \
                    of the program made it; keep it as evidence in another place and judge again"
            .to_owned());
    }
    let pdf = certificate(args, sources, made)?;
    write_whole(&paths.pdf, &pdf)
        .and_then(|()| write_whole(&paths.json, &json))
        .map_err(|e| format!("the record could not be written: {e}"))
}

fn certificate(args: &Args, sources: &Sources, made: &Made) -> Result<Vec<u8>, String> {
    let curves: Vec<Curve> = made
        .curves
        .iter()
        .map(|c| Curve {
            part: c.part.clone(),
            verdict: c.verdict,
            frequency: c.sweep.frequency.clone(),
            impedance: c.sweep.impedance.clone(),
        })
        .collect();
    let paper = match args.paper {
        PaperArg::A4 => Paper::A4,
        PaperArg::Letter => Paper::Letter,
    };
    let texts = certificate::Sources {
        limit_file: std::str::from_utf8(&sources.limits.bytes).ok(),
        station_file: std::str::from_utf8(&sources.station.bytes).ok(),
    };
    certificate::render(&made.record, &curves, &texts, paper)
        .map(|made| made.pdf)
        .map_err(|e| format!("the PDF lot record could not be made: {e}"))
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
    record: &LotRecord,
    paths: &Paths,
    budget: &str,
    first: bool,
) -> std::io::Result<()> {
    let gap = if first { "" } else { "\n" };
    let pdf = printable(&paths.pdf.display().to_string());
    let chain = args
        .explain
        .as_ref()
        .map_or(String::new(), |part| explain::screen(record, part));
    let screen = present::screen(record);
    write!(
        context.out,
        "{gap}{screen}{chain}{budget}
Record  {pdf}
"
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

fn say_unreadable(context: &mut Context, all: &[Unreadable]) {
    for one in all {
        say(context, &one.path.display().to_string(), &one.note.text);
    }
}

fn say_faults(context: &mut Context, faults: &Faults) {
    let _ = write!(context.err, "{}", diagnostic::render(faults, true));
}
