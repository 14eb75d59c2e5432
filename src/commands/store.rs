//! Putting a record on the disk: whole or not at all.

use std::fs::{self, File};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// How the name of a file ends that is not whole yet.
const TEMPORARY: &str = ".part";

/// Where a record's two files lie.
#[derive(Debug, Clone)]
#[allow(missing_docs)]
pub struct Paths {
    pub pdf: PathBuf,
    pub json: PathBuf,
}

impl Paths {
    /// `<folder>/<record>.pdf` and `.json`.
    pub fn of(folder: &Path, record: &str) -> Paths {
        Paths {
            pdf: folder.join(format!("{record}.pdf")),
            json: folder.join(format!("{record}.json")),
        }
    }
}

/// Writes a file whole: a temporary file beside it, forced to the disk, then renamed.
///
/// # Errors
/// Any of the system's; nothing but the temporary file is then left, and that is removed.
pub fn write_whole(path: &Path, bytes: &[u8]) -> io::Result<()> {
    let folder = path.parent().unwrap_or(Path::new("."));
    fs::create_dir_all(folder)?;
    let mut name = path.file_name().unwrap_or_default().to_owned();
    name.push(format!(".{}{TEMPORARY}", std::process::id()));
    let temporary = folder.join(name);
    let written = File::create(&temporary).and_then(|mut file| {
        // For `remove_leftovers`; a share that gives no locks is no reason not to write.
        let _ = file.try_lock();
        file.write_all(bytes)?;
        file.sync_all()
    });
    let done = written.and_then(|()| fs::rename(&temporary, path));
    if done.is_err() {
        let _ = fs::remove_file(&temporary);
        return done;
    }
    sync_folder(folder)
}

/// Writes a file that only its owner can read, where there is none yet.
///
/// # Errors
/// A file that exists, or any of the system's; nothing is then left.
pub fn write_private(path: &Path, bytes: &[u8]) -> io::Result<()> {
    let mut options = fs::OpenOptions::new();
    options.write(true).create_new(true);
    #[cfg(unix)]
    std::os::unix::fs::OpenOptionsExt::mode(&mut options, 0o600);
    let mut file = options.open(path)?;
    let written = file.write_all(bytes).and_then(|()| file.sync_all());
    if written.is_err() {
        let _ = fs::remove_file(path);
        return written;
    }
    sync_folder(path.parent().unwrap_or(Path::new(".")))
}

/// Removes what runs that were killed have left beside a file. A file that a process is still
/// writing is locked, and stays.
pub fn remove_leftovers(path: &Path) {
    let (Some(folder), Some(name)) = (path.parent(), path.file_name().and_then(|n| n.to_str()))
    else {
        return;
    };
    let leftover = |found: &str| {
        let process = found
            .strip_prefix(name)
            .and_then(|rest| rest.strip_prefix('.'))
            .and_then(|rest| rest.strip_suffix(TEMPORARY));
        process.is_some_and(|p| !p.is_empty() && p.bytes().all(|b| b.is_ascii_digit()))
    };
    for entry in fs::read_dir(folder).into_iter().flatten().flatten() {
        if entry.file_name().to_str().is_some_and(leftover) {
            let free = File::options()
                .write(true)
                .open(entry.path())
                .is_ok_and(|file| file.try_lock().is_ok());
            if free {
                let _ = fs::remove_file(entry.path());
            }
        }
    }
}

/// A rename is on the disk once its folder is. Windows has no such call for folders; there the
/// file system's own journal orders the rename.
#[cfg(unix)]
fn sync_folder(folder: &Path) -> io::Result<()> {
    let folder = if folder.as_os_str().is_empty() {
        Path::new(".")
    } else {
        folder
    };
    File::open(folder)?.sync_all()
}

#[cfg(not(unix))]
fn sync_folder(_: &Path) -> io::Result<()> {
    Ok(())
}
