//! One record with everything that it rests on, as a BagIt package (RFC 8493) that can be verified
//! elsewhere without this program.
//!
//! Objects are stored under their digests, so that no name from outside becomes a path.

use super::digest::sha256_hex;
use super::disk::Disk;
use super::entry::{Act, Entry};
use super::error::LedgerError;
use super::proof::Proof;
use super::trust::Trust;
use super::{Ledger, Query};
use chrono::{DateTime, FixedOffset};
use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

/// What a package is made of besides the ledger.
#[derive(Debug, Clone, Copy)]
#[allow(missing_docs)]
pub struct Export<'a> {
    pub record: &'a str,
    /// The PDF, where there is one.
    pub certificate: Option<&'a [u8]>,
    pub time: DateTime<FixedOffset>,
    /// Name and version of the program.
    pub program: &'a str,
}

/// Acts, and roles of their notes among the objects of a judged lot.
const STATEMENTS: [&str; 2] = ["approval", "withdrawal"];

/// Path within the package, with `/`, and content.
type Files = BTreeMap<String, Vec<u8>>;

/// Writes the package of a record as the folder `target`, which must not exist yet: the folder
/// appears with everything in it, or not at all.
///
/// # Errors
/// An unknown record, an object that is missing or damaged, a target that exists, what the file
/// system says.
pub fn export(
    ledger: &Ledger,
    export: &Export,
    target: &Path,
    disk: &dyn Disk,
) -> Result<(), LedgerError> {
    if target.symlink_metadata().is_ok() {
        return Err(LedgerError::Refused(format!(
            "{}: is there already: name a folder that is not",
            target.display()
        )));
    }
    let payload = payload(ledger, export)?;
    let files = package(payload, export);
    let mut name = target.file_name().unwrap_or_default().to_owned();
    name.push(".unfinished");
    let unfinished = target.with_file_name(name);
    let written = write(&files, &unfinished, disk).and_then(|()| {
        disk.rename(&unfinished, target)
            .map_err(|e| LedgerError::io("naming the package", target, e))
    });
    match (&written, target.parent()) {
        (Err(_), _) => remove(&files, &unfinished, disk),
        (Ok(()), Some(parent)) if !parent.as_os_str().is_empty() => disk
            .sync_folder(parent)
            .map_err(|e| LedgerError::io("syncing the folder", parent, e))?,
        _ => {}
    }
    written
}

fn payload(ledger: &Ledger, export: &Export) -> Result<Files, LedgerError> {
    let entries = ledger.find(Query::Record(export.record))?;
    let judged = entries
        .iter()
        .find(|entry| matches!(entry.act, Act::Judged { .. }))
        .ok_or_else(|| {
            LedgerError::Refused(format!("the ledger has no record {:?}", export.record))
        })?;
    let mut files = Files::new();
    add_proven(ledger, judged, "data/entry", &mut files)?;
    for entry in entries.iter().filter(|entry| entry.index != judged.index) {
        let name = format!("data/history/{}-{}", entry.index, entry.act.kind());
        add_proven(ledger, entry, &name, &mut files)?;
    }
    for object in entries.iter().flat_map(|entry| &entry.objects) {
        let bytes = ledger.archive().get(&object.sha256)?;
        files.insert(format!("data/objects/{}", object.sha256), bytes);
    }
    add_approvals(ledger, judged, &mut files)?;
    if let Some(certificate) = export.certificate {
        files.insert("data/certificate.pdf".to_owned(), certificate.to_vec());
    }
    let key = ledger.verifier().text() + "\n";
    files.insert("data/public-key.txt".to_owned(), key.into_bytes());
    files.insert("data/README.txt".to_owned(), README.as_bytes().to_vec());
    Ok(files)
}

/// The approvals that the record rests on, with their entries and the keys that were trusted.
fn add_approvals(ledger: &Ledger, judged: &Entry, files: &mut Files) -> Result<(), LedgerError> {
    let mut notes = Vec::new();
    for object in judged
        .objects
        .iter()
        .filter(|o| STATEMENTS.contains(&o.role.as_str()))
    {
        notes.push(ledger.archive().get(&object.sha256)?);
    }
    if notes.is_empty() {
        return Ok(());
    }
    let trust = Trust::read(ledger.store(), ledger.archive(), judged.index)?;
    let chain: Vec<u64> = trust.site_files().iter().map(|s| s.granted.entry).collect();
    let mut entries = Vec::new();
    for kind in STATEMENTS {
        entries.extend(ledger.find(Query::Kind(kind))?);
    }
    for entry in entries {
        let (Act::Approval { statement, .. } | Act::Withdrawal { statement, .. }) = &entry.act
        else {
            continue;
        };
        let wanted = notes.iter().any(|note| note == statement.as_bytes());
        if entry.index >= judged.index || !(wanted || chain.contains(&entry.index)) {
            continue;
        }
        let name = format!("data/approvals/{}-{}", entry.index, entry.act.kind());
        add_proven(ledger, &entry, &name, files)?;
        for object in &entry.objects {
            let bytes = ledger.archive().get(&object.sha256)?;
            files.insert(format!("data/objects/{}", object.sha256), bytes);
        }
    }
    let own = judged.objects_of("site").next();
    let own = own.map(|o| ledger.archive().get(&o.sha256)).transpose()?;
    let own = own.and_then(|bytes| crate::site::read("limits/site.yaml", &bytes).ok());
    let sites = trust.site_files().iter().map(|site| &site.file);
    let keys: BTreeSet<String> = sites
        .chain(&own)
        .flat_map(|site| &site.trusted_keys)
        .map(|trusted| trusted.key.text() + "\n")
        .collect();
    let text: String = keys.into_iter().collect();
    files.insert("data/approval-keys.txt".to_owned(), text.into_bytes());
    Ok(())
}

/// The entry's bytes, and the proof that it is in the ledger as it now is.
fn add_proven(
    ledger: &Ledger,
    entry: &Entry,
    name: &str,
    files: &mut Files,
) -> Result<(), LedgerError> {
    let size = ledger.size()?;
    let proof = Proof {
        index: entry.index,
        hashes: ledger.inclusion_proof(entry.index, size)?,
        checkpoint: ledger.entry(size.saturating_sub(1))?.checkpoint,
    };
    files.insert(format!("{name}.json"), entry.bytes()?.into_bytes());
    files.insert(format!("{name}.tlog-proof"), proof.text().into_bytes());
    Ok(())
}

/// Payload and tag files.
fn package(payload: Files, export: &Export) -> Files {
    let bytes: usize = payload.values().map(Vec::len).sum();
    let info = format!(
        "Bag-Software-Agent: {}\nBagging-Date: {}\nExternal-Identifier: {}\nPayload-Oxum: {bytes}.{}\n",
        one_line(export.program),
        export.time.format("%Y-%m-%d"),
        one_line(export.record),
        payload.len()
    );
    let declaration = "BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n";
    let mut tags = Files::new();
    tags.insert("bagit.txt".to_owned(), declaration.as_bytes().to_vec());
    tags.insert("bag-info.txt".to_owned(), info.into_bytes());
    tags.insert("manifest-sha256.txt".to_owned(), manifest(&payload));
    let of_tags = manifest(&tags);
    tags.insert("tagmanifest-sha256.txt".to_owned(), of_tags);
    tags.extend(payload);
    tags
}

fn manifest(files: &Files) -> Vec<u8> {
    let lines: String = files
        .iter()
        .map(|(path, bytes)| format!("{}  {path}\n", sha256_hex(bytes)))
        .collect();
    lines.into_bytes()
}

/// A value of `bag-info.txt` must not begin another line.
fn one_line(text: &str) -> String {
    text.chars().filter(|c| !c.is_control()).collect()
}

fn write(files: &Files, folder: &Path, disk: &dyn Disk) -> Result<(), LedgerError> {
    for folder in folders(files, folder) {
        disk.create_folder(&folder)
            .map_err(|e| LedgerError::io("making the folder", &folder, e))?;
    }
    for (path, bytes) in files {
        let path = folder.join(path);
        let at = |doing| {
            let path = path.clone();
            move |e| LedgerError::io(doing, &path, e)
        };
        let mut file = disk.create(&path).map_err(at("making the file"))?;
        disk.write(&mut file, bytes)
            .map_err(at("writing the file"))?;
        disk.sync(&file).map_err(at("syncing the file"))?;
    }
    for folder in folders(files, folder).iter().rev() {
        disk.sync_folder(folder)
            .map_err(|e| LedgerError::io("syncing the folder", folder, e))?;
    }
    Ok(())
}

/// The folders of the package, outer ones first.
fn folders(files: &Files, folder: &Path) -> Vec<PathBuf> {
    let mut out = vec![folder.to_owned()];
    for path in files.keys().filter_map(|path| Path::new(path).parent()) {
        for ancestor in path.ancestors().collect::<Vec<_>>().iter().rev() {
            let inner = folder.join(ancestor);
            if !out.contains(&inner) && !ancestor.as_os_str().is_empty() {
                out.push(inner);
            }
        }
    }
    out
}

/// Takes an unfinished package away, file by file, as far as that goes.
fn remove(files: &Files, folder: &Path, disk: &dyn Disk) {
    for path in files.keys() {
        let _ = disk.remove(&folder.join(path));
    }
    for folder in folders(files, folder).iter().rev() {
        let _ = std::fs::remove_dir(folder);
    }
}

const README: &str = "\
A lot record and what it rests on, as a BagIt package (RFC 8493).

entry.json            the entry of the ledger by which the lot was judged: one line of JSON
entry.tlog-proof      that this entry is in the ledger (C2SP tlog-proof, RFC 9162 section 2.1)
history/              later entries about the same record (dispositions, certificates), likewise
objects/<sha256>      the bytes that the entries rest on, by SHA-256; the entry says in \"objects\"
                      what each is: the record itself, the lot, limit and station files as they
                      were, the sweeps
certificate.pdf       the certificate, where one was given
approvals/            the entries by which the files that the lot was judged by were approved, and the site
                      files that say whose approvals count, likewise
approval-keys.txt     the public keys that those site files list, in the form of public-key.txt
public-key.txt        the public key of the ledger: name+id+base64 of 01 and 32 bytes (Ed25519)

To check by hand, with sha256sum and any program that knows Ed25519:
1. Every file has the SHA-256 that manifest-sha256.txt gives.
2. Every object named in entry.json is in objects/ under its SHA-256.
3. Leaf = SHA-256 of the byte 00 and the bytes of entry.json. Climb with the hashes of the proof
   (RFC 9162 section 2.1.3.2, node = SHA-256 of the byte 01, left, right): the result is the third
   line of the checkpoint, in base64.
4. The signature of the checkpoint, without its first four bytes, is an Ed25519 signature of the
   checkpoint's text (up to the line before the empty one, with its line end).
5. The approvals are objects with the role \"approval\": signed notes like the checkpoint, by one of
   approval-keys.txt. The note has the SHA-256 of the file that was approved; that of the lot's own
   file must be the same.
6. Compare public-key.txt with the key that the site has given you by another way, and the
   checkpoint with one from a certificate that has left the site.
";
