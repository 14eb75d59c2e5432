//! Labels: 37 scans with the expected reading, every way of mangling separators, hostile text.

use proptest::prelude::*;
use reelgate::label::{self, ErrorKind, Expected, Label, LabelError};
use serde_json::Value;

/// Invented labels after ISO/IEC 15434 and ANSI MH10.8.2, with the renderings of the separators that
/// keyboard-emulating scanners make (common practice, no source).
const EXAMPLES: &str = include_str!("reference/label/examples.json");

fn codes(result: &Result<Label, LabelError>) -> Vec<String> {
    let notes = match result {
        Ok(label) => label.notes.iter().chain(&label.confirm).collect::<Vec<_>>(),
        Err(error) => error.notes.iter().collect(),
    };
    let mut codes: Vec<String> = notes.iter().map(|note| note.code.clone()).collect();
    codes.sort();
    codes
}

fn verdict(result: &Result<Label, LabelError>) -> &'static str {
    match result {
        Ok(label) if label.confirm.is_empty() => "accept",
        Ok(_) => "accept_with_confirmation",
        Err(error) if error.kind == ErrorKind::Ask => "ask",
        Err(_) => "refuse",
    }
}

fn check(case: &Value) -> Vec<String> {
    let name = case["name"].as_str().unwrap_or("?");
    let scan = case["scan"].as_str().expect("scan");
    let expect = &case["expect"];
    let result = label::read(scan);
    let mut wrong = Vec::new();
    if verdict(&result) != expect["verdict"].as_str().expect("verdict") {
        wrong.push(format!(
            "{name}: {result:?}, expected {}",
            expect["verdict"]
        ));
    }
    let mut warnings: Vec<String> = expect["warnings"]
        .as_array()
        .expect("warnings")
        .iter()
        .filter_map(|w| w.as_str().map(str::to_owned))
        .collect();
    warnings.sort();
    if codes(&result) != warnings {
        wrong.push(format!(
            "{name}: {:?}, expected {warnings:?}",
            codes(&result)
        ));
    }
    let fields = expect["fields"].as_object().expect("fields");
    let mut count = 0;
    for (id, values) in fields {
        let values: Vec<&str> = values
            .as_array()
            .expect("values")
            .iter()
            .filter_map(Value::as_str)
            .collect();
        count += values.len();
        let found: Vec<&str> = result.iter().flat_map(|l| l.values(id)).collect();
        if found != values {
            wrong.push(format!("{name}: {id} {found:?}, expected {values:?}"));
        }
    }
    if result.map_or(0, |l| l.fields.len()) != count {
        wrong.push(format!("{name}: not {count} fields"));
    }
    wrong
}

#[test]
fn every_example() {
    let examples: Value = serde_json::from_str(EXAMPLES).expect("JSON");
    let cases = examples["examples"].as_array().expect("examples");
    assert_eq!(cases.len(), 37);
    let wrong: Vec<String> = cases.iter().flat_map(check).collect();
    assert!(wrong.is_empty(), "{wrong:#?}");
}

fn read(text: &str) -> Label {
    label::read(text).unwrap_or_else(|error| panic!("{text:?}: {error}"))
}

fn code_of_error(text: &str) -> String {
    match label::read(text) {
        Ok(label) => panic!("{text:?} was read as {label:?}"),
        Err(error) => error.notes[0].code.clone(),
    }
}

#[test]
fn ambiguity_is_refused() {
    let refused = [
        (
            "[)>\u{1e}06\u{1d}1PA\u{1d}Q1\u{1e}\u{4}[)>\u{1e}06\u{1d}1PB\u{1d}Q1\u{1e}\u{4}",
            "two_labels",
        ),
        ("[)>\u{1e}06\u{1d}1PA{GS}Q1\u{1e}\u{4}", "separators_mixed"),
        ("[)>{RS}06{GS}1PA<GS>Q1{RS}{EOT}", "separators_mixed"),
        ("[)>^06]1PA]x]Q1^", "separators_ambiguous"),
        ("[)>^06]1PA^]Q1", "separators_missing"),
        ("[)>|06|1PA|Q1||", "separators_missing"),
        ("[)>\u{1e}061PAQ1\u{1e}\u{4}", "separators_missing"),
        (
            "[)>\u{1e}06\u{1d}1PA\u{1d}-12\u{1e}\u{4}",
            "not_an_identifier",
        ),
        ("1PA\nQ100", "control_character"),
        ("[)>\u{f70b}06\u{f70c}1PA", "control_character"),
        ("P\u{202e}ABC", "control_character"),
        ("P\u{1b}[31mABC", "control_character"),
        ("[)>?06?1PA?Q1", "encoding_damaged"),
        ("]C1011234", "format_not_06"),
        ("", "empty"),
        ("\r\n", "empty"),
        ("[)>\u{1e}06\u{1d}\u{1e}\u{4}", "empty"),
        ("XYZ[)>\u{1e}06\u{1d}1PA\u{1e}\u{4}", "no_known_di"),
        ("10000", "no_known_di"),
        ("QC0402", "no_known_di"),
        ("77XABC\u{1d}Q1", "no_known_di"),
    ];
    for (text, code) in refused {
        assert_eq!(code_of_error(text), code, "{text:?}");
    }
    assert_eq!(code_of_error(&"P1".repeat(label::MAX_BYTES)), "too_long");
}

#[test]
fn identity() {
    let label = read(
        "[)>\u{1e}06\u{1d}PRG-0475-X7R\u{1d}Q4000\u{1d}1T26K-0457\u{1d}10D2638\u{1d}VSUP-041\u{1d}KPO-88120\u{1e}\u{4}",
    );
    assert_eq!(label.part().one(), Some("RG-0475-X7R"));
    assert_eq!(label.lot().one(), Some("26K-0457"));
    assert_eq!(label.quantity().one(), Some(4000));
    assert_eq!(label.date_code().one(), Some("2638"));
    assert_eq!(label.supplier().one(), Some("SUP-041"));
    assert_eq!(label.order().one(), Some("PO-88120"));
    let expected = Expected {
        part: Some("RG-0475-X7R"),
        lot: Some("26K-0457"),
        quantity: Some(4000),
        date_code: Some("202638"),
        supplier: Some("SUP-041"),
        order: Some("PO-88120"),
    };
    assert_eq!(label::compare(&label, &expected), []);
}

#[test]
fn differences() {
    let label = read(
        "[)>\u{1e}06\u{1d}PSTOCK-9\u{1d}1PRG-1\u{1d}Q0400\u{1d}1TA\u{1d}1TB\u{1d}9D201105\u{1d}1VNAME\u{1e}\u{4}",
    );
    let expected = Expected {
        part: Some("RG-1"),
        lot: Some("A"),
        quantity: Some(400),
        date_code: Some("1105"),
        supplier: Some("SUP-041"),
        order: Some("PO-1"),
    };
    let found: Vec<(&str, String)> = label::compare(&label, &expected)
        .into_iter()
        .map(|m| (m.field, m.on_label))
        .collect();
    // The part agrees by 1P, the quantity by value; order and V are not on the label.
    let wanted = [
        ("lot", "1T A and B".to_owned()),
        ("date_code", "9D 201105".to_owned()),
    ];
    assert_eq!(found, wanted);
    let other = Expected {
        part: Some("RG-2"),
        quantity: Some(4000),
        ..Expected::default()
    };
    let found = label::compare(&label, &other);
    assert_eq!(found[0].on_label, "P STOCK-9, 1P RG-1");
    assert_eq!(found[1].on_label, "Q 0400");
    assert_eq!(found[1].expected, "4000");
}

#[test]
fn quantities_that_are_none() {
    for (field, code) in [
        ("Q0", "quantity_zero"),
        ("Q99999999999999999999", "quantity_not_numeric"),
        ("Q-5", "quantity_not_numeric"),
        ("Q1.5", "quantity_not_numeric"),
        ("7Q30FT", "quantity_not_numeric"),
        ("7Q30", "quantity_not_numeric"),
    ] {
        let label = read(&format!("[)>\u{1e}06\u{1d}1PA\u{1d}{field}\u{1e}\u{4}"));
        assert_eq!(label.confirm[0].code, code, "{field}");
    }
    let two = read("[)>\u{1e}06\u{1d}Q5\u{1d}Q6\u{1e}\u{4}");
    assert_eq!(two.quantity(), label::Found::Several(vec![5, 6]));
}

#[test]
fn characters_of_another_keyboard_are_to_be_confirmed() {
    let label = read("[)>\u{1e}06\u{1d}1PPO\u{df}1\u{1e}\u{4}");
    assert_eq!(label.confirm[0].code, "unexpected_character");
}

/// How each rendering writes GS, RS, EOT.
const RENDERINGS: &[[&str; 3]] = &[
    ["\u{1d}", "\u{1e}", "\u{4}"],
    ["^]", "^^", "^D"],
    ["{GS}", "{RS}", "{EOT}"],
    ["<gs>", "<rs>", "<eot>"],
    ["[GS]", "[RS]", "[EOT]"],
    ["(GS)", "(RS)", "(EOT)"],
    ["\u{241d}", "\u{241e}", "\u{2404}"],
    ["\u{2194}", "\u{25b2}", "\u{2666}"],
    ["_x001D_", "_x001E_", "_x0004_"],
    ["\\x1d", "\\x1e", "\\x04"],
    ["\\u001d", "\\u001e", "\\u0004"],
    ["%1D", "%1E", "%04"],
    ["&#29;", "&#30;", "&#4;"],
    ["&#x1D;", "&#x1E;", "&#x4;"],
];

fn render(canonical: &str, [gs, rs, eot]: [&str; 3]) -> String {
    canonical
        .replace('\u{1d}', gs)
        .replace('\u{1e}', rs)
        .replace('\u{4}', eot)
}

fn fields() -> impl Strategy<Value = Vec<(String, String)>> {
    prop::collection::vec(("[0-9]{0,3}[A-Z]", "[A-Za-z0-9./+_-]{1,12}"), 1..8)
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(2000))]

    #[test]
    fn every_rendering_reads_alike(fields in fields(), suffix in "(\r\n|\r|\n)?", aim in "(\\]d1)?") {
        let canonical = label::write(&fields);
        for rendering in RENDERINGS {
            let text = format!("{aim}{}{suffix}", render(&canonical, *rendering));
            let label = label::read(&text);
            prop_assert_eq!(label.map(|l| l.fields), Ok(fields.clone()), "{:?}", text);
        }
    }

    #[test]
    fn any_text_is_read_or_refused(text in any::<String>()) {
        if let Ok(label) = label::read(&text) {
            prop_assert!(!label.fields.is_empty());
            let _ = (label.quantity(), label.part(), label.date_code());
        }
    }

    #[test]
    fn broken_labels_are_read_or_refused(
        fields in fields(), which in 0..RENDERINGS.len(), cut in 0..400_usize, at in 0..400_usize, put in "\\PC{0,3}",
    ) {
        let mut text = render(&label::write(&fields), RENDERINGS[which]);
        text = text.chars().take(cut.max(1)).collect();
        let place = text.char_indices().nth(at % text.len().max(1)).map_or(0, |(k, _)| k);
        text.insert_str(place, &put);
        match label::read(&text) {
            Ok(label) => prop_assert!(label.fields.iter().all(|(_, v)| !v.contains(char::is_control))),
            Err(error) => prop_assert!(!error.notes.is_empty()),
        }
    }

    #[test]
    fn no_note_carries_a_control_character(text in any::<String>()) {
        let notes = match label::read(&text) {
            Ok(label) => [label.notes, label.confirm].concat(),
            Err(error) => error.notes,
        };
        prop_assert!(notes.iter().all(|n| !n.text.contains(char::is_control)));
    }
}
