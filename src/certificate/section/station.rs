//! The station: instrument, jig, calibration, method, uncertainty; and how the lot was measured.

use crate::certificate::figures::{fixed, instant, plain, short};
use crate::certificate::flow::Flow;
use crate::certificate::ink::QUIET;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use crate::record::LotRecord;

pub(in crate::certificate) fn station(flow: &mut Flow, record: &LotRecord) {
    let mut table = Table::new(vec![
        Column::new("", Align::Left, Span::Fixed(120.0)),
        Column::new("", Align::Left, Span::Share(1.0)),
    ]);
    for (label, value) in facts(record) {
        table.row(vec![Cell::text(label).ink(QUIET), Cell::text(value)]);
    }
    // On one page, where that is possible.
    let height = table
        .height(flow)
        .min(flow.sheet.bottom - flow.sheet.top - 60.0);
    flow.heading("Station and calibration", height);
    table.set(flow);
}

/// What is known of the station and of the measurement, for the document and its text twin.
pub(in crate::certificate) fn facts(record: &LotRecord) -> Vec<(&'static str, String)> {
    let s = &record.station;
    let lot = &record.lot;
    let mut out = vec![
        ("Station", s.station.clone()),
        ("Method", s.method.replace('_', " ")),
    ];
    let mut add = |label, value: Option<String>| {
        if let Some(value) = value.filter(|v| !v.is_empty()) {
            out.push((label, value));
        }
    };
    add("Reference impedance", s.reference.clone());
    add("Instrument", s.instrument.clone());
    add("Calibrated", s.instrument_calibrated.clone());
    add("Calibration due", s.instrument_due.clone());
    add("Jig", s.jig.clone());
    add("Jig checked", s.jig_checked.as_deref().map(instant));
    add(
        "Jig check valid for",
        s.jig_valid_for.map(|v| format!("{} h", plain(v / 3600.0))),
    );
    add("Compensation", Some(s.compensation.join(", ")));
    add("Stated uncertainty", Some(s.uncertainty.join("; ")));
    add("Measured", Some(instant(&lot.measured)));
    add("Operator", lot.operator.clone());
    add(
        "Ambient temperature",
        lot.temperature.map(|t| format!("{} °C", plain(t))),
    );
    add(
        "Relative humidity",
        lot.humidity.map(|h| format!("{} %", fixed(h * 100.0, 0))),
    );
    add("Drive as set", lot.drive.map(|d| short(d, "V rms")));
    add("Last heat", lot.last_heat.clone());
    add("Label as scanned", lot.label.as_deref().map(visible));
    add("Sweeps", Some(lot.sweeps.clone()));
    if let Some(run) = &lot.run {
        add("Seed of the sample", run.seed.map(|s| s.to_string()));
        add("Scans", Some(joined(run.scans.iter().map(|s| visible(s)))));
        add("Operators", Some(run.operators.join(", ")));
        add(
            "Last good check of the jig",
            run.jig_checked.as_deref().map(instant),
        );
        let aside = run.set_aside.iter().map(|a| {
            let by =
                a.by.as_ref()
                    .map_or(String::new(), |by| format!(" by {by}"));
            format!("{}: {}{by}", a.sweep, a.why.name().replace('_', " "))
        });
        add("Sweeps set aside", Some(joined(aside)));
    }
    out
}

fn joined(each: impl Iterator<Item = String>) -> String {
    each.collect::<Vec<_>>().join("; ")
}

/// A scan with its control characters as their names in angle brackets.
fn visible(scan: &str) -> String {
    scan.chars()
        .map(|c| match c {
            '\u{4}' => "<EOT>".to_owned(),
            '\u{1c}' => "<FS>".to_owned(),
            '\u{1d}' => "<GS>".to_owned(),
            '\u{1e}' => "<RS>".to_owned(),
            '\u{1f}' => "<US>".to_owned(),
            c => c.to_string(),
        })
        .collect()
}
