//! What YAML could change silently, and does not.

use super::{LIMITS, LOT, listed, with};
use reelgate::{limits, lot};

fn lot_with(piece: &str, by: &str) -> Result<lot::Lot, reelgate::diagnostic::Faults> {
    lot::read("lot.yaml", with(LOT, piece, by).as_bytes())
}

fn bytes(bytes: &[u8]) -> Vec<String> {
    listed(limits::read("x.yaml", bytes))
}

#[test]
fn a_text_that_yaml_takes_for_something_else_keeps_its_text_or_asks_for_quotes() {
    let code = |text: &str| lot_with("date_code: \"2638\"", &format!("date_code: {text}"));
    for (text, kept) in [
        ("2638", "2638"),
        ("26.10", "26.10"),
        ("'no'", "no"),
        ("W38", "W38"),
    ] {
        assert_eq!(code(text).expect(text).date_code.as_deref(), Some(kept));
    }
    for trap in [
        "no",
        "Yes",
        "on",
        "n",
        "true",
        "010",
        "0238",
        "1e3",
        ".nan",
        "-.inf",
        "0x1F",
        "0o17",
        "1:30",
        "+26",
        ".5",
        "1_000",
        "2026-10-05",
        "12e03",
    ] {
        assert_eq!(listed(code(trap)), [format!("needs_quotes {trap}")]);
        let quoted = code(&format!("\"{trap}\"")).expect(trap);
        assert_eq!(quoted.date_code.as_deref(), Some(trap));
    }
    for nothing in ["", "~", "null"] {
        let marked = if nothing.is_empty() {
            "date_code"
        } else {
            nothing
        };
        assert_eq!(listed(code(nothing)), [format!("missing_value {marked}")]);
    }
}

#[test]
fn a_quoted_value_is_marked_up_to_its_closing_quote() {
    let quantity = |text: &str| lot_with("quantity: 4000", &format!("quantity: {text}"));
    for quoted in ["\"four\"", "'four'", "\"a \\\" b\"", "'a '' b'", "\"µF\""] {
        for after in ["", "   ", "  # the whole \"reel's\" own"] {
            let found = listed(quantity(&format!("{quoted}{after}")));
            assert_eq!(found.len(), 1, "{found:?}");
            assert!(found[0].ends_with(&format!(" {quoted}")), "{found:?}");
        }
    }
}

#[test]
fn a_number_is_a_decimal_number() {
    let quantity = |text: &str| lot_with("quantity: 4000", &format!("quantity: {text}"));
    assert_eq!(quantity("4000").expect("valid").quantity, 4000);
    for (text, code) in [
        ("0", "out_of_range"),
        ("-1", "out_of_range"),
        ("4e3", "out_of_range"),
        ("0x10", "out_of_range"),
        ("4000.0", "out_of_range"),
        (".inf", "out_of_range"),
        ("99999999999999999999999", "out_of_range"),
        ("010", "not_a_number"),
        ("4_000", "not_a_number"),
        ("4,000", "not_a_number"),
        ("\"4000\"", "not_a_number"),
        ("yes", "not_a_number"),
        ("true", "not_a_number"),
    ] {
        assert_eq!(listed(quantity(text)), [format!("{code} {text}")]);
    }
    let alpha = |text: &str| {
        limits::read(
            "x.yaml",
            with(LIMITS, "alpha: 0.01", &format!("alpha: {text}")).as_bytes(),
        )
    };
    assert_eq!(
        alpha("1e-2").expect("valid").outlier_rules[0].alpha,
        Some(0.01)
    );
    for trap in [".nan", ".inf", "0x1"] {
        assert_eq!(listed(alpha(trap)), [format!("not_a_quantity {trap}")]);
    }
}

#[test]
fn aliases_anchors_tags_and_merge_keys() {
    assert_eq!(bytes(b"a: &x 1\nb: *x\n"), ["anchor 1", "alias *x"]);
    assert_eq!(bytes(b"a: !!str 3\n"), ["tag 3"]);
    assert_eq!(
        bytes(b"a: !mine {b: 1}\n").first().map(String::as_str),
        Some("tag {")
    );
    let merged = listed(limits::read(
        "x.yaml",
        with(LIMITS, "retest: {", "retest: {<<: {a: 1}, ").as_bytes(),
    ));
    assert_eq!(merged, ["merge_key <<"]);
    // Nine levels of nine aliases: 9^9 nodes if they were followed.
    let mut bomb = String::from("a0: &a0 [x, x, x, x, x, x, x, x, x]\n");
    for level in 1..9 {
        let before = level - 1;
        let items = vec![format!("*a{before}"); 9].join(", ");
        bomb.push_str(&format!("a{level}: &a{level} [{items}]\n"));
    }
    let faults = bytes(bomb.as_bytes());
    assert!(
        faults
            .iter()
            .all(|f| f.starts_with("alias") || f.starts_with("anchor")),
        "{faults:?}"
    );
}

#[test]
fn documents_sizes_and_encodings() {
    assert_eq!(bytes(b""), ["empty_file"]);
    assert_eq!(bytes(b"# only a comment\n"), ["empty_file #"]);
    assert_eq!(bytes(b"a: 1\n---\nb: 2\n"), ["second_document ---"]);
    assert_eq!(bytes(b"- 1\n"), ["not_a_map"]);
    assert_eq!(bytes(b"part\n"), ["not_a_map part"]);
    let large = limits::read("x.yaml", &vec![b'#'; 256 * 1024 + 1]).expect_err("too large");
    assert_eq!(
        large.iter().map(|f| f.code).collect::<Vec<_>>(),
        ["file_too_large"]
    );
    let with_mark = [b"\xef\xbb\xbf".as_slice(), LIMITS.as_bytes()].concat();
    limits::read("x.yaml", &with_mark).expect("a byte-order mark is no fault");
    let crlf = LIMITS.replace('\n', "\r\n");
    let read = |text: &str| limits::read("x.yaml", text.as_bytes());
    assert_eq!(read(&crlf).expect("CRLF"), read(LIMITS).expect("LF"));
    let utf16: Vec<u8> = "part: x"
        .encode_utf16()
        .flat_map(u16::to_le_bytes)
        .collect();
    let utf16 = [b"\xff\xfe".as_slice(), &utf16].concat();
    let faults = limits::read("x.yaml", &utf16).expect_err("UTF-16");
    assert!(faults.to_string().contains("UTF-16"));
}

#[test]
fn bytes_that_are_not_utf8_have_a_place() {
    let faults = limits::read("x.yaml", b"part: P\nrevision: \xb5F\n").expect_err("Latin-1");
    let all: Vec<_> = faults.iter().map(|f| (f.code, f.line, f.column)).collect();
    assert_eq!(all, [("not_utf8", 2, 11)]);
    assert!(faults.to_string().contains("byte 19 (0xB5)"), "{faults}");
}

#[test]
fn tabs_and_invisible_characters() {
    assert_eq!(bytes(b"part: P\nconditions:\n\tdrive: 1 V\n"), ["tab \t"]);
    let text = with(
        LIMITS,
        "revision: 3",
        "revision: 3\t# a tab before a comment",
    );
    assert_eq!(listed(limits::read("x.yaml", text.as_bytes())), ["tab \t"]);
    assert_eq!(bytes(b"part: a\0b\n"), ["hidden_character \0"]);
    assert_eq!(
        bytes("part: a\u{1b}[31mb\n".as_bytes()),
        ["hidden_character \u{1b}"]
    );
    assert_eq!(
        bytes("part: a\u{202e}b\n".as_bytes()),
        ["hidden_character \u{202e}"]
    );
    assert_eq!(
        bytes("part: a\u{85}b: c\n".as_bytes()),
        ["hidden_character \u{85}"]
    );
    assert_eq!(bytes(b"part: a\rrevision: 3\n"), ["hidden_character \r"]);
    let escaped = with(LIMITS, "revision: 3", "revision: \"3\\u202e\"");
    let faults = listed(limits::read("x.yaml", escaped.as_bytes()));
    assert_eq!(faults, ["hidden_character \"3\\u202e\""]);
}

#[test]
fn nesting_is_bounded() {
    for (open, close) in [("[", "]"), ("{a: ", "}")] {
        let deep = format!("part: {}{}", open.repeat(5000), close.repeat(5000));
        assert!(bytes(deep.as_bytes())[0].starts_with("too_deep"), "{open}");
    }
    let block: String = (0..300).map(|n| format!("{}a:\n", " ".repeat(n))).collect();
    assert!(bytes(block.as_bytes())[0].starts_with("too_deep"));
}

#[test]
fn syntax_is_explained() {
    for (text, words) in [
        ("part: a: b\n", "a second `:`"),
        ("part: [a, b\nrevision: 3\n", "does not go on or close"),
        ("part: \"a\nrevision: 3\n", "never closed"),
        ("part: %a\n", "cannot begin a value"),
        ("part: \"\\q\"\n", "backslash"),
        ("part: a\n  revision: 3\n", "a second `:`"),
        ("part: P\nrevision\n", "without `:`"),
    ] {
        let faults = limits::read("x.yaml", text.as_bytes()).expect_err(text);
        let rendered = faults.to_string();
        assert_eq!(faults.count(), 1, "{rendered}");
        assert!(rendered.contains(words), "{text}: {rendered}");
        assert!(faults.iter().all(|f| f.line > 0 && f.column > 0));
    }
}

#[test]
fn a_file_full_of_faults_is_listed_up_to_a_bound() {
    let many: String = (0..5000).map(|n| format!("key{n}: 1\n")).collect();
    let faults = limits::read("x.yaml", many.as_bytes()).expect_err("faults");
    assert_eq!(faults.iter().count(), 100);
    assert_eq!(
        faults.count(),
        5004,
        "5000 unknown keys and four that are missing"
    );
    assert!(faults.to_string().contains("and 4904 more faults"));
}
