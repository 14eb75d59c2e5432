//! The PDF lot record, looked at by programs that are not ours: qpdf, poppler, mutool.

mod lots;

use lots::Case;
use reelgate::certificate::{Certificate, Paper, Sources, render};

fn sources(case: &Case) -> Sources<'_> {
    Sources {
        limit_file: Some(&case.limit_file),
        station_file: Some(&case.station_file),
    }
}

fn rendered(case: &Case, paper: Paper) -> Certificate {
    render(&case.record, &case.curves, &sources(case), paper).expect("a document")
}

fn cases() -> Vec<(&'static str, Case)> {
    vec![
        ("accepted", lots::accepted(32, 8)),
        ("rejected", lots::rejected()),
        ("held", lots::held_single()),
        ("hostile", lots::hostile()),
        ("empty", lots::empty()),
    ]
}

#[test]
fn write_out() {
    let Ok(folder) = std::env::var("OUT") else {
        return;
    };
    for (name, case) in cases() {
        let c = rendered(&case, Paper::A4);
        eprintln!("{name} {} {:?}", c.pdf.len(), c.warnings);
        std::fs::write(format!("{folder}/{name}.pdf"), c.pdf).expect("write");
    }
}
