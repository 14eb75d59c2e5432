//! Finding, reading and telling apart the files that people write.

use super::Kind;
use crate::diagnostic::yaml::{Node, Shape};
use crate::diagnostic::{Faults, MAX_BYTES, Source, yaml};
use crate::limits::Limits;
use crate::lot::Lot;
use crate::site::SiteFile;
use crate::station::Station;
use std::fs;
use std::io::Read;
use std::path::{Path, PathBuf};

/// Deepest folder below one that is named.
const DEEPEST: usize = 16;

/// Every YAML file at a path, in the order of their names. A file that is named is taken whatever
/// its extension. Links to folders are not followed.
pub fn find(path: &Path) -> Result<Vec<PathBuf>, Faults> {
    let mut found = Vec::new();
    let kind = fs::metadata(path).map_err(|error| unreadable(path, &error))?;
    if kind.is_dir() {
        walk(path, DEEPEST, &mut found)?;
    } else {
        found.push(path.to_owned());
    }
    found.sort();
    Ok(found)
}

fn walk(folder: &Path, depth: usize, found: &mut Vec<PathBuf>) -> Result<(), Faults> {
    let fail = |error: std::io::Error| unreadable(folder, &error);
    for entry in fs::read_dir(folder).map_err(fail)? {
        let entry = entry.map_err(fail)?;
        let kind = entry.file_type().map_err(fail)?;
        let path = entry.path();
        let hidden = entry.file_name().to_string_lossy().starts_with('.');
        if hidden {
            continue;
        }
        if kind.is_dir() && depth > 0 {
            walk(&path, depth - 1, found)?;
        } else if !kind.is_dir() && is_yaml(&path) {
            found.push(path);
        }
    }
    Ok(())
}

fn is_yaml(path: &Path) -> bool {
    let extension = path.extension().map(|e| e.to_string_lossy().to_lowercase());
    matches!(extension.as_deref(), Some("yaml" | "yml"))
}

/// The bytes of a regular file, at most one more than such a file may have.
pub fn bytes(path: &Path) -> Result<Vec<u8>, Faults> {
    let fail = |error: std::io::Error| unreadable(path, &error);
    let kind = fs::metadata(path).map_err(fail)?;
    if !kind.is_file() {
        let name = path.display().to_string();
        return Err(Faults::of_file(
            &name,
            "not_a_file",
            "no file",
            "a file",
            None,
        ));
    }
    let mut bytes = Vec::new();
    let most = u64::try_from(MAX_BYTES)
        .unwrap_or(u64::MAX)
        .saturating_add(1);
    let file = fs::File::open(path).map_err(fail)?;
    file.take(most).read_to_end(&mut bytes).map_err(fail)?;
    Ok(bytes)
}

fn unreadable(path: &Path, error: &std::io::Error) -> Faults {
    Faults::of_file(
        &path.display().to_string(),
        "unreadable",
        format!("cannot be read: {error}"),
        "a file or folder that can be read",
        Some("check the path and who may read it".to_owned()),
    )
}

/// A valid file.
#[derive(Debug)]
pub enum Valid {
    /// A limit file.
    Limits(Box<Limits>),
    /// A station file.
    Station(Box<Station>),
    /// A lot file.
    Lot(Box<Lot>),
    /// The site file.
    Site(Box<SiteFile>),
}

/// Reads a file as what it is.
pub fn read(path: &Path) -> Result<Valid, Faults> {
    parse(path, &bytes(path)?)
}

/// The file with these bytes, as what it is.
pub fn parse(path: &Path, bytes: &[u8]) -> Result<Valid, Faults> {
    let name = path.display().to_string();
    if path.extension().is_some_and(|e| e != "yaml") {
        return Err(Faults::of_file(
            &name,
            "wrong_extension",
            "a file name that does not end in `.yaml`",
            "a name that ends in `.yaml`: under another the file is not found when it is needed",
            Some("rename the file".to_owned()),
        ));
    }
    match kind(path, &name, bytes)? {
        Kind::Limits => crate::limits::read(&name, bytes).map(|l| Valid::Limits(Box::new(l))),
        Kind::Station => station(path, &name, bytes),
        Kind::Lot => crate::lot::read(&name, bytes).map(|l| Valid::Lot(Box::new(l))),
        Kind::Site => crate::site::read(&name, bytes).map(|s| Valid::Site(Box::new(s))),
    }
}

/// A station file whose compensation sweeps are there.
fn station(path: &Path, name: &str, bytes: &[u8]) -> Result<Valid, Faults> {
    let station = crate::station::read(name, bytes)?;
    let folder = path.parent().unwrap_or(Path::new(""));
    let standards = &station.compensation;
    let all = [&standards.open, &standards.short, &standards.load];
    let missing = |sweep: &&str| !folder.join(sweep).is_file();
    let sweeps = all.into_iter().flatten().map(|s| s.sweep.as_str());
    let absent = sweeps.into_iter().find(missing).map(str::to_owned);
    match absent {
        None => Ok(Valid::Station(Box::new(station))),
        Some(sweep) => Err(Faults::of_file(
            name,
            "sweep_missing",
            format!("`{sweep}` does not exist beside the station file"),
            "the sweep of each compensation standard",
            Some("measure the standard, or correct the path".to_owned()),
        )),
    }
}

/// What a file is: by its folder, otherwise by its keys.
fn kind(path: &Path, name: &str, bytes: &[u8]) -> Result<Kind, Faults> {
    let folder = path.parent().and_then(Path::file_name);
    match folder.map(|f| f.to_string_lossy()).as_deref() {
        Some("parts") => return Ok(Kind::Limits),
        Some("stations") => return Ok(Kind::Station),
        Some("limits") if path.file_name().is_some_and(|name| name == "site.yaml") => {
            return Ok(Kind::Site);
        }
        _ => {}
    }
    let source = Source::new(name, bytes)?;
    let root = yaml::parse(&source)?;
    by_keys(&root).ok_or_else(|| {
        Faults::of_file(
            name,
            "unknown_kind",
            "keys of neither a limit file, a station file, a lot file nor a site file",
            "`characteristics`, `method`, `lot` or `site` among the keys of the file",
            Some("check that this is the file you meant".to_owned()),
        )
    })
}

fn by_keys(root: &Node) -> Option<Kind> {
    let Shape::Map(entries) = &root.shape else {
        return None;
    };
    let has = |keys: &[&str]| {
        entries.iter().any(|(key, _)| match &key.shape {
            Shape::Text { text, .. } => keys.contains(&text.as_str()),
            _ => false,
        })
    };
    if has(&[
        "characteristics",
        "acceptance",
        "conditions",
        "lot_rules",
        "decision_rule",
    ]) {
        Some(Kind::Limits)
    } else if has(&["lot", "sweeps", "measured", "date_code", "supplier"]) {
        Some(Kind::Lot)
    } else if has(&[
        "method",
        "instrument",
        "jig",
        "layout",
        "compensation",
        "station",
    ]) {
        Some(Kind::Station)
    } else if has(&["site", "trusted_keys", "approval", "signing", "witness"]) {
        Some(Kind::Site)
    } else if has(&["part", "revision", "retest"]) {
        Some(Kind::Limits)
    } else {
        None
    }
}
