//! The door to the file system: the few steps that make a file durable.
//!
//! Everything that is written outside the database goes through [`Disk`], so that tests can let any
//! step fail. What depends on the platform is here and nowhere else in the ledger.

use std::fs::{self, File, OpenOptions};
use std::io::{self, Write};
use std::path::Path;

/// The steps by which files come to be.
pub trait Disk: Send + Sync {
    /// Makes a folder; one that is there already is fine.
    #[allow(missing_docs)]
    fn create_folder(&self, path: &Path) -> io::Result<()>;
    /// Makes a file that must not exist yet.
    #[allow(missing_docs)]
    fn create(&self, path: &Path) -> io::Result<File>;
    /// The same, for nobody's eyes but the user's where the platform knows such files.
    #[allow(missing_docs)]
    fn create_private(&self, path: &Path) -> io::Result<File>;
    /// Writes all of it.
    #[allow(missing_docs)]
    fn write(&self, file: &mut File, bytes: &[u8]) -> io::Result<()>;
    /// Waits until the file's bytes are on the medium.
    #[allow(missing_docs)]
    fn sync(&self, file: &File) -> io::Result<()>;
    /// Gives the file its name, atomically.
    #[allow(missing_docs)]
    fn rename(&self, from: &Path, to: &Path) -> io::Result<()>;
    /// Waits until the names in a folder are on the medium.
    #[allow(missing_docs)]
    fn sync_folder(&self, path: &Path) -> io::Result<()>;
    #[allow(missing_docs)]
    fn remove(&self, path: &Path) -> io::Result<()>;
    /// A step of an act that is no file operation of ours (`begin`, `insert`, `commit` …): a place
    /// where a test can let the act end.
    #[allow(missing_docs)]
    fn step(&self, _name: &'static str) -> io::Result<()> {
        Ok(())
    }
}

/// The file system of the machine.
#[derive(Debug, Clone, Copy, Default)]
pub struct System;

impl Disk for System {
    fn create_folder(&self, path: &Path) -> io::Result<()> {
        match fs::create_dir(path) {
            Err(error) if error.kind() == io::ErrorKind::AlreadyExists && path.is_dir() => Ok(()),
            other => other,
        }
    }

    fn create(&self, path: &Path) -> io::Result<File> {
        OpenOptions::new().write(true).create_new(true).open(path)
    }

    fn create_private(&self, path: &Path) -> io::Result<File> {
        let mut options = OpenOptions::new();
        options.write(true).create_new(true);
        #[cfg(unix)]
        std::os::unix::fs::OpenOptionsExt::mode(&mut options, 0o600);
        options.open(path)
    }

    fn write(&self, file: &mut File, bytes: &[u8]) -> io::Result<()> {
        file.write_all(bytes)
    }

    fn sync(&self, file: &File) -> io::Result<()> {
        file.sync_all()
    }

    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        fs::rename(from, to)
    }

    /// A folder cannot be opened as a file on Windows, where the file system keeps names in its journal.
    fn sync_folder(&self, path: &Path) -> io::Result<()> {
        if cfg!(windows) {
            return Ok(());
        }
        File::open(path)?.sync_all()
    }

    fn remove(&self, path: &Path) -> io::Result<()> {
        fs::remove_file(path)
    }
}

/// Why a folder cannot hold a database that several processes share, as far as its file system
/// tells: network file systems do not keep the promises of locks (SQLite, "SQLite Over a Network").
pub fn unfit_for_locks(folder: &Path) -> io::Result<Option<&'static str>> {
    #[cfg(target_os = "linux")]
    {
        // Magic numbers of statfs(2).
        let kind = rustix::fs::statfs(folder)?.f_type as u64 & 0xffff_ffff;
        Ok(match kind {
            0x6969 => Some("an NFS share"),
            0xff53_4d42 => Some("an SMB share (cifs)"),
            0xfe53_4d42 => Some("an SMB share (smb2)"),
            0x517b => Some("an SMB share (smbfs)"),
            0x6573_5546 => Some("a FUSE file system"),
            0x0102_1997 => Some("a 9P share"),
            0x00c3_6400 => Some("a Ceph share"),
            0x5346_414f => Some("an AFS share"),
            _ => None,
        })
    }
    #[cfg(not(target_os = "linux"))]
    {
        let _ = folder;
        Ok(None)
    }
}
