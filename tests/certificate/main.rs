//! The PDF lot record, looked at by programs that are not ours.
//!
//! Needs qpdf and poppler-utils (pdftotext, pdffonts, pdfinfo, pdfdetach, pdfsig), as Debian packages
//! them.

mod archive;
mod evidence;
mod layout;
mod lots;
mod numbers;
mod pictures;
mod signature;
mod structure;
mod tags;
mod tools;

use lots::Case;
use reelgate::certificate::{Certificate, Paper, Sources, render};

fn sources(case: &Case) -> Sources<'_> {
    Sources {
        limit_file: Some(&case.limit_file),
        station_file: Some(&case.station_file),
        ledger: None,
        signature: None,
    }
}

fn rendered(case: &Case, paper: Paper) -> Certificate {
    render(&case.record, &case.curves, &sources(case), paper).expect("a document")
}

/// Lots of every kind, by name.
fn cases() -> Vec<(&'static str, Case)> {
    vec![
        ("accepted", lots::accepted(32, 8)),
        ("rejected", lots::rejected()),
        ("held", lots::held_single()),
        ("found", lots::found()),
        ("hostile", lots::hostile()),
        ("empty", lots::empty()),
    ]
}

const PAPERS: [Paper; 2] = [Paper::A4, Paper::Letter];
