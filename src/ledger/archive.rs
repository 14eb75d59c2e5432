//! The raw archive: `raw/<first two digits>/<sha256>`, each object a gzip file (RFC 1952) of the
//! bytes whose SHA-256 is its name.
//!
//! An object is written to a temporary name in its folder, synced, renamed, and the folder synced:
//! under its name there is all of it or nothing. Each read hashes again.

use super::digest::{is_hex_digest, sha256, sha256_hex};
use super::disk::Disk;
use super::error::LedgerError;
use flate2::{Compression, Crc, bufread::GzDecoder, write::DeflateEncoder};
use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::io::{self, Read, Write};
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};

/// The largest object, uncompressed, in bytes: no file of a lot comes near it.
pub const MAX_OBJECT: u64 = 256 << 20;

/// How many objects are on their way to the medium at once: syncs wait, they do not compute.
const WRITERS: usize = 16;

/// The raw archive of a site.
#[derive(Clone)]
pub struct Archive {
    folder: PathBuf,
    disk: Arc<dyn Disk>,
}

/// What stands in the archive's folders.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Listing {
    /// Names of objects.
    pub objects: BTreeSet<String>,
    /// Temporary files that an interrupted run left.
    pub temporary: Vec<PathBuf>,
    /// Anything else.
    pub foreign: Vec<PathBuf>,
}

impl Archive {
    /// The archive in `records/raw`; nothing is touched before the first object.
    pub fn new(records: &Path, disk: Arc<dyn Disk>) -> Self {
        Archive {
            folder: records.join("raw"),
            disk,
        }
    }

    /// Keeps all of them and returns when they are durable; their digests in the same order. What
    /// is there already is read and compared, not written again.
    pub fn put_all(&self, objects: &[&[u8]]) -> Result<Vec<String>, LedgerError> {
        let names: Vec<String> = objects.iter().map(|bytes| sha256_hex(bytes)).collect();
        let absent: BTreeMap<&str, &[u8]> = names
            .iter()
            .map(String::as_str)
            .zip(objects.iter().copied())
            .collect();
        if absent.is_empty() {
            return Ok(names);
        }
        self.make_folders(absent.keys().copied())?;
        let absent: Vec<(&str, &[u8])> = absent.into_iter().collect();
        in_parallel(&absent, |(name, bytes)| self.put(name, bytes))?;
        let folders: BTreeSet<PathBuf> = absent
            .iter()
            .filter_map(|(name, _)| self.path(name).parent().map(Path::to_owned))
            .collect();
        let folders: Vec<PathBuf> = folders.into_iter().collect();
        in_parallel(&folders, |folder| {
            self.disk
                .sync_folder(folder)
                .map_err(|e| LedgerError::io("syncing the folder", folder, e))
        })?;
        Ok(names)
    }

    /// The bytes of an object, hashed anew.
    pub fn get(&self, name: &str) -> Result<Vec<u8>, LedgerError> {
        if !is_hex_digest(name) {
            return Err(LedgerError::Refused(format!("{name:?} is no digest")));
        }
        let path = self.path(name);
        let what = || format!("archive object {name}");
        let kind = fs::symlink_metadata(&path).map_err(|error| match error.kind() {
            io::ErrorKind::NotFound => LedgerError::damaged(what(), "missing"),
            _ => LedgerError::io("looking at the object", &path, error),
        })?;
        if !kind.is_file() {
            return Err(LedgerError::damaged(what(), "not a plain file"));
        }
        let packed =
            fs::read(&path).map_err(|e| LedgerError::io("reading the object", &path, e))?;
        let bytes = unpack(&packed).map_err(|why| LedgerError::damaged(what(), why))?;
        if sha256_hex(&bytes) != name {
            return Err(LedgerError::damaged(
                what(),
                "its bytes have another digest",
            ));
        }
        Ok(bytes)
    }

    /// Whether the archive holds any object.
    pub fn is_empty(&self) -> Result<bool, LedgerError> {
        Ok(self.list()?.objects.is_empty())
    }

    /// Every file under the archive's folder, by what it is.
    pub fn list(&self) -> Result<Listing, LedgerError> {
        let mut listing = Listing::default();
        for (path, is_folder) in entries(&self.folder)? {
            let name = file_name(&path);
            let prefix = name.len() == 2 && name.bytes().all(|b| b.is_ascii_hexdigit());
            if !(is_folder && prefix) {
                listing.foreign.push(path);
                continue;
            }
            for (path, _) in entries(&path)? {
                let object = file_name(&path);
                if is_hex_digest(&object) && object.starts_with(&name) {
                    listing.objects.insert(object);
                } else if object.ends_with(TEMPORARY) {
                    listing.temporary.push(path);
                } else {
                    listing.foreign.push(path);
                }
            }
        }
        Ok(listing)
    }

    /// Where an object lies.
    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.join(name.get(..2).unwrap_or("")).join(name)
    }

    fn make_folders<'a>(&self, names: impl Iterator<Item = &'a str>) -> Result<(), LedgerError> {
        self.make_folder(&self.folder)?;
        let wanted: BTreeSet<PathBuf> = names
            .filter_map(|name| self.path(name).parent().map(Path::to_owned))
            .collect();
        let missing: Vec<PathBuf> = wanted.into_iter().filter(|path| !path.is_dir()).collect();
        for folder in &missing {
            self.disk
                .create_folder(folder)
                .map_err(|e| LedgerError::io("making the folder", folder, e))?;
        }
        if missing.is_empty() {
            return Ok(());
        }
        self.disk
            .sync_folder(&self.folder)
            .map_err(|e| LedgerError::io("syncing the folder", &self.folder, e))
    }

    fn make_folder(&self, folder: &Path) -> Result<(), LedgerError> {
        if folder.is_dir() {
            return Ok(());
        }
        self.disk
            .create_folder(folder)
            .map_err(|e| LedgerError::io("making the folder", folder, e))?;
        let Some(parent) = folder.parent() else {
            return Ok(());
        };
        self.disk
            .sync_folder(parent)
            .map_err(|e| LedgerError::io("syncing the folder", parent, e))
    }

    fn put(&self, name: &str, bytes: &[u8]) -> Result<(), LedgerError> {
        if bytes.len() as u64 > MAX_OBJECT {
            return Err(LedgerError::Refused(format!(
                "a file of {} bytes is larger than the archive takes ({MAX_OBJECT})",
                bytes.len()
            )));
        }
        let path = self.path(name);
        if fs::symlink_metadata(&path).is_ok() {
            return self.get(name).map(|_| ());
        }
        let temporary = temporary_name(&path, name);
        let written = self.write(&temporary, bytes).and_then(|()| {
            self.disk
                .rename(&temporary, &path)
                .map_err(|e| LedgerError::io("naming the object", &path, e))
        });
        if written.is_err() {
            // What cannot be removed now is reported by `list`; the first error is the one to tell.
            let _ = self.disk.remove(&temporary);
        }
        written
    }

    fn write(&self, path: &Path, bytes: &[u8]) -> Result<(), LedgerError> {
        let at = |doing| move |e| LedgerError::io(doing, path, e);
        let packed = pack(bytes).map_err(at("compressing the object"))?;
        let mut file = self.disk.create(path).map_err(at("making the object"))?;
        self.disk
            .write(&mut file, &packed)
            .map_err(at("writing the object"))?;
        self.disk.sync(&file).map_err(at("syncing the object"))
    }
}

const TEMPORARY: &str = ".tmp";

/// A name that no other writer uses: not in this process, and, since one left by a process of the
/// same number that was killed is passed over, not of one before it.
fn temporary_name(path: &Path, name: &str) -> PathBuf {
    static NEXT: AtomicU64 = AtomicU64::new(0);
    loop {
        let n = NEXT.fetch_add(1, Ordering::Relaxed);
        let file = format!("{name}.{}-{n}{TEMPORARY}", std::process::id());
        let candidate = path.with_file_name(file);
        if fs::symlink_metadata(&candidate).is_err() {
            return candidate;
        }
    }
}

/// Head of an object's file: gzip, no name, no time, one extra field of 32 bytes, "RG" (RFC 1952
/// section 2.3), which holds the SHA-256 of everything after it. Different compressed bytes can
/// stand for the same content; with this, no byte of the file can change unseen.
const HEAD: [u8; 16] = [
    0x1f, 0x8b, 8, 4, 0, 0, 0, 0, 0, 0xff, 36, 0, b'R', b'G', 32, 0,
];

fn pack(bytes: &[u8]) -> io::Result<Vec<u8>> {
    let mut encoder = DeflateEncoder::new(Vec::new(), Compression::new(6));
    encoder.write_all(bytes)?;
    let mut body = encoder.finish()?;
    let mut crc = Crc::new();
    crc.update(bytes);
    body.extend_from_slice(&crc.sum().to_le_bytes());
    body.extend_from_slice(&crc.amount().to_le_bytes());
    Ok([&HEAD[..], &sha256(&body), &body].concat())
}

/// One gzip member, with nothing after it and no more in it than an object may have.
fn unpack(packed: &[u8]) -> Result<Vec<u8>, String> {
    let rest = packed
        .strip_prefix(&HEAD)
        .ok_or("not a file of the archive")?;
    let (digest, body) = rest
        .split_first_chunk::<32>()
        .ok_or("not a file of the archive")?;
    if sha256(body) != *digest {
        return Err("its compressed bytes were changed".to_owned());
    }
    let mut decoder = GzDecoder::new(packed);
    let mut bytes = Vec::new();
    decoder
        .by_ref()
        .take(MAX_OBJECT + 1)
        .read_to_end(&mut bytes)
        .map_err(|error| format!("cannot be decompressed ({error})"))?;
    if bytes.len() as u64 > MAX_OBJECT {
        return Err("larger than any object".to_owned());
    }
    if !decoder.into_inner().is_empty() {
        return Err("bytes follow the compressed object".to_owned());
    }
    Ok(bytes)
}

/// Does it to every item, several at a time; the first error in item order.
fn in_parallel<T: Sync>(
    items: &[T],
    work: impl Fn(&T) -> Result<(), LedgerError> + Sync,
) -> Result<(), LedgerError> {
    let share = items.len().div_ceil(WRITERS).max(1);
    std::thread::scope(|scope| {
        let threads: Vec<_> = items
            .chunks(share)
            .map(|chunk| scope.spawn(|| chunk.iter().try_for_each(&work)))
            .collect();
        let mut outcome = Ok(());
        for thread in threads {
            let result = thread
                .join()
                .unwrap_or_else(|panic| std::panic::resume_unwind(panic));
            outcome = outcome.and(result);
        }
        outcome
    })
}

/// Path and whether it is a folder, sorted; nothing where the folder does not exist.
fn entries(folder: &Path) -> Result<Vec<(PathBuf, bool)>, LedgerError> {
    let at = |e| LedgerError::io("listing the folder", folder, e);
    let listing = match fs::read_dir(folder) {
        Err(error) if error.kind() == io::ErrorKind::NotFound => return Ok(Vec::new()),
        other => other.map_err(at)?,
    };
    let mut out = Vec::new();
    for entry in listing {
        let entry = entry.map_err(at)?;
        out.push((entry.path(), entry.file_type().map_err(at)?.is_dir()));
    }
    out.sort();
    Ok(out)
}

fn file_name(path: &Path) -> String {
    path.file_name()
        .map(|name| name.to_string_lossy().into_owned())
        .unwrap_or_default()
}
