//! The instrument on the network, against a simulated one with its faults.

use crate::simulated::{Fault, POINTS, Simulated, frequencies, impedances};
use proptest::prelude::*;
use reelgate::bench::source::{Event, Instrument, Proof, Source, Taken, Trouble};
use reelgate::station::{self, Station};
use reelgate::sweep::{RawFile, read_file};
use std::time::{Duration, Instant};

/// Longer than any wait of the program.
const LONG: Duration = Duration::from_secs(60);

/// A station of this instrument; `read` is the list of questions, `more` further keys of the link.
fn station(port: u16, read: &str, more: &str) -> Station {
    let text = format!(
        "station: T\nmethod: direct\ninstrument_link:\n  tcp: \"127.0.0.1:{port}\"\n  setup: [\"*CLS\", \
         \"SWE:POIN 60\"]\n  trigger: INIT\n  wait: {{query: \"*OPC?\", until: \"1\", longest: 20 s}}\n  \
         errors: {{query: \"ERR?\", none: \"0\"}}\n  abort: [\"ABOR\", \"OUTP OFF\"]\n  finish: \"OUTP:REST\"\n  read: [{read}]\n{more}"
    );
    station::read("t.yaml", text.as_bytes()).unwrap_or_else(|faults| panic!("{faults}"))
}

const ASCII: &str = "{quantity: frequency, query: \"F:ASC?\", format: ascii}, {quantity: \
                     [resistance, reactance], query: \"Z:ASC?\", format: ascii}";
const BINARY: &str = "{quantity: frequency, query: \"F:R64L?\", format: real64, order: little}, \
                      {quantity: [resistance, reactance], query: \"Z:R64B?\", format: real64, order: big}";

fn open(station: &Station) -> Instrument {
    let link = station.instrument_link.as_ref().expect("a link");
    Instrument::open(link, station).expect("a source")
}

/// What a measurement comes to.
fn outcome(source: &mut Instrument) -> Result<Taken, Trouble> {
    let end = Instant::now() + LONG;
    while Instant::now() < end {
        match source.next(LONG)? {
            Event::Sweep(taken) => return Ok(taken),
            Event::Step(_) | Event::Lost(_) | Event::Recovered(_) => {}
            other => panic!("{other:?}"),
        }
    }
    panic!("nothing came");
}

fn measure(source: &mut Instrument, stem: &str) -> Result<Taken, Trouble> {
    source.begin(stem)?;
    outcome(source)
}

/// The sweep is the simulated one to the last digit.
fn is_right(taken: &Taken, station: &Station) {
    let file = RawFile {
        name: taken.name.clone(),
        bytes: taken.bytes.clone(),
    };
    let attempts = read_file(&file, station, None);
    let sweep = attempts[0].sweep.as_ref().expect("a sweep");
    assert_eq!(sweep.frequency, frequencies());
    let read: Vec<(f64, f64)> = sweep.impedance.iter().map(|z| (z.re, z.im)).collect();
    assert_eq!(read, impedances());
}

#[test]
fn every_way_of_writing_numbers_gives_the_same_sweep() {
    let simulated = Simulated::new();
    let turns = |query: &str, format: &str| {
        format!("{{quantity: [resistance, reactance], query: \"{query}\", format: {format}}}")
    };
    let frequency = [
        "{quantity: frequency, query: \"F:ASC?\", format: ascii}",
        "{quantity: frequency, query: \"F:HZ?\", format: ascii}",
        "{quantity: frequency, query: \"F:R64L?\", format: real64, order: little}",
    ];
    let impedance = [
        turns("Z:ASC?", "ascii"),
        turns("Z:R32B?", "real32, order: big"),
        turns("Z:R32L?", "real32, order: little"),
        turns("Z:R64B?", "real64, order: big"),
        turns("Z:R64L?", "real64, order: little"),
        turns("Z:UNTIL?", "real64, order: big"),
        "{quantity: [resistance, skip, reactance], query: \"Z:FLAG?\", format: ascii}".to_owned(),
    ];
    for frequency in frequency {
        for impedance in &impedance {
            for more in ["", "  points: 60\n"] {
                let station = station(simulated.port, &format!("{frequency}, {impedance}"), more);
                let mut source = open(&station);
                let taken = measure(&mut source, "017~2").expect("a sweep");
                assert_eq!(
                    (taken.name.as_str(), taken.proof.clone()),
                    ("017~2.csv", Proof::Answered)
                );
                is_right(&taken, &station);
            }
        }
    }
}

#[test]
fn the_messages_are_those_of_the_station_file_in_its_order() {
    let simulated = Simulated::new();
    let more = "  identity: {query: \"*IDN?\", contains: FA-0112}\n";
    let station = station(simulated.port, ASCII, more);
    let mut source = open(&station);
    let taken = measure(&mut source, "1").expect("a sweep");
    let text = String::from_utf8(taken.bytes.clone()).expect("text");
    assert!(
        text.starts_with("# made up no model FA-0112 1\nFrequency (Hz),Resistance (Ohm),"),
        "{text}"
    );
    is_right(&taken, &station);
    let once = [
        "INIT",
        "*OPC?",
        "ERR?",
        "F:ASC?",
        "Z:ASC?",
        "OUTP:REST",
        "ERR?",
    ];
    let first = ["*IDN?", "*CLS", "SWE:POIN 60", "ERR?"];
    assert_eq!(
        simulated.heard(),
        [first.as_slice(), once.as_slice()].concat()
    );
    measure(&mut source, "2").expect("a sweep");
    assert_eq!(simulated.heard(), once);
    drop(source);
    let end = Instant::now() + LONG;
    let mut heard = Vec::new();
    while heard.len() < 2 && Instant::now() < end {
        heard.extend(simulated.heard());
        std::thread::sleep(Duration::from_millis(10));
    }
    assert_eq!(
        heard,
        ["ABOR", "OUTP OFF"],
        "the run ends with the stimulus off"
    );
}

#[test]
fn the_headings_are_those_of_the_layout_where_there_is_one() {
    let simulated = Simulated::new();
    let read = "{quantity: frequency, query: \"F:HZ?\", format: ascii}, {quantity: [resistance, \
                reactance], query: \"Z:ASC?\", format: ascii}";
    let more =
        "layout:\n  columns: {reactance: \"X, (Ohm)\", frequency: f / kHz, resistance: R (Ohm)}\n";
    let station = station(simulated.port, read, more);
    let mut source = open(&station);
    let taken = measure(&mut source, "1").expect("a sweep");
    assert!(taken.bytes.starts_with(b"\"X, (Ohm)\",f / kHz,R (Ohm)\n"));
    is_right(&taken, &station);
}

#[test]
fn after_every_fault_the_next_measurement_is_whole() {
    let garbage = |text: &str| Fault::Instead(text.as_bytes().to_vec());
    let cases: Vec<(&str, &str, Fault, &str)> = vec![
        (ASCII, "*OPC?", Fault::Close, "connection_broken"),
        (ASCII, "F:ASC?", Fault::Close, "connection_broken"),
        (ASCII, "Z:ASC?", Fault::CloseWithin, "connection_broken"),
        (BINARY, "Z:R64B?", Fault::CloseWithin, "connection_broken"),
        (ASCII, "Z:ASC?", Fault::Half, "instrument_silent"),
        (BINARY, "Z:R64B?", Fault::Half, "instrument_silent"),
        (ASCII, "F:ASC?", Fault::Silent, "instrument_silent"),
        (ASCII, "Z:ASC?", Fault::Trickle, "instrument_silent"),
        (ASCII, "Z:ASC?", garbage("1,2,what?\n"), "answer_wrong"),
        (ASCII, "Z:ASC?", garbage("1,2,3\n"), "answer_wrong"),
        (ASCII, "Z:ASC?", garbage("1,2\n"), "answer_wrong"),
        (
            ASCII,
            "Z:ASC?",
            Fault::Instead(vec![0xff, 0, b'\n']),
            "answer_wrong",
        ),
        (
            ASCII,
            "F:ASC?",
            Fault::Then(b"1,2,3\n".to_vec()),
            "answer_wrong",
        ),
        (BINARY, "Z:R64B?", garbage("1,2,3\n"), "answer_wrong"),
        (BINARY, "Z:R64B?", garbage("#9999999999"), "answer_wrong"),
        (BINARY, "Z:R64B?", garbage("#15abcde\n"), "answer_wrong"),
        (
            BINARY,
            "Z:R64B?",
            Fault::Then(vec![b'x'; 8]),
            "answer_wrong",
        ),
        (
            BINARY,
            "Z:R64B?",
            garbage("#216aaaaaaaabbbbbbbb\n"),
            "answer_wrong",
        ),
    ];
    for (read, query, fault, code) in cases {
        let simulated = Simulated::new();
        let station = station(simulated.port, read, "  timeout: 1 s\n");
        let mut source = open(&station);
        is_right(&measure(&mut source, "1").expect("a sweep"), &station);
        simulated.fault(query, fault.clone());
        let trouble = measure(&mut source, "2").expect_err("a trouble");
        assert_eq!(trouble.code, code, "{query} {fault:?}: {trouble}");
        assert!(trouble.text.contains(query), "{trouble}");
        is_right(&measure(&mut source, "2").expect("a sweep"), &station);
    }
}

#[test]
fn an_answer_in_pieces_is_put_together() {
    let simulated = Simulated::new();
    let station = station(simulated.port, BINARY, "");
    let mut source = open(&station);
    for query in ["*OPC?", "F:R64L?", "Z:R64B?"] {
        simulated.fault(query, Fault::Pieces);
    }
    is_right(&measure(&mut source, "1").expect("a sweep"), &station);
}

#[test]
fn it_is_asked_again_until_the_measurement_is_finished() {
    let simulated = Simulated::new();
    let station = station(simulated.port, ASCII, "");
    let mut source = open(&station);
    for _ in 0..3 {
        simulated.fault("*OPC?", Fault::Instead(b"0\n".to_vec()));
    }
    is_right(&measure(&mut source, "1").expect("a sweep"), &station);
    let asked = simulated.heard().iter().filter(|m| *m == "*OPC?").count();
    assert_eq!(asked, 4);
}

#[test]
fn errors_of_the_instrument_are_shown_and_nothing_is_kept() {
    let simulated = Simulated::new();
    let station = station(simulated.port, ASCII, "");
    let mut source = open(&station);
    measure(&mut source, "1").expect("a sweep");
    simulated.error("-222,\"Data out of range\"");
    simulated.error("-113,\"Undefined \u{1b}[31mheader\"");
    let trouble = measure(&mut source, "2").expect_err("a trouble");
    assert_eq!(trouble.code, "instrument_error");
    for part in ["-222", "Data out of range", "-113"] {
        assert!(trouble.text.contains(part), "{trouble}");
    }
    assert!(
        !trouble.text.contains('\u{1b}'),
        "nothing steers the terminal"
    );
    is_right(&measure(&mut source, "2").expect("a sweep"), &station);
}

#[test]
fn numbers_that_are_none_leave_the_part_unmeasured() {
    let simulated = Simulated::new();
    let station = station(simulated.port, ASCII, "");
    let mut source = open(&station);
    for mark in ["9.91E37", "NAN", "-9.9E+37"] {
        let mut words = vec!["1.5".to_owned(); 2 * POINTS];
        words[17] = mark.to_owned();
        simulated.fault(
            "Z:ASC?",
            Fault::Instead(format!("{}\n", words.join(",")).into_bytes()),
        );
        let taken = measure(&mut source, "1").expect("a sweep");
        let file = RawFile {
            name: taken.name,
            bytes: taken.bytes,
        };
        let faults = read_file(&file, &station, None)[0]
            .sweep
            .clone()
            .expect_err("faults");
        assert_eq!(faults[0].code, "not_a_number", "{faults:?}");
    }
}

#[test]
fn a_measurement_broken_off_leaves_nothing_behind() {
    let simulated = Simulated::new();
    let station = station(simulated.port, ASCII, "");
    let mut source = open(&station);
    measure(&mut source, "1").expect("a sweep");
    simulated.heard();
    simulated.fault("*OPC?", Fault::Silent);
    source.begin("2").expect("begun");
    assert_eq!(
        source.begin("3").map_err(|t| t.code),
        Err("instrument_busy")
    );
    // Until it waits for the measurement.
    let end = Instant::now() + LONG;
    let mut heard = Vec::new();
    while !heard.contains(&"*OPC?".to_owned()) && Instant::now() < end {
        heard.extend(simulated.heard());
        std::thread::sleep(Duration::from_millis(5));
    }
    source.cancel();
    let taken = measure(&mut source, "3").expect("a sweep");
    assert_eq!(taken.name, "3.csv");
    is_right(&taken, &station);
    assert!(simulated.heard().contains(&"OUTP OFF".to_owned()));
}

#[test]
fn a_connection_that_ends_between_two_parts_is_made_anew() {
    let simulated = Simulated::new();
    let port = simulated.port;
    let station = station(port, ASCII, "");
    let mut source = open(&station);
    measure(&mut source, "1").expect("a sweep");
    // The instrument is switched off and on again.
    drop(simulated);
    let simulated = Simulated::at(port);
    is_right(&measure(&mut source, "2").expect("a sweep"), &station);
    // Something comes that was not asked for.
    simulated.fault("ERR?", Fault::Then(Vec::new()));
    simulated.fault("ERR?", Fault::Then(b"late\n".to_vec()));
    let third = measure(&mut source, "3");
    if let Ok(taken) = &third {
        is_right(taken, &station);
    }
    is_right(&measure(&mut source, "4").expect("a sweep"), &station);
}

#[test]
fn an_instrument_that_is_not_there_is_told_and_found_when_it_comes() {
    let port = Simulated::new().port;
    let station = station(port, ASCII, "");
    let mut source = open(&station);
    match source.next(LONG).expect("an event") {
        Event::Lost(trouble) => {
            assert_eq!(trouble.code, "instrument_not_reached");
            assert!(trouble.remedy.contains("cable"), "{trouble}");
        }
        other => panic!("{other:?}"),
    }
    let trouble = measure(&mut source, "1").expect_err("a trouble");
    assert_eq!(trouble.code, "instrument_not_reached");
    let _simulated = Simulated::at(port);
    assert!(matches!(source.next(LONG), Ok(Event::Recovered(_))));
    is_right(&measure(&mut source, "1").expect("a sweep"), &station);
}

#[test]
fn another_instrument_is_not_measured_with() {
    let simulated = Simulated::new();
    let more = "  identity: {query: \"*IDN?\", contains: FA-0999}\n";
    let station = station(simulated.port, ASCII, more);
    let mut source = open(&station);
    let trouble = measure(&mut source, "1").expect_err("a trouble");
    assert_eq!(trouble.code, "wrong_instrument");
    assert!(
        trouble.text.contains("FA-0112") && trouble.text.contains("FA-0999"),
        "{trouble}"
    );
    assert!(!simulated.heard().contains(&"INIT".to_owned()));
}

#[test]
fn points_of_the_station_file_must_come() {
    let simulated = Simulated::new();
    let station = station(simulated.port, ASCII, "  points: 61\n");
    let mut source = open(&station);
    let trouble = measure(&mut source, "1").expect_err("a trouble");
    assert!(
        trouble.text.contains("60 points") && trouble.text.contains("61"),
        "{trouble}"
    );
}

/// The cable is pulled again and again, at any step; `tests/tools/soak_sources` does it 500 times.
#[test]
fn no_broken_sweep_is_kept_however_often_the_cable_is_pulled() {
    let count = if std::env::var_os("REELGATE_SOAK").is_some() {
        500
    } else {
        24
    };
    let simulated = Simulated::new();
    let station = station(simulated.port, BINARY, "");
    let mut source = open(&station);
    let mut state = 0x2545_f491_4f6c_dd1d_u64;
    for i in 0..count {
        // xorshift64 (Marsaglia 2003).
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        let query = ["*OPC?", "ERR?", "F:R64L?", "Z:R64B?"][(state >> 33) as usize % 4];
        let fault = [Fault::Close, Fault::CloseWithin][(state >> 40) as usize % 2].clone();
        is_right(
            &measure(&mut source, &format!("{i}")).expect("a sweep"),
            &station,
        );
        simulated.fault(query, fault);
        let trouble = measure(&mut source, &format!("{i}~2")).expect_err("a trouble");
        assert_eq!(trouble.code, "connection_broken", "{trouble}");
    }
    is_right(&measure(&mut source, "last").expect("a sweep"), &station);
    if count == 500 {
        use std::io::Write;
        writeln!(
            std::io::stderr(),
            "{count} broken connections, nothing of a broken sweep kept, every other sweep right"
        )
        .expect("said");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, ..ProptestConfig::default() })]

    /// Whatever comes, there is an end, and a sweep only where there is one.
    #[test]
    fn no_bytes_make_it_hang(bytes in prop::collection::vec(any::<u8>(), 0..300), header in 0usize..4, query in 0usize..3, close in any::<bool>()) {
        let simulated = Simulated::new();
        let mut station = station(simulated.port, BINARY, "  timeout: 100 ms\n");
        if let Some(wait) = station.instrument_link.as_mut().and_then(|link| link.wait.as_mut()) {
            wait.longest = 0.1;
        }
        let mut source = open(&station);
        let mut answer = [b"".as_slice(), b"#3960", b"#0", b"#"][header].to_vec();
        answer.extend(&bytes);
        let query = ["*OPC?", "F:R64L?", "Z:R64B?"][query];
        simulated.fault(query, Fault::Instead(answer));
        if close {
            simulated.fault("ERR?", Fault::Close);
        }
        // Under load the usual answers may miss their 100 ms as well: an end is an end.
        if let Ok(taken) = measure(&mut source, "1") {
            let lines = taken.bytes.iter().filter(|b| **b == b'\n').count();
            prop_assert_eq!(lines, POINTS + 1);
        }
    }
}
