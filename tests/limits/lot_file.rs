//! Lot files.

use super::{LOT, listed, with};
use reelgate::lot::{self, Aside, Lot};

fn read(text: &str) -> Result<Lot, reelgate::diagnostic::Faults> {
    lot::read("lot.yaml", text.as_bytes())
}

fn only(piece: &str, by: &str, fault: &str) {
    assert_eq!(listed(read(&with(LOT, piece, by))), [fault], "{by}");
}

#[test]
fn a_valid_file_means_what_it_says() {
    let lot = read(LOT).expect("a valid file");
    assert_eq!(
        (lot.lot.as_str(), lot.part.as_str(), lot.quantity),
        ("26K-0457", "RG-0475-X7R", 4000)
    );
    assert_eq!(lot.date_code.as_deref(), Some("2638"));
    assert_eq!(
        lot.label.as_deref(),
        Some("[)>\u{1e}06\u{1d}PRG-0475-X7R\u{1d}Q4000\u{1d}1T26K-0457\u{1e}\u{4}")
    );
    assert_eq!(lot.measured.to_rfc3339(), "2026-10-05T09:12:00+02:00");
    assert_eq!(
        (lot.temperature, lot.humidity, lot.drive),
        (Some(22.8), Some(0.41), Some(0.98))
    );
    assert_eq!(
        lot.last_heat.map(|t| t.to_string()).as_deref(),
        Some("2026-07-01 00:00:00")
    );
    assert_eq!(lot.sweeps, "sweeps");
}

#[test]
fn the_last_heat_is_in_the_local_time_of_the_measurement() {
    let text = with(LOT, "2026-07-01", "2026-07-01T23:00:00+00:00");
    let lot = read(&text).expect("valid");
    assert_eq!(
        lot.last_heat.map(|t| t.to_string()).as_deref(),
        Some("2026-07-02 01:00:00")
    );
}

#[test]
fn what_the_operators_run_says() {
    let run = "run: {seed: 7, scans: [\"Q4000\", \"1T26K-0457\"], operators: [OP-17, OP-08], \
               jig_checked: 2026-10-05T08:00:00+02:00, \
               set_aside: [{sweep: \"017\", why: misplaced, by: OP-17}, {sweep: 017~2, why: jig_check}]}";
    let lot = read(&with(
        LOT,
        "sweeps: sweeps",
        &format!("sweeps: sweeps\n{run}"),
    ))
    .expect("valid");
    assert_eq!((lot.run.seed, lot.run.scans.len()), (Some(7), 2));
    assert_eq!(lot.run.operators, ["OP-17", "OP-08"]);
    assert_eq!(
        lot.run.jig_checked.map(|t| t.to_rfc3339()).as_deref(),
        Some("2026-10-05T08:00:00+02:00")
    );
    assert_eq!(lot.run.aside("017", 1), Some(Aside::Misplaced));
    assert_eq!(lot.run.aside("017", 2), Some(Aside::JigCheck));
    assert_eq!(lot.run.aside("018", 1), None);
    for (piece, fault) in [
        ("run: {seed: -1}", "out_of_range -1"),
        ("run: {sed: 1}", "unknown_key sed"),
        ("run: {set_aside: 017}", "not_a_list 017"),
        (
            "run: {set_aside: [{sweep: \"017\", why: tired}]}",
            "unknown_value tired",
        ),
    ] {
        let faults = listed(read(&with(
            LOT,
            "sweeps: sweeps",
            &format!("sweeps: sweeps\n{piece}"),
        )));
        assert!(
            faults.len() == 1 && faults[0].starts_with(fault),
            "{piece}: {faults:?}"
        );
    }
}

#[test]
fn what_is_optional_may_be_left_out() {
    let lot = read("lot: L\npart: P\nquantity: 1\nstation: S\nmeasured: 2026-10-05T09:12:00Z\nsweeps: all.csv\n")
        .expect("valid");
    assert_eq!(
        (lot.supplier, lot.label, lot.temperature, lot.last_heat),
        (None, None, None, None)
    );
}

#[test]
fn faults() {
    only(
        "lot: 26K-0457\n",
        "lot: 26K/0457\n",
        "name_not_safe 26K/0457",
    );
    only("station: BENCH-2\n", "", "missing_key");
    only(
        "station: BENCH-2\n",
        "staton: BENCH-2\n",
        "unknown_key staton",
    );
    only("quantity: 4000", "quantity: 4 000", "not_a_number 4 000");
    only("41 %", "41", "impossible_value 41");
    only("41 %", "0.41", "share_without_sign 0.41");
    only("41 %", "141 %", "impossible_value 141 %");
    only("22.8 °C", "22.8 V", "not_a_quantity 22.8 V");
    only("drive: 0.98 Vrms", "drive: 0 V", "impossible_value 0 V");
    only(
        "2026-10-05T09:12:00+02:00",
        "2026-10-05 09:12",
        "not_a_time 2026-10-05 09:12",
    );
    only(
        "last_heat: 2026-07-01",
        "last_heat: 2026-11-01",
        "reversed 2026-11-01",
    );
    only(
        "last_heat: 2026-07-01",
        "last_heat: last week",
        "not_a_time last week",
    );
    only(
        "sweeps: sweeps",
        "sweeps: ../sweeps",
        "path_not_safe ../sweeps",
    );
    only("operator: OP-17", "operator: {a: 1}", "wrong_kind operator");
    only(
        "operator: OP-17",
        "operator: \"OP\\e\"",
        "hidden_character \"OP\\e\"",
    );
    let long = with(
        LOT,
        "operator: OP-17",
        &format!("operator: {}", "x".repeat(1001)),
    );
    assert!(matches!(listed(read(&long)).as_slice(), [one] if one.starts_with("text_too_long x")));
}
