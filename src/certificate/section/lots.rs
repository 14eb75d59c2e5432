//! This lot among the accepted lots of the same part and supplier before it.

use super::Characteristic;
use super::distributions::figure;
use crate::certificate::figures::chance;
use crate::certificate::flow::{Flow, SMALL, SMALL_LEADING};
use crate::certificate::plot::lot_chart::lot_chart;
use crate::record::{LotChart, LotRecord};

const HEIGHT: f64 = 104.0;

pub(in crate::certificate) fn lots(flow: &mut Flow, record: &LotRecord, all: &[Characteristic]) {
    let charts: Vec<(&Characteristic, &LotChart)> = charts(record, all);
    if charts.is_empty() {
        return;
    }
    // With what the drawings are and the first of them.
    flow.heading("Lot to lot", HEIGHT + 130.0);
    flow.small(
        "Accepted lots of the same part and supplier in the order in which they were recorded, this lot last and larger. Dot: \
         mean of the lot; bar: ± one standard deviation within it; fine line: mean of the lots before; dashed: their control \
         limits; coloured line: exponentially weighted moving average, dotted its limits; hatched: limits of the limit file.",
    );
    for (c, chart) in charts {
        flow.subheading(&c.title(), HEIGHT + 24.0);
        let area = flow.take(HEIGHT);
        let words = format!("Lot means of {}, {} lots", c.bound.name, chart.lots.len());
        figure(flow, words, |page| lot_chart(page, area, c, chart));
        flow.y += 3.0;
        flow.paragraph_of(&caption(record, c, chart), SMALL, SMALL_LEADING);
    }
}

/// The charts of a record with their characteristics.
pub(in crate::certificate) fn charts<'c, 'r>(
    record: &'r LotRecord,
    all: &'c [Characteristic<'r>],
) -> Vec<(&'c Characteristic<'r>, &'r LotChart)> {
    let found = record.findings.lots.iter().filter_map(|chart| {
        let c = all.iter().find(|c| c.bound.key == chart.of)?;
        (chart.lots.len() > 1).then_some((c, chart))
    });
    found.collect()
}

/// The numbers of a chart, for the document and its text twin.
pub(in crate::certificate) fn caption(
    record: &LotRecord,
    c: &Characteristic,
    chart: &LotChart,
) -> String {
    let fine = |v: f64| c.scale.finer(v);
    let mut words = Vec::new();
    if let Some(last) = chart.lots.last() {
        words.push(format!("this lot {}", fine(last.mean)));
    }
    match (chart.centre, chart.limits) {
        (Some(centre), Some([low, high])) => words.push(format!(
            "mean of the lots before {}, control limits {} to {}",
            fine(centre),
            fine(low),
            fine(high)
        )),
        _ => words.push("no control limits with fewer than eight lots before".to_owned()),
    }
    if let Some([value, low, high]) = chart.lots.last().and_then(|lot| lot.ewma) {
        words.push(format!(
            "moving average {} within {} to {}",
            fine(value),
            fine(low),
            fine(high)
        ));
    }
    if let Some(trend) = record.findings.trend.iter().find(|t| t.of == chart.of) {
        words.extend(
            trend
                .shift_p_value
                .map(|v| format!("p of a shift {}", chance(v))),
        );
        words.extend(
            trend
                .spread_p_value
                .map(|v| format!("p of another spread {}", chance(v))),
        );
        words.extend(trend.signals.iter().cloned());
    }
    format!("{} ({}).", words.join(" · "), c.scale.unit)
}
