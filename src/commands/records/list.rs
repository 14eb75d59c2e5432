//! `records list`: judged lots in the order of the ledger.

use super::{Done, open, severities};
use crate::commands::site::Site;
use crate::commands::{Format, exit};
use crate::diagnostic::printable;
use crate::ledger::{Act, Decision, Entry};
use chrono::{DateTime, FixedOffset, NaiveDate};
use comfy_table::{ContentArrangement, Table, presets};
use serde::Serialize;
use std::collections::BTreeMap;

#[derive(Debug, clap::Args)]
pub struct Args {
    /// Not before this day (2026-10-05) or time (RFC 3339)
    #[arg(long, value_name = "TIME", value_parser = limit)]
    from: Option<Limit>,
    /// Not after this day or time
    #[arg(long, value_name = "TIME", value_parser = limit)]
    to: Option<Limit>,
    /// Of this part
    #[arg(long, value_name = "PART")]
    part: Option<String>,
    /// From this supplier
    #[arg(long, value_name = "SUPPLIER")]
    supplier: Option<String>,
    /// With this verdict
    #[arg(long, value_parser = ["accept", "reject", "hold"])]
    verdict: Option<String>,
    /// Of this lot
    #[arg(long, value_name = "LOT")]
    lot: Option<String>,
    /// Instead: severities of inspection that a person set
    #[arg(long, conflicts_with_all = ["verdict", "lot"])]
    severities: bool,
    /// As a CSV table for other programs
    #[arg(long)]
    csv: bool,
}

/// A day means that day by the clock of the place where the record was made.
#[derive(Debug, Clone, Copy)]
enum Limit {
    Day(NaiveDate),
    Time(DateTime<FixedOffset>),
}

fn limit(text: &str) -> Result<Limit, String> {
    if let Ok(day) = NaiveDate::parse_from_str(text, "%Y-%m-%d") {
        return Ok(Limit::Day(day));
    }
    DateTime::parse_from_rfc3339(text)
        .map(Limit::Time)
        .map_err(|_| {
            "neither a day such as 2026-10-05 nor a time such as 2026-10-05T09:12:00+02:00"
                .to_owned()
        })
}

impl Limit {
    /// How a time stands to it.
    fn compare(&self, time: &DateTime<FixedOffset>) -> std::cmp::Ordering {
        match self {
            Limit::Day(day) => time.date_naive().cmp(day),
            Limit::Time(limit) => time.cmp(limit),
        }
    }
}

/// One line of the list.
#[derive(Debug, Serialize)]
struct Line {
    entry: u64,
    issued: String,
    record: String,
    lot: String,
    part: String,
    supplier: Option<String>,
    verdict: String,
    /// The newest decision of a person.
    disposition: Option<Decision>,
    /// The newest record of the same lot, where this is not it.
    superseded_by: Option<String>,
}

pub fn run(args: &Args, site: &Site, format: Format) -> Done {
    let entries = open(site)?.entries().map_err(|e| e.to_string())?;
    let set = severities::lines(&entries, |part, supplier, time| {
        wanted_of(args, part, supplier, time)
    });
    if args.severities {
        let bytes = severities::bytes(&set, args.csv, format)?;
        return Ok((exit::OK, bytes));
    }
    let lines: Vec<Line> = lines(&entries)
        .into_iter()
        .filter(|line| wanted(args, line))
        .collect();
    let bytes = match (args.csv, format) {
        (true, _) => csv(&lines).map_err(|e| e.to_string())?,
        (false, Format::Json) => {
            let mut bytes = serde_json::to_vec_pretty(&lines).map_err(|e| e.to_string())?;
            bytes.push(b'\n');
            bytes
        }
        (false, Format::Text) => {
            let mut out = text(&lines);
            // A list of certain lots or verdicts is of nothing else.
            if !set.is_empty() && args.verdict.is_none() && args.lot.is_none() {
                out.push_str(&severities::text(&set));
            }
            out.into_bytes()
        }
    };
    Ok((exit::OK, bytes))
}

fn lines(entries: &[Entry]) -> Vec<Line> {
    let mut lines: Vec<Line> = Vec::new();
    let mut places: BTreeMap<&str, usize> = BTreeMap::new();
    let mut of_entry: BTreeMap<u64, usize> = BTreeMap::new();
    for entry in entries {
        match &entry.act {
            Act::Judged {
                record,
                lot,
                part,
                supplier,
                verdict,
                earlier,
                ..
            } => {
                let before = earlier.and_then(|e| of_entry.get(&e)).copied();
                if let Some(line) = before.and_then(|place| lines.get_mut(place)) {
                    line.superseded_by = Some(record.clone());
                }
                places.insert(record, lines.len());
                of_entry.insert(entry.index, lines.len());
                lines.push(Line {
                    entry: entry.index,
                    issued: entry.time.clone(),
                    record: record.clone(),
                    lot: lot.clone(),
                    part: part.clone(),
                    supplier: supplier.clone(),
                    verdict: verdict.clone(),
                    disposition: None,
                    superseded_by: None,
                });
            }
            Act::Disposition {
                record, decision, ..
            } => {
                let place = places.get(record.as_str()).copied();
                if let Some(line) = place.and_then(|place| lines.get_mut(place)) {
                    line.disposition = Some(*decision);
                }
            }
            _ => {}
        }
    }
    lines
}

fn wanted(args: &Args, line: &Line) -> bool {
    is(&args.verdict, Some(&line.verdict))
        && is(&args.lot, Some(&line.lot))
        && wanted_of(args, &line.part, line.supplier.as_deref(), &line.issued)
}

fn is(wanted: &Option<String>, found: Option<&str>) -> bool {
    wanted.as_deref().is_none_or(|wanted| found == Some(wanted))
}

/// Of the part, supplier and time that were asked for.
fn wanted_of(args: &Args, part: &str, supplier: Option<&str>, time: &str) -> bool {
    let time = DateTime::parse_from_rfc3339(time).ok();
    let in_time = |limit: &Option<Limit>, out: std::cmp::Ordering| match (limit, &time) {
        (None, _) => true,
        (Some(limit), Some(time)) => limit.compare(time) != out,
        (Some(_), None) => false,
    };
    is(&args.part, Some(part))
        && is(&args.supplier, supplier)
        && in_time(&args.from, std::cmp::Ordering::Less)
        && in_time(&args.to, std::cmp::Ordering::Greater)
}

pub(super) fn decision(decision: Decision) -> &'static str {
    match decision {
        Decision::Concession => "concession",
        Decision::Return => "return",
        Decision::Sort => "sort",
        Decision::Scrap => "scrap",
        Decision::Retest => "retest",
    }
}

fn text(lines: &[Line]) -> String {
    let mut table = Table::new();
    table
        .load_style(presets::NOTHING)
        .set_content_arrangement(ContentArrangement::Disabled)
        .set_header(["Issued", "Record", "Part", "Supplier", "Verdict", "Since"]);
    for column in table.column_iter_mut() {
        column.set_padding((0, 2));
    }
    for line in lines {
        let since = match (&line.superseded_by, line.disposition) {
            (Some(_), _) => "superseded",
            (None, Some(made)) => decision(made),
            (None, None) => "",
        };
        let day: String = line.issued.chars().take(16).collect();
        table.add_row([
            day.replace('T', " "),
            printable(&line.record),
            printable(&line.part),
            printable(line.supplier.as_deref().unwrap_or("–")),
            printable(&line.verdict),
            since.to_owned(),
        ]);
    }
    let mut out = String::new();
    for row in table.lines() {
        out.push_str(row.trim_end());
        out.push('\n');
    }
    let plural = if lines.len() == 1 { "" } else { "s" };
    out + &format!("{} record{plural}\n", lines.len())
}

fn csv(lines: &[Line]) -> Result<Vec<u8>, csv::Error> {
    let mut writer = csv::WriterBuilder::new()
        .terminator(csv::Terminator::CRLF)
        .from_writer(Vec::new());
    writer.write_record([
        "entry",
        "issued",
        "record",
        "lot",
        "part",
        "supplier",
        "verdict",
        "disposition",
        "superseded_by",
    ])?;
    for line in lines {
        writer.write_record([
            line.entry.to_string(),
            cell(&line.issued),
            cell(&line.record),
            cell(&line.lot),
            cell(&line.part),
            cell(line.supplier.as_deref().unwrap_or("")),
            cell(&line.verdict),
            line.disposition.map_or("", decision).to_owned(),
            cell(line.superseded_by.as_deref().unwrap_or("")),
        ])?;
    }
    writer
        .into_inner()
        .map_err(|e| csv::Error::from(e.into_error()))
}

/// A cell that a spreadsheet would take for a formula gets an apostrophe in front.
pub(super) fn cell(text: &str) -> String {
    const BEGIN: [char; 11] = ['=', '+', '-', '@', '\t', '\r', '\n', '＝', '＋', '－', '＠'];
    if text.starts_with(BEGIN) {
        format!("'{text}")
    } else {
        text.to_owned()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn line(supplier: &str) -> Line {
        Line {
            entry: 3,
            issued: "2026-10-05T23:30:00+02:00".to_owned(),
            record: "26K-0001-0123456789ab".to_owned(),
            lot: "26K-0001".to_owned(),
            part: "RG-1".to_owned(),
            supplier: Some(supplier.to_owned()),
            verdict: "hold".to_owned(),
            disposition: Some(Decision::Sort),
            superseded_by: None,
        }
    }

    #[test]
    fn no_cell_is_a_formula_and_no_text_breaks_a_row() {
        for c in ['=', '+', '-', '@', '\t', '\r', '\n', '＝', '＋', '－', '＠'] {
            assert_eq!(cell(&format!("{c}1")), format!("'{c}1"));
        }
        let bytes = csv(&[line("=cmd|' /C x'!A0"), line("a,\"b\"\r\nc")]).expect("CSV");
        let text = String::from_utf8(bytes).expect("text");
        assert!(text.contains(",'=cmd|' /C x'!A0,"), "{text}");
        assert!(
            text.contains(",\"a,\"\"b\"\"\r\nc\",hold,sort,\r\n"),
            "{text}"
        );
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        assert_eq!(reader.records().filter(Result::is_ok).count(), 2);
    }

    #[test]
    fn days_are_those_of_the_place() {
        let time = DateTime::parse_from_rfc3339("2026-10-05T23:30:00+02:00").expect("a time");
        use std::cmp::Ordering::*;
        assert_eq!(limit("2026-10-05").expect("a day").compare(&time), Equal);
        assert_eq!(limit("2026-10-06").expect("a day").compare(&time), Less);
        let later = limit("2026-10-05T21:00:00Z").expect("a time");
        assert_eq!(later.compare(&time), Greater);
        assert!(limit("yesterday").is_err());
    }

    #[test]
    fn text_from_files_cannot_act_on_the_terminal() {
        assert!(!text(&[line("\u{1b}]0;x\u{7}")]).contains('\u{1b}'));
    }
}
