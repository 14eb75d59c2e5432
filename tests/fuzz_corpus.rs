//! What the fuzz targets have found worth keeping is read again: no panic, and what is taken is
//! sound. `tests/tools/fuzz.py` makes the inputs; tests/fuzz/README.md says how.

#[path = "fuzz/entry/lib.rs"]
mod entry;

use std::fs;
use std::path::{Path, PathBuf};
use std::sync::atomic::Ordering;

/// Inputs of a target, by name.
fn corpus(target: &str) -> Vec<(PathBuf, Vec<u8>)> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/fuzz/corpus")
        .join(target);
    let mut files: Vec<PathBuf> = fs::read_dir(&folder)
        .unwrap_or_else(|e| panic!("{}: {e}", folder.display()))
        .map(|file| file.expect("a file").path())
        .collect();
    files.sort();
    files
        .into_iter()
        .map(|path| {
            let bytes = fs::read(&path).expect("bytes");
            (path, bytes)
        })
        .collect()
}

#[test]
fn every_kept_input_is_read_or_refused() {
    entry::THOROUGH.store(true, Ordering::Relaxed);
    for (name, read) in entry::TARGETS {
        let inputs = corpus(name);
        assert!(inputs.len() >= 2, "{name} has {} inputs", inputs.len());
        for (path, bytes) in inputs {
            let found = std::panic::catch_unwind(|| read(&bytes));
            assert!(found.is_ok(), "tests/fuzz/corpus: {}", path.display());
        }
    }
}

/// Each target, its corpus and its file of the crate belong together.
#[test]
fn every_target_is_there() {
    let home = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/fuzz");
    let named = |folder: &str, ending: &str| -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(home.join(folder))
            .expect("a folder")
            .map(|file| {
                file.expect("a file")
                    .file_name()
                    .to_string_lossy()
                    .replace(ending, "")
            })
            .collect();
        names.sort();
        names
    };
    let mut targets: Vec<&str> = entry::TARGETS.iter().map(|(name, _)| *name).collect();
    targets.sort_unstable();
    assert_eq!(named("targets", ".rs"), targets);
    assert_eq!(named("corpus", ""), targets);
}
