//! Places to sign.

use crate::certificate::canvas::Pen;
use crate::certificate::flow::{Flow, SMALL};
use crate::certificate::ink::TEXT;
use crate::certificate::text::Style;
use crate::record::{LotRecord, LotVerdict};

pub(in crate::certificate) fn signatures(flow: &mut Flow, record: &LotRecord) {
    flow.heading("Signatures", 150.0);
    let mut fields = vec![
        "Inspected: measured as stated above",
        "Reviewed: record complete, evidence in order",
    ];
    if record.verdict != LotVerdict::Accept {
        fields.push("Disposition of the lot (what is to be done with it)");
    }
    for field in fields {
        let area = flow.take(66.0);
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
    }
}
