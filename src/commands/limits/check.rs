//! `limits check`: every fault of every file.

use super::desk::Desk;
use super::files::{self, Valid};
use super::{INVALID, OK};
use crate::diagnostic::{Faults, as_json, printable, wrap};
use crate::judgement::abilities;
use crate::limits::Limits;
use crate::quantity::{engineering, shortest};
use crate::station::Station;
use serde_json::json;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

struct Checked {
    path: String,
    result: Result<Valid, Faults>,
    /// Whether it is approved, and where it stands in words; of files that approvals are about.
    approval: Option<(bool, String)>,
}

/// Checks files and folders; without any, the limits of the site.
pub fn run(
    paths: &[PathBuf],
    station: Option<&Path>,
    site: &Path,
    json: bool,
    out: &mut dyn Write,
    err: &mut dyn Write,
) -> io::Result<u8> {
    let default = [site.join("limits")];
    let paths = if paths.is_empty() { &default } else { paths };
    let checked: Vec<Checked> = paths.iter().flat_map(|path| check(path)).collect();
    let mut checked = checked;
    match Desk::open(site) {
        Ok(desk) => checked.iter_mut().for_each(|file| file.ask(&desk)),
        // A faulty site file is among the results where it was to be checked.
        Err(_) if checked.iter().any(|file| file.result.is_err()) => {}
        Err(text) => {
            let line = printable(&format!("warning: approvals were not looked at: {text}"));
            let _ = writeln!(err, "{line}");
        }
    }
    let bench = match station.map(files::read) {
        Some(Ok(Valid::Station(station))) => Some(station),
        Some(Ok(_)) => {
            let path = station.unwrap_or(Path::new("")).display().to_string();
            let found = "a file that describes no station";
            let faults = Faults::of_file(&path, "not_a_station", found, "a station file", None);
            checked.push(Checked {
                path,
                result: Err(faults),
                approval: None,
            });
            None
        }
        Some(Err(faults)) => {
            let path = station.unwrap_or(Path::new("")).display().to_string();
            checked.push(Checked {
                path,
                result: Err(faults),
                approval: None,
            });
            None
        }
        None => None,
    };
    let invalid = checked.iter().filter(|c| c.result.is_err()).count();
    if json {
        write_json(&checked, bench.as_deref(), invalid, out)?;
    } else {
        write_text(&checked, invalid, out, err)?;
        if let Some(station) = &bench {
            for file in &checked {
                if let Ok(Valid::Limits(limits)) = &file.result {
                    write_abilities(limits, station, out)?;
                }
            }
        }
    }
    Ok(if invalid == 0 { OK } else { INVALID })
}

impl Checked {
    fn ask(&mut self, desk: &Desk) {
        let path = Path::new(&self.path);
        if let (Ok(valid), Ok(bytes)) = (&self.result, files::bytes(path)) {
            self.approval = desk.words(path, valid, bytes);
        }
    }
}

fn check(path: &Path) -> Vec<Checked> {
    let failed = |path: &Path, faults: Faults| Checked {
        path: path.display().to_string(),
        result: Err(faults),
        approval: None,
    };
    match files::find(path) {
        Err(faults) => vec![failed(path, faults)],
        Ok(found) if found.is_empty() => vec![failed(path, nothing(path))],
        Ok(found) => found
            .iter()
            .map(|file| Checked {
                path: file.display().to_string(),
                result: files::read(file),
                approval: None,
            })
            .collect(),
    }
}

fn nothing(folder: &Path) -> Faults {
    Faults::of_file(
        &folder.display().to_string(),
        "nothing_to_check",
        "a folder without `.yaml` files",
        "limit, station or lot files",
        Some("check the path".to_owned()),
    )
}

fn write_text(
    checked: &[Checked],
    invalid: usize,
    out: &mut dyn Write,
    err: &mut dyn Write,
) -> io::Result<()> {
    for file in checked {
        let path = printable(&file.path);
        let line = match &file.result {
            Ok(valid) => format!("✔ {path}: {}", words(valid)),
            Err(faults) => {
                // A screen that is gone does not make the files valid: results go on.
                let _ = err.write_all(faults.render().as_bytes());
                format!("✘ {path}: {}", count(faults.count(), "fault"))
            }
        };
        for line in wrap(&line, 80) {
            writeln!(out, "{line}")?;
        }
        if let Some((approved, words)) = &file.approval {
            let mark = if *approved { "✔" } else { "‖" };
            for line in wrap(&printable(&format!("{mark} {words}")), 76) {
                writeln!(out, "    {line}")?;
            }
        }
    }
    let valid = checked.len().saturating_sub(invalid);
    writeln!(out, "{} valid, {invalid} invalid", count(valid, "file"))
}

/// What the bench can make of each limit.
fn write_abilities(limits: &Limits, station: &Station, out: &mut dyn Write) -> io::Result<()> {
    writeln!(
        out,
        "\n{} on {}",
        printable(&limits.part),
        printable(&station.name)
    )?;
    for ability in abilities(limits, station) {
        let unit = limits
            .bounds
            .iter()
            .find(|b| b.key == ability.key)
            .map_or("", |b| b.characteristic.unit());
        let share = match (ability.expanded_uncertainty, ability.ratio) {
            (Some(u), Some(ratio)) => format!(
                "±{} at {}, {:.0} % of the room",
                engineering(u, unit, 2),
                shortest(ability.limit, unit),
                100.0 * ratio
            ),
            _ => format!("at {}", shortest(ability.limit, unit)),
        };
        let why = if ability.why.is_empty() {
            String::new()
        } else {
            format!(" ({})", ability.why)
        };
        let line = format!(
            "  {}: {}: {share}{why}",
            ability.key,
            ability.ability.words()
        );
        for line in wrap(&printable(&line), 78) {
            writeln!(out, "{line}")?;
        }
    }
    Ok(())
}

fn count(number: usize, what: &str) -> String {
    let ending = if number == 1 { "" } else { "s" };
    format!("{number} {what}{ending}")
}

fn words(valid: &Valid) -> String {
    let text = match valid {
        Valid::Limits(limits) => format!(
            "limits of {}, revision {}, {}",
            limits.part,
            limits.revision,
            count(limits.bounds.len(), "bound")
        ),
        Valid::Station(station) => format!("station {}", station.name),
        Valid::Lot(lot) => format!("lot {} of {}", lot.lot, lot.part),
        Valid::Site(site) => format!(
            "site {}, approval {}, {}",
            site.name,
            site.approval.name(),
            count(site.trusted_keys.len(), "trusted key")
        ),
    };
    printable(&text)
}

fn write_json(
    checked: &[Checked],
    bench: Option<&Station>,
    invalid: usize,
    out: &mut dyn Write,
) -> io::Result<()> {
    let files: Vec<_> = checked.iter().map(|file| file_json(file, bench)).collect();
    let all = json!({
        "valid": invalid == 0,
        "files": files,
    });
    serde_json::to_writer_pretty(&mut *out, &all)?;
    writeln!(out)
}

fn file_json(file: &Checked, bench: Option<&Station>) -> serde_json::Value {
    let kind = match &file.result {
        Ok(Valid::Limits(_)) => Some("limits"),
        Ok(Valid::Station(_)) => Some("station"),
        Ok(Valid::Lot(_)) => Some("lot"),
        Ok(Valid::Site(_)) => Some("site"),
        Err(_) => None,
    };
    let faults = file.result.as_ref().err().map_or(json!([]), as_json);
    let mut all =
        json!({"path": file.path, "valid": file.result.is_ok(), "kind": kind, "faults": faults});
    if let (Ok(Valid::Limits(limits)), Some(station)) = (&file.result, bench) {
        all["bench"] = json!(abilities(limits, station));
    }
    if let Some((approved, words)) = &file.approval {
        all["approval"] = json!({"approved": approved, "text": words});
    }
    all
}
