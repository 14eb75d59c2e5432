//! What a record says to the lots after it.

use super::LotRecord;
use crate::lot::{PastCharacteristic, PastClass, PastLot};

impl PastLot {
    /// The lot of a record, as history.
    pub fn of(record: &LotRecord) -> PastLot {
        let sampling = &record.sampling;
        let classes = sampling.classes.iter().map(|(name, class)| {
            let severity = class.severity.as_ref().or(sampling.severity.as_ref());
            let past = PastClass {
                severity: severity.and_then(|s| s.parse().ok()),
                aql: class.aql,
                code_letter: class.code_letter.clone(),
                n: class.n,
                ac: class.ac,
                nonconforming: class.nonconforming,
                undecided: class.undecided,
                by_variables: class.by_variables,
                accepted_one_step_tighter: class.by_variables
                    && class
                        .variables
                        .iter()
                        .all(|of| of.accepted_one_step_tighter == Some(true)),
                verdict: class.verdict,
                before: sampling
                    .switching
                    .as_ref()
                    .and_then(|switching| switching.classes.get(name).cloned()),
            };
            (name.clone(), past)
        });
        let characteristics = record.statistics.iter().filter_map(|(key, s)| {
            let past = PastCharacteristic {
                n: s.n,
                mean: s.mean?,
                standard_deviation: s.standard_deviation,
            };
            Some((key.clone(), past))
        });
        PastLot {
            record: record.record.clone(),
            lot: record.lot.lot.clone(),
            measured: record.lot.measured.clone(),
            verdict: record.verdict,
            conditions_met: record.limits.conditions.iter().all(|c| c.met),
            complete: sampling.presented >= sampling.required && sampling.unmeasured == 0,
            classes: classes.collect(),
            characteristics: characteristics.collect(),
            station: record.station.station.clone(),
            series: record.findings.common_shift.as_ref().map(|s| s.lot),
        }
    }
}
