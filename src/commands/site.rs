//! A site on the disk: where limit files, station files and lots lie, and reading them.

use crate::diagnostic::{Faults, Note};
use crate::lot;
use crate::record::Sources;
use crate::site::{self, SiteFile};
use crate::sweep::{RawFile, is_sweep_file};
use std::fs;
use std::io::Read;
use std::path::{Path, PathBuf};

/// Larger files are no sweeps: 401 points take 40 kB, a long table of 1,250 parts 50 MB.
const SWEEP_BYTES_MAX: u64 = 256 << 20;
/// Limit, station and lot files are written by hand.
const TEXT_BYTES_MAX: u64 = 1 << 20;

/// A site: the folder with `limits/` and `records/`.
#[derive(Debug, Clone)]
pub struct Site {
    root: PathBuf,
}

impl Site {
    /// The site at a folder.
    pub fn new(root: &Path) -> Site {
        // Paths are shown to people: no `./` in front of them.
        let root = if root == Path::new(".") {
            Path::new("")
        } else {
            root
        };
        Site {
            root: root.to_owned(),
        }
    }

    /// What holds for the whole site: `limits/site.yaml`, where there is one.
    ///
    /// # Errors
    /// A file that cannot be read, or its faults.
    pub fn rules(&self) -> Result<Option<RawFile>, Stop> {
        let path = self.root.join("limits").join("site.yaml");
        if path.symlink_metadata().is_err() {
            return Ok(None);
        }
        // A link that leads nowhere is no missing site file.
        let raw = text_file(&path).map_err(|e| Stop::Unreadable(vec![e]))?;
        site::read(&raw.name, &raw.bytes).map_err(Stop::Faults)?;
        Ok(Some(raw))
    }

    /// Where a path of the site file leads: relative to the site's folder.
    pub fn resolve(&self, path: &str) -> PathBuf {
        self.root.join(path)
    }

    /// The witness file: the one that was asked for, else the one that the site file names.
    pub fn witness(&self, asked: Option<&Path>, rules: Option<&RawFile>) -> Option<PathBuf> {
        if let Some(path) = asked {
            return Some(path.to_owned());
        }
        let file = meaning(rules?)?;
        file.witness.map(|path| self.resolve(&path))
    }

    /// Certificate and key that the site file names.
    pub fn signing(&self, rules: Option<&RawFile>) -> Option<(PathBuf, PathBuf)> {
        let signing = meaning(rules?)?.signing?;
        Some((
            self.resolve(&signing.certificate),
            self.resolve(&signing.key),
        ))
    }

    /// `limits/parts/<part>.yaml`
    pub fn limit_file(&self, part: &str) -> PathBuf {
        self.root
            .join("limits")
            .join("parts")
            .join(format!("{part}.yaml"))
    }

    /// `limits/stations/<station>.yaml`
    pub fn station_file(&self, station: &str) -> PathBuf {
        self.root
            .join("limits")
            .join("stations")
            .join(format!("{station}.yaml"))
    }

    /// `records`
    pub fn records(&self) -> PathBuf {
        self.root.join("records")
    }

    /// `records/certificates`
    pub fn certificates(&self) -> PathBuf {
        self.records().join("certificates")
    }
}

/// What a site file means; [`Site::rules`] has found no fault in it.
pub fn meaning(rules: &RawFile) -> Option<SiteFile> {
    site::read(&rules.name, &rules.bytes).ok()
}

/// A file that could not be read: its path and a sentence.
#[derive(Debug)]
#[allow(missing_docs)]
pub struct Unreadable {
    pub path: PathBuf,
    pub note: Note,
}

impl Unreadable {
    fn new(path: &Path, code: &str, text: impl Into<String>) -> Unreadable {
        Unreadable {
            path: path.to_owned(),
            note: Note::new(code, text),
        }
    }
}

/// Reads a whole file, refusing anything but a regular file of at most `limit` bytes.
fn bytes(path: &Path, limit: u64) -> Result<Vec<u8>, Unreadable> {
    let fail =
        |e: std::io::Error| Unreadable::new(path, "unreadable", format!("cannot be read: {e}"));
    let kind = fs::metadata(path).map_err(fail)?;
    if !kind.is_file() {
        return Err(Unreadable::new(path, "not_a_file", "is not a file"));
    }
    let mut bytes = Vec::new();
    fs::File::open(path)
        .map_err(fail)?
        .take(limit + 1)
        .read_to_end(&mut bytes)
        .map_err(fail)?;
    if bytes.len() as u64 > limit {
        return Err(Unreadable::new(
            path,
            "too_large",
            format!(
                "is larger than {} MiB, which no file of its kind is",
                limit >> 20
            ),
        ));
    }
    Ok(bytes)
}

/// Reads a limit, station or lot file.
pub fn text_file(path: &Path) -> Result<RawFile, Unreadable> {
    Ok(RawFile {
        name: path.display().to_string(),
        bytes: bytes(path, TEXT_BYTES_MAX)?,
    })
}

/// Reads `limits/…/<name>.yaml`, naming the files there are where it is missing.
fn controlled_file(path: &Path, kind: &str, name: &str) -> Result<RawFile, Unreadable> {
    if path.exists() {
        return text_file(path);
    }
    let mut there: Vec<String> = path
        .parent()
        .and_then(|folder| fs::read_dir(folder).ok())
        .into_iter()
        .flatten()
        .filter_map(|entry| Some(entry.ok()?.path()))
        .filter(|p| p.extension().is_some_and(|e| e == "yaml"))
        .filter_map(|p| Some(p.file_stem()?.to_string_lossy().into_owned()))
        .collect();
    there.sort_by(|a, b| {
        strsim::jaro_winkler(b, name)
            .total_cmp(&strsim::jaro_winkler(a, name))
            .then(a.cmp(b))
    });
    there.truncate(5);
    let nearest = if there.is_empty() {
        "there are none at all in that folder; is --site right?".to_owned()
    } else {
        format!("nearest there: {}", there.join(", "))
    };
    Err(Unreadable::new(
        path,
        "no_such_file",
        format!("there is no {kind} file for `{name}`; {nearest}"),
    ))
}

/// Why the files of a lot could not be collected.
#[derive(Debug)]
#[allow(missing_docs)]
pub enum Stop {
    Unreadable(Vec<Unreadable>),
    /// `lot.yaml` itself is wrong, so that limit and station file are not known.
    Faults(Faults),
}

impl std::fmt::Display for Stop {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Stop::Unreadable(all) => {
                let each = all
                    .iter()
                    .map(|one| format!("{}: {}", one.path.display(), one.note.text));
                f.write_str(&each.collect::<Vec<_>>().join("; "))
            }
            Stop::Faults(faults) => f.write_str(&crate::diagnostic::render(faults, false)),
        }
    }
}

/// Collects every file that the verdict on a lot folder rests on.
///
/// A sweep file that cannot be read is an empty file with its name: its part is then unmeasured
/// with a reason, and the other parts go on.
///
/// # Errors
/// Files without which nothing can be judged, all of them at once.
pub fn gather(site: &Site, folder: &Path) -> Result<Sources, Stop> {
    if !folder.is_dir() {
        let text = "is not a lot folder: a folder with lot.yaml and sweeps was expected";
        return Err(Stop::Unreadable(vec![Unreadable::new(
            folder,
            "no_lot_folder",
            text,
        )]));
    }
    let file = text_file(&folder.join("lot.yaml")).map_err(|e| Stop::Unreadable(vec![e]))?;
    let lot = lot::read(&file.name, &file.bytes).map_err(Stop::Faults)?;
    let rules = site.rules()?;
    let limits = controlled_file(&site.limit_file(&lot.part), "limit", &lot.part);
    let station = controlled_file(&site.station_file(&lot.station), "station", &lot.station);
    match (limits, station, sweeps(folder, &lot.sweeps)) {
        (Ok(limits), Ok(station), Ok(sweeps)) => {
            let compensation = compensation(&site.station_file(&lot.station), &station)
                .map_err(Stop::Unreadable)?;
            Ok(Sources {
                site: rules,
                lot: file,
                limits,
                station,
                compensation,
                sweeps,
            })
        }
        (limits, station, sweeps) => {
            let all = [limits.err(), station.err(), sweeps.err()];
            Err(Stop::Unreadable(all.into_iter().flatten().collect()))
        }
    }
}

/// The sweep files of a lot: one file, or all sweep files of a folder in name order.
fn sweeps(folder: &Path, name: &str) -> Result<Vec<RawFile>, Unreadable> {
    let path = folder.join(name);
    if path.is_file() {
        return Ok(vec![sweep_file(&path, name.replace('\\', "/"))]);
    }
    let entries = fs::read_dir(&path).map_err(|e| {
        Unreadable::new(
            &path,
            "no_sweeps",
            format!("cannot be listed ({e}): lot.yaml names it as the place of the sweeps"),
        )
    })?;
    let mut found = Vec::new();
    for entry in entries {
        let entry = entry.map_err(|e| {
            Unreadable::new(
                &path,
                "unreadable",
                format!("cannot be listed to its end: {e}"),
            )
        })?;
        let file = entry.file_name().to_string_lossy().into_owned();
        if is_sweep_file(&file) && !entry.path().is_dir() {
            found.push((
                format!("{}/{file}", name.trim_end_matches(['/', '\\'])),
                entry.path(),
            ));
        }
    }
    found.sort();
    Ok(found
        .into_iter()
        .map(|(name, path)| sweep_file(&path, name))
        .collect())
}

fn sweep_file(path: &Path, name: String) -> RawFile {
    RawFile {
        name,
        bytes: bytes(path, SWEEP_BYTES_MAX).unwrap_or_default(),
    }
}

/// The sweeps of the compensation standards, beside the station file.
pub fn compensation(station_path: &Path, file: &RawFile) -> Result<Vec<RawFile>, Vec<Unreadable>> {
    let Ok(station) = crate::station::read(&file.name, &file.bytes) else {
        return Ok(Vec::new());
    };
    let folder = station_path.parent().unwrap_or(Path::new("."));
    let (mut found, mut missing) = (Vec::new(), Vec::new());
    let standards = &station.compensation;
    for standard in [&standards.open, &standards.short, &standards.load]
        .into_iter()
        .flatten()
    {
        match bytes(&folder.join(&standard.sweep), SWEEP_BYTES_MAX) {
            Ok(bytes) => found.push(RawFile {
                name: standard.sweep.clone(),
                bytes,
            }),
            Err(unreadable) => missing.push(unreadable),
        }
    }
    if missing.is_empty() {
        Ok(found)
    } else {
        Err(missing)
    }
}
