//! Simulated lots through the judgement of a lot: as many are accepted as the operating
//! characteristic in the record says.

mod lot_support;

use lot_support::*;
use reelgate::judgement::{PartRecord, PartVerdict};
use reelgate::lot::{History, LotVerdict, judge, plan};
use reelgate::statistics::random::Random;
use reelgate::statistics::sampling::Severity;

const LOTS: u32 = 100_000;
/// Accepted lots of a probability lie within this many standard errors but for one run in 16 000.
const ERRORS: f64 = 4.0;

/// ISO 2859-1:1999 Table 2-A: lot of 50, level II, letter D, AQL 6.5: n = 8, Ac 1. 100 000 lots of a
/// process at a share between the two risk points of the record's curve are judged, part by part.
#[test]
fn as_many_lots_are_accepted_as_the_curve_in_the_record_says() {
    let limits = limits(aql(6.5));
    let (lot, station) = (lot(50), station());
    let plan = plan(&limits.acceptance, lot.quantity, Severity::Normal).expect("a plan");
    assert_eq!((plan.classes["A"].n, plan.classes["A"].ac), (8, 1));
    // Equal values: what is counted is the verdict of each part, and statistics of none are needed.
    let good: Vec<PartRecord> = (0..8)
        .map(|i| part(i, PartVerdict::Conforming, 1e-6))
        .collect();
    let bad: Vec<PartRecord> = (0..8)
        .map(|i| part(i, PartVerdict::Nonconforming, 1e-6))
        .collect();
    let history = History::default();
    let mut random = Random::seeded(28_591);
    let mut share = 0.0;
    let mut law = 0.0;
    let mut accepted = 0;
    for number in 0..LOTS {
        let sample: Vec<PartRecord> = good
            .iter()
            .zip(&bad)
            .map(|(good, bad)| {
                let nonconforming = random.uniform() < share;
                if nonconforming { bad } else { good }.clone()
            })
            .collect();
        let judged = judge(&lot, &limits, &station, &plan, &sample, vec![], &history);
        if number == 0 {
            // The first lot, of a process without a nonconforming part, brings the curve.
            assert_eq!(judged.verdict, LotVerdict::Accept);
            let curve = judged.sampling.classes["A"]
                .operating_characteristic
                .as_ref();
            let points = &curve.expect("a curve").points;
            [share, law] = points[points.len() / 3];
            assert!((0.2..0.8).contains(&law), "{law}");
        }
        accepted += u32::from(judged.verdict == LotVerdict::Accept);
    }
    let rate = f64::from(accepted) / f64::from(LOTS);
    let error = (law * (1.0 - law) / f64::from(LOTS)).sqrt();
    assert!(
        (rate - law).abs() <= ERRORS * error,
        "{rate} for {law} ± {error}"
    );
}
