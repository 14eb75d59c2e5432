//! Reading delimited sweep files: dialects, faults, long tables.

mod sweep_support;

use num_complex::Complex64;
use proptest::prelude::*;
use reelgate::station::{Column, Layout, Method, Station};
use reelgate::sweep::{Attempt, RawFile, order, read_file};
use std::f64::consts::TAU;
use sweep_support::{codes, layout, one, station, sweep};

fn file(name: &str, text: impl AsRef<[u8]>) -> RawFile {
    RawFile {
        name: name.to_owned(),
        bytes: text.as_ref().to_vec(),
    }
}

/// 1 µF, 10 mΩ, 1 nH.
fn z(f: f64) -> Complex64 {
    let w = TAU * f;
    Complex64::new(10e-3, w * 1e-9 - 1.0 / (w * 1e-6))
}

fn grid() -> Vec<f64> {
    (0..=60)
        .map(|i| 1e3 * 10f64.powf(f64::from(i) / 20.0))
        .collect()
}

fn direct(columns: &[(Column, &str)]) -> Station {
    station(Method::Direct, Some(layout(columns)))
}

fn rx() -> Station {
    direct(&[
        (Column::Frequency, "Frequency (Hz)"),
        (Column::Resistance, "R (Ohm)"),
        (Column::Reactance, "X (Ohm)"),
    ])
}

/// The table with the fields in the order of `rx`, written by `cell`.
fn table(head: &str, delimiter: &str, end: &str, cell: impl Fn(f64) -> String) -> String {
    let mut text = format!("{head}{end}");
    for f in grid() {
        let z = z(f);
        let fields = [cell(f), cell(z.re), cell(z.im)];
        text.push_str(&fields.join(delimiter));
        text.push_str(end);
    }
    text
}

fn plain() -> String {
    table("Frequency (Hz),R (Ohm),X (Ohm)", ",", "\n", |v| {
        format!("{v:.9e}")
    })
}

fn is_truth(attempt: &Attempt) {
    let sweep = attempt.sweep.as_ref().unwrap_or_else(|f| panic!("{f:?}"));
    assert_eq!(sweep.frequency.len(), 61);
    for (f, found) in sweep.frequency.iter().zip(&sweep.impedance) {
        let truth = z(*f);
        assert!(
            (found - truth).norm() < 1e-6 * truth.norm(),
            "{f}: {found} {truth}"
        );
    }
}

fn notes(attempt: &Attempt) -> Vec<&str> {
    attempt.notes.iter().map(|n| n.code.as_str()).collect()
}

#[test]
fn plain_csv() {
    let attempt = one(&file("sweeps/017~2.csv", plain()), &rx());
    is_truth(&attempt);
    assert_eq!((attempt.part.as_str(), attempt.attempt), ("017", 2));
    assert_eq!(attempt.file, "sweeps/017~2.csv");
    assert!(attempt.notes.is_empty(), "{:?}", attempt.notes);
}

#[test]
fn the_digest_is_that_of_the_bytes() {
    // FIPS 180-4, the digest of no bytes at all.
    let attempt = one(&file("1.csv", ""), &rx());
    assert_eq!(
        attempt.sha256,
        "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855"
    );
    assert_eq!(codes(&attempt), ["file_empty"]);
}

#[test]
fn dialects_are_found_out() {
    let comma = |v: f64| format!("{v:.9e}").replace('.', ",");
    let point = |v: f64| format!("{v:.9e}");
    let cases: Vec<(String, Vec<&str>)> = vec![
        (
            table("Frequency (Hz);R (Ohm);X (Ohm)", ";", "\r\n", comma),
            vec!["delimiter_semicolon", "decimal_comma"],
        ),
        (
            table("Frequency (Hz)\tR (Ohm)\tX (Ohm)", "\t", "\r", point),
            vec!["delimiter_tab"],
        ),
        (
            table("Frequency (Hz)\tR (Ohm)\tX (Ohm)", "\t", "\n", comma),
            vec!["delimiter_tab", "decimal_comma"],
        ),
        (
            table("Frequency (Hz)  R (Ohm)   X (Ohm)", "   ", "\n", point),
            vec!["delimiter_whitespace"],
        ),
        (
            table("# Frequency (Hz) R (Ohm) X (Ohm)", " ", "\n", comma),
            vec!["delimiter_whitespace", "decimal_comma"],
        ),
        (
            table(
                "\"Frequency (Hz)\",\"R (Ohm)\",\"X (Ohm)\"",
                ",",
                "\n",
                |v| format!("\"{v:.9e}\""),
            ),
            vec![],
        ),
        (
            table(
                "\"Frequency (Hz)\",\"R (Ohm)\",\"X (Ohm)\"",
                ",",
                "\n",
                |v| format!("\"{}\"", comma(v)),
            ),
            vec!["decimal_comma"],
        ),
        (
            table(
                "Bench export; 5\" jig\n\nDate, 2026-10-05\nfrequency [Hz] , r[ohm],X  (OHM)",
                ",",
                "\n",
                point,
            ),
            vec!["preamble"],
        ),
        (
            table("Frequency,R,X\nHz,Ohm,Ohm", ",", "\n", point),
            vec!["units_row"],
        ),
        (
            table("Frequency (Hz),R (Ohm),X (Ohm),", ",", ",\n", point),
            vec![],
        ),
        (
            table("Frequency (Hz),R (Ohm),X (Ohm)", " , ", " \n\n", point),
            vec![],
        ),
    ];
    for (text, expected) in cases {
        let attempt = one(&file("1.txt", &text), &rx());
        let head: String = text.chars().take(60).collect();
        assert!(attempt.sweep.is_ok(), "{head}: {:?}", attempt.sweep);
        is_truth(&attempt);
        assert_eq!(notes(&attempt), expected, "{head}");
    }
}

#[test]
fn encodings_are_found_out() {
    let text = table("Frequency (Hz),R (µΩ),X (µΩ)", ",", "\r\n", |v| {
        format!("{v:.9e}")
    });
    let scaled = |text: &str| text.replace("(µΩ)", "(Ω)");
    let utf16 = |text: &str, order: fn(u16) -> [u8; 2]| -> Vec<u8> {
        std::iter::once(0xFEFF)
            .chain(text.encode_utf16())
            .flat_map(order)
            .collect()
    };
    let mut with_bom = b"\xEF\xBB\xBF".to_vec();
    with_bom.extend(scaled(&text).bytes());
    for (bytes, code) in [
        (with_bom, "encoding_utf8_bom"),
        (utf16(&scaled(&text), u16::to_le_bytes), "encoding_utf16le"),
        (utf16(&scaled(&text), u16::to_be_bytes), "encoding_utf16be"),
    ] {
        let attempt = one(&file("1.csv", bytes), &rx());
        is_truth(&attempt);
        assert_eq!(notes(&attempt), [code]);
    }
    // Windows-1252 has µ and no Ω.
    let mut bytes = Vec::new();
    for c in plain()
        .replace("Frequency", "µ,Frequency")
        .replace('\n', "\n1,")
        .chars()
    {
        bytes.push(if c == 'µ' { 0xB5 } else { c as u8 });
    }
    bytes.truncate(bytes.len() - 2);
    let attempt = one(&file("1.csv", bytes), &rx());
    is_truth(&attempt);
    assert_eq!(notes(&attempt), ["encoding_windows_1252"]);
}

#[test]
fn units_in_headings_are_honoured() {
    let mut text = "Frequency [kHz];|Z| [mΩ];Phase (rad)\n".to_owned();
    for f in grid() {
        text.push_str(&format!(
            "{:.9e};{:.9e};{:.12}\n",
            f / 1e3,
            z(f).norm() * 1e3,
            z(f).arg()
        ));
    }
    let station = direct(&[
        (Column::Frequency, "frequency (Hz)"),
        (Column::Magnitude, "|Z| (Ohm)"),
        (Column::Phase, "phase (°)"),
    ]);
    is_truth(&one(&file("1.csv", text), &station));
}

#[test]
fn a_phase_without_unit_is_degrees_or_refused() {
    let write = |phase: fn(f64) -> f64| {
        let mut text = "f,Z,phase\n".to_owned();
        for f in grid() {
            text.push_str(&format!(
                "{f:.9e},{:.9e},{:.12}\n",
                z(f).norm(),
                phase(z(f).arg())
            ));
        }
        text
    };
    let station = direct(&[
        (Column::Frequency, "f"),
        (Column::Magnitude, "Z"),
        (Column::Phase, "phase"),
    ]);
    is_truth(&one(&file("1.csv", write(f64::to_degrees)), &station));
    assert_eq!(
        codes(&one(&file("1.csv", write(|p| p)), &station)),
        ["phase_unit_unknown"]
    );
}

#[test]
fn every_set_of_columns() {
    type Row = fn(f64) -> Vec<f64>;
    let sets: Vec<(Vec<(Column, &str)>, Row)> = vec![
        (
            vec![
                (Column::Magnitude, "|Z| (Ohm)"),
                (Column::Phase, "theta (deg)"),
            ],
            |f| vec![z(f).norm(), z(f).arg().to_degrees()],
        ),
        (
            vec![(Column::Resistance, "R"), (Column::Reactance, "X")],
            |f| vec![z(f).re, z(f).im],
        ),
        (
            vec![
                (Column::Capacitance, "Cs (nF)"),
                (Column::Esr, "ESR (mOhm)"),
            ],
            |f| vec![-1e9 / (TAU * f * z(f).im), z(f).re * 1e3],
        ),
        (
            vec![
                (Column::Capacitance, "Cs"),
                (Column::DissipationFactor, "D (%)"),
            ],
            |f| vec![-1.0 / (TAU * f * z(f).im), 100.0 * z(f).re / z(f).im.abs()],
        ),
    ];
    for (set, values) in sets {
        let mut columns = vec![(Column::Frequency, "f (Hz)")];
        columns.extend(set);
        // Columns stand in another order than in the layout, among others.
        let mut text = format!("{},index,{},{}\n", columns[1].1, columns[2].1, columns[0].1);
        for (i, f) in grid().into_iter().enumerate() {
            let v = values(f);
            text.push_str(&format!("{:.12e},{i},{:.12e},{f:.12e}\n", v[0], v[1]));
        }
        is_truth(&one(&file("1.csv", text), &direct(&columns)));
    }
}

#[test]
fn two_channels_give_impedance_and_level() {
    let zref = |f: f64| Complex64::new(1.0, TAU * f * 0.3e-9);
    let write = |unit: &str, scale: f64| {
        let mut text = format!("f_Hz,A_re_{unit},A_im_{unit},B_re_{unit},B_im_{unit}\n");
        for f in grid() {
            let i = 2.0 / (50.0 + zref(f) + z(f)) * scale;
            let (a, b) = (i * (zref(f) + z(f)), i * z(f));
            text.push_str(&format!(
                "{f:.12e},{:.12e},{:.12e},{:.12e},{:.12e}\n",
                a.re, a.im, b.re, b.im
            ));
        }
        text
    };
    let mut two = station(Method::SeriesReference, Some(sweep_support::two_channel()));
    for (unit, scale, peak, expected) in [
        ("V", 1.0, false, 1.0),
        ("mV", 1e3, false, 1.0),
        ("V", 1.0, true, std::f64::consts::FRAC_1_SQRT_2),
        ("Vpk", 1.0, false, std::f64::consts::FRAC_1_SQRT_2),
        ("Vrms", 1.0, true, 1.0),
    ] {
        if let Some(layout) = &mut two.layout {
            layout.peak = peak;
        }
        let attempt = one(&file("1.csv", write(unit, scale)), &two);
        is_truth(&attempt);
        let sweep = attempt.sweep.expect("valid");
        let level = sweep.level.expect("two channels have a level");
        let truth = (2.0 / (50.0 + zref(sweep.frequency[7]) + z(sweep.frequency[7]))
            * z(sweep.frequency[7]))
        .norm();
        assert!((level[7] / truth - expected).abs() < 1e-9, "{unit} {peak}");
    }
}

#[test]
fn a_ratio_in_decibel_with_phase() {
    let mut text = "f (Hz),B/A (dB),phase (deg)\n".to_owned();
    for f in grid() {
        let h = z(f) / (z(f) + Complex64::new(1.0, TAU * f * 0.3e-9));
        text.push_str(&format!(
            "{f:.12e},{:.12e},{:.12e}\n",
            20.0 * h.norm().log10(),
            h.arg().to_degrees()
        ));
    }
    let columns = layout(&[
        (Column::Frequency, "f (Hz)"),
        (Column::RatioDb, "B/A (dB)"),
        (Column::Phase, "phase (deg)"),
    ]);
    let attempt = one(
        &file("1.csv", text),
        &station(Method::SeriesReference, Some(columns)),
    );
    is_truth(&attempt);
    assert_eq!(attempt.sweep.expect("valid").level, None);
}

#[test]
fn order_of_frequencies_is_mended_and_said() {
    let text = plain();
    let mut lines: Vec<&str> = text.lines().collect();
    let rows = lines.split_off(1);
    let reversed: Vec<&str> = rows.iter().rev().copied().collect();
    let mut shuffled = rows.clone();
    shuffled.swap(3, 40);
    for rows in [reversed, shuffled] {
        let text = format!("{}\n{}\n", lines[0], rows.join("\n"));
        let attempt = one(&file("1.csv", text), &rx());
        is_truth(&attempt);
        assert_eq!(notes(&attempt), ["sorted"]);
    }
}

/// The text of the first fault.
fn told(text: impl AsRef<[u8]>, station: &Station) -> (String, String) {
    let attempt = one(&file("1.csv", text), station);
    let faults = attempt.sweep.expect_err("a fault");
    (faults[0].code.clone(), faults[0].text.clone())
}

fn with_line(number: usize, change: impl Fn(&str) -> String) -> String {
    let text = plain();
    let lines: Vec<String> = text
        .lines()
        .enumerate()
        .map(|(i, line)| {
            if i + 1 == number {
                change(line)
            } else {
                line.to_owned()
            }
        })
        .collect();
    lines.join("\n") + "\n"
}

#[test]
fn faults_are_told_with_line_and_column() {
    let cell = |index: usize, with: &'static str| {
        move |line: &str| {
            let mut fields: Vec<&str> = line.split(',').collect();
            fields[index] = with;
            fields.join(",")
        }
    };
    for (text, code, says) in [
        (
            with_line(9, cell(1, "n/a")),
            "text_in_number",
            "line 9, column `R (Ohm)`: `n/a`",
        ),
        (
            with_line(9, cell(2, "NaN")),
            "not_a_number",
            "line 9, column `X (Ohm)`",
        ),
        (with_line(9, cell(2, "-inf")), "not_a_number", "line 9"),
        (with_line(9, cell(2, "9.9E37")), "not_a_number", "line 9"),
        (
            with_line(9, cell(1, "")),
            "empty_cell",
            "line 9, column `R (Ohm)`",
        ),
        (with_line(9, |_| "1.0".to_owned()), "short_row", "line 9"),
        (
            with_line(9, |line| format!("{line},5")),
            "ragged_row",
            "line 9",
        ),
        (
            with_line(9, cell(0, "0")),
            "frequency_not_positive",
            "line 9",
        ),
        (
            with_line(9, cell(0, "-1000")),
            "frequency_not_positive",
            "line 9",
        ),
        (
            with_line(9, |line| format!("{line}\n{line}")),
            "duplicate_frequency",
            "lines 9 and 10",
        ),
        (
            with_line(9, |line| format!("{line}\n{}", cell(1, "0.5")(line))),
            "conflicting_frequency",
            "lines 9 and 10",
        ),
        (with_line(9, |_| String::new()), "gap", "no points between"),
        (
            "Frequency (Hz),R (Ohm),X (Ohm)\n".to_owned(),
            "no_data",
            "line 1",
        ),
        (
            "Frequency (Hz),R (Ohm),X (Ohm)\n1,2,3\n2,3,4\n".to_owned(),
            "too_few_points",
            "2 point",
        ),
        (
            plain().replace("X (Ohm)", "Xs (Ohm)"),
            "heading_missing",
            "`Frequency (Hz)`, `R (Ohm)`, `Xs (Ohm)`",
        ),
        (
            plain().replace("(Hz)", "(mhz)"),
            "heading_missing",
            "no column `Frequency (Hz)`",
        ),
        ("\n\n \n".to_owned(), "file_empty", "empty"),
        ("hello".to_owned(), "heading_missing", "no line of headings"),
        ("a\0b".to_owned(), "not_text", "NUL"),
    ] {
        let (found, text) = told(text, &rx());
        assert_eq!(found, code, "{text}");
        assert!(text.contains(says), "{code}: {text}");
    }
    let mut faulty = station(Method::Direct, None);
    assert_eq!(told(plain(), &faulty).0, "layout_missing");
    faulty = station(Method::SeriesReference, rx().layout);
    assert_eq!(told(plain(), &faulty).0, "method_mismatch");
}

#[test]
fn a_file_cut_anywhere_in_its_last_line_is_refused() {
    let text = plain();
    let last = text.trim_end().rfind('\n').expect("lines") + 1;
    for end in last + 1..text.len() - 1 {
        let attempt = one(&file("1.csv", &text[..end]), &rx());
        assert!(
            codes(&attempt).contains(&"truncated_line".to_owned()),
            "{:?}: {:?}",
            &text[last..end],
            attempt.sweep
        );
    }
    is_truth(&one(&file("1.csv", text.trim_end()), &rx()));
}

#[test]
fn decimal_marks_may_not_be_mixed() {
    let text = table("Frequency (Hz);R (Ohm);X (Ohm)", ";", "\n", |v| {
        format!("{v:.9e}")
    });
    let mixed = text.replacen("e3;1.0", "e3;1,0", 1);
    assert_ne!(text, mixed);
    assert_eq!(told(mixed, &rx()).0, "mixed_decimal_marks");
    // A decimal comma where a comma separates makes more fields than headings.
    let ragged = table("Frequency (Hz),R (Ohm),X (Ohm)", ",", "\n", |v| {
        format!("{v:.9e}").replace('.', ",")
    });
    assert!(one(&file("1.csv", ragged), &rx()).sweep.is_err());
}

fn long_table(parts: &[&str], heading: &str) -> String {
    let mut text = format!("{heading},Frequency (Hz),R (Ohm),X (Ohm)\n");
    for part in parts {
        for f in grid() {
            text.push_str(&format!("{part},{f:.9e},{:.9e},{:.9e}\n", z(f).re, z(f).im));
        }
    }
    text
}

#[test]
fn a_long_table_holds_many_parts_and_a_fault_stays_with_its_part() {
    let text = long_table(&["10", "2", "2~2", "\"a,b\"", "<script>"], "Part");
    let broken = text.replacen("2,1.000000000e3", "2,oops", 1);
    let mut attempts = read_file(&file("all.csv", broken), &rx(), None);
    assert_eq!(
        attempts.iter().map(|a| a.part.as_str()).collect::<Vec<_>>(),
        ["10", "2", "2", "a,b", "<script>"]
    );
    order(&mut attempts);
    let summary: Vec<(&str, u32, bool)> = attempts
        .iter()
        .map(|a| (a.part.as_str(), a.attempt, a.sweep.is_ok()))
        .collect();
    assert_eq!(
        summary,
        [
            ("2", 1, false),
            ("2", 2, true),
            ("10", 1, true),
            ("<script>", 1, true),
            ("a,b", 1, true)
        ]
    );
    attempts
        .iter()
        .filter(|a| a.sweep.is_ok())
        .for_each(is_truth);
}

#[test]
fn a_long_table_names_its_part_column_in_the_layout() {
    let mut station = rx();
    if let Some(layout) = &mut station.layout {
        layout
            .columns
            .push((Column::Part, "Specimen no.".to_owned()));
    }
    let attempts = read_file(
        &file("all.csv", long_table(&["1", "", "3"], "specimen No.")),
        &station,
        None,
    );
    assert_eq!(attempts.len(), 3);
    is_truth(&attempts[0]);
    assert_eq!(codes(&attempts[1]), ["part_missing"]);
    is_truth(&attempts[2]);
}

fn any_layout() -> Vec<Layout> {
    vec![
        sweep_support::two_channel(),
        rx().layout.expect("layout"),
        layout(&[
            (Column::Frequency, "f"),
            (Column::Capacitance, "C"),
            (Column::DissipationFactor, "D"),
        ]),
    ]
}

proptest! {
    #[test]
    fn no_bytes_panic(bytes in prop::collection::vec(any::<u8>(), 0..400), which in 0usize..3, ext in "csv|s1p|s2p|ts|z3p") {
        for method in [Method::Direct, Method::SeriesReference, Method::ShuntThrough, Method::SeriesThrough, Method::Reflection] {
            let layout = any_layout().swap_remove(which);
            for attempt in read_file(&file(&format!("1.{ext}"), &bytes), &station(method, Some(layout)), None) {
                if let Err(faults) = attempt.sweep {
                    prop_assert!(!faults.is_empty());
                }
            }
        }
    }

    #[test]
    fn no_damage_to_a_good_file_panics_or_gives_a_broken_sweep(
        at in 0usize..3000, cut in 0usize..50, with in prop::collection::vec(any::<u8>(), 0..20)
    ) {
        let mut bytes = plain().into_bytes();
        let at = at.min(bytes.len());
        let end = (at + cut).min(bytes.len());
        bytes.splice(at..end, with);
        for attempt in read_file(&file("1.csv", bytes), &rx(), None) {
            match attempt.sweep {
                Ok(sweep) => {
                    prop_assert!(sweep.frequency.len() >= 2 && sweep.frequency.len() == sweep.impedance.len());
                    prop_assert!(sweep.frequency.windows(2).all(|w| w[0] < w[1]) && sweep.frequency[0] > 0.0);
                    prop_assert!(sweep.impedance.iter().all(|z| z.is_finite()));
                }
                Err(faults) => prop_assert!(!faults.is_empty()),
            }
        }
    }

    #[test]
    fn a_file_cut_at_any_byte_is_never_longer_than_its_whole_rows(end in 0usize..2900) {
        let text = plain();
        let end = end.min(text.len());
        for attempt in read_file(&file("1.csv", &text[..end]), &rx(), None) {
            if let Ok(sweep) = attempt.sweep {
                for (f, found) in sweep.frequency.iter().zip(&sweep.impedance) {
                    prop_assert!((found - z(*f)).norm() < 1e-6 * z(*f).norm());
                }
            }
        }
    }
}

#[test]
fn reading_is_the_same_every_time() {
    let text = long_table(&["1", "2", "3"], "part");
    let read = || read_file(&file("all.csv", &text), &rx(), None);
    assert_eq!(read(), read());
    let _ = sweep(&file("1.csv", plain()), &rx());
}
