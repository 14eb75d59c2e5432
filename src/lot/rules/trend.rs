//! A lot against the accepted lots before it, of the same part and supplier.

use super::{Judged, Ruled, warnings};
use crate::diagnostic::Note;
use crate::limits::{Action, Bound, TrendRule};
use crate::lot::explain::{number, step};
use crate::lot::{LotVerdict, PastCharacteristic, PastLot};
use crate::statistics::lot_to_lot::{
    EWMA_LAMBDA, EWMA_WIDTH, EwmaPoint, LOTS_MIN, LotSpread, RunRule, control_limits, ewma,
    mean_shift, run_signals, spread_change,
};
use crate::statistics::summary::Summary;
use serde::{Deserialize, Serialize};

/// Significance of shift and change of spread, two-sided. Common practice, no source.
const ALPHA: f64 = 0.01;
/// Fewest lots before with which a lot is compared.
const COMPARED_MIN: usize = 3;
/// Rules for lot means; with all eight of Nelson's, stable suppliers would be stopped too often.
const RUN_RULES: [RunRule; 3] = [
    RunRule::BeyondThreeSigma,
    RunRule::OneSide(9),
    RunRule::Trend,
];

/// One characteristic against the accepted lots before.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct TrendSection {
    /// Key of the bound.
    pub of: String,
    /// `warn` or `hold`.
    pub action: String,
    /// Records compared with, oldest first.
    pub history: Vec<String>,
    pub mean: Option<f64>,
    /// Mean of the lot means before.
    pub previous_mean: Option<f64>,
    /// Standard deviation of the lot means before.
    #[serde(default)]
    pub previous_standard_deviation: Option<f64>,
    /// t of the shift.
    #[serde(default)]
    pub shift_statistic: Option<f64>,
    pub shift_p_value: Option<f64>,
    /// F of the spread.
    #[serde(default)]
    pub spread_statistic: Option<f64>,
    pub spread_p_value: Option<f64>,
    /// Value and limits, from eight lots before on.
    pub ewma: Option<[f64; 3]>,
    /// What is unlike, in words; empty where nothing is.
    pub signals: Vec<String>,
}

pub(super) fn evaluate(judged: &Judged, ruled: &mut Ruled) {
    for rule in &judged.limits.trend_rules {
        for bound in judged
            .limits
            .bounds
            .iter()
            .filter(|b| rule.of.contains(&b.key))
        {
            of_bound(judged, rule, bound, ruled);
        }
    }
}

fn of_bound(judged: &Judged, rule: &TrendRule, bound: &Bound, ruled: &mut Ruled) {
    let before = comparable(judged, &bound.key);
    let mut section = TrendSection {
        of: bound.key.clone(),
        action: rule.action.name().to_owned(),
        history: before.iter().map(|(lot, _)| lot.record.clone()).collect(),
        mean: judged.statistics.get(&bound.key).and_then(|s| s.mean),
        previous_mean: None,
        previous_standard_deviation: None,
        shift_statistic: None,
        shift_p_value: None,
        spread_statistic: None,
        spread_p_value: None,
        ewma: None,
        signals: Vec::new(),
    };
    let result = if before.len() < COMPARED_MIN || section.mean.is_none() {
        ruled
            .warnings
            .push(warnings::no_history(&bound.key, before.len(), COMPARED_MIN));
        "nothing to compare with".to_owned()
    } else {
        let past: Vec<PastCharacteristic> = before.iter().map(|(_, of)| *of).collect();
        compare(judged, &mut section, &past);
        match (section.signals.is_empty(), rule.action) {
            (true, _) => "like the lots before".to_owned(),
            (false, Action::Hold) => {
                ruled
                    .holds
                    .push(Note::new("lot_unlike_previous", unlike(&section, bound)));
                format!("{}: holds the lot", section.signals.join("; "))
            }
            (false, Action::Warn) => {
                let text = unlike(&section, bound);
                ruled.warnings.push(warnings::lot_unlike_previous(text));
                format!("{}: a warning", section.signals.join("; "))
            }
        }
    };
    ruled.steps.push(step(
        &bound.key,
        "like the accepted lots before: mean (t of one more value) and spread (F) at p 0.01, EWMA and run rules of the lot means",
        "NIST/SEMATECH e-Handbook 1.3.5.9, 6.3.2.2, 6.3.2.4; Lucas and Saccucci 1990; Nelson 1984",
        numbers(&section, bound),
        result,
    ));
    ruled.findings.trend.push(section);
}

/// Lots to compare with that have a mean of the characteristic.
pub(super) fn comparable<'a>(
    judged: &Judged<'a>,
    key: &str,
) -> Vec<(&'a PastLot, PastCharacteristic)> {
    comparable_lots(judged)
        .filter_map(|lot| Some((lot, *lot.characteristics.get(key)?)))
        .collect()
}

/// Accepted lots, measured as demanded, other than this one. Of several records of one lot the last
/// counts.
pub(super) fn comparable_lots<'a>(judged: &Judged<'a>) -> impl Iterator<Item = &'a PastLot> {
    let lots = &judged.history.lots;
    let this = judged.lot;
    let last =
        move |at: usize, lot: &PastLot| !lots.iter().skip(at + 1).any(|later| later.lot == lot.lot);
    lots.iter()
        .enumerate()
        .filter(move |(at, lot)| lot.lot != this && last(*at, lot))
        .filter(|(_, lot)| lot.verdict == LotVerdict::Accept && lot.conditions_met)
        .map(|(_, lot)| lot)
}

fn compare(judged: &Judged, section: &mut TrendSection, past: &[PastCharacteristic]) {
    let Some(mean) = section.mean else { return };
    let means: Vec<f64> = past.iter().map(|of| of.mean).collect();
    section.previous_mean = Some(means.iter().sum::<f64>() / means.len() as f64);
    section.previous_standard_deviation = Summary::of(&means)
        .ok()
        .and_then(|summary| summary.standard_deviation.ok());
    if let Ok(shift) = mean_shift(mean, &means) {
        section.shift_statistic = Some(shift.statistic);
        section.shift_p_value = Some(shift.p_value);
        if shift.p_value < ALPHA {
            section.signals.push(format!(
                "the mean has shifted (t {:.2}, p {:.2e})",
                shift.statistic, shift.p_value
            ));
        }
    }
    spread(judged, section, past);
    if means.len() as u64 >= LOTS_MIN {
        chart(section, &means, mean);
    }
}

fn spread(judged: &Judged, section: &mut TrendSection, past: &[PastCharacteristic]) {
    let of = |n: u64, s: Option<f64>| {
        s.map(|standard_deviation| LotSpread {
            standard_deviation,
            n,
        })
    };
    let now = judged.statistics.get(&section.of);
    let Some(now) = now.and_then(|s| of(s.n, s.standard_deviation)) else {
        return;
    };
    let before: Vec<LotSpread> = past
        .iter()
        .filter_map(|p| of(p.n, p.standard_deviation))
        .collect();
    if let Ok(change) = spread_change(now, &before) {
        section.spread_statistic = Some(change.statistic);
        section.spread_p_value = Some(change.p_value);
        if change.p_value < ALPHA {
            let how = if change.statistic > 1.0 {
                "wider"
            } else {
                "narrower"
            };
            section.signals.push(format!(
                "the spread is {how} (F {:.2}, p {:.2e})",
                change.statistic, change.p_value
            ));
        }
    }
}

/// EWMA and run rules: what they say at this lot.
fn chart(section: &mut TrendSection, means: &[f64], mean: f64) {
    let Ok(limits) = control_limits(means) else {
        return;
    };
    let mut all = means.to_vec();
    all.push(mean);
    let points = ewma(&all, limits.centre, limits.sigma, EWMA_LAMBDA, EWMA_WIDTH);
    if let Some(EwmaPoint {
        value,
        lower,
        upper,
        signal,
    }) = points.ok().and_then(|points| points.last().copied())
    {
        section.ewma = Some([value, lower, upper]);
        if signal {
            section
                .signals
                .push("the EWMA of the lot means is beyond its limits".to_owned());
        }
    }
    let now = all.len() - 1;
    for signal in run_signals(&all, limits.centre, limits.sigma, &RUN_RULES) {
        if signal.index == now {
            let rule = signal.rule.text();
            section.signals.push(format!("lot means: {rule}"));
        }
    }
}

fn unlike(section: &TrendSection, bound: &Bound) -> String {
    format!(
        "{}: unlike the {} accepted lots before: {}; mean {}, before {}: ask the supplier what has changed",
        section.of,
        section.history.len(),
        section.signals.join("; "),
        number(section.mean, bound),
        number(section.previous_mean, bound)
    )
}

fn numbers(section: &TrendSection, bound: &Bound) -> String {
    let p = |value: Option<f64>| value.map_or("–".to_owned(), |p| format!("{p:.3}"));
    let chart = section.ewma.map_or(String::new(), |[value, lower, upper]| {
        format!(
            ", EWMA (λ {EWMA_LAMBDA}) {} within {} to {}",
            number(Some(value), bound),
            number(Some(lower), bound),
            number(Some(upper), bound)
        )
    });
    let statistic =
        |value: Option<f64>| value.map_or("–".to_owned(), |value| format!("{value:.3}"));
    format!(
        "{} accepted lots before with mean {} and standard deviation of the lot means {}, this lot {}; shift t {}, p {}; spread F {}, p {}{chart}",
        section.history.len(),
        number(section.previous_mean, bound),
        number(section.previous_standard_deviation, bound),
        number(section.mean, bound),
        statistic(section.shift_statistic),
        p(section.shift_p_value),
        statistic(section.spread_statistic),
        p(section.spread_p_value)
    )
}
