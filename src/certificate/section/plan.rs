//! The plan: how probably it accepts a lot of a given quality, and what sampling by variables found.

use super::distributions::figure;
use super::{lot_ink, lot_mark, lot_word};
use crate::certificate::canvas::{Anchor, Area, Canvas, Pen};
use crate::certificate::figures::{ABSENT, instant, plain, significant};
use crate::certificate::flow::{Flow, SMALL};
use crate::certificate::ink::{ACCEPT, QUIET, TEXT};
use crate::certificate::plot::axis::{Axis, Kind, TICK, linear_below, linear_left};
use crate::certificate::structure::Role;
use crate::certificate::table::{Align, Cell, Column, Span, Table};
use crate::certificate::text::{Style, wrap};
use crate::lot::{ClassSection, OperatingCharacteristic};
use crate::record::{LotRecord, Switching};

const HEIGHT: f64 = 128.0;
const SPACE: f64 = 22.0;
const TITLE: Style = Style::bold(9.2);

pub(in crate::certificate) fn plan(flow: &mut Flow, record: &LotRecord) {
    by_variables(flow, record);
    shares(flow, record);
    switching(flow, record);
    let curves: Vec<(&String, &ClassSection, &OperatingCharacteristic)> = record
        .sampling
        .classes
        .iter()
        .filter_map(|(name, class)| Some((name, class, class.operating_characteristic.as_ref()?)))
        .filter(|(_, _, oc)| oc.points.len() > 1)
        .collect();
    if curves.is_empty() {
        return;
    }
    flow.heading("Operating characteristic of the plan", HEIGHT + 60.0);
    let width = (flow.sheet.measure() - SPACE) / 2.0;
    for pair in curves.chunks(2) {
        let captions: Vec<Vec<String>> = pair
            .iter()
            .map(|(_, _, oc)| wrap(&words(oc), SMALL, width))
            .collect();
        let below = captions.iter().map(Vec::len).max().unwrap_or(0) as f64 * 10.5;
        let area = flow.take(14.0 + HEIGHT + below + 14.0);
        for (index, ((name, class, oc), caption)) in pair.iter().zip(&captions).enumerate() {
            let left = area.left + index as f64 * (width + SPACE);
            let plot = Area {
                left,
                right: left + width,
                top: area.top + 14.0,
                bottom: area.top + 14.0 + HEIGHT,
            };
            let title = format!("Class {name}: n {}, Ac {}", class.n, class.ac);
            let title = crate::certificate::text::elide(&title, TITLE, width);
            let before = flow.enter(Role::Heading(2));
            flow.page().text((left, area.top + 9.0), TITLE, &title);
            flow.leave(before);
            let words = format!("Operating characteristic of class {name}: {}", words(oc));
            figure(flow, words, |page| draw(page, plot, oc));
            let before = flow.enter(Role::Paragraph);
            for (n, line) in caption.iter().enumerate() {
                let at = (left, plot.bottom + 8.0 + n as f64 * 10.5);
                flow.page().text(at, SMALL, line);
            }
            flow.leave(before);
        }
    }
    flow.small(
        "Abscissa: nonconforming parts in the lot or process, %. Ordinate: probability that the plan accepts, %.",
    );
}

/// The curve's law and its two usual points in words.
pub(in crate::certificate) fn words(oc: &OperatingCharacteristic) -> String {
    let percent = |share: f64| significant(share * 100.0, 3);
    format!(
        "{} law; accepted with 95 % at {} % nonconforming, with 10 % at {} %",
        oc.law,
        percent(oc.producers_risk_quality),
        percent(oc.consumers_risk_quality)
    )
}

fn draw(page: &mut Canvas, area: Area, oc: &OperatingCharacteristic) {
    let plot = Area {
        left: area.left + 26.0,
        right: area.right - 4.0,
        top: area.top + 6.0,
        bottom: area.bottom - 16.0,
    };
    let most = oc.points.last().map_or(1.0, |p| p[0]).max(1e-9) * 100.0;
    let axis = |high: f64, from: f64, to: f64| Axis {
        kind: Kind::Linear,
        low: 0.0,
        high,
        from,
        to,
    };
    let x = axis(most, plot.left, plot.right);
    let y = axis(100.0, plot.bottom, plot.top);
    for (share, chance, label) in [
        (oc.producers_risk_quality, 95.0, "95 %"),
        (oc.consumers_risk_quality, 10.0, "10 %"),
    ] {
        let at = (x.at(share * 100.0).min(plot.right), y.at(chance));
        let lines = vec![vec![(plot.left, at.1), at], vec![at, (at.0, plot.bottom)]];
        page.lines(lines, Pen::dashed(0.5, QUIET));
        page.disc(at, 1.8, TEXT);
        // The curve falls to the right: above right of a point on it is free.
        let (anchor, to) = if at.0 + 26.0 < plot.right {
            (Anchor::Middle, at.0 + 13.0)
        } else {
            (Anchor::End, plot.right)
        };
        page.text_at((to, at.1 - 3.5), anchor, TICK, label);
    }
    let curve = oc
        .points
        .iter()
        .map(|p| (x.at(p[0] * 100.0), y.at(p[1] * 100.0)))
        .collect();
    page.lines(vec![curve], Pen::solid(1.1, ACCEPT));
    linear_below(page, plot, &x);
    linear_left(page, plot, &y, 5.0);
}

/// What the counts say of the lot.
fn shares(flow: &mut Flow, record: &LotRecord) {
    let classes = &record.sampling.classes;
    if classes
        .values()
        .all(|c| c.share_nonconforming_upper_95.is_none())
    {
        return;
    }
    flow.heading("Share nonconforming", 70.0);
    let mut table = Table::new(vec![
        Column::new("Class", Align::Left, Span::Natural),
        Column::new("n", Align::Right, Span::Natural),
        Column::new("Nonconforming", Align::Right, Span::Natural),
        Column::new("Undecided", Align::Right, Span::Natural),
        Column::new("Share in the sample", Align::Decimal, Span::Natural).unit("%"),
        Column::new("In the lot at least", Align::Decimal, Span::Natural).unit("%"),
        Column::new("In the lot at most", Align::Decimal, Span::Natural).unit("%"),
    ]);
    for (name, class) in classes {
        table.row(vec![
            Cell::text(name.clone()).bold(),
            Cell::text(class.n.to_string()),
            Cell::text(class.nonconforming.to_string()),
            Cell::text(class.undecided.to_string()),
            Cell::text(share(class.share_nonconforming)),
            Cell::text(share(class.share_nonconforming_lower_95)),
            Cell::text(share(class.share_nonconforming_upper_95)),
        ]);
    }
    table.set(flow);
    flow.y += 3.0;
    flow.small(SHARE);
}

const SHARE: &str = "Bounds one-sided with a confidence of 95 % each, exact for a lot of this size. Undecided parts count as nonconforming in the share and in the upper bound.";

/// A share in percent.
pub(in crate::certificate) fn share(value: Option<f64>) -> String {
    value.map_or_else(|| ABSENT.to_owned(), |v| significant(v * 100.0, 3))
}

/// Where the switching rules stand, and why.
fn switching(flow: &mut Flow, record: &LotRecord) {
    let Some(switching) = &record.sampling.switching else {
        return;
    };
    flow.heading("Severity of inspection", 70.0);
    let mut table = Table::new(vec![
        Column::new("Class", Align::Left, Span::Natural),
        Column::new("Inspection", Align::Left, Span::Natural),
        Column::new("Switching score", Align::Right, Span::Natural),
        Column::new("Lots that count", Align::Right, Span::Natural),
        Column::new("Why", Align::Left, Span::Share(1.0)),
    ]);
    for (name, state) in &switching.classes {
        let severity = if state.discontinued {
            format!("{}, discontinued", state.severity)
        } else {
            state.severity.clone()
        };
        table.row(vec![
            Cell::text(name.clone()).bold(),
            Cell::text(severity),
            Cell::text(state.score.to_string()),
            Cell::text(state.lots.to_string()),
            Cell::text(state.why.clone()),
        ]);
    }
    table.set(flow);
    flow.y += 3.0;
    for words in decisions(switching) {
        flow.small(&words);
    }
    flow.small(&before(switching));
}

/// Changes of the severity in view and decisions of persons, for the document and its text twin.
pub(in crate::certificate) fn decisions(switching: &Switching) -> Vec<String> {
    let mut out = Vec::new();
    for (class, state) in &switching.classes {
        for change in &state.changes {
            let after = change
                .after
                .as_ref()
                .map_or(String::new(), |lot| format!(" after lot {lot}"));
            out.push(format!(
                "Class {class}: from {} to {}{after}: {}.",
                change.from, change.to, change.rule
            ));
        }
        if let Some(set) = &state.set {
            let by = set
                .by
                .as_ref()
                .map_or(String::new(), |by| format!(" by {by}"));
            out.push(format!(
                "Class {class}: set to {}{by} on {}, entry {} of the ledger, because: {}.",
                set.severity,
                instant(&set.time),
                set.entry,
                set.reason
            ));
        }
    }
    out
}

/// The records that the switching rules looked at, for the document and its text twin.
pub(in crate::certificate) fn before(switching: &Switching) -> String {
    match switching.history.as_slice() {
        [] => "No record of the same part and supplier before this one.".to_owned(),
        records => format!("Records before, oldest first: {}.", records.join(", ")),
    }
}

/// What sampling by variables found, characteristic by characteristic.
fn by_variables(flow: &mut Flow, record: &LotRecord) {
    let sections = record.sampling.classes.values().flat_map(|c| &c.variables);
    if sections.clone().next().is_none() {
        return;
    }
    flow.heading("Sampling by variables", 80.0);
    let mut table = Table::new(vec![
        Column::new("Characteristic", Align::Left, Span::Share(1.0)),
        Column::new("n", Align::Right, Span::Natural),
        Column::new("Form", Align::Left, Span::Natural),
        Column::new("k", Align::Decimal, Span::Natural),
        Column::new("M", Align::Decimal, Span::Natural).unit("%"),
        Column::new("Q lower", Align::Decimal, Span::Natural),
        Column::new("Q upper", Align::Decimal, Span::Natural),
        Column::new("Estimated share", Align::Decimal, Span::Natural).unit("%"),
        Column::new("Normality p", Align::Decimal, Span::Natural),
        Column::new("Verdict", Align::Left, Span::Natural),
        Column::new("Why", Align::Left, Span::Share(1.6)),
    ]);
    table.size = 8.6;
    let number =
        |v: Option<f64>| Cell::text(v.map_or_else(|| ABSENT.to_owned(), |v| significant(v, 4)));
    for s in sections {
        table.row(vec![
            Cell::text(s.key.clone()),
            Cell::text(s.n.to_string()),
            Cell::text(s.form.clone().unwrap_or_else(|| ABSENT.to_owned())),
            Cell::text(plain(s.k)),
            number(Some(s.m * 100.0)),
            number(s.q_lower),
            number(s.q_upper),
            number(s.estimated_share.map(|v| v * 100.0)),
            number(s.normality_p_value),
            Cell::text(lot_word(s.verdict))
                .mark(Some(lot_mark(s.verdict)))
                .ink(lot_ink(s.verdict)),
            Cell::text(s.why.clone()),
        ]);
    }
    table.set(flow);
}
