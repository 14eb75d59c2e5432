//! Sweep files. The first byte of the input says which station or which name the file has.

use reelgate::station::{
    Column, Compensation, Layout, Method, Reference, Standard, Station, Uncertainty,
};
use reelgate::sweep::{Attempt, RawFile, Standards, read_file};

/// A table: `0` resistance and reactance, `1` two channels, `2` capacitance and loss, `3` ratio in
/// dB and phase, `4` the sweep of a standard.
pub fn delimited(bytes: &[u8]) {
    let Some((which, bytes)) = bytes.split_first() else {
        return;
    };
    let columns: &[(Column, &str)] = match which % 5 {
        1 => &[
            (Column::Frequency, "f"),
            (Column::ARe, "a"),
            (Column::AIm, "b"),
            (Column::BRe, "c"),
            (Column::BIm, "d"),
        ],
        2 => &[
            (Column::Frequency, "f"),
            (Column::Capacitance, "C"),
            (Column::Esr, "R"),
        ],
        3 => &[
            (Column::Frequency, "f"),
            (Column::RatioDb, "g"),
            (Column::Phase, "p"),
        ],
        _ => &[
            (Column::Frequency, "f"),
            (Column::Resistance, "R"),
            (Column::Reactance, "X"),
        ],
    };
    let method = match which % 5 {
        1 | 3 => Method::SeriesReference,
        _ => Method::Direct,
    };
    let mut station = station(method);
    station.layout = Some(Layout {
        columns: columns.iter().map(|(c, h)| (*c, (*h).to_owned())).collect(),
        peak: false,
    });
    let file = raw("001.csv", bytes);
    if which % 5 == 4 {
        station.compensation.short = Some(Standard {
            sweep: file.name.clone(),
            resistance: 0.0,
            inductance: 0.0,
            capacitance: 0.0,
        });
        match Standards::read(std::slice::from_ref(&file), &station) {
            Ok(standards) => all_sound(&read_file(&file, &station, Some(&standards)), bytes),
            Err(notes) => assert!(!notes.is_empty()),
        }
        return;
    }
    all_sound(&read_file(&file, &station, None), bytes);
}

/// A Touchstone file: `0` one port in reflection, `1` two ports in shunt, `2` two ports in series,
/// `3` one port of impedances, `4` without the number of ports in the name.
pub fn touchstone(bytes: &[u8]) {
    let Some((which, bytes)) = bytes.split_first() else {
        return;
    };
    let (name, method) = match which % 5 {
        0 => ("001.s1p", Method::Reflection),
        1 => ("001.s2p", Method::ShuntThrough),
        2 => ("001.s2p", Method::SeriesThrough),
        3 => ("001.z1p", Method::Reflection),
        _ => ("001.ts", Method::ShuntThrough),
    };
    all_sound(&read_file(&raw(name, bytes), &station(method), None), bytes);
}

fn raw(name: &str, bytes: &[u8]) -> RawFile {
    RawFile {
        name: name.to_owned(),
        bytes: bytes.to_vec(),
    }
}

fn station(method: Method) -> Station {
    Station {
        name: "BENCH-F".to_owned(),
        instrument: None,
        jig: None,
        method,
        reference: (method == Method::SeriesReference).then_some(Reference {
            resistance: 1.0,
            tolerance: 0.0,
            inductance: 0.0,
        }),
        layout: None,
        compensation: Compensation::default(),
        uncertainty: Uncertainty::default(),
    }
}

/// At least one try; a sweep that was taken is finite and sorted, one that was not says why.
fn all_sound(attempts: &[Attempt], bytes: &[u8]) {
    assert!(!attempts.is_empty() && attempts.len() <= bytes.len() + 1);
    for attempt in attempts {
        match &attempt.sweep {
            Err(faults) => {
                assert!(!faults.is_empty());
                let text: usize = faults.iter().map(|f| f.text.len()).sum();
                assert!(
                    text < 16 * 1024 + 8 * bytes.len(),
                    "as long as the file: {text}"
                );
            }
            Ok(sweep) => {
                let f = &sweep.frequency;
                assert!(f.len() >= 2 && f.len() <= bytes.len());
                assert!(f.iter().all(|f| f.is_finite() && *f > 0.0));
                assert!(f.windows(2).all(|pair| pair[0] < pair[1]));
                assert_eq!(sweep.impedance.len(), f.len());
                assert!(sweep.impedance.iter().all(|z| z.is_finite()));
                if let Some(level) = &sweep.level {
                    assert_eq!(level.len(), f.len());
                    assert!(level.iter().all(|v| v.is_finite()));
                }
            }
        }
    }
}
