//! Listing a folder.

use super::look::Stamp;
use std::ffi::OsString;
use std::fs;
use std::io;
use std::path::Path;

/// One name of a folder.
#[derive(Debug)]
pub struct Entry {
    /// The name.
    pub name: OsString,
    /// `None` for what is no file.
    pub stamp: Option<Stamp>,
}

/// The names in a folder with their stamps; a name that is gone again is left out.
pub fn list(folder: &Path) -> io::Result<Vec<Entry>> {
    let mut entries = Vec::new();
    for entry in fs::read_dir(folder)? {
        let entry = entry?;
        let mut data = entry.metadata();
        if data.as_ref().is_ok_and(fs::Metadata::is_symlink) {
            data = fs::metadata(entry.path());
        }
        let stamp = match data {
            Ok(data) => data.is_file().then(|| Stamp::of(&data)),
            Err(_) => continue,
        };
        entries.push(Entry {
            name: entry.file_name(),
            stamp,
        });
    }
    Ok(entries)
}

/// The stamp of a file; `None` where there is no such file.
pub fn stamp(path: &Path) -> Option<Stamp> {
    let data = fs::metadata(path).ok()?;
    data.is_file().then(|| Stamp::of(&data))
}

/// What tells a folder from another one that has taken its name.
pub fn identity(folder: &Path) -> Option<(u64, u64)> {
    let data = fs::metadata(folder).ok()?;
    identity_of(&data)
}

#[cfg(unix)]
fn identity_of(data: &fs::Metadata) -> Option<(u64, u64)> {
    use std::os::unix::fs::MetadataExt;
    Some((data.dev(), data.ino()))
}

#[cfg(not(unix))]
fn identity_of(_: &fs::Metadata) -> Option<(u64, u64)> {
    None
}
