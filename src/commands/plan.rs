//! `reelgate plan`: the sampling plan for a part and a quantity, or for the plan's own figures.

use super::evidence::severity_at;
use super::site::{Site, text_file};
use super::text::wrapped;
use super::{Context, Format, exit, switching};
use crate::diagnostic::{self, printable};
use crate::ledger::{Ledger, LedgerError};
use crate::limits::{self, Acceptance, Limits};
use crate::lot::{OperatingCharacteristic, Plan, PlanClass, Switching, plan, plan_in_state};
use crate::quantity::shortest;
use crate::statistics::sampling::{InspectionLevel, Severity};
use serde_json::{Value, json};
use std::fmt::Write as _;
use std::io::IsTerminal;

/// Columns and rows of the curve in the terminal.
const COLUMNS: usize = 56;
const ROWS: usize = 11;

/// Show the sampling plan for a part and a quantity
#[derive(Debug, clap::Args)]
pub struct Args {
    /// Part number: the plan of its limit file
    #[arg(conflicts_with_all = ["level", "aql"], required_unless_present = "aql")]
    part: Option<String>,
    /// Parts in the lot
    #[arg(long, visible_alias = "quantity", value_name = "N", value_parser = clap::value_parser!(u64).range(1..))]
    lot_size: u64,
    /// Inspection level: S-1 to S-4, I, II, III
    #[arg(long, value_name = "L", default_value = "II", value_parser = level)]
    level: InspectionLevel,
    /// AQL of ISO 2859-1, in percent
    #[arg(long, value_name = "A")]
    aql: Option<f64>,
    /// Supplier of the lot: the switching rules look at the lots before [default: lots that name none]
    #[arg(long, value_name = "SUPPLIER", requires = "part")]
    supplier: Option<String>,
    /// Severity of inspection [default: that in force for part and supplier; by its own figures: normal]
    #[arg(long, value_name = "S", value_parser = severity)]
    severity: Option<Severity>,
}

fn level(text: &str) -> Result<InspectionLevel, String> {
    text.parse()
        .map_err(|_| "one of S-1, S-2, S-3, S-4, I, II, III was expected".to_owned())
}

pub(super) fn severity(text: &str) -> Result<Severity, String> {
    text.parse()
        .map_err(|_| "one of normal, tightened, reduced was expected".to_owned())
}

/// Prints the plan: for people on a terminal. A plan by its own figures is JSON elsewhere, so that
/// scripts need no option.
pub fn run(args: &Args, context: &mut Context) -> u8 {
    let made = match (&args.part, args.aql) {
        (Some(part), _) => of_part(part, args, context),
        (None, Some(aql)) => {
            let acceptance = Acceptance::Attributes {
                level: args.level.to_string(),
                aql: vec![("A".to_owned(), aql)],
            };
            let severity = args.severity.unwrap_or(Severity::Normal);
            plan(&acceptance, args.lot_size, severity)
        }
        (None, None) => Err("a part number, or --level and --aql, were expected".to_owned()),
    };
    let plan = match made {
        Ok(plan) => plan,
        Err(text) => {
            let _ = writeln!(context.err, "error: {}", printable(&text));
            return exit::FAILED;
        }
    };
    let default = if args.part.is_none() && !std::io::stdout().is_terminal() {
        Format::Json
    } else {
        Format::Text
    };
    let text = match context.format_given.unwrap_or(default) {
        Format::Json => format!("{:#}\n", as_json(&plan, args)),
        Format::Text => as_text(&plan, args.supplier.as_deref()),
    };
    match context
        .out
        .write_all(text.as_bytes())
        .and_then(|()| context.out.flush())
    {
        Ok(()) => exit::OK,
        Err(_) => exit::NOT_PRINTED,
    }
}

fn of_part(part: &str, args: &Args, context: &mut Context) -> Result<Plan, String> {
    let path = Site::new(&context.site).limit_file(part);
    let file = text_file(&path).map_err(|e| format!("{}: {}", path.display(), e.note.text))?;
    let limits = limits::read(&file.name, &file.bytes).map_err(|faults| {
        let _ = write!(context.err, "{}", diagnostic::render(&faults, true));
        format!("{} is not valid", file.name)
    })?;
    same_part(part, &limits)?;
    match args.severity {
        Some(severity) => plan(&limits.acceptance, args.lot_size, severity),
        None => {
            let switching = in_force(&limits, args, &Site::new(&context.site))
                .map_err(|e| format!("the severity in force cannot be found: {e}"))?;
            plan_in_state(&limits.acceptance, args.lot_size, switching)
        }
    }
}

/// The lots before are those of the part, so that its file must be of it.
pub(super) fn same_part(part: &str, limits: &Limits) -> Result<(), String> {
    if limits.part == part {
        return Ok(());
    }
    Err(format!(
        "the limit file of `{part}` says that it is of part `{}`: correct `part` or the name of the file",
        limits.part
    ))
}

/// The severities by the ledger; a site without one begins.
fn in_force(limits: &Limits, args: &Args, site: &Site) -> Result<Option<Switching>, LedgerError> {
    let ledger = match Ledger::open(&site.records()) {
        Ok(ledger) => Some(ledger),
        Err(LedgerError::Missing { .. }) => None,
        Err(error) => return Err(error),
    };
    severity_at(ledger.as_ref(), limits, args.supplier.as_deref())
}

fn class_json(class: &PlanClass, curve: Option<OperatingCharacteristic>) -> Value {
    let mut all = json!({"aql": class.aql, "plan_letter": class.code_letter, "n": class.n, "ac": class.ac, "re": class.re,
           "operating_characteristic": curve});
    if let Some(object) = all.as_object_mut()
        && let Some(plan) = class.variables
    {
        let variables = json!({"n": plan.n, "k": plan.k, "m": plan.m});
        object.insert("variables".to_owned(), variables);
    }
    all
}

/// A plan by its own figures is flat: `code_letter`, `n`, `ac`, `re`.
fn as_json(plan: &Plan, args: &Args) -> Value {
    let flat = args.part.is_none();
    let mut all = json!({
        "scheme": plan.scheme,
        "lot_size": plan.lot_size,
        "level": plan.level,
        "severity": plan.severity.map(|s| s.to_string()),
        "code_letter": plan.code_letter,
        "source": plan.source,
    });
    let classes = || {
        plan.classes
            .iter()
            .map(|(name, class)| (name.clone(), class_json(class, plan.curve(class))))
    };
    if let Some(object) = all.as_object_mut() {
        match (flat, classes().next()) {
            (true, Some((_, Value::Object(class)))) => object.extend(class),
            _ => {
                object.insert("supplier".to_owned(), args.supplier.clone().into());
                object.insert("switching".to_owned(), json!(plan.switching));
                object.insert("required".to_owned(), plan.required().into());
                object.insert("classes".to_owned(), Value::Object(classes().collect()));
            }
        }
    }
    all
}

fn as_text(plan: &Plan, supplier: Option<&str>) -> String {
    let mut out = String::new();
    let severity = plan
        .severity
        .map_or(String::new(), |s| format!(", {s} inspection"));
    let letter = plan
        .code_letter
        .as_ref()
        .map_or(String::new(), |l| format!(", code letter {l}"));
    let _ = writeln!(
        out,
        "Pull {} of {} parts{letter}{severity}",
        plan.required(),
        plan.lot_size
    );
    out.push_str(&wrapped(&plan.source, "", ""));
    if let Some(state) = &plan.switching {
        out.push_str(&switching::screen(state, supplier));
    }
    for (name, class) in &plan.classes {
        let aql = class.aql.map_or(String::new(), |a| format!(", AQL {a} %"));
        let _ = writeln!(out, "\n{}", printable(&plan_words(name, &aql, class)));
        match plan.curve(class) {
            Some(curve) => draw(&mut out, &curve),
            None => out.push_str("  the whole lot is inspected\n"),
        }
    }
    out
}

fn plan_words(name: &str, aql: &str, class: &PlanClass) -> String {
    match class.variables {
        Some(plan) => format!(
            "class {name}{aql}: by variables n {}, k {:.3}, M {:.3} %; where that cannot be, by attributes n {}, Ac {}, Re {}",
            plan.n,
            plan.k,
            100.0 * plan.m,
            class.n,
            class.ac,
            class.re
        ),
        None => format!(
            "class {name}{aql}: n {}, Ac {}, Re {}",
            class.n, class.ac, class.re
        ),
    }
}

/// Probability of acceptance against the share nonconforming.
fn draw(out: &mut String, curve: &OperatingCharacteristic) {
    let percent = |ratio: f64| shortest((ratio * 1e4).round() / 1e4, "1");
    let _ = writeln!(
        out,
        "  a lot with {} nonconforming is accepted with 95 %, one with {} with 10 %\n  ({} law)\n",
        percent(curve.producers_risk_quality),
        percent(curve.consumers_risk_quality),
        curve.law
    );
    let last = curve
        .points
        .last()
        .map_or(1.0, |p| p[0])
        .max(f64::MIN_POSITIVE);
    let column = |p: f64| ((p / last) * (COLUMNS - 1) as f64).round() as usize;
    let row = |pa: f64| ((1.0 - pa) * (ROWS - 1) as f64).round() as usize;
    let mut grid = vec![vec![' '; COLUMNS]; ROWS];
    for i in 0..COLUMNS {
        let p = last * i as f64 / (COLUMNS - 1) as f64;
        if let Some(cell) = grid
            .get_mut(row(between(&curve.points, p)))
            .and_then(|r| r.get_mut(i))
        {
            *cell = '•';
        }
    }
    for (pa, quality) in [
        (0.95, curve.producers_risk_quality),
        (0.10, curve.consumers_risk_quality),
    ] {
        if let Some(cell) = grid
            .get_mut(row(pa))
            .and_then(|r| r.get_mut(column(quality)))
        {
            *cell = '◆';
        }
    }
    for (i, line) in grid.iter().enumerate() {
        let label = if i % 5 == 0 {
            format!("{:>5} %", 100 - 10 * i)
        } else {
            String::new()
        };
        let text: String = line.iter().collect();
        let _ = writeln!(out, "  {label:>7} │{}", text.trim_end());
    }
    let _ = writeln!(out, "          └{}", "─".repeat(COLUMNS));
    let _ = writeln!(
        out,
        "           0{:>width$}",
        format!("{} nonconforming", percent(last)),
        width = COLUMNS - 1
    );
}

/// The curve between its points.
fn between(points: &[[f64; 2]], p: f64) -> f64 {
    let i = points
        .partition_point(|point| point[0] < p)
        .clamp(1, points.len().max(2) - 1);
    match (points.get(i - 1), points.get(i)) {
        (Some([p0, a0]), Some([p1, a1])) if p1 > p0 => {
            a0 + (a1 - a0) * ((p - p0) / (p1 - p0)).clamp(0.0, 1.0)
        }
        (Some([_, a]), _) => *a,
        _ => 1.0,
    }
}
