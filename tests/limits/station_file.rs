//! Station files.

use super::{STATION, listed, with};
use reelgate::readings::Characteristic;
use reelgate::station::{self, Column, Method, REPEATABLE, Repeatability, Station};

fn read(text: &str) -> Result<Station, reelgate::diagnostic::Faults> {
    station::read("bench.yaml", text.as_bytes())
}

fn only(piece: &str, by: &str, fault: &str) {
    assert_eq!(listed(read(&with(STATION, piece, by))), [fault], "{by}");
}

#[test]
fn a_valid_file_means_what_it_says() {
    let station = read(STATION).expect("a valid file");
    assert_eq!(
        (station.name.as_str(), station.method),
        ("BENCH-2", Method::SeriesReference)
    );
    let reference = station.reference.expect("a reference");
    assert_eq!((reference.resistance, reference.tolerance), (1.0, 0.001));
    assert!((reference.inductance - 0.3e-9).abs() < 1e-24);
    let jig = station.jig.expect("a jig");
    assert_eq!(jig.valid_for, Some(43_200.0));
    assert_eq!(
        jig.checked.map(|t| t.to_rfc3339()).as_deref(),
        Some("2026-10-05T07:50:00+02:00")
    );
    let layout = station.layout.expect("a layout");
    assert_eq!(layout.columns[1], (Column::ARe, "ChA Re (V)".to_owned()));
    assert!(!layout.peak);
    let short = station.compensation.short.expect("a short");
    assert!(
        (short.resistance - 0.12e-3).abs() < 1e-15 && (short.inductance - 0.15e-9).abs() < 1e-22
    );
    assert_eq!(
        station.compensation.open.map(|o| o.sweep).as_deref(),
        Some("compensation/open.csv")
    );
    let uncertainty = station.uncertainty;
    assert_eq!(uncertainty.magnitude, Some(0.002));
    assert!(
        uncertainty
            .phase
            .is_some_and(|p| (p - 0.05_f64.to_radians()).abs() < 1e-15)
    );
    assert_eq!(
        uncertainty.repeatability[0],
        ("capacitance".into(), Repeatability::Relative(0.002))
    );
    assert_eq!(
        uncertainty.repeatability[1],
        ("esr_minimum".into(), Repeatability::Absolute(0.2e-3))
    );
}

#[test]
fn peak_amplitudes_are_said() {
    let text = with(STATION, "layout:  ", "layout:\n  amplitude: peak  ");
    assert!(read(&text).expect("valid").layout.is_some_and(|l| l.peak));
}

#[test]
fn every_characteristic_can_have_a_repeatability() {
    let names: Vec<_> = Characteristic::ALL.iter().map(|c| c.name()).collect();
    assert_eq!(REPEATABLE.map(|(name, _)| name).as_slice(), names);
}

#[test]
fn the_reference_belongs_to_its_method() {
    let no_reference = STATION.replace("reference: {", "#");
    assert_eq!(listed(read(&no_reference)), ["missing_key"]);
    let direct = "station: S\nmethod: direct\nreference: {resistance: 1 Ω}\n";
    assert_eq!(listed(read(direct)), ["no_effect reference"]);
    only(
        "resistance: 1.000 Ω, tol",
        "resistance: 0 Ω, tol",
        "impossible_value 0 Ω",
    );
    only(
        "tolerance: 0.1 %",
        "tolerance: 60 %",
        "impossible_value 60 %",
    );
    only(
        "method: series_reference",
        "method: serial",
        "unknown_value serial",
    );
}

#[test]
fn columns_are_one_complete_set() {
    only(", b_im: \"ChB Im (V)\"", "", "bad_columns columns");
    only("frequency: \"Frequency (Hz)\", ", "", "missing_key columns");
    only("a_re:", "a_real:", "unknown_key a_real");
    only(
        "\"ChA Im (V)\"",
        "\"ChA Re (V)\"",
        "duplicate_heading \"ChA Re (V)\"",
    );
    only(
        "b_im: \"ChB Im (V)\"",
        "b_im: \"ChB Im (V)\", phase: P",
        "bad_columns phase",
    );
    let suits = |method: &str, columns: &str| {
        let reference = if method == "series_reference" {
            "reference: {resistance: 1 Ω}\n"
        } else {
            ""
        };
        read(&format!(
            "station: S\nmethod: {method}\n{reference}layout: {{columns: {{frequency: f, {columns}}}}}\n"
        ))
    };
    for columns in [
        "magnitude: z, phase: p",
        "resistance: r, reactance: x",
        "capacitance: c, esr: r",
        "capacitance: c, dissipation_factor: d, part: Nr",
    ] {
        suits("direct", columns).expect(columns);
        assert_eq!(
            listed(suits("series_reference", columns)),
            ["layout_does_not_suit layout"]
        );
    }
    suits("series_reference", "ratio_db: g, phase: p").expect("a ratio");
    assert_eq!(
        listed(suits("direct", "ratio_db: g, phase: p")),
        ["layout_does_not_suit layout"]
    );
    assert_eq!(
        listed(suits("reflection", "magnitude: z, phase: p")),
        ["layout_does_not_suit layout"]
    );
    only(
        "layout:  ",
        "layout:\n  amplitude: rms2  ",
        "unknown_value rms2",
    );
}

#[test]
fn standards_have_a_sweep_in_the_folder_and_true_values() {
    only(
        "open:  compensation/open.csv",
        "open:  ../open.csv",
        "path_not_safe ../open.csv",
    );
    only(
        "open:  compensation/open.csv",
        "open:  /open.csv",
        "path_not_safe /open.csv",
    );
    only(
        "open:  compensation/open.csv",
        "open:  C:\\open.csv",
        "path_not_safe C:\\open.csv",
    );
    only(
        "{sweep: compensation/load.csv, resistance: 1.000 Ω}",
        "load.csv",
        "missing_key load.csv",
    );
    only(
        "load.csv, resistance: 1.000 Ω",
        "load.csv, resistance: 0 Ω",
        "impossible_value 0 Ω",
    );
    only(
        "resistance: 0.12 mΩ",
        "resistance: -0.12 mΩ",
        "impossible_value -0.12 mΩ",
    );
    only(
        "inductance: 0.15 nH",
        "inductance: 0.15 nF",
        "not_a_quantity 0.15 nF",
    );
    only("short: {sweep", "shorts: {sweep", "unknown_key shorts");
}

#[test]
fn times_and_uncertainties() {
    only("due: 2027-03-02", "due: 2025-03-02", "reversed 2025-03-02");
    only(
        "due: 2027-03-02",
        "due: 2027-02-30",
        "not_a_time 2027-02-30",
    );
    only(
        "2026-10-05T07:50:00+02:00",
        "2026-10-05",
        "not_a_time 2026-10-05",
    );
    only(
        "2026-10-05T07:50:00+02:00",
        "2026-10-05T07:50:00",
        "not_a_time 2026-10-05T07:50:00",
    );
    only(
        "checked: 2026-10-05T07:50:00+02:00, ",
        "",
        "no_effect valid_for",
    );
    only("valid_for: 12 h", "valid_for: 12", "not_a_quantity 12");
    only("magnitude: 0.2 %", "magnitude: 0 %", "impossible_value 0 %");
    only(
        "magnitude: 0.2 %",
        "magnitude: 120 %",
        "impossible_value 120 %",
    );
    only(
        "magnitude: 0.2 %",
        "magnitude: 0.2",
        "share_without_sign 0.2",
    );
    only("phase: 0.05 °", "phase: 100 °", "impossible_value 100 °");
    only("srf: 0.3 %", "q: 0.3 %", "unknown_key q");
    let temperature = |text: &str| {
        let by = format!("phase: 0.05 °, temperature: {text},");
        read(&with(STATION, "phase: 0.05 °,", &by))
    };
    for text in ["0.5 K", "0.5 °C", "0.5K"] {
        let station = temperature(text).expect("a valid file");
        assert_eq!(station.uncertainty.temperature, Some(0.5), "{text}");
    }
    for (text, fault) in [
        ("0 K", "impossible_value 0 K"),
        ("60 K", "impossible_value 60 K"),
        ("0.5", "not_a_quantity 0.5"),
        ("warm", "not_a_quantity warm"),
    ] {
        assert_eq!(listed(temperature(text)), [fault], "{text}");
    }
}

#[test]
fn a_file_among_the_stations_is_named_as_its_station() {
    let path = |path: &str| station::read(path, STATION.as_bytes());
    path("limits/stations/BENCH-2.yaml").expect("its own name");
    path("limits\\stations\\BENCH-2.yaml").expect("its own name on Windows");
    let listed = listed(path("limits/stations/BENCH-1.yaml"));
    assert_eq!(listed, ["name_differs_from_file BENCH-2"]);
}
