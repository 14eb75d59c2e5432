//! Limit file and station file, verbatim, with line numbers.

use crate::certificate::Sources;
use crate::certificate::canvas::Anchor;
use crate::certificate::flow::Flow;
use crate::certificate::ink::QUIET;
use crate::certificate::structure::Role;
use crate::certificate::text::{Style, width, wrap};
use crate::record::LotRecord;

const CODE: Style = Style::regular(8.6);
const NUMBER: Style = Style::regular(7.4).ink(QUIET);
const LEADING: f64 = 10.8;
const INDENT: f64 = 26.0;

pub(in crate::certificate) fn sources(flow: &mut Flow, record: &LotRecord, sources: &Sources) {
    for (title, folder, text) in [
        ("Limit file", "limits/parts/", sources.limit_file),
        ("Station file", "limits/stations/", sources.station_file),
    ] {
        if let Some(text) = text {
            flow.heading(title, 60.0);
            if let Some(words) = record.approval_words(folder) {
                flow.paragraph(&words);
                flow.gap(4.0);
            }
            verbatim(flow, text);
        }
    }
}

/// Every line with its number; a long line goes on below, indented as it began.
fn verbatim(flow: &mut Flow, text: &str) {
    for (index, line) in text.lines().enumerate() {
        let body = line.trim_start_matches(' ');
        let spaces = line.len() - body.len();
        let room = flow.sheet.measure() - INDENT;
        let inset = width(&" ".repeat(spaces.min(200)), CODE) * 1.6;
        let inset = inset.min(room * 0.5);
        let before = flow.enter(Role::Paragraph);
        for (n, part) in wrap(body, CODE, room - inset).iter().enumerate() {
            let area = flow.take(LEADING);
            let y = area.top + 8.0;
            let page = flow.page();
            if n == 0 {
                let number = (index + 1).to_string();
                page.text_at((area.left + INDENT - 8.0, y), Anchor::End, NUMBER, &number);
            }
            page.text((area.left + INDENT + inset, y), CODE, part);
        }
        flow.leave(before);
    }
}
