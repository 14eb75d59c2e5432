//! A lot, its limit file and station, and parts made for a test.
#![allow(dead_code)] // each test uses a part of it

use chrono::{DateTime, NaiveDate};
use indexmap::IndexMap;
use reelgate::judgement::{AttemptRecord, PartRecord, PartVerdict, ReadingRecord};
use reelgate::limits::{
    Acceptance, Bound, Conditions, DecisionRule, DecisionRuleKind, Limits, Retest,
};
use reelgate::lot::{History, Lot, LotJudgement, LotVerdict, judge, plan};
use reelgate::readings::{Characteristic, Equivalent, Place};
use reelgate::station::{Compensation, Instrument, Jig, Method, Station, Uncertainty};
use reelgate::statistics::sampling::Severity;

pub const KEY: &str = "capacitance@1kHz";

pub fn time(text: &str) -> DateTime<chrono::FixedOffset> {
    DateTime::parse_from_rfc3339(text).expect("a time")
}

pub fn lot(quantity: u64) -> Lot {
    Lot {
        lot: "26K-0001".into(),
        part: "RG-1".into(),
        supplier: Some("SUP-001".into()),
        quantity,
        date_code: None,
        order: None,
        label: None,
        operator: None,
        station: "BENCH-1".into(),
        measured: time("2026-10-05T09:12:00+02:00"),
        temperature: Some(23.0),
        humidity: None,
        drive: Some(1.0),
        last_heat: None,
        sweeps: "sweeps".into(),
        run: Default::default(),
    }
}

pub fn limits(acceptance: Acceptance) -> Limits {
    Limits {
        part: "RG-1".into(),
        revision: "1".into(),
        description: None,
        conditions: Conditions {
            drive: None,
            temperature: None,
            equivalent: Equivalent::Series,
            ageing: None,
            date_code_age: None,
            temperature_coefficients: vec![],
        },
        bounds: vec![Bound {
            key: KEY.into(),
            characteristic: Characteristic::Capacitance,
            place: Place::At(1e3),
            lower: Some(0.9e-6),
            upper: Some(1.1e-6),
            nominal: Some(1e-6),
            class: "A".into(),
        }],
        decision_rule: DecisionRule {
            kind: DecisionRuleKind::SimpleAcceptance,
            coverage_factor: 2.0,
        },
        acceptance,
        capability_rules: vec![],
        outlier_rules: vec![],
        mixed_rules: vec![],
        trend_rules: vec![],
        reduced_inspection: false,
        retest: Retest::default(),
    }
}

pub fn aql(value: f64) -> Acceptance {
    Acceptance::Attributes {
        level: "II".into(),
        aql: vec![("A".into(), value)],
    }
}

pub fn station() -> Station {
    Station {
        name: "BENCH-1".into(),
        instrument: Some(Instrument {
            asset: "FA-1".into(),
            calibrated: NaiveDate::from_ymd_opt(2026, 3, 2),
            due: NaiveDate::from_ymd_opt(2027, 3, 2),
        }),
        jig: Some(Jig {
            asset: "JG-1".into(),
            checked: Some(time("2026-10-05T07:50:00+02:00")),
            valid_for: Some(12.0 * 3600.0),
        }),
        method: Method::Direct,
        reference: None,
        layout: None,
        compensation: Compensation::default(),
        uncertainty: Uncertainty::default(),
        watch: None,
        instrument_link: None,
        jig_check: None,
    }
}

/// A value that wanders evenly inside the limits, a little differently for each part.
pub fn value(i: usize) -> f64 {
    1e-6 + 1e-8 * ((i as f64 * 0.618_034).fract() - 0.5)
}

pub fn part(i: usize, verdict: PartVerdict, value: f64) -> PartRecord {
    let reading = ReadingRecord {
        value: Some(value),
        standard_uncertainty: None,
        unit: "F".into(),
        lower: Some(0.9e-6),
        upper: Some(1.1e-6),
        margin: None,
        verdict,
        frequency: None,
        above: None,
        below: None,
        as_measured: None,
        conformance_probability: None,
        warnings: vec![],
    };
    let class = matches!(verdict, PartVerdict::Nonconforming | PartVerdict::Undecided)
        .then(|| "A".to_owned());
    PartRecord {
        part: format!("{:03}", i + 1),
        verdict,
        class,
        drive: None,
        series: None,
        attempts: vec![AttemptRecord {
            attempt: 1,
            file: format!("sweeps/{:03}.csv", i + 1),
            sha256: format!("{i:064x}"),
            verdict,
            counts: true,
            set_aside: None,
            notes: vec![],
            faults: vec![],
        }],
        readings: IndexMap::from([(KEY.to_owned(), reading)]),
        faults: vec![],
        warnings: vec![],
    }
}

/// `n` conforming parts but for those named.
pub fn parts(n: usize, others: &[(usize, PartVerdict)]) -> Vec<PartRecord> {
    (0..n)
        .map(|i| {
            let verdict = others
                .iter()
                .find(|(at, _)| *at == i)
                .map_or(PartVerdict::Conforming, |(_, v)| *v);
            let value = if verdict == PartVerdict::Nonconforming {
                1.2e-6
            } else {
                value(i)
            };
            part(i, verdict, value)
        })
        .collect()
}

pub fn judged(lot: &Lot, limits: &Limits, station: &Station, parts: &[PartRecord]) -> LotJudgement {
    let plan = plan(&limits.acceptance, lot.quantity, Severity::Normal).expect("a plan");
    judge(
        lot,
        limits,
        station,
        &plan,
        parts,
        vec![],
        &History::default(),
    )
}

pub fn outcome(judgement: &LotJudgement) -> (LotVerdict, Vec<&str>) {
    (
        judgement.verdict,
        judgement.reasons.iter().map(|r| r.code.as_str()).collect(),
    )
}

pub fn first(n: usize, verdict: PartVerdict) -> Vec<(usize, PartVerdict)> {
    (0..n).map(|i| (i, verdict)).collect()
}
