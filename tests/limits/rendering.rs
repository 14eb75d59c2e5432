//! Faults as a quality engineer reads them.

use super::FAULTY;
use reelgate::diagnostic::as_json;
use reelgate::limits;
use unicode_width::UnicodeWidthStr;

#[test]
fn all_faults_of_a_file_in_one_go() {
    let faults = limits::read("limits/faulty.yaml", FAULTY.as_bytes()).expect_err("faults");
    insta::assert_snapshot!(faults.to_string());
    insta::assert_snapshot!(
        "json",
        serde_json::to_string_pretty(&as_json(&faults)).expect("JSON")
    );
}

#[test]
fn colour_adds_nothing_but_colour() {
    let faults = limits::read("limits/faulty.yaml", FAULTY.as_bytes()).expect_err("faults");
    let styled = faults.render();
    assert!(styled.contains("\u{1b}["));
    assert_eq!(
        anstream::adapter::strip_str(&styled).to_string(),
        faults.to_string()
    );
}

#[test]
fn a_long_line_is_cut_and_the_column_stays_true() {
    let line = format!("part: {}: x\n", "µ".repeat(1000));
    let text = format!("a: {{{}, 'part\u{1F50B}: [\n", "b: 1, ".repeat(300));
    for text in [line, text] {
        let faults = limits::read("x.yaml", text.as_bytes()).expect_err("faults");
        let rendered = faults.to_string();
        let fault = faults.iter().next().expect("a fault");
        assert!(
            rendered.contains(&format!("x.yaml:{}:{}", fault.line, fault.column)),
            "{rendered}"
        );
        assert!(
            rendered.lines().all(|line| line.width() <= 80),
            "{rendered}"
        );
    }
}

#[test]
fn nothing_in_a_file_or_path_steers_the_terminal() {
    let text = "part: \"\\e[2J\"\nrevision: \"\\x07\"\n\"\\e]0;x\\a\": 1\n";
    let faults = limits::read("a\u{1b}[2Jb.yaml", text.as_bytes()).expect_err("faults");
    let rendered = faults.to_string();
    assert!(
        !rendered.chars().any(|c| c.is_control() && c != '\n'),
        "{rendered:?}"
    );
}
