//! What a station file says for the operator's run: watched folder, instrument link, jig check.

use super::{listed, with};
use reelgate::station::{self, ByteOrder, Column, Form, Station};
use std::fs;

/// The sample station that has all of it.
pub fn sample() -> String {
    fs::read_to_string("limits/stations/BENCH-4.yaml").expect("the sample station")
}

fn read(text: &str) -> Result<Station, reelgate::diagnostic::Faults> {
    station::read("bench.yaml", text.as_bytes())
}

/// One fault: its code, and where a value is at fault, the value that is marked.
fn only(piece: &str, by: &str, fault: &str) {
    let listed = listed(read(&with(&sample(), piece, by)));
    let code = |text: &str| text.split(' ').next().map(str::to_owned);
    match listed.as_slice() {
        [one] if fault.contains(' ') => assert_eq!(one, fault, "{by}"),
        [one] => assert_eq!(code(one), code(fault), "{by}"),
        all => panic!("{by}: {all:?}"),
    }
}

#[test]
fn the_sample_station_means_what_it_says() {
    let station = read(&sample()).expect("a valid file");
    let watch = station.watch.expect("a watch");
    assert_eq!(
        (watch.folder.as_str(), watch.settle, watch.points),
        ("watched/bench-4", 0.5, Some(401))
    );
    assert_eq!(watch.patterns, ["*.csv"]);
    let link = station.instrument_link.expect("a link");
    assert_eq!(
        (link.host.as_str(), link.port, link.timeout),
        ("192.0.2.17", 5025, 5.0)
    );
    assert_eq!(
        (link.setup.len(), link.trigger.as_slice()),
        (
            7,
            ["DRIVE:ON".to_owned(), "SWEEP:ONCE".to_owned()].as_slice()
        )
    );
    assert_eq!(
        link.read[1].quantities,
        [Some(Column::Resistance), Some(Column::Reactance)]
    );
    assert_eq!(link.read[1].form, Form::Real64(ByteOrder::Big));
    let wait = link.wait.expect("a wait");
    assert_eq!((wait.longest, wait.every), (60.0, 0.1));
    let check = station.jig_check.expect("a check");
    assert_eq!(check.every, Some(25));
    assert_eq!(check.open.map(|o| o.impedance), Some(1e7));
    assert_eq!(check.short.map(|s| (s.at, s.impedance)), Some((1e6, 0.03)));
    let known = check.reference_part.expect("a part").characteristics;
    assert_eq!(
        (known[0].characteristic.as_str(), known[0].at),
        ("capacitance", Some(1e3))
    );
    // 4.683 µF ± 0.5 %, by hand.
    assert!(
        (known[0].lower - 4.659_585e-6).abs() < 1e-15
            && (known[0].upper - 4.706_415e-6).abs() < 1e-15
    );
    assert!(known[1].at.is_none() && (known[1].lower - 3.6e-3).abs() < 1e-12);
}

#[test]
fn a_link_without_a_layout_brings_its_own() {
    let text = sample();
    let columns = "layout:\n  columns: {frequency: \"Frequency (Hz)\", resistance: \"R (Ohm)\", reactance: \"X (Ohm)\"}\n";
    let station = read(&with(&text, columns, "")).expect("valid");
    let columns = station.layout.expect("a layout").columns;
    assert_eq!(
        columns[2],
        (Column::Reactance, "Reactance (Ohm)".to_owned())
    );
}

#[test]
fn faults_of_the_watched_folder() {
    only("settle: 0.5 s", "settle: 0.5", "not_a_quantity 0.5");
    only("settle: 0.5 s", "settle: 2 h", "impossible_value 2 h");
    only(
        "pattern: \"*.csv\"",
        "pattern: \"sub/*.csv\"",
        "bad_pattern \"sub/*.csv\"",
    );
    only("folder: watched/bench-4, ", "", "missing_key");
    only("patter", "pater", "unknown_key patern");
    only(
        "settle: 0.5 s, points: 401",
        "settle: 0.5 s, points: 1",
        "out_of_range 1",
    );
}

#[test]
fn faults_of_the_link() {
    for address in [
        "192.0.2.17",
        "\"192.0.2.17:0\"",
        "\"192.0.2.17:70000\"",
        "\"::1:5025\"",
        "\"a b:1\"",
    ] {
        only(
            "\"192.0.2.17:5025\"",
            address,
            &format!("bad_address {address}"),
        );
    }
    let ipv6 = read(&with(&sample(), "192.0.2.17:5025", "[2001:db8::17]:5025")).expect("valid");
    assert_eq!(
        ipv6.instrument_link.map(|l| l.host).as_deref(),
        Some("2001:db8::17")
    );
    // A question whose answer nobody reads would be taken for the next one's.
    only("\"BIAS:OFF\"", "\"BIAS?\"", "answer_unread \"BIAS?\"");
    assert!(read(&with(&sample(), "\"BIAS:OFF\"", "\"NOTE 'why?'\"")).is_ok());
    only(
        "\"ERROR:NEXT?\"",
        "\"ERROR:NEXT\"",
        "not_a_question \"ERROR:NEXT\"",
    );
    only(
        "\"BIAS:OFF\"",
        "\"BIAS:OFF µ\"",
        "bad_message \"BIAS:OFF µ\"",
    );
    only(
        "[resistance, reactance], query",
        "[resistance, phase], query",
        "bad_columns",
    );
    only(
        "[resistance, reactance], query",
        "[resistance, reactanse], query",
        "unknown_value reactanse",
    );
    only(
        "[resistance, reactance], query",
        "[resistance, reactance, resistance], query",
        "bad_columns",
    );
    only(
        "[resistance, reactance], query",
        "[capacitance, esr], query",
        "layout_does_not_suit",
    );
    only(
        "IMPEDANCES?\", format: real64, order: big",
        "IMPEDANCES?\", format: real64",
        "missing_key",
    );
    only(
        "IMPEDANCES?\", format: real64, order: big",
        "IMPEDANCES?\", format: ascii, order: big",
        "no_effect order",
    );
    only(
        "IMPEDANCES?\", format: real64",
        "IMPEDANCES?\", format: real16",
        "unknown_value real16",
    );
    only("longest: 60 s", "longest: 60 d", "impossible_value 60 d");
}

#[test]
fn faults_of_the_jig_check() {
    only("every: 25 parts", "every: 0 parts", "out_of_range 0 parts");
    only("every: 25 parts", "every: a few", "out_of_range a few");
    only(
        "at: 1 kHz, value: 4.683 µF",
        "value: 4.683 µF",
        "missing_key",
    );
    only(
        "{value: 4.1 mΩ",
        "{at: 1 kHz, value: 4.1 mΩ",
        "no_effect at",
    );
    only("value: 4.1 mΩ", "value: 4.1 mF", "not_a_quantity 4.1 mF");
    only(
        "tolerance: ±0.5 mΩ",
        "tolerance: +2 mΩ / +1 mΩ",
        "impossible_value +2 mΩ / +1 mΩ",
    );
    only("asset: REF-03\n", "\n", "missing_key");
    let text = sample();
    let start = text.find("jig_check:").expect("a check");
    let empty = format!("{}jig_check: {{every: 25 parts}}\n", &text[..start]);
    assert!(listed(read(&empty))[0].starts_with("missing_key"));
    let plain = format!(
        "{}jig_check: {{every: 25, open: {{at: 1 kHz, min: 1 MΩ}}}}\n",
        &text[..start]
    );
    assert_eq!(
        read(&plain).expect("valid").jig_check.and_then(|c| c.every),
        Some(25)
    );
}
