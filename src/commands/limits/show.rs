//! `limits show`: what a limit file resolves to, as absolute values.

mod json;
mod text;

use super::{INVALID, OK, files};
use crate::diagnostic::{Faults, as_json};
use crate::limits::{self, Limits};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// Shows a limit file, or that of a part of the site.
pub fn run(
    file: &Path,
    site: &Path,
    json: bool,
    out: &mut dyn Write,
    err: &mut dyn Write,
) -> io::Result<u8> {
    match read(&locate(file, site)) {
        Ok(limits) if json => {
            serde_json::to_writer_pretty(&mut *out, &json::object(&limits))?;
            writeln!(out)?;
            Ok(OK)
        }
        Ok(limits) => {
            out.write_all(text::page(&limits).as_bytes())?;
            Ok(OK)
        }
        Err(faults) => {
            if json {
                let object = serde_json::json!({"valid": false, "faults": as_json(&faults)});
                serde_json::to_writer_pretty(&mut *out, &object)?;
                writeln!(out)?;
            } else {
                let _ = err.write_all(faults.render().as_bytes());
            }
            Ok(INVALID)
        }
    }
}

fn read(path: &Path) -> Result<Limits, Faults> {
    limits::read(&path.display().to_string(), &files::bytes(path)?)
}

/// The file named, or where it does not exist and has no folder, the one of that part.
fn locate(file: &Path, site: &Path) -> PathBuf {
    let bare = file.components().count() == 1;
    if file.exists() || !bare {
        return file.to_owned();
    }
    let of_part = site
        .join("limits")
        .join("parts")
        .join(format!("{}.yaml", file.display()));
    if of_part.is_file() {
        of_part
    } else {
        file.to_owned()
    }
}
