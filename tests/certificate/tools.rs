//! Running the outside programs.

use std::path::{Path, PathBuf};
use std::process::Command;

/// A document on disk for as long as this lives.
pub struct Saved {
    pub folder: tempfile::TempDir,
    pub path: PathBuf,
}

pub fn save(pdf: &[u8]) -> Saved {
    let folder = tempfile::tempdir().expect("temporary folder");
    let path = folder.path().join("record.pdf");
    std::fs::write(&path, pdf).expect("write");
    Saved { folder, path }
}

/// What a program prints; it must be there and succeed.
pub fn run(program: &str, arguments: &[&str], path: &Path) -> String {
    let mut command = Command::new(program);
    // FILE stands for the path.
    for argument in arguments {
        if *argument == "FILE" {
            command.arg(path);
        } else {
            command.arg(argument);
        }
    }
    let output = command
        .output()
        .unwrap_or_else(|e| panic!("{program} cannot be run ({e}): install its Debian package"));
    let text = String::from_utf8_lossy(&output.stdout).into_owned();
    assert!(
        output.status.success(),
        "{program} {arguments:?}: {}\n{text}{}",
        output.status,
        String::from_utf8_lossy(&output.stderr)
    );
    text
}

/// The text of every page, columns kept apart.
pub fn pages(path: &Path) -> Vec<String> {
    let text = run(
        "pdftotext",
        &["-layout", "-enc", "UTF-8", "FILE", "-"],
        path,
    );
    let mut pages: Vec<String> = text.split('\u{c}').map(str::to_owned).collect();
    pages.pop();
    pages
}
