//! The raw archive.

use crate::support::{files, scratch};
use proptest::prelude::*;
use reelgate::ledger::disk::System;
use reelgate::ledger::{Archive, LedgerError};
use std::path::Path;
use std::sync::Arc;

fn archive(folder: &Path) -> Archive {
    Archive::new(folder, Arc::new(System))
}

#[test]
fn objects_have_the_name_of_their_bytes_and_are_kept_once() {
    let folder = scratch();
    let archive = archive(folder.path());
    let zeros = vec![0_u8; 100_000];
    let names = archive
        .put_all(&[b"abc", b"", &zeros, b"abc"])
        .expect("names");
    // SHA-256 of "abc": FIPS 180-4 example.
    let abc = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
    assert_eq!((names[0].as_str(), names[3].as_str()), (abc, abc));
    assert_eq!(archive.get(abc).expect("bytes"), b"abc");
    assert_eq!(archive.get(&names[1]).expect("bytes"), b"");
    assert_eq!(archive.get(&names[2]).expect("bytes"), zeros);
    let kept = files(folder.path());
    assert_eq!(kept.len(), 3);
    assert!(kept.contains(&folder.path().join("raw").join("ba").join(abc)));
    let packed = std::fs::metadata(archive.path(&names[2]))
        .expect("a file")
        .len();
    assert!(packed < 1000, "{packed} bytes are not compressed");
    // A second time nothing is written: the files keep their times.
    let before: Vec<_> = kept
        .iter()
        .map(|f| f.metadata().and_then(|m| m.modified()).ok())
        .collect();
    archive.put_all(&[b"abc", b"", &zeros]).expect("names");
    let after: Vec<_> = kept
        .iter()
        .map(|f| f.metadata().and_then(|m| m.modified()).ok())
        .collect();
    assert_eq!(before, after);
}

#[test]
fn many_objects_at_once() {
    let folder = scratch();
    let archive = archive(folder.path());
    let objects: Vec<Vec<u8>> = (0..300_u32).map(|k| k.to_string().into_bytes()).collect();
    let slices: Vec<&[u8]> = objects.iter().map(Vec::as_slice).collect();
    let names = archive.put_all(&slices).expect("names");
    for (name, bytes) in names.iter().zip(&objects) {
        assert_eq!(&archive.get(name).expect("bytes"), bytes);
    }
    assert_eq!(archive.list().expect("a listing").objects.len(), 300);
}

fn damage(outcome: Result<Vec<u8>, LedgerError>) -> String {
    match outcome {
        Err(LedgerError::Damaged { why, .. }) => why,
        other => panic!("{other:?}"),
    }
}

#[test]
fn every_changed_byte_is_found() {
    let folder = scratch();
    let archive = archive(folder.path());
    let name = archive
        .put_all(&[b"frequency,magnitude,phase\n1000,33.9,-89.1\n"])
        .expect("names")
        .remove(0);
    let path = archive.path(&name);
    let good = std::fs::read(&path).expect("bytes");
    for place in 0..good.len() {
        for bit in 0..8 {
            let mut bad = good.clone();
            bad[place] ^= 1 << bit;
            std::fs::write(&path, &bad).expect("written");
            damage(archive.get(&name));
        }
    }
    for length in 0..good.len() {
        std::fs::write(&path, &good[..length]).expect("written");
        damage(archive.get(&name));
    }
    std::fs::write(&path, [good.as_slice(), b"x"].concat()).expect("written");
    damage(archive.get(&name));
    std::fs::write(&path, [good.as_slice(), good.as_slice()].concat()).expect("written");
    damage(archive.get(&name));
}

#[test]
fn what_is_damaged_is_not_healed_unseen() {
    let folder = scratch();
    let archive = archive(folder.path());
    let name = archive.put_all(&[b"abc"]).expect("names").remove(0);
    std::fs::write(archive.path(&name), b"").expect("written");
    assert!(matches!(
        archive.put_all(&[b"abc"]),
        Err(LedgerError::Damaged { .. })
    ));
}

#[test]
fn what_is_no_file_or_no_digest_is_refused() {
    let folder = scratch();
    let archive = archive(folder.path());
    let name = archive.put_all(&[b"abc"]).expect("names").remove(0);
    for bad in ["", "..", "../../x", "ABC", &name.to_uppercase(), &name[1..]] {
        assert!(
            matches!(archive.get(bad), Err(LedgerError::Refused(_))),
            "{bad}"
        );
    }
    std::fs::remove_file(archive.path(&name)).expect("removed");
    assert_eq!(damage(archive.get(&name)), "missing");
    std::fs::create_dir(archive.path(&name)).expect("a folder");
    assert_eq!(damage(archive.get(&name)), "not a plain file");
}

#[cfg(unix)]
#[test]
fn links_and_pipes_are_not_followed() {
    let folder = scratch();
    let archive = archive(folder.path());
    let name = archive.put_all(&[b"abc"]).expect("names").remove(0);
    let elsewhere = folder.path().join("elsewhere");
    std::fs::rename(archive.path(&name), &elsewhere).expect("moved");
    std::os::unix::fs::symlink(&elsewhere, archive.path(&name)).expect("a link");
    assert_eq!(damage(archive.get(&name)), "not a plain file");
}

#[test]
fn a_listing_tells_objects_from_leftovers() {
    let folder = scratch();
    let archive = archive(folder.path());
    assert!(archive.is_empty().expect("a listing"));
    let name = archive.put_all(&[b"abc"]).expect("names").remove(0);
    std::fs::write(folder.path().join("raw/ba/x.17.tmp"), b"").expect("written");
    std::fs::write(folder.path().join("raw/notes.txt"), b"").expect("written");
    let listing = archive.list().expect("a listing");
    assert_eq!(listing.objects.into_iter().collect::<Vec<_>>(), [name]);
    assert_eq!((listing.temporary.len(), listing.foreign.len()), (1, 1));
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn what_was_put_is_got(objects in prop::collection::vec(prop::collection::vec(any::<u8>(), 0..300), 0..8)) {
        let folder = scratch();
        let archive = archive(folder.path());
        let slices: Vec<&[u8]> = objects.iter().map(Vec::as_slice).collect();
        let names = archive.put_all(&slices).expect("names");
        for (name, bytes) in names.iter().zip(&objects) {
            prop_assert_eq!(&archive.get(name).expect("bytes"), bytes);
        }
    }
}

/// The objects can be read without this program: they are gzip files.
#[cfg(unix)]
#[test]
fn gunzip_reads_an_object() {
    let folder = scratch();
    let archive = archive(folder.path());
    let text = b"frequency,magnitude,phase\n1000,33.9,-89.1\n";
    let name = archive.put_all(&[text]).expect("names").remove(0);
    let file = std::fs::File::open(archive.path(&name)).expect("a file");
    let out = std::process::Command::new("gzip")
        .args(["-d", "-c"])
        .stdin(file)
        .output()
        .expect("gzip");
    assert!(out.status.success());
    assert_eq!(out.stdout, text);
}
