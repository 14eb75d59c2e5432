//! The JSON Schemas accept what the readers accept, and refuse what a schema can tell.

use super::{FAULTY, LIMITS, LOT, SITE, STATION, with};
use jsonschema::Validator;
use serde_json::Value;
use std::fs;
use std::path::{Path, PathBuf};

fn validator(schema: &str) -> Validator {
    let schema: Value = serde_json::from_str(schema).expect("JSON");
    assert_eq!(
        schema["$schema"],
        "https://json-schema.org/draft/2020-12/schema"
    );
    jsonschema::draft202012::meta::validate(&schema).expect("a valid schema");
    jsonschema::draft202012::new(&schema).expect("a usable schema")
}

fn value(text: &str) -> Value {
    serde_yaml::from_str(text).expect("YAML")
}

fn accepts(validator: &Validator, name: &str, text: &str) {
    let value = value(text);
    let errors: Vec<_> = validator
        .iter_errors(&value)
        .map(|e| format!("{}: {e}", e.instance_path()))
        .collect();
    assert!(errors.is_empty(), "{name}: {errors:#?}");
}

fn sample_files(folder: &Path) -> Vec<PathBuf> {
    let entries = fs::read_dir(folder).unwrap_or_else(|e| panic!("{}: {e}", folder.display()));
    let paths = entries.map(|entry| entry.expect("an entry").path());
    let mut files: Vec<_> = paths
        .filter(|p| p.extension().is_some_and(|e| e == "yaml"))
        .collect();
    files.sort();
    assert!(!files.is_empty(), "{}", folder.display());
    files
}

#[test]
fn the_sample_files_are_valid_for_reader_and_schema() {
    let limits = validator(reelgate::limits::SCHEMA);
    for path in sample_files(Path::new("limits/parts")) {
        let (name, text) = (
            path.display().to_string(),
            fs::read_to_string(&path).expect("text"),
        );
        reelgate::limits::read(&name, text.as_bytes()).unwrap_or_else(|f| panic!("{f}"));
        accepts(&limits, &name, &text);
    }
    let station = validator(reelgate::station::SCHEMA);
    for path in sample_files(Path::new("limits/stations")) {
        let (name, text) = (
            path.display().to_string(),
            fs::read_to_string(&path).expect("text"),
        );
        reelgate::station::read(&name, text.as_bytes()).unwrap_or_else(|f| panic!("{f}"));
        accepts(&station, &name, &text);
    }
    let lot = validator(reelgate::lot::SCHEMA);
    for folder in fs::read_dir("sample-lots").expect("sample lots") {
        let path = folder.expect("an entry").path().join("lot.yaml");
        if path.exists() {
            let (name, text) = (
                path.display().to_string(),
                fs::read_to_string(&path).expect("text"),
            );
            reelgate::lot::read(&name, text.as_bytes()).unwrap_or_else(|f| panic!("{f}"));
            accepts(&lot, &name, &text);
        }
    }
}

#[test]
fn the_full_shapes_are_valid() {
    accepts(&validator(reelgate::limits::SCHEMA), "limits", LIMITS);
    let rules = "lot_rules:\n  mixed: {of: capacitance, alpha: 0.05}\n  trend: [{of: [capacitance, srf], action: hold}, {of: esr_minimum, action: warn}]\n  switching: {reduced: allowed}\n";
    let outliers = "outliers:\n    - {of: [capacitance, srf], method: joint, alpha: 1 %, allowed: 0}\n    - {of: capacitance, method: part_average, allowed: 1}\n    - ";
    let all = with(LIMITS, "lot_rules:\n", rules);
    let all = with(&all, "outliers:   ", outliers);
    accepts(&validator(reelgate::limits::SCHEMA), "limits", &all);
    let coefficients = "equivalent: series\n  temperature_coefficient: {capacitance: ±30 ppm/K, srf: -0.05 %/°C}\n  #";
    let told = with(LIMITS, "equivalent: series ", coefficients);
    accepts(&validator(reelgate::limits::SCHEMA), "limits", &told);
    let station = with(
        STATION,
        "phase: 0.05 °,",
        "phase: 0.05 °, temperature: 0.5 K,",
    );
    accepts(&validator(reelgate::station::SCHEMA), "station", &station);
    accepts(&validator(reelgate::station::SCHEMA), "station", STATION);
    accepts(&validator(reelgate::lot::SCHEMA), "lot", LOT);
    accepts(&validator(reelgate::site::SCHEMA), "site", SITE);
    accepts(&validator(reelgate::site::SCHEMA), "site", "site: Hall 2\n");
}

#[test]
fn faulty_site_files_are_refused() {
    let site = validator(reelgate::site::SCHEMA);
    for (piece, by) in [
        ("site: Goods-in, hall 2\n", ""),
        ("approval: required", "approval: yes"),
        ("approval: required", "aproval: required"),
        ("role: quality_engineer", "role: metrologist"),
        ("{name: QE-02", "{name: QЕ-02"),
        ("+913c4863+", "+"),
        ("from_entry: 12", "from_entry: -1"),
        (", key: ../keys/goods-in.key.pem", ""),
        ("/reelgate-witness.txt", "/"),
    ] {
        let text = with(SITE, piece, by);
        assert!(!site.is_valid(&value(&text)), "{by}");
        assert!(
            reelgate::site::read("site.yaml", text.as_bytes()).is_err(),
            "{by}"
        );
    }
}

#[test]
fn faulty_limit_files_are_refused() {
    let limits = validator(reelgate::limits::SCHEMA);
    let no_duplicates = with(FAULTY, "max: 6 mΩ, max: 7 mΩ", "max: 7 mΩ");
    assert!(!limits.is_valid(&value(&no_duplicates)));
    for (piece, by) in [
        ("tolerance: ±10 %, class", "toleranse: ±10 %, class"),
        ("nominal: 4.7 µF, ", ""),
        ("tolerance: ±10 %, class", "class"),
        ("tolerance: ±10 %", "tolerance: ±10 %, min: 4 µF"),
        ("{at: 1 kHz, nominal", "{nominal"),
        ("{max: 6 mΩ", "{at: 1 kHz, max: 6 mΩ"),
        ("{at: 100 kHz, max: 0.40 Ω}", "{max: 0.40 Ω}"),
        ("{at: 100 kHz,", "{at: 1 kHz, between: [1 kHz, 2 kHz],"),
        ("[700 kHz, 4 MHz]", "[700 kHz]"),
        ("A: 0.65", "A: 0.7"),
        ("level: II", "level: IV"),
        ("revision: 3\n", ""),
        (
            "  attributes: {",
            "  fixed: {sample: 8, accept: 0}\n  attributes: {",
        ),
        ("{of: capacitance,", "{of: capacitanse,"),
        ("allowed: 0", "allowed: 0.5"),
        ("method: generalized_esd", "method: modified_z"),
        ("method: generalized_esd, alpha: 0.01", "method: grubbs"),
        ("method: generalized_esd", "method: eyesight"),
        ("lot_rules:\n", "lot_rules:\n  mixed: {of: capacitance}\n"),
        (
            "lot_rules:\n",
            "lot_rules:\n  trend: {of: capacitance, action: reject}\n",
        ),
        ("{kind: guarded_acceptance", "{kind: simple_acceptance"),
        ("kind: guarded_acceptance", "kind: guarded"),
        ("unmeasured: 1", "unmeasured: -1"),
        ("part: RG-0475-X7R", "part: RG/0475"),
        (
            "  equivalent: series ",
            "  temperature_coefficient: {capacitance: 0.1 %}\n  equivalent: series ",
        ),
        (
            "  equivalent: series ",
            "  temperature_coefficient: {capacity: 0.1 %/K}\n  equivalent: series ",
        ),
    ] {
        let text = with(LIMITS, piece, by);
        assert!(!limits.is_valid(&value(&text)), "{by}");
        assert!(
            reelgate::limits::read("x.yaml", text.as_bytes()).is_err(),
            "{by}"
        );
    }
}

#[test]
fn faulty_station_and_lot_files_are_refused() {
    let station = validator(reelgate::station::SCHEMA);
    for (piece, by) in [
        ("method: series_reference", "method: direct"),
        (", b_im: \"ChB Im (V)\"", ""),
        ("frequency: \"Frequency (Hz)\", ", ""),
        (
            "{sweep: compensation/load.csv, resistance: 1.000 Ω}",
            "load.csv",
        ),
        ("open:  compensation/open.csv", "open:  ../open.csv"),
        ("due: 2027-03-02", "due: soon"),
        ("checked: 2026-10-05T07:50:00+02:00, ", ""),
        ("srf: 0.3 %", "q: 0.3 %"),
    ] {
        assert!(!station.is_valid(&value(&with(STATION, piece, by))), "{by}");
    }
    let bench = super::station_bench::sample();
    for (piece, by) in [
        ("folder: watched/bench-4, ", ""),
        ("pattern: \"*.csv\"", "pattern: \"sub/*.csv\""),
        ("settle: 0.5 s, points: 401", "settle: 0.5 s, points: 1"),
        ("192.0.2.17:5025", "192.0.2.17"),
        ("\"ERROR:NEXT?\"", "\"ERROR:NEXT\""),
        (
            "IMPEDANCES?\", format: real64, order: big",
            "IMPEDANCES?\", format: real64",
        ),
        (
            "IMPEDANCES?\", format: real64, order: big",
            "IMPEDANCES?\", format: ascii, order: big",
        ),
        ("every: 25 parts", "every: some parts"),
        ("at: 1 kHz, value: 4.683 µF", "value: 4.683 µF"),
        ("asset: REF-03", "aset: REF-03"),
    ] {
        assert!(!station.is_valid(&value(&with(&bench, piece, by))), "{by}");
    }
    let lot = validator(reelgate::lot::SCHEMA);
    for (piece, by) in [
        ("quantity: 4000", "quantity: 0"),
        ("quantity: 4000", "quantity: \"4000\""),
        ("station: BENCH-2\n", ""),
        ("station: BENCH-2\n", "staton: BENCH-2\n"),
        ("last_heat: 2026-07-01", "last_heat: last week"),
        ("sweeps: sweeps", "sweeps: /sweeps"),
    ] {
        assert!(!lot.is_valid(&value(&with(LOT, piece, by))), "{by}");
    }
}
