//! A characteristic's mean in this lot and in the accepted lots before, for whoever looks at a supplier:
//! decides nothing.

use super::Judged;
use super::trend::comparable;
use crate::statistics::lot_to_lot::{
    EWMA_LAMBDA, EWMA_WIDTH, EwmaPoint, LOTS_MIN, control_limits, ewma,
};
use serde::{Deserialize, Serialize};

/// Most lots of a chart, this one included.
const SHOWN: usize = 30;

/// The means of one characteristic, lot by lot.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct LotChart {
    /// Key of the bound.
    pub of: String,
    /// Mean of the lot means before; null below eight lots before.
    pub centre: Option<f64>,
    /// Control limits of the lot means: the centre ± 3 mean moving ranges over d2 (ISO 7870-2); null below eight lots before.
    pub limits: Option<[f64; 2]>,
    /// Oldest first, the last is this lot; the newest thirty.
    pub lots: Vec<ChartedLot>,
}

/// One lot of a chart.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[allow(missing_docs)]
pub struct ChartedLot {
    /// Identity of its record; null for this lot.
    pub record: Option<String>,
    pub lot: String,
    pub n: u64,
    pub mean: f64,
    pub standard_deviation: Option<f64>,
    /// Exponentially weighted moving average, and its lower and upper limit; null below eight lots before.
    pub ewma: Option<[f64; 3]>,
}

/// A chart for each characteristic that an accepted lot before has a mean of.
pub(super) fn charts(judged: &Judged) -> Vec<LotChart> {
    let each = judged.limits.bounds.iter();
    each.filter_map(|bound| chart(judged, &bound.key)).collect()
}

fn chart(judged: &Judged, key: &str) -> Option<LotChart> {
    let before = comparable(judged, key);
    if before.is_empty() {
        return None;
    }
    let now = judged.statistics.get(key)?;
    let mut lots: Vec<ChartedLot> = before
        .iter()
        .map(|(lot, of)| ChartedLot {
            record: Some(lot.record.clone()),
            lot: lot.lot.clone(),
            n: of.n,
            mean: of.mean,
            standard_deviation: of.standard_deviation,
            ewma: None,
        })
        .collect();
    let means: Vec<f64> = lots.iter().map(|lot| lot.mean).collect();
    lots.push(ChartedLot {
        record: None,
        lot: judged.lot.to_owned(),
        n: now.n,
        mean: now.mean?,
        standard_deviation: now.standard_deviation,
        ewma: None,
    });
    let limits = (means.len() as u64 >= LOTS_MIN)
        .then(|| control_limits(&means).ok())
        .flatten();
    if let Some(limits) = limits {
        let all: Vec<f64> = lots.iter().map(|lot| lot.mean).collect();
        let points = ewma(&all, limits.centre, limits.sigma, EWMA_LAMBDA, EWMA_WIDTH);
        for (lot, point) in lots.iter_mut().zip(points.unwrap_or_default()) {
            let EwmaPoint {
                value,
                lower,
                upper,
                ..
            } = point;
            lot.ewma = Some([value, lower, upper]);
        }
    }
    let first = lots.len().saturating_sub(SHOWN);
    lots.drain(..first);
    Some(LotChart {
        of: key.to_owned(),
        centre: limits.map(|l| l.centre),
        limits: limits.map(|l| [l.lower, l.upper]),
        lots,
    })
}
