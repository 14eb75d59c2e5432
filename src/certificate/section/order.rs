//! Run charts: every characteristic in measuring order.

use super::Characteristic;
use super::distributions::figure;
use crate::certificate::flow::Flow;
use crate::certificate::plot::run_chart::run_chart;

const HEIGHT: f64 = 104.0;

pub(in crate::certificate) fn order(
    flow: &mut Flow,
    characteristics: &[Characteristic],
    parts: usize,
) {
    flow.heading("In measuring order", HEIGHT + 30.0);
    for c in characteristics.iter().filter(|c| !c.values.is_empty()) {
        flow.subheading(&c.title(), HEIGHT);
        let area = flow.take(HEIGHT);
        let words = format!("Values in measuring order. {}", c.in_words());
        figure(flow, words, |page| run_chart(page, area, c, parts));
    }
    flow.gap(4.0);
    flow.small(
        "Abscissa: place in measuring order. Hatched lines are limits, the dashed line is the nominal value, \
         the fine line the mean; marked points are parts that are not conforming.",
    );
}
