//! The ledger's own key, in a file beside it, made when the first lot is judged.
//!
//! It lets nobody but this ledger make its checkpoints; it does not keep the person who owns the
//! machine from making others. For that there are checkpoints that have left the machine.

use super::disk::Disk;
use super::error::LedgerError;
use crate::keys::Signer;
use std::fs::{self, File};
use std::io::ErrorKind;
use std::path::Path;

/// The key's file in the records folder.
pub const KEY_FILE: &str = "ledger.key";

/// The key of the ledger in `records`. Where there are neither key nor ledger yet, `new` makes one
/// from good randomness (its name is the origin of the ledger's checkpoints), and it is kept.
///
/// # Errors
/// A ledger whose key is gone, a file that is no key, what the file system says.
pub fn ledger_key(
    records: &Path,
    new: &dyn Fn() -> Result<Signer, LedgerError>,
    disk: &dyn Disk,
) -> Result<Signer, LedgerError> {
    let path = records.join(KEY_FILE);
    if let Some(signer) = read(&path)? {
        return Ok(signer);
    }
    super::make_records(records, disk)?;
    let lock_path = records.join("key.lock");
    let lock = File::create(&lock_path)
        .map_err(|e| LedgerError::io("opening the lock file", &lock_path, e))?;
    lock.lock()
        .map_err(|e| LedgerError::io("locking", &lock_path, e))?;
    // Another process may have made it while this one waited.
    if let Some(signer) = read(&path)? {
        return Ok(signer);
    }
    let length = fs::metadata(records.join(super::FILE)).map_or(0, |m| m.len());
    if length > 0 {
        return Err(LedgerError::Key(format!(
            "{}: the ledger is there and its key is not: put the key back from its backup",
            path.display()
        )));
    }
    let signer = new()?;
    keep(&signer, &path, disk)?;
    disk.sync_folder(records)
        .map_err(|e| LedgerError::io("syncing the folder", records, e))?;
    Ok(signer)
}

fn read(path: &Path) -> Result<Option<Signer>, LedgerError> {
    match fs::read_to_string(path) {
        Ok(text) => Signer::read(&text)
            .map(Some)
            .map_err(|e| LedgerError::Key(format!("{}: {e}", path.display()))),
        Err(error) if error.kind() == ErrorKind::NotFound => Ok(None),
        Err(error) => Err(LedgerError::io("reading the key", path, error)),
    }
}

fn keep(signer: &Signer, path: &Path, disk: &dyn Disk) -> Result<(), LedgerError> {
    let temporary = path.with_extension("key.tmp");
    let at = |doing| move |e| LedgerError::io(doing, path, e);
    if temporary.symlink_metadata().is_ok() {
        disk.remove(&temporary)
            .map_err(at("removing an unfinished key"))?;
    }
    let mut file = disk
        .create_private(&temporary)
        .map_err(at("making the key file"))?;
    let text = signer.secret_text() + "\n";
    disk.write(&mut file, text.as_bytes())
        .map_err(at("writing the key"))?;
    disk.sync(&file).map_err(at("syncing the key"))?;
    disk.rename(&temporary, path).map_err(at("naming the key"))
}
