//! `limits check`: every fault of every file.

use super::files::{self, Valid};
use super::{INVALID, OK};
use crate::diagnostic::{Faults, as_json, printable, wrap};
use serde_json::json;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

struct Checked {
    path: String,
    result: Result<Valid, Faults>,
}

/// Checks files and folders; without any, the limits of the site.
pub fn run(
    paths: &[PathBuf],
    site: &Path,
    json: bool,
    out: &mut dyn Write,
    err: &mut dyn Write,
) -> io::Result<u8> {
    let default = [site.join("limits")];
    let paths = if paths.is_empty() { &default } else { paths };
    let checked: Vec<Checked> = paths.iter().flat_map(|path| check(path)).collect();
    let invalid = checked.iter().filter(|c| c.result.is_err()).count();
    if json {
        write_json(&checked, invalid, out)?;
    } else {
        write_text(&checked, invalid, out, err)?;
    }
    Ok(if invalid == 0 { OK } else { INVALID })
}

fn check(path: &Path) -> Vec<Checked> {
    let failed = |path: &Path, faults: Faults| Checked {
        path: path.display().to_string(),
        result: Err(faults),
    };
    match files::find(path) {
        Err(faults) => vec![failed(path, faults)],
        Ok(found) if found.is_empty() => vec![failed(path, nothing(path))],
        Ok(found) => found
            .iter()
            .map(|file| Checked {
                path: file.display().to_string(),
                result: files::read(file),
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
    }
    let valid = checked.len().saturating_sub(invalid);
    writeln!(out, "{} valid, {invalid} invalid", count(valid, "file"))
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
    };
    printable(&text)
}

fn write_json(checked: &[Checked], invalid: usize, out: &mut dyn Write) -> io::Result<()> {
    let files: Vec<_> = checked.iter().map(file_json).collect();
    let all = json!({
        "valid": invalid == 0,
        "files": files,
    });
    serde_json::to_writer_pretty(&mut *out, &all)?;
    writeln!(out)
}

fn file_json(file: &Checked) -> serde_json::Value {
    let kind = match &file.result {
        Ok(Valid::Limits(_)) => Some("limits"),
        Ok(Valid::Station(_)) => Some("station"),
        Ok(Valid::Lot(_)) => Some("lot"),
        Err(_) => None,
    };
    let faults = file.result.as_ref().err().map_or(json!([]), as_json);
    json!({"path": file.path, "valid": file.result.is_ok(), "kind": kind, "faults": faults})
}
