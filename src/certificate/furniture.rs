//! Running head and foot of every page: what the document is, whose record, which page of how many.

use super::canvas::{Anchor, Canvas, Item};
use super::flow::Flow;
use super::ink::QUIET;
use super::section::lot_word;
use super::text::{Style, elide, width};
use crate::record::LotRecord;

/// Baseline of the running head, points from the top.
pub(super) const HEAD: f64 = 38.0;
/// Baseline of the running foot, points from the bottom.
pub(super) const FOOT_FROM_BOTTOM: f64 = 32.0;
const HEAD_QUIET: Style = Style::regular(8.6).ink(QUIET);
const HEAD_STRONG: Style = Style::bold(8.6);
const FOOT: Style = Style::regular(8.0).ink(QUIET);

pub(super) fn furniture(flow: &mut Flow, record: &LotRecord, copy: Option<&str>) {
    let count = flow.pages.len();
    let sheet = flow.sheet;
    for (index, page) in flow.pages.iter_mut().enumerate() {
        page.items.push(Item::Run(None));
        head(page, &sheet, record, copy.is_some());
        foot(
            page,
            &sheet,
            record,
            &format!("page {} of {count}", index + 1),
        );
    }
}

fn head(page: &mut Canvas, sheet: &super::paper::Sheet, record: &LotRecord, copy: bool) {
    let y = HEAD;
    let half = sheet.measure() / 2.0 - 12.0;
    let title = if copy {
        "Copy of lot record "
    } else {
        "Lot record "
    };
    let x = sheet.left + page.text((sheet.left, y), HEAD_QUIET, title);
    let lot = elide(&record.lot.lot, HEAD_STRONG, half - (x - sheet.left));
    page.text((x, y), HEAD_STRONG, &lot);
    let verdict = format!(": {}", lot_word(record.verdict));
    let part = elide(
        &record.lot.part,
        HEAD_QUIET,
        half - width(&verdict, HEAD_QUIET),
    );
    page.text_at(
        (sheet.right, y),
        Anchor::End,
        HEAD_QUIET,
        &format!("{part}{verdict}"),
    );
    page.rule(sheet.left, sheet.right, y + 6.0);
}

fn foot(page: &mut Canvas, sheet: &super::paper::Sheet, record: &LotRecord, number: &str) {
    let y = sheet.height - FOOT_FROM_BOTTOM;
    page.rule(sheet.left, sheet.right, y - 12.0);
    let room = sheet.measure() - width(number, FOOT) - 24.0;
    let identity = elide(&format!("record {}", record.record), FOOT, room);
    page.text((sheet.left, y), FOOT, &identity);
    page.text_at((sheet.right, y), Anchor::End, FOOT, number);
}
