//! README and docs say what is true: commands run, outputs are what is printed, links lead
//! somewhere, examples are valid, tables of codes are complete.
//!
//! Conventions of the pages. A `console` block holds commands behind `$ ` (continued behind `> `)
//! and what they print; `REELGATE_UPDATE=1 cargo test --test docs` writes the outputs anew. Other
//! code holds commands alone, one a line, perhaps with a `#` comment. `# exit status 3` in a
//! comment says which exit status is expected; 0 is where nothing is said.

use std::collections::BTreeSet;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

const TIME: &str = "2026-11-02T08:00:00+01:00";

/// What stands for what in commands with placeholders.
const PLACEHOLDERS: [(&str, &str); 3] = [
    ("<lot folder>", "sample-lots/26K-0457"),
    ("<part>", "RG-0475-X7R"),
    ("<station>", "BENCH-1"),
];

fn pages() -> Vec<PathBuf> {
    let docs = fs::read_dir("docs").expect("docs");
    let mut pages: Vec<PathBuf> = docs
        .map(|entry| entry.expect("an entry").path())
        .filter(|path| path.extension().is_some_and(|e| e == "md"))
        .collect();
    pages.extend(["README.md", "DEVELOPERS.md", "sample-lots/README.md"].map(PathBuf::from));
    pages.sort();
    pages
}

fn text(path: &Path) -> String {
    fs::read_to_string(path).unwrap_or_else(|e| panic!("{}: {e}", path.display()))
}

/// A piece of code of a page: fenced with its language, or indented (language empty).
#[derive(Debug)]
struct Block {
    language: String,
    /// Index of its first line in the page.
    start: usize,
    lines: Vec<String>,
}

fn blocks(page: &str) -> Vec<Block> {
    let mut found: Vec<Block> = Vec::new();
    let mut fence: Option<Block> = None;
    let mut indented = false;
    for (at, line) in page.lines().enumerate() {
        if let Some(language) = line.strip_prefix("```") {
            match fence.take() {
                Some(block) => found.push(block),
                None => {
                    let (language, lines) = (language.trim().to_owned(), Vec::new());
                    fence = Some(Block {
                        language,
                        start: at + 1,
                        lines,
                    });
                }
            }
        } else if let Some(block) = &mut fence {
            block.lines.push(line.to_owned());
        } else if let Some(code) = line.strip_prefix("    ") {
            if !indented {
                found.push(Block {
                    language: String::new(),
                    start: at,
                    lines: Vec::new(),
                });
            }
            if let Some(block) = found.last_mut() {
                block.lines.push(code.trim_start().to_owned());
            }
        }
        indented = fence.is_none() && line.starts_with("    ");
    }
    assert!(fence.is_none(), "a fence that is never closed");
    found
}

/// A folder with limit files and sample lots in which records can be made.
fn site() -> tempfile::TempDir {
    let site = tempfile::tempdir().expect("a folder");
    for folder in ["limits", "sample-lots"] {
        copy(Path::new(folder), &site.path().join(folder));
    }
    site
}

fn copy(from: &Path, to: &Path) {
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

/// Runs a command line of a page in the site; its exit status and all that it prints.
fn run(site: &Path, command: &str) -> (Option<i32>, String) {
    let program = Path::new(env!("CARGO_BIN_EXE_reelgate"));
    let folder = program.parent().expect("a folder").display();
    let path = std::env::var("PATH").unwrap_or_default();
    let command = command.replace("cargo run --release -- ", "reelgate ");
    let output = Command::new("sh")
        .args(["-c", &format!("exec 2>&1\n{command}\n")])
        .current_dir(site)
        .env("PATH", format!("{folder}:{path}"))
        .env("REELGATE_NOW", TIME)
        .env("PYTHONIOENCODING", "utf-8")
        .env_remove("REELGATE_SITE")
        .output()
        .expect("sh");
    let printed = String::from_utf8_lossy(&output.stdout);
    let lines: Vec<&str> = printed.lines().map(str::trim_end).collect();
    (output.status.code(), lines.join("\n").trim_end().to_owned())
}

/// The exit status that a command's comment promises.
fn promised(command: &str) -> i32 {
    let comment = command.rsplit_once("# exit status ");
    comment.map_or(0, |(_, digits)| digits.trim().parse().expect("a number"))
}

#[test]
fn consoles_show_what_is_printed() {
    let update = std::env::var_os("REELGATE_UPDATE").is_some();
    let mut sessions = 0;
    let site = site();
    for path in pages() {
        let page = text(&path);
        let mut lines: Vec<String> = page.lines().map(str::to_owned).collect();
        let consoles = blocks(&page)
            .into_iter()
            .filter(|b| b.language == "console");
        // From the last to the first, so that places stay valid.
        for block in consoles.collect::<Vec<_>>().into_iter().rev() {
            sessions += 1;
            let shown = play(site.path(), &block, &path);
            lines.splice(block.start..block.start + block.lines.len(), shown);
        }
        let fresh = lines.join("\n") + "\n";
        if update {
            fs::write(&path, &fresh).expect("the page is written");
        }
        assert_eq!(
            text(&path),
            fresh,
            "{}: REELGATE_UPDATE=1 cargo test --test docs writes it anew",
            path.display()
        );
    }
    assert!(sessions > 0);
}

/// A console block with the commands it has and the output they have now.
fn play(site: &Path, block: &Block, page: &Path) -> Vec<String> {
    let mut shown = Vec::new();
    let mut lines = block.lines.iter().peekable();
    while let Some(line) = lines.next() {
        let Some(first) = line.strip_prefix("$ ") else {
            continue;
        };
        shown.push(line.clone());
        let mut command = first.to_owned();
        while let Some(more) = lines.next_if(|line| line.starts_with('>')) {
            shown.push(more.clone());
            command.push('\n');
            command.push_str(
                more.trim_start_matches('>')
                    .strip_prefix(' ')
                    .unwrap_or_default(),
            );
        }
        let (status, printed) = run(site, &command);
        assert_eq!(
            status,
            Some(promised(&command)),
            "{}: {command}\n{printed}",
            page.display()
        );
        shown.extend(printed.lines().map(str::to_owned));
    }
    shown
}

#[test]
fn commands_run() {
    let mut commands = 0;
    let site = site();
    for path in pages() {
        let page = text(&path);
        for block in blocks(&page).iter().filter(|b| b.language != "console") {
            for line in &block.lines {
                if !line.starts_with("reelgate ") && !line.starts_with("cargo run --release -- ") {
                    continue;
                }
                let command = PLACEHOLDERS
                    .iter()
                    .fold(line.clone(), |line, (from, to)| line.replace(from, to));
                assert!(
                    !command.contains(['<', '…']),
                    "{}: {line}: a placeholder that is not known",
                    path.display()
                );
                let (status, printed) = run(site.path(), &command);
                assert_eq!(
                    status,
                    Some(promised(&command)),
                    "{}: {line}\n{printed}",
                    path.display()
                );
                commands += 1;
            }
        }
    }
    assert!(commands > 5, "only {commands} commands were found");
}

#[test]
fn links_lead_somewhere() {
    let mut links = 0;
    for path in pages() {
        let page = text(&path);
        let folder = path.parent().expect("a folder");
        for (at, _) in page.match_indices("](") {
            let target = &page[at + 2..];
            let target = target.split(')').next().unwrap_or_default();
            if target.contains("://") {
                continue;
            }
            let file = target.split('#').next().unwrap_or_default();
            assert!(folder.join(file).exists(), "{}: {target}", path.display());
            links += 1;
        }
    }
    assert!(links > 10, "only {links} links were found");
}

#[test]
fn example_files_are_valid() {
    let mut examples = 0;
    let site = site();
    for path in pages() {
        let page = text(&path);
        for block in blocks(&page).iter().filter(|b| b.language == "yaml") {
            let first = block
                .lines
                .iter()
                .find(|l| !l.starts_with('#'))
                .expect("an example");
            let (key, value) = first.split_once(": ").expect("a key and its value");
            let name = match key {
                "part" => format!("limits/parts/{value}.yaml"),
                "station" => format!("limits/stations/{value}.yaml"),
                "lot" => "lot/lot.yaml".to_owned(),
                "site" => "limits/site.yaml".to_owned(),
                _ => panic!("{}: an example that begins with `{key}`", path.display()),
            };
            let file = site.path().join(&name);
            fs::create_dir_all(file.parent().expect("a folder")).expect("a folder");
            fs::write(&file, block.lines.join("\n") + "\n").expect("a file");
            let (status, printed) = run(site.path(), &format!("reelgate limits check {name}"));
            assert_eq!(status, Some(0), "{}:\n{printed}", path.display());
            examples += 1;
        }
    }
    assert!(examples >= 2, "only {examples} examples were found");
}

/// Codes in the first column of the tables of a page, from one line on to an ending one.
fn codes_of_table(page: &str, from: &str, to: &str) -> BTreeSet<String> {
    let text = text(Path::new(page));
    let start = text.find(from).unwrap_or_else(|| panic!("{page}: {from}"));
    let rest = &text[start..];
    let end = rest.find(to).unwrap_or_else(|| panic!("{page}: {to}"));
    let cell = |line: &str| Some(line.strip_prefix("| `")?.split_once("` |")?.0.to_owned());
    rest[..end].lines().filter_map(cell).collect()
}

/// Code of the program without its unit tests.
fn program(path: &Path) -> String {
    if path.is_dir() {
        let entries = fs::read_dir(path).expect("a folder of src");
        let mut paths: Vec<PathBuf> = entries.map(|e| e.expect("an entry").path()).collect();
        paths.sort();
        return paths.iter().map(|p| program(p)).collect();
    }
    let text = text(path);
    let end = text.find("#[cfg(test)]").unwrap_or(text.len());
    text[..end].to_owned()
}

/// Codes that sources give to notes: the first literal in a call that makes one, or in a pair of a
/// code and its words.
fn codes_of_source(paths: &[&str]) -> BTreeSet<String> {
    let source: String = paths.iter().map(|path| program(Path::new(path))).collect();
    codes_in(&source)
}

fn codes_in(source: &str) -> BTreeSet<String> {
    let mut codes = BTreeSet::new();
    for (call, any_word) in [
        ("Note::new(", true),
        ("Reading::missing(", true),
        (".add(", true),
        ("(", false),
    ] {
        for (at, _) in source.match_indices(call) {
            let Some(literal) = source[at + call.len()..].trim_start().strip_prefix('"') else {
                continue;
            };
            let Some((code, rest)) = literal.split_once('"') else {
                continue;
            };
            let of_code = |c: char| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '_';
            let is_code = !code.is_empty() && code.chars().all(of_code);
            // A pair's code has two words; its second item is a sentence or makes one.
            let is_pair = code.contains('_') && rest.starts_with(',');
            if is_code && (any_word || is_pair) {
                codes.insert(code.to_owned());
            }
        }
    }
    codes
}

/// The source of a lot's verdict: what gives reasons, and what gives warnings, which decide nothing.
fn verdict() -> (String, String) {
    let source = program(Path::new("src/lot/verdict.rs"));
    let parts = source.split_once("fn warnings(").expect("warnings");
    (parts.0.to_owned(), parts.1.to_owned())
}

fn list(codes: &BTreeSet<String>) -> String {
    codes.iter().cloned().collect::<Vec<_>>().join(", ")
}

/// Every code that reading a sweep can give stands in `docs/file-formats.md`, and no other.
#[test]
fn codes_of_sweeps_are_documented() {
    let page = "docs/file-formats.md";
    let mut documented = codes_of_table(page, "<!-- codes: faults -->", "<!-- end -->");
    documented.extend(codes_of_table(
        page,
        "<!-- codes: notes -->",
        "<!-- end -->",
    ));
    // Names of methods, in words about them.
    let methods = ["series_reference", "series_through", "shunt_through"].map(str::to_owned);
    let given: BTreeSet<String> = &codes_of_source(&["src/sweep"]) - &methods.into();
    let (missing, surplus) = (&given - &documented, &documented - &given);
    assert!(missing.is_empty(), "add to {page}: {}", list(&missing));
    assert!(
        surplus.is_empty(),
        "not given any more, in {page}: {}",
        list(&surplus)
    );
}

/// Every warning of readings, statistics and lots stands in `docs/methods.md`, and no other.
#[test]
fn warnings_are_documented() {
    let page = "docs/methods.md";
    let documented = codes_of_table(page, "<!-- codes: warnings -->", "<!-- end -->");
    let mut given = codes_of_source(&[
        "src/readings",
        "src/judgement/zone.rs",
        "src/judgement/bench.rs",
        "src/lot/statistics.rs",
        "src/lot/capability.rs",
        "src/lot/rules/warnings.rs",
    ]);
    given.remove("sigma_within"); // the name of a statistic
    given.extend(codes_in(&verdict().1));
    let (missing, surplus) = (&given - &documented, &documented - &given);
    assert!(missing.is_empty(), "add to {page}: {}", list(&missing));
    assert!(
        surplus.is_empty(),
        "not given any more, in {page}: {}",
        list(&surplus)
    );
}

/// Every reason of a verdict stands in `docs/operator.md`, and no other.
#[test]
fn reasons_are_documented() {
    let page = "docs/operator.md";
    let documented = codes_of_table(page, "## Reasons", "## What is kept");
    let rules = ["capability", "joint", "mixed", "outliers", "trend"]
        .map(|rule| format!("src/lot/rules/{rule}.rs"));
    let mut given = codes_of_source(&rules.each_ref().map(String::as_str));
    given.extend(codes_of_source(&[
        "src/lot/conditions.rs",
        "src/judgement/part.rs",
    ]));
    given.extend(codes_in(&verdict().0));
    given.extend(reelgate::lot::NOT_APPROVED.map(str::to_owned));
    given.remove("no_reading"); // the cause of parts that have neither fault nor warning
    let (missing, surplus) = (&given - &documented, &documented - &given);
    assert!(missing.is_empty(), "add to {page}: {}", list(&missing));
    assert!(
        surplus.is_empty(),
        "not given any more, in {page}: {}",
        list(&surplus)
    );
}

/// Every finding of `records verify` stands in `docs/auditor.md`, and no other.
#[test]
fn findings_are_documented() {
    let page = "docs/auditor.md";
    let documented = codes_of_table(page, "<!-- codes: findings -->", "<!-- end -->");
    let source = program(Path::new("src/ledger/verify.rs"))
        + &program(Path::new("src/commands/records/verify.rs"))
        + &program(Path::new("src/commands/records/verify"));
    let of_code = |c: char| c.is_ascii_lowercase() || c == '_';
    let mut given: BTreeSet<String> = source
        .split('"')
        .skip(1)
        .step_by(2)
        .filter(|text| text.contains('_') && text.chars().all(of_code))
        .map(str::to_owned)
        .collect();
    for key in ["since_entry", "since_time", "judged_again"] {
        given.remove(key);
    }
    let (missing, surplus) = (&given - &documented, &documented - &given);
    assert!(missing.is_empty(), "add to {page}: {}", list(&missing));
    assert!(
        surplus.is_empty(),
        "not given any more, in {page}: {}",
        list(&surplus)
    );
}
