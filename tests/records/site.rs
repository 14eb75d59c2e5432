//! A site with one small lot of invented parts, in a folder of its own.

use serde_json::Value;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

pub struct Site {
    folder: tempfile::TempDir,
}

/// Runs the program in the site: exit status, standard output, standard error.
pub fn run(site: &Site, args: &[&str]) -> (Option<i32>, String, String) {
    let output = Command::new(env!("CARGO_BIN_EXE_reelgate"))
        .args(args)
        .current_dir(site.folder.path())
        .env("REELGATE_NOW", "2026-11-02T08:00:00+01:00")
        .env_remove("REELGATE_SITE")
        .output()
        .expect("reelgate runs");
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).expect("text");
    (
        output.status.code(),
        text(output.stdout),
        text(output.stderr),
    )
}

impl Site {
    /// With the limit files of this project and lot 26K-0001 of three parts, fewer than demanded.
    pub fn new() -> Site {
        let memory = Path::new("/dev/shm");
        let folder = tempfile::tempdir_in(memory).or_else(|_| tempfile::tempdir());
        let site = Site {
            folder: folder.expect("a folder"),
        };
        copy(Path::new("limits"), &site.file("limits"));
        site.lot("26K-0001");
        site
    }

    pub fn file(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// A lot folder with the first three sweeps of a sample lot.
    pub fn lot(&self, lot: &str) {
        let text = fs::read_to_string("sample-lots/26K-0457/lot.yaml").expect("a lot file");
        let folder = self.file(&format!("lots/{lot}"));
        fs::create_dir_all(folder.join("sweeps")).expect("a folder");
        fs::write(folder.join("lot.yaml"), text.replace("26K-0457", lot)).expect("a lot file");
        for part in ["001", "002", "003"] {
            self.copy_sweep(lot, part);
        }
    }

    pub fn copy_sweep(&self, lot: &str, part: &str) {
        let to = self.file(&format!("lots/{lot}/sweeps/{part}.csv"));
        fs::copy(format!("sample-lots/26K-0457/sweeps/{part}.csv"), to).expect("a sweep");
    }

    /// Judges a lot, which is held; its record.
    pub fn judge(&self, lot: &str) -> Value {
        let lot = format!("lots/{lot}");
        let (status, out, err) = run(self, &["judge", "--format", "json", &lot]);
        assert_eq!(status, Some(3), "{err}");
        serde_json::from_str(&out).expect("a record")
    }

    pub fn certificate(&self, record: &Value, kind: &str) -> PathBuf {
        let name = record["record"].as_str().expect("a name");
        self.file(&format!("records/certificates/{name}.{kind}"))
    }

    pub fn ok(&self, args: &[&str]) -> String {
        let (status, out, err) = run(self, args);
        assert_eq!(status, Some(0), "{args:?}: {out}{err}");
        out
    }

    pub fn json(&self, args: &[&str]) -> Value {
        let out = self.ok(&[args, &["--format", "json"]].concat());
        serde_json::from_str(&out).expect("JSON")
    }

    /// Exit status 2; standard error.
    pub fn fails(&self, args: &[&str]) -> String {
        let (status, out, err) = run(self, args);
        assert_eq!(status, Some(2), "{args:?}: {out}{err}");
        assert_eq!(out, "");
        err
    }

    /// Exit status 1 of `records verify`; the codes and places of what is wrong.
    pub fn wrong(&self, documents: &[&str]) -> Vec<(String, String)> {
        let args = [&["records", "verify", "--format", "json"], documents].concat();
        let (status, out, err) = run(self, &args);
        assert_eq!(status, Some(1), "{out}{err}");
        let found: Value = serde_json::from_str(&out).expect("JSON");
        assert_eq!(found["proven"], false);
        let findings = found["findings"].as_array().expect("findings").iter();
        let text = |value: &Value| value.as_str().expect("text").to_owned();
        findings
            .map(|f| {
                (
                    text(&f["code"]),
                    format!("{}: {}", text(&f["where"]), text(&f["text"])),
                )
            })
            .collect()
    }
}

pub fn copy(from: &Path, to: &Path) {
    fs::create_dir_all(to).expect("a folder");
    for entry in fs::read_dir(from).expect("a folder") {
        let path = entry.expect("an entry").path();
        let target = to.join(path.file_name().expect("a name"));
        if path.is_dir() {
            copy(&path, &target);
        } else {
            fs::copy(&path, &target).expect("a copy");
        }
    }
}
