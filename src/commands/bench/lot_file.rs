//! `lot.yaml` of a run, from what happened: the same run, the same bytes.

use crate::bench::event::Question;
use crate::bench::run::Run;
use crate::lot::Aside;
use std::fmt::Write;

/// The lot file of a run that is closed.
pub fn lot_file(run: &Run) -> String {
    let mut out = String::from("# Written by reelgate bench.\n");
    let b = &run.began;
    let mut line = |key: &str, value: String| {
        let _ = writeln!(out, "{key}: {value}");
    };
    line("lot", quoted(&b.lot));
    line("part", quoted(&b.part));
    for (key, value) in [("supplier", &b.supplier)] {
        if let Some(value) = value {
            line(key, quoted(value));
        }
    }
    line("quantity", b.quantity.to_string());
    for (key, value) in [
        ("date_code", &b.date_code),
        ("order", &b.order),
        ("label", &b.label),
    ] {
        if let Some(value) = value {
            line(key, quoted(value));
        }
    }
    line("operator", quoted(&b.operator));
    line("station", quoted(&b.station));
    line("measured", measured(run).to_owned());
    let answer = |q| run.answers.get(&q).filter(|text| !text.is_empty());
    if let Some(temperature) = answer(Question::Temperature) {
        line(
            "ambient",
            format!("{{temperature: {}}}", quoted(temperature)),
        );
    }
    if let Some(drive) = answer(Question::Drive) {
        line("drive", quoted(drive));
    }
    if let Some(heat) = answer(Question::LastHeat) {
        line("last_heat", heat.clone());
    }
    line("sweeps", "sweeps".to_owned());
    out.push_str("run:\n");
    let _ = writeln!(out, "  seed: {}", b.seed);
    let list = |values: &[String]| {
        let all: Vec<String> = values.iter().map(|v| quoted(v)).collect();
        format!("[{}]", all.join(", "))
    };
    if b.label.is_none() && !b.scans.is_empty() {
        let _ = writeln!(out, "  scans: {}", list(&b.scans));
    }
    let _ = writeln!(out, "  operators: {}", list(&run.operators));
    if let Some(at) = run.jig_good_at() {
        let _ = writeln!(out, "  jig_checked: {at}");
    }
    let aside: Vec<(&str, Aside, &str)> = run
        .tries
        .iter()
        .filter_map(|t| t.aside.as_ref().map(|(why, by)| (t, *why, by.as_str())))
        .map(|(t, why, by)| (t.file.as_str(), why, by))
        .collect();
    if !aside.is_empty() {
        out.push_str("  set_aside:\n");
        for (file, why, by) in aside {
            let stem = file.rsplit_once('/').map_or(file, |(_, leaf)| leaf);
            let stem = stem.rsplit_once('.').map_or(stem, |(stem, _)| stem);
            let _ = writeln!(
                out,
                "    - {{sweep: {}, why: {}, by: {}}}",
                quoted(stem),
                why.name(),
                quoted(by)
            );
        }
    }
    out
}

/// When the last sweep that was not set aside came; else when the run was closed.
fn measured(run: &Run) -> &str {
    run.last_kept().map_or_else(
        || run.closed.as_deref().unwrap_or(&run.began_at),
        |t| t.at.as_str(),
    )
}

/// A text in double quotes; what JSON escapes, YAML reads (YAML 1.2, 10.3).
fn quoted(text: &str) -> String {
    let mut out = String::from("\"");
    for c in text.chars() {
        match c {
            '"' | '\\' => {
                out.push('\\');
                out.push(c);
            }
            c if crate::diagnostic::is_hidden(c) && u32::from(c) < 0x1_0000 => {
                let _ = write!(out, "\\u{:04X}", u32::from(c));
            }
            c => out.push(c),
        }
    }
    out.push('"');
    out
}
