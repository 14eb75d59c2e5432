//! The house rules that the compiler does not know: the order of the layers, where files, clock
//! and environment are touched, and what the program never does.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

/// Modules in the order that `src/lib.rs` declares them.
fn layers() -> Vec<String> {
    let text = fs::read_to_string("src/lib.rs").expect("src/lib.rs");
    text.lines()
        .filter_map(|line| line.strip_prefix("pub mod ")?.strip_suffix(';'))
        .map(str::to_owned)
        .collect()
}

fn sources(folder: &Path, found: &mut Vec<PathBuf>) {
    for entry in fs::read_dir(folder).expect("a folder of src") {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            sources(&path, found);
        } else if path.extension().is_some_and(|e| e == "rs") {
            found.push(path);
        }
    }
}

/// Code of each module without comments.
fn code() -> BTreeMap<String, Vec<(PathBuf, String)>> {
    let mut all = BTreeMap::new();
    for layer in layers() {
        let mut files = Vec::new();
        sources(&Path::new("src").join(&layer), &mut files);
        files.sort();
        let texts = files.into_iter().map(|path| {
            let text = fs::read_to_string(&path).expect("a source file");
            let code: Vec<&str> = text
                .lines()
                .map(|line| line.split("//").next().unwrap_or(""))
                .collect();
            (path, code.join("\n"))
        });
        all.insert(layer, texts.collect());
    }
    all
}

/// Names that follow `crate::` in a text: `a` of `crate::a::b`, and of `crate::{a::b, c}`.
fn uses(code: &str) -> Vec<String> {
    let word = |text: &str| -> String {
        text.trim_start()
            .chars()
            .take_while(|c| c.is_alphanumeric() || *c == '_')
            .collect()
    };
    let mut found = Vec::new();
    for rest in code.split("crate::").skip(1) {
        match rest.strip_prefix('{') {
            None => found.push(word(rest)),
            Some(group) => {
                let mut depth = 0;
                let mut start = true;
                for (i, c) in group.char_indices() {
                    if start && !c.is_whitespace() {
                        found.push(word(&group[i..]));
                        start = false;
                    }
                    match c {
                        '{' => depth += 1,
                        '}' if depth == 0 => break,
                        '}' => depth -= 1,
                        ',' if depth == 0 => start = true,
                        _ => {}
                    }
                }
            }
        }
    }
    found.retain(|name| !name.is_empty());
    found
}

#[test]
fn a_module_uses_only_those_above_it() {
    let layers = layers();
    assert!(
        layers.len() > 10,
        "src/lib.rs declares the modules one a line: {layers:?}"
    );
    let place = |name: &str| layers.iter().position(|l| l == name);
    let mut seen = 0;
    for (layer, files) in code() {
        for (path, code) in files {
            for used in uses(&code) {
                let Some(there) = place(&used) else { continue };
                seen += 1;
                assert!(
                    Some(there) <= place(&layer),
                    "{}: `{layer}` uses `{used}`, which stands below it in src/lib.rs",
                    path.display()
                );
            }
        }
    }
    assert!(
        seen > 50,
        "the test found only {seen} uses: it no longer understands the sources"
    );
}

#[test]
fn what_must_not_see_what() {
    let forbidden = [
        ("readings", "limits"),
        ("readings", "site"),
        ("judgement", "site"),
        ("lot", "site"),
        ("certificate", "ledger"),
        ("ledger", "certificate"),
        ("statistics", "quantity"),
        ("statistics", "readings"),
    ];
    let code = code();
    for (module, other) in forbidden {
        for (path, text) in code.get(module).into_iter().flatten() {
            assert!(
                !uses(text).iter().any(|u| u == other),
                "{}: `{module}` must not see `{other}`",
                path.display()
            );
        }
    }
}

#[test]
fn files_clock_and_environment_stay_at_the_ends() {
    let doors = ["commands", "ledger", "bench"];
    let touches = [
        "std::fs",
        "std::env::var",
        "std::net",
        "Local::now",
        "Utc::now",
        "SystemTime",
        "Instant::now",
        "std::process",
        "println!",
    ];
    for (layer, files) in code() {
        if doors.contains(&layer.as_str()) {
            continue;
        }
        for (path, text) in files {
            for touch in touches {
                assert!(
                    !text.contains(touch),
                    "{}: {touch} belongs to {doors:?}",
                    path.display()
                );
            }
        }
    }
}

#[test]
fn no_output_that_panics_when_the_pipe_is_closed() {
    for files in code().into_values() {
        for (path, text) in files {
            for macro_name in ["println!", "print!(", "eprintln!", "eprint!("] {
                assert!(
                    !text.contains(macro_name),
                    "{}: {macro_name} panics on a closed pipe",
                    path.display()
                );
            }
        }
    }
}

#[test]
fn the_test_itself_understands_uses() {
    assert_eq!(uses("use crate::a::b;"), ["a"]);
    assert_eq!(uses("use crate::{a::{b, c}, d::e, f};"), ["a", "d", "f"]);
}
