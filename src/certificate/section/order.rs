//! Run charts: every characteristic in measuring order.

use super::Characteristic;
use super::distributions::{FEWEST, figure};
use crate::certificate::flow::Flow;
use crate::certificate::plot::run_chart::run_chart;

/// Highest chart, and most charts on a page.
const HEIGHT: f64 = 104.0;
const ON_A_PAGE: usize = 6;

pub(in crate::certificate) fn order(
    flow: &mut Flow,
    characteristics: &[Characteristic],
    parts: usize,
) {
    let drawn: Vec<&Characteristic> = characteristics
        .iter()
        .filter(|c| c.values.len() >= FEWEST)
        .collect();
    if drawn.is_empty() {
        return;
    }
    // Heading, what the drawings are, and the charts share a page where they can.
    let whole = flow.sheet.bottom - flow.sheet.top - 62.0;
    let each = whole / drawn.len().clamp(1, ON_A_PAGE) as f64 - 30.0;
    let height = each.min(HEIGHT);
    flow.heading("In measuring order", height + 30.0);
    for c in drawn {
        flow.subheading(&c.title(), height);
        let area = flow.take(height);
        let words = format!("Values in measuring order. {}", c.in_words());
        figure(flow, words, |page| run_chart(page, area, c, parts));
    }
    flow.gap(4.0);
    flow.small(
        "Abscissa: place in measuring order. Hatched lines are limits, the dashed line is the nominal value, \
         the fine line the mean; marked points are parts that are not conforming.",
    );
}
