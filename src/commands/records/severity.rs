//! `records severity`: where the switching rules stand for a part and supplier, and a person's word on it.

use super::{Circumstances, Done, place, show};
use crate::commands::evidence::{severity_at, severity_in_force};
use crate::commands::plan::{same_part, severity};
use crate::commands::site::{Site, text_file};
use crate::commands::text::wrapped;
use crate::commands::{Context, Format, exit, switching};
use crate::diagnostic::{self, printable};
use crate::ledger::{
    Act, Archive, Entry, Ledger, LedgerError, Query, Reader, Recorded, SetSeverity, disk,
};
use crate::limits::{self, Acceptance, Limits};
use crate::lot::Switching;
use crate::statistics::sampling::Severity;
use serde_json::json;
use std::path::PathBuf;
use std::sync::Arc;

#[derive(Debug, clap::Args)]
pub struct Args {
    /// Part number
    part: String,
    /// Supplier [default: lots that name none]
    #[arg(long, value_name = "SUPPLIER")]
    supplier: Option<String>,
    /// Severity from the next lot on: normal, tightened, reduced
    #[arg(long, value_name = "S", value_parser = severity, requires_all = ["reason", "by"])]
    set: Option<Severity>,
    /// For this class alone [default: every class]
    #[arg(long, value_name = "CLASS", requires = "set")]
    class: Option<String>,
    /// Why
    #[arg(long, value_name = "TEXT", requires = "set")]
    reason: Option<String>,
    /// Who decided: the code that the site uses for a person
    #[arg(long, value_name = "PERSON", requires = "set")]
    by: Option<String>,
    /// Key that a new ledger begins with [default: one is made]
    #[arg(long, env = "REELGATE_LEDGER_KEY", value_name = "FILE")]
    ledger_key: Option<PathBuf>,
    #[command(flatten)]
    with: Circumstances,
}

pub fn run(args: &Args, site: &Site, context: &mut Context) -> Done {
    let limits = limit_file(args, site, context)?;
    same_part(&args.part, &limits)?;
    if !has_severities(&limits) {
        return Err(format!(
            "{}: its plan has no severities of inspection; only `attributes` and `variables` have",
            args.part
        ));
    }
    match args.set {
        None => {
            let ledger = look(site)?;
            let found = Found::of(ledger.as_ref(), &limits, args)?;
            Ok((exit::OK, found.bytes(args, context.format)))
        }
        Some(severity) => set(args, severity, &limits, site, context),
    }
}

fn limit_file(args: &Args, site: &Site, context: &mut Context) -> Result<Limits, String> {
    let path = site.limit_file(&args.part);
    let file = text_file(&path).map_err(|e| format!("{}: {}", path.display(), e.note.text))?;
    limits::read(&file.name, &file.bytes).map_err(|faults| {
        let _ = write!(context.err, "{}", diagnostic::render(&faults, true));
        format!("{} is not valid", file.name)
    })
}

fn has_severities(limits: &Limits) -> bool {
    classes(limits).next().is_some()
}

fn classes(limits: &Limits) -> impl Iterator<Item = &str> {
    let aql = match &limits.acceptance {
        Acceptance::Attributes { aql, .. } | Acceptance::Variables { aql, .. } => aql.as_slice(),
        _ => &[],
    };
    aql.iter().map(|(class, _)| class.as_str())
}

fn look(site: &Site) -> Result<Option<Ledger>, String> {
    match Ledger::open(&site.records()) {
        Ok(ledger) => Ok(Some(ledger)),
        Err(LedgerError::Missing { .. }) => Ok(None),
        Err(error) => Err(error.to_string()),
    }
}

/// The state and the decisions of persons that are in the ledger.
struct Found {
    switching: Option<Switching>,
    decisions: Vec<Entry>,
    /// Whether a lot of the part from the supplier was judged.
    known: bool,
}

impl Found {
    fn of(ledger: Option<&Ledger>, limits: &Limits, args: &Args) -> Result<Found, String> {
        let text = |e: LedgerError| e.to_string();
        let supplier = args.supplier.as_deref();
        let switching = severity_at(ledger, limits, supplier).map_err(text)?;
        let query = Query::PartSupplier {
            part: &args.part,
            supplier,
        };
        let entries = match ledger {
            Some(ledger) => ledger.find(query).map_err(text)?,
            None => Vec::new(),
        };
        let known = entries
            .iter()
            .any(|entry| matches!(entry.act, Act::Judged { .. }));
        let decisions = entries
            .into_iter()
            .filter(|entry| matches!(entry.act, Act::Severity { .. }))
            .collect();
        Ok(Found {
            switching,
            decisions,
            known,
        })
    }

    fn bytes(&self, args: &Args, format: Format) -> Vec<u8> {
        match format {
            Format::Json => {
                let all = json!({
                    "part": args.part,
                    "supplier": args.supplier,
                    "switching": self.switching,
                    "decisions": self.decisions,
                });
                format!("{all:#}\n").into_bytes()
            }
            Format::Text => self.text(args).into_bytes(),
        }
    }

    fn text(&self, args: &Args) -> String {
        let mut out = format!("Severity of inspection of {}\n", printable(&args.part));
        let Some(state) = &self.switching else {
            return out;
        };
        out.push_str(&switching::screen(state, args.supplier.as_deref()));
        let changes = state
            .classes
            .iter()
            .flat_map(|(class, state)| state.changes.iter().map(move |change| (class, change)));
        let lines: String = changes
            .map(|(class, change)| {
                let after = change
                    .after
                    .as_ref()
                    .map_or(String::new(), |lot| format!(" after lot {lot}"));
                let line = format!(
                    "class {class}{after}: {} to {}: {}",
                    change.from, change.to, change.rule
                );
                wrapped(&line, "  ", "    ")
            })
            .collect();
        if !lines.is_empty() {
            out.push_str("\nChanges in view\n");
            out.push_str(&lines);
        }
        if !self.decisions.is_empty() {
            out.push_str("\nIn the ledger\n");
            for entry in &self.decisions {
                let line = format!("Entry {}: {}", entry.index, show::words(entry));
                out.push_str(&wrapped(&line, "  ", "    "));
            }
        }
        out
    }
}

fn set(
    args: &Args,
    severity: Severity,
    limits: &Limits,
    site: &Site,
    context: &mut Context,
) -> Done {
    let text = |e: LedgerError| e.to_string();
    refuse(args, severity, limits)?;
    let mut place = place(site, &args.with)?;
    place.key = args.ledger_key.clone();
    let archive = Archive::new(&place.records, Arc::new(disk::System));
    let act = SetSeverity {
        part: &limits.part,
        supplier: args.supplier.as_deref(),
        class: args.class.as_deref(),
        severity,
        reason: args.reason.as_deref().unwrap_or_default(),
    };
    let mut ledger = place.open().map_err(text)?;
    let allowed = |reader: &dyn Reader| {
        let size = reader.size()?;
        let state = severity_in_force(reader, &archive, limits, act.supplier, size)?;
        discontinued(state.as_ref(), &act)
    };
    let recorded = ledger
        .set_severity(&act, &place.by(args.by.as_deref()), &allowed)
        .map_err(text)?;
    if let Err(warning) = place.tell_witness(&ledger) {
        let _ = writeln!(context.err, "warning: {}", printable(&warning));
    }
    let found = Found::of(Some(&ledger), limits, args)?;
    if !found.known {
        let _ = writeln!(
            context.err,
            "warning: the ledger has no lot of {} from {} yet: check that both are spelled right",
            printable(&args.part),
            printable(args.supplier.as_deref().unwrap_or("no stated supplier"))
        );
    }
    Ok((exit::OK, answer(args, &recorded, &found, context.format)?))
}

fn answer(
    args: &Args,
    recorded: &Recorded,
    found: &Found,
    format: Format,
) -> Result<Vec<u8>, String> {
    let entry = &recorded.entry;
    match format {
        Format::Json => {
            let value = serde_json::to_value(entry).map_err(|e| e.to_string())?;
            Ok(format!("{value:#}\n").into_bytes())
        }
        Format::Text => {
            let again = if recorded.new { "" } else { " (as before)" };
            let line = format!("Entry {}{again}: {}", entry.index, show::words(entry));
            let mut out = wrapped(&line, "", "  ");
            if let Some(state) = &found.switching {
                out.push_str(&switching::screen(state, args.supplier.as_deref()));
            }
            Ok(out.into_bytes())
        }
    }
}

/// What the limit file says against it.
fn refuse(args: &Args, severity: Severity, limits: &Limits) -> Result<(), String> {
    if let Some(class) = &args.class
        && classes(limits).all(|known| known != class)
    {
        let known: Vec<&str> = classes(limits).collect();
        return Err(format!(
            "the plan of {} has no class `{class}`, it has {}",
            args.part,
            known.join(", ")
        ));
    }
    if severity == Severity::Reduced && !limits.reduced_inspection {
        return Err(format!(
            "the limit file of {} does not allow reduced inspection: state `switching: {{reduced: allowed}}` under \
             `lot_rules` first",
            args.part
        ));
    }
    Ok(())
}

/// After discontinuation inspection is resumed as tightened, once the supplier has acted (9.4).
fn discontinued(state: Option<&Switching>, act: &SetSeverity) -> Result<(), LedgerError> {
    let all = state.iter().flat_map(|switching| &switching.classes);
    let mut stopped = all.filter(|(class, state)| {
        state.discontinued && act.class.is_none_or(|of| of == class.as_str())
    });
    match stopped.next() {
        Some((class, _)) if act.severity != Severity::Tightened => {
            Err(LedgerError::Refused(format!(
                "inspection of class {class} is discontinued; once the supplier has acted it is resumed as \
                 tightened inspection (ISO 2859-1:1999 9.4): set `tightened`"
            )))
        }
        _ => Ok(()),
    }
}
