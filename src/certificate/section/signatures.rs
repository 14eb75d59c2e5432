//! Who signed, and how to check it; places to sign by hand.

use crate::certificate::Signatory;
use crate::certificate::canvas::Pen;
use crate::certificate::figures::instant;
use crate::certificate::flow::{Flow, SMALL, SMALL_LEADING};
use crate::certificate::ink::{QUIET, TEXT};
use crate::certificate::structure::Role;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use crate::certificate::text::{Style, wrap};
use crate::record::{LotRecord, LotVerdict};

const FIELD: f64 = 62.0;

/// How a signature is checked.
const HOW: &str = "The signature is over the whole file. Any program that knows PAdES signatures checks it, for example `pdfsig` of \
     poppler-utils or pyHanko; whether the certificate is trusted depends on the authorities that your program knows, so compare its \
     SHA-256 with what the site has published. The time is that of the program, not of a time-stamping authority.";

/// The certificate, for the document and its text twin.
pub(in crate::certificate) fn facts(by: &Signatory) -> Vec<(&'static str, String)> {
    vec![
        ("Signed by", by.subject.clone()),
        ("Certificate issued by", by.issuer.clone()),
        ("Serial number", by.serial.clone()),
        (
            "Valid",
            format!(
                "{} to {}",
                instant(&by.valid_from),
                instant(&by.valid_until)
            ),
        ),
        ("SHA-256 of the certificate", by.sha256.clone()),
        (
            "Form",
            "PAdES baseline, level B-B (ETSI EN 319 142-1): ECDSA P-256 with SHA-256".to_owned(),
        ),
    ]
}

/// Places to sign.
fn fields(record: &LotRecord) -> Vec<&'static str> {
    let mut fields = vec![
        "Inspected: measured as stated above",
        "Reviewed: record complete, evidence in order",
    ];
    if record.verdict != LotVerdict::Accept {
        fields.push("Disposition of the lot (what is to be done with it)");
    }
    fields
}

/// The electronic signature as a table.
fn signed(by: &Signatory) -> Table<'static> {
    let mut table = Table::new(vec![
        Column::new("", Align::Left, Span::Fixed(120.0)),
        Column::new("", Align::Left, Span::Share(1.0)),
    ]);
    for (label, value) in facts(by) {
        table.row(vec![Cell::text(label).ink(QUIET), Cell::text(value)]);
    }
    table
}

/// How high the section is, its heading included.
pub(in crate::certificate) fn height(
    flow: &Flow,
    record: &LotRecord,
    electronic: Option<&Signatory>,
) -> f64 {
    let hand = 50.0 + FIELD * fields(record).len() as f64;
    electronic.map_or(hand, |by| {
        let how = wrap(HOW, SMALL, flow.sheet.measure()).len() as f64;
        hand + 2.0 * 28.0 + signed(by).height(flow) + how * SMALL_LEADING + 5.0
    })
}

/// Sets the section. An electronic signature is that of the site's certificate.
pub(in crate::certificate) fn signatures(
    flow: &mut Flow,
    record: &LotRecord,
    electronic: Option<&Signatory>,
) {
    flow.heading("Signatures", 150.0);
    if let Some(signatory) = electronic {
        flow.subheading("Electronic signature", 120.0);
        signed(signatory).set(flow);
        flow.y += 3.0;
        flow.small(HOW);
        flow.subheading("By hand", 66.0);
    }
    for field in fields(record) {
        let area = flow.take(FIELD);
        let before = flow.enter(Role::Paragraph);
        let page = flow.page();
        page.text((area.left, area.top + 12.0), Style::bold(9.2), field);
        let y = area.bottom - 14.0;
        let columns = [
            ("Name", 0.0, 0.36),
            ("Date", 0.40, 0.58),
            ("Signature", 0.62, 1.0),
        ];
        for (label, from, to) in columns {
            let (from, to) = (
                area.left + from * area.width(),
                area.left + to * area.width(),
            );
            page.line((from, y), (to, y), Pen::solid(0.6, TEXT));
            page.text((from, y + 9.0), SMALL, label);
        }
        flow.leave(before);
    }
}
