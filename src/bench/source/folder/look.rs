//! Looking at a file: its stamp, and its bytes with the promise that they belong together.

use std::fs::{File, Metadata, TryLockError};
use std::io::{self, Read};
use std::path::Path;
use std::time::UNIX_EPOCH;

/// Longest file that is read, in bytes: a thousand times a sweep of 401 points.
pub const LONGEST: u64 = 64 << 20;

/// By what a change of a file shows without reading it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Stamp {
    /// Length in bytes.
    pub bytes: u64,
    /// Last change of the contents, nanoseconds since 1970; what a copying program may have set.
    pub modified: i64,
    /// Last change of anything, which no copying program can set; 0 where the platform has none.
    pub changed: i64,
    /// Number of the file in its file system; 0 where the platform has none.
    pub inode: u64,
}

impl Stamp {
    /// The stamp in a file's metadata.
    pub fn of(data: &Metadata) -> Stamp {
        let (changed, inode) = beyond(data);
        Stamp {
            bytes: data.len(),
            modified: modified(data),
            changed,
            inode,
        }
    }
}

fn modified(data: &Metadata) -> i64 {
    let Ok(time) = data.modified() else { return 0 };
    let nanoseconds = match time.duration_since(UNIX_EPOCH) {
        Ok(after) => i64::try_from(after.as_nanos()),
        Err(before) => i64::try_from(before.duration().as_nanos()).map(|n| -n),
    };
    nanoseconds.unwrap_or(0)
}

#[cfg(unix)]
fn beyond(data: &Metadata) -> (i64, u64) {
    use std::os::unix::fs::MetadataExt;
    let seconds = data.ctime().saturating_mul(1_000_000_000);
    (seconds.saturating_add(data.ctime_nsec()), data.ino())
}

#[cfg(not(unix))]
fn beyond(_: &Metadata) -> (i64, u64) {
    (0, 0)
}

/// What reading a file came to.
#[derive(Debug)]
pub enum Look {
    /// The bytes, and the stamp that the file had before and after they were read.
    Bytes(Vec<u8>, Stamp),
    /// It changed while it was read.
    Changing,
    /// Another program keeps others out.
    Locked,
    /// It is not there.
    Gone,
    /// Longer than [`LONGEST`].
    TooLong(u64),
    /// It cannot be read.
    Failed(io::Error),
}

/// Reads a file. `locks`: whether the file system can be asked for locks.
pub fn read(path: &Path, locks: bool) -> Look {
    match attempt(path, locks) {
        Ok(look) => look,
        Err(error) if error.kind() == io::ErrorKind::NotFound => Look::Gone,
        Err(error) if is_sharing_violation(&error) => Look::Locked,
        Err(error) => Look::Failed(error),
    }
}

fn attempt(path: &Path, locks: bool) -> io::Result<Look> {
    let mut file = File::open(path)?;
    let before = Stamp::of(&file.metadata()?);
    if before.bytes > LONGEST {
        return Ok(Look::TooLong(before.bytes));
    }
    if locks {
        // A program that locks what it writes is waited for. The lock is let go with the file.
        match file.try_lock_shared() {
            Err(TryLockError::WouldBlock) => return Ok(Look::Locked),
            Ok(()) | Err(TryLockError::Error(_)) => {}
        }
    }
    let mut bytes = Vec::with_capacity(usize::try_from(before.bytes).unwrap_or(0));
    let read = (&mut file).take(LONGEST + 1).read_to_end(&mut bytes)?;
    let after = Stamp::of(&file.metadata()?);
    let named = Stamp::of(&std::fs::metadata(path)?);
    let steady = before == after && named.inode == after.inode && read as u64 == after.bytes;
    Ok(if steady {
        Look::Bytes(bytes, after)
    } else {
        Look::Changing
    })
}

/// Another program has the file open without sharing it: `ERROR_SHARING_VIOLATION` and
/// `ERROR_LOCK_VIOLATION` of Windows.
fn is_sharing_violation(error: &io::Error) -> bool {
    cfg!(windows) && matches!(error.raw_os_error(), Some(32 | 33))
}
