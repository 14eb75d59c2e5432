//! Page one: the verdict, the lot, the sentence why, the plan with its counts, the characteristics.

use super::{Characteristic, lot_ink, lot_mark, lot_word};
use crate::certificate::canvas::Area;
use crate::certificate::figures::{ABSENT, fixed, index, instant, plain, sentence};
use crate::certificate::flow::{BODY, BODY_LEADING, Bookmark, Flow, SMALL, SMALL_LEADING};
use crate::certificate::ink::{ACCEPT, NONCONFORMING, QUIET};
use crate::certificate::paper::Sheet;
use crate::certificate::plot::strip::strip;
use crate::certificate::structure::Role;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use crate::certificate::text::{Style, wrap};
use crate::record::{ClassSection, LotRecord};

const VERDICT: Style = Style::bold(42.0);
const REASON: Style = Style::regular(12.5);
/// Where the verdict's word begins, behind its mark: points from the left margin.
pub(in crate::certificate) const WORD_LEFT: f64 = 52.0;
/// Baseline of the verdict's word, points from the top margin.
pub(in crate::certificate) const WORD: f64 = 39.0;
/// Where the sentence why begins, points from the top margin.
pub(in crate::certificate) const SENTENCE: f64 = 64.0;
const SENTENCE_LEADING: f64 = 16.0;
const KEY: Style = Style::bold(10.5);
const VALUE: Style = Style::regular(10.5);
/// Width of the labels in the right column, and its line height.
pub(in crate::certificate) const LABEL: f64 = 58.0;
const SIDE: f64 = 13.0;

/// The first page (more, where texts are very long).
pub(in crate::certificate) fn answer(
    flow: &mut Flow,
    record: &LotRecord,
    characteristics: &[Characteristic],
) {
    let place = flow.here();
    flow.bookmarks.push(Bookmark {
        title: format!("Verdict: {}", lot_word(record.verdict)),
        place,
    });
    head(flow, record);
    sampling(flow, record);
    table(flow, characteristics);
}

/// Where the right column of page one begins.
pub(in crate::certificate) fn split(sheet: &Sheet) -> f64 {
    sheet.left + sheet.measure() * 0.57
}

/// Verdict and reason on the left, identity of the lot on the right.
fn head(flow: &mut Flow, record: &LotRecord) {
    let measure = flow.sheet.measure();
    let left = flow.left();
    let split = split(&flow.sheet);
    let identity = identity(record);
    let lines = side_lines(&identity, flow.right() - split - LABEL);
    let side_height: f64 = lines.iter().map(|l| 3.0 + l.len() as f64 * SIDE).sum();
    let beside = side_height <= 300.0;
    let top = flow.y;
    let ink = lot_ink(record.verdict);
    let word = lot_word(record.verdict).to_uppercase();
    flow.page()
        .mark(lot_mark(record.verdict), (left + 20.0, top + 25.0), 40.0);
    let before = flow.enter(Role::Heading(1));
    flow.page()
        .text((left + WORD_LEFT, top + WORD), VERDICT.ink(ink), &word);
    flow.leave(before);
    flow.y = top + SENTENCE;
    let room = if beside { split - 26.0 - left } else { measure };
    why(flow, record, room);
    if beside {
        let end = flow.y;
        let below = side(flow, (split, top + 8.0), &identity, &lines);
        // A reason that ran on to a further page ends below the identity anyway.
        if flow.pages.len() == 1 {
            flow.y = end.max(below);
        }
    } else {
        full_width(flow, identity);
    }
}

/// Labels and values in the right column of page one; answers where they end.
fn side(
    flow: &mut Flow,
    (x, top): (f64, f64),
    identity: &[(&'static str, String)],
    lines: &[Vec<String>],
) -> f64 {
    let mut y = top;
    for (index, ((label, _), lines)) in identity.iter().zip(lines).enumerate() {
        let style = if index < 2 { KEY } else { VALUE };
        let before = flow.enter(Role::Paragraph);
        flow.page().text((x, y + 9.0), SMALL, label);
        for line in lines {
            flow.page().text((x + LABEL, y + 9.0), style, line);
            y += SIDE;
        }
        flow.leave(before);
        y += 3.0;
    }
    y
}

/// Identity as a table, where its texts are too long for the right column.
fn full_width(flow: &mut Flow, identity: Vec<(&'static str, String)>) {
    flow.gap(6.0);
    let mut table = Table::new(vec![
        Column::new("", Align::Left, Span::Fixed(86.0)),
        Column::new("", Align::Left, Span::Share(1.0)),
    ]);
    for (label, value) in identity {
        table.row(vec![Cell::text(label).ink(QUIET), Cell::text(value)]);
    }
    table.set(flow);
}

/// Most lines of reasons after the first on page one.
const FURTHER: usize = 8;

/// The first reason in full, further ones as far as there is room, and how many more and where.
fn why(flow: &mut Flow, record: &LotRecord, room: f64) {
    let Some((first, others)) = record.reasons.split_first() else {
        return;
    };
    let before = flow.enter(Role::Paragraph);
    for line in wrap(&sentence(&first.text), REASON, room) {
        let area = flow.take(SENTENCE_LEADING);
        flow.page()
            .text((area.left, area.top + 11.5), REASON, &line);
    }
    flow.leave(before);
    let mut left = FURTHER;
    let mut shown = 0;
    flow.gap(if others.is_empty() { 0.0 } else { 3.0 });
    for reason in others {
        let lines = wrap(&sentence(&reason.text), BODY, room);
        if lines.len() > left {
            break;
        }
        left -= lines.len();
        shown += 1;
        flow.gap(3.0);
        let before = flow.enter(Role::Paragraph);
        for line in lines {
            let area = flow.take(BODY_LEADING);
            flow.page().text((area.left, area.top + 9.5), BODY, &line);
        }
        flow.leave(before);
    }
    let more = others.len() - shown;
    if more == 0 {
        return;
    }
    let plural = if more == 1 { "reason" } else { "reasons" };
    flow.gap(3.0);
    let area = flow.take(BODY_LEADING);
    let text = format!("and {more} more {plural}: see Reasons");
    let before = flow.enter(Role::Paragraph);
    let wide = flow
        .page()
        .text((area.left, area.top + 9.5), BODY.ink(ACCEPT), &text);
    let target = Area {
        right: area.left + wide,
        ..area
    };
    flow.page().link(target, "reasons");
    flow.leave(before);
}

/// What names the lot; only what the record has.
pub(in crate::certificate) fn identity(record: &LotRecord) -> Vec<(&'static str, String)> {
    let lot = &record.lot;
    let mut out = vec![("Lot", lot.lot.clone()), ("Part", lot.part.clone())];
    let mut add = |label, value: &Option<String>| {
        if let Some(value) = value.as_ref().filter(|v| !v.is_empty()) {
            out.push((label, value.clone()));
        }
    };
    add("Description", &record.limits.description);
    add("Supplier", &lot.supplier);
    add("Date code", &lot.date_code);
    add("Order", &lot.order);
    add("Supersedes record", &record.supersedes);
    out.push(("Quantity", lot.quantity.to_string()));
    out.push(("Measured", instant(&lot.measured)));
    let place = match &lot.operator {
        Some(operator) => format!("{} by {operator}", record.station.station),
        None => record.station.station.clone(),
    };
    out.push(("At station", place));
    let limits = &record.limits;
    let revision = format!("{} revision {}", limits.part, limits.revision);
    out.push(("Limit file", revision));
    out.push(("Issued", instant(&record.issued)));
    out
}

fn side_lines(identity: &[(&'static str, String)], room: f64) -> Vec<Vec<String>> {
    identity
        .iter()
        .map(|(_, value)| wrap(value, KEY, room))
        .collect()
}

/// The plan and the counts against it, class by class.
fn sampling(flow: &mut Flow, record: &LotRecord) {
    let s = &record.sampling;
    flow.subheading("Sampling", 60.0);
    let mut table = Table::new(vec![
        Column::new("Class", Align::Left, Span::Natural),
        Column::new("AQL", Align::Decimal, Span::Natural).unit("%"),
        Column::new("Code letter", Align::Left, Span::Natural),
        Column::new("Sample n", Align::Right, Span::Natural),
        Column::new("Ac", Align::Right, Span::Natural),
        Column::new("Re", Align::Right, Span::Natural),
        Column::new("Nonconforming", Align::Right, Span::Natural),
        Column::new("Undecided", Align::Right, Span::Natural),
        Column::new("Class alone", Align::Left, Span::Share(1.0)),
    ]);
    for (name, class) in &s.classes {
        let over = class.nonconforming > class.ac && !class.by_variables;
        // Where variables decided, acceptance numbers did not.
        let decisive = |number: u64| {
            if class.by_variables {
                ABSENT.to_owned()
            } else {
                number.to_string()
            }
        };
        let mut count = Cell::text(class.nonconforming.to_string());
        if over {
            count = count.bold().ink(NONCONFORMING);
        }
        table.row(vec![
            Cell::text(name.clone()).bold(),
            Cell::text(class.aql.map_or_else(|| ABSENT.to_owned(), plain)),
            Cell::text(
                class
                    .code_letter
                    .clone()
                    .unwrap_or_else(|| ABSENT.to_owned()),
            ),
            Cell::text(class.n.to_string()),
            Cell::text(decisive(class.ac)),
            Cell::text(decisive(class.re)),
            count,
            Cell::text(class.undecided.to_string()),
            Cell::text(by(class))
                .mark(Some(lot_mark(class.verdict)))
                .ink(lot_ink(class.verdict)),
        ]);
    }
    table.set(flow);
    flow.y += 4.0;
    flow.paragraph_of(&plan(record), SMALL, SMALL_LEADING);
}

/// A class's own verdict, with how it was had where that is not by counting.
fn by(class: &ClassSection) -> String {
    let word = lot_word(class.verdict);
    if class.by_variables {
        format!("{word}, by variables")
    } else {
        word.to_owned()
    }
}

/// The plan and the counts in words.
pub(in crate::certificate) fn plan(record: &LotRecord) -> String {
    let s = &record.sampling;
    let mut words = vec![s.scheme.replace('_', " ")];
    words.extend(s.level.as_ref().map(|l| format!("level {l}")));
    words.extend(s.code_letter.as_ref().map(|l| format!("code letter {l}")));
    words.extend(s.severity.as_ref().map(|v| format!("{v} inspection")));
    let mut text = format!(
        "Plan: {} ({}). Parts: {} required, {} presented, {} measured; {} nonconforming, {} undecided, {} unmeasured.",
        words.join(", "),
        s.source,
        s.required,
        s.presented,
        s.measured,
        s.nonconforming,
        s.undecided,
        s.unmeasured
    );
    if s.nonconforming_beyond_sample > 0 {
        text.push_str(&format!(
            " Beyond the required sample: {} nonconforming.",
            s.nonconforming_beyond_sample
        ));
    }
    text
}

/// The characteristics with a drawing in each row.
fn table(flow: &mut Flow, characteristics: &[Characteristic]) {
    flow.subheading("Characteristics", 90.0);
    let mut table = Table::new(vec![
        Column::new("", Align::Left, Span::Fixed(108.0)),
        Column::new("Lower limit", Align::Decimal, Span::Natural),
        Column::new("Nominal", Align::Decimal, Span::Natural),
        Column::new("Upper limit", Align::Decimal, Span::Natural),
        Column::new(
            "Every part between the limits",
            Align::Left,
            Span::Share(1.0),
        ),
        Column::new("Mean", Align::Decimal, Span::Natural),
        Column::new("Ppk", Align::Decimal, Span::Natural),
        Column::new("Out", Align::Right, Span::Natural),
    ]);
    table.row_height = 31.0;
    for c in characteristics {
        let exact =
            |v: Option<f64>| Cell::text(v.map_or_else(|| ABSENT.to_owned(), |v| c.scale.exact(v)));
        let out = c.statistics.map_or(0, |s| s.nonconforming);
        let mut count = Cell::text(out.to_string());
        if out > 0 {
            count = count.bold().ink(NONCONFORMING);
        }
        let mean = c.statistics.and_then(|s| s.mean).map_or_else(
            || ABSENT.to_owned(),
            |m| fixed(c.scale.scaled(m), c.scale.decimals),
        );
        table.row(vec![
            Cell::text(c.title()).bold(),
            exact(c.bound.lower),
            exact(c.bound.nominal),
            exact(c.bound.upper),
            Cell::drawing(c.in_words(), move |page, area| strip(page, area, c)),
            Cell::text(mean),
            Cell::text(index(c.statistics.and_then(|s| s.ppk))),
            count,
        ]);
    }
    table.set(flow);
    flow.y += 4.0;
    flow.paragraph_of(
        "Each tick is one part; ticks that fall together on paper stand for all of them. The bar below is \
         the mean ± one standard deviation, hatched lines are limits, the diamond is the nominal value, an arrowhead is a \
         part beyond the edge. Out: nonconforming parts.",
        SMALL,
        SMALL_LEADING,
    );
}
