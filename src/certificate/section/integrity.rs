//! What the document rests on: digests, versions, and a two-dimensional code with the record's
//! identity and digest.

use crate::certificate::canvas::{Area, Canvas};
use crate::certificate::figures::instant;
use crate::certificate::flow::Flow;
use crate::certificate::ink::{QUIET, TEXT};
use crate::certificate::structure::Role;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use crate::certificate::{InLedger, Sources};
use crate::record::LotRecord;
use qrcode::{Color, EcLevel, QrCode};

const SIDE: f64 = 112.0;

/// Sets the section; false where the identity is too long for a code.
pub(in crate::certificate) fn integrity(
    flow: &mut Flow,
    record: &LotRecord,
    digest: &str,
    sources: &Sources,
) -> bool {
    let mut table = Table::new(vec![
        Column::new("", Align::Left, Span::Fixed(120.0)),
        Column::new("", Align::Left, Span::Share(1.0)),
    ]);
    let in_ledger = sources.ledger.as_ref().map_or_else(Vec::new, ledger_facts);
    for (label, value) in facts(record, digest).into_iter().chain(in_ledger) {
        table.row(vec![Cell::text(label).ink(QUIET), Cell::text(value)]);
    }
    // With the signatures on one page, where that is possible.
    let below = 12.0 + SIDE + super::signatures::height(flow, record, sources.signature);
    flow.heading("Integrity", table.height(flow) + below);
    table.set(flow);
    flow.gap(12.0);
    let coded = code(&payload(record, digest));
    if let Some(code) = &coded {
        let area = flow.take(SIDE);
        let before = flow.enter(Role::Figure(
            "Two-dimensional code with the record's identity and digest".to_owned(),
        ));
        draw(
            flow.page(),
            Area {
                right: area.left + SIDE,
                ..area
            },
            code,
        );
        flow.leave(before);
        let before = flow.enter(Role::Paragraph);
        let style = crate::certificate::flow::SMALL;
        let room = area.width() - SIDE - 16.0;
        let text = "The code holds the record's identity and the SHA-256 of the JSON record. The JSON record is \
                    attached to this document; recompute its SHA-256 and compare. The attached CSV holds the readings \
                    for other programs.";
        for (n, line) in crate::certificate::text::wrap(text, style, room)
            .iter()
            .enumerate()
        {
            let at = (area.left + SIDE + 16.0, area.top + 16.0 + n as f64 * 11.0);
            flow.page().text(at, style, line);
        }
        flow.leave(before);
    }
    coded.is_some()
}

/// The place in the ledger and the checkpoint that is signed, for the document and its text twin.
pub(in crate::certificate) fn ledger_facts(ledger: &InLedger) -> Vec<(&'static str, String)> {
    let mut out = vec![("Entry of the ledger", ledger.index.to_string())];
    out.extend(ledger.copy.map(|copy| ("Copy", copy.to_owned())));
    let note = ledger.proof.split_once("\n\n").map_or("", |(_, note)| note);
    for (line, label) in note.lines().filter(|line| !line.is_empty()).zip([
        "Checkpoint: ledger",
        "Checkpoint: entries",
        "Checkpoint: root of the tree",
        "Checkpoint: signature",
    ]) {
        out.push((label, line.to_owned()));
    }
    out
}

/// Digests and versions, for the document and its text twin.
pub(in crate::certificate) fn facts(
    record: &LotRecord,
    digest: &str,
) -> Vec<(&'static str, String)> {
    let mut out = vec![
        ("Record", record.record.clone()),
        ("Issued", instant(&record.issued)),
        (
            "Program",
            format!("{} {}", record.program.name, record.program.version),
        ),
        ("Record schema", record.schema.to_string()),
        ("SHA-256 of the JSON record", digest.to_owned()),
        ("SHA-256 of the limit file", record.limits.sha256.clone()),
        ("SHA-256 of the station file", record.station.sha256.clone()),
        ("SHA-256 of the lot file", record.lot.sha256.clone()),
    ];
    if let Some(site) = &record.site {
        out.push((
            "Site",
            format!("{}, approvals {}", site.site, site.approval),
        ));
        out.push(("SHA-256 of the site file", site.sha256.clone()));
    }
    let approved = |a: &crate::record::ApprovalSection| format!("{}: {}", a.file, a.words());
    out.extend(record.approvals.iter().map(|a| ("Approved", approved(a))));
    out
}

/// What the code says, one fact a line.
pub(in crate::certificate) fn payload(record: &LotRecord, digest: &str) -> String {
    format!("record {}\nsha256 {digest}\n", record.record)
}

/// A QR code (ISO/IEC 18004) of medium error correction.
fn code(text: &str) -> Option<QrCode> {
    QrCode::with_error_correction_level(text, EcLevel::M).ok()
}

/// The dark modules; runs in a row are one rectangle. Four modules of paper around it.
fn draw(page: &mut Canvas, area: Area, code: &QrCode) {
    let modules = code.width();
    let colours = code.to_colors();
    let module = area.width() / (modules + 8) as f64;
    let at = |n: usize| (n + 4) as f64 * module;
    for (row, line) in colours.chunks(modules.max(1)).enumerate() {
        let mut column = 0;
        while column < line.len() {
            let run = line[column..]
                .iter()
                .take_while(|c| **c == Color::Dark)
                .count();
            if run > 0 {
                page.fill_area(
                    Area {
                        left: area.left + at(column),
                        right: area.left + at(column + run),
                        top: area.top + at(row),
                        bottom: area.top + at(row + 1),
                    },
                    TEXT,
                );
            }
            column += run.max(1);
        }
    }
}
