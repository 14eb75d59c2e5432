//! Invented lots of every kind for the tests of the document. No real parts, suppliers or people.

use indexmap::IndexMap;
use num_complex::Complex64;
use reelgate::certificate::Curve;
use reelgate::diagnostic::Note;
use reelgate::lot::{OperatingCharacteristic, Step, VariablesSection};
use reelgate::record::*;

/// A small linear congruential generator (constants of Knuth's MMIX, from memory): the lots are
/// the same on every machine.
pub struct Dice(u64);

impl Dice {
    pub fn new(seed: u64) -> Self {
        Dice(seed)
    }

    pub fn uniform(&mut self) -> f64 {
        self.0 = self
            .0
            .wrapping_mul(6364136223846793005)
            .wrapping_add(1442695040888963407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Nearly normal: twelve uniform numbers less six.
    pub fn normal(&mut self) -> f64 {
        (0..12).map(|_| self.uniform()).sum::<f64>() - 6.0
    }
}

pub struct Case {
    pub record: LotRecord,
    pub curves: Vec<Curve>,
    pub limit_file: String,
    pub station_file: String,
}

pub const LIMIT_FILE: &str = "part: RG-0475-X7R
revision: 3
description: 4.7 µF ±10 % 25 V X7R 0805 multilayer ceramic

conditions:                       # how the part must be measured
  drive: 1.0 Vrms ± 20 %
  temperature: 18 °C .. 28 °C
  equivalent: series

characteristics:
  capacitance:        {at: 1 kHz, nominal: 4.7 µF, tolerance: ±10 %, class: A}
  esr_minimum:        {max: 6 mΩ, class: A}
  srf:                {min: 1.9 MHz, max: 2.9 MHz, class: B}
  dissipation_factor: {at: 1 kHz, max: 5 %, class: B}
  impedance:
    - {at: 100 kHz, max: 0.40 Ω}

decision_rule: {kind: guarded_acceptance, coverage_factor: 2}
acceptance:
  attributes: {level: II, aql: {A: 0.65, B: 1.5}}
";

pub const STATION_FILE: &str = "station: BENCH-2
instrument: {asset: FA-0112, calibrated: 2026-03-02, due: 2027-03-02}
jig:        {asset: JG-07, checked: 2026-10-05T07:50:00+02:00, valid_for: 12 h}
method: series_reference
reference: {resistance: 1.000 Ω, tolerance: 0.1 %, inductance: 0.3 nH}
";

struct Kind {
    key: &'static str,
    name: &'static str,
    unit: &'static str,
    class: &'static str,
    lower: Option<f64>,
    upper: Option<f64>,
    nominal: Option<f64>,
    at: Option<f64>,
    between: Option<[f64; 2]>,
    centre: f64,
    spread: f64,
    uncertainty: f64,
}

fn kinds(count: usize) -> Vec<Kind> {
    let kind =
        |key, name, unit, class, limits: (Option<f64>, Option<f64>), values: (f64, f64, f64)| {
            Kind {
                key,
                name,
                unit,
                class,
                lower: limits.0,
                upper: limits.1,
                nominal: None,
                at: None,
                between: None,
                centre: values.0,
                spread: values.1,
                uncertainty: values.2,
            }
        };
    let mut all = vec![
        Kind {
            nominal: Some(4.7e-6),
            at: Some(1e3),
            ..kind(
                "capacitance@1kHz",
                "capacitance at 1 kHz",
                "F",
                "A",
                (Some(4.23e-6), Some(5.17e-6)),
                (4.69e-6, 5.1e-8, 9.9e-9),
            )
        },
        kind(
            "esr_minimum",
            "minimum ESR",
            "Ω",
            "A",
            (None, Some(6e-3)),
            (4.1e-3, 2.2e-4, 1.1e-4),
        ),
        kind(
            "srf",
            "self-resonant frequency",
            "Hz",
            "B",
            (Some(1.9e6), Some(2.9e6)),
            (2.32e6, 6.0e4, 7.0e3),
        ),
        Kind {
            at: Some(1e3),
            ..kind(
                "dissipation_factor@1kHz",
                "dissipation factor at 1 kHz",
                "1",
                "B",
                (None, Some(0.05)),
                (0.021, 1.2e-3, 2.1e-4),
            )
        },
        Kind {
            at: Some(1e5),
            ..kind(
                "impedance@100kHz",
                "impedance at 100 kHz",
                "Ω",
                "A",
                (None, Some(0.40)),
                (0.339, 3.6e-3, 6.8e-4),
            )
        },
        Kind {
            between: Some([7e5, 4e6]),
            ..kind(
                "impedance@700kHz..4MHz",
                "impedance from 700 kHz to 4 MHz",
                "Ω",
                "A",
                (None, Some(0.08)),
                (0.042, 1.1e-3, 4.0e-4),
            )
        },
        kind(
            "esl",
            "equivalent series inductance",
            "H",
            "A",
            (None, Some(1.4e-9)),
            (1.0e-9, 4.0e-11, 2.0e-11),
        ),
        Kind {
            at: Some(1e4),
            ..kind(
                "esr@10kHz",
                "ESR at 10 kHz",
                "Ω",
                "B",
                (None, Some(0.1)),
                (0.055, 2.0e-3, 5.0e-4),
            )
        },
    ];
    all.truncate(count);
    all
}

/// A lot of so many parts and characteristics in which all goes well.
pub fn accepted(parts: usize, characteristics: usize) -> Case {
    let kinds = kinds(characteristics);
    let mut dice = Dice::new(20261005);
    let width = parts.to_string().len().max(3);
    let names: Vec<String> = (1..=parts).map(|n| format!("{n:0width$}")).collect();
    let records = names.iter().map(|n| part(n, &kinds, &mut dice)).collect();
    let mut case = Case {
        record: LotRecord {
            schema: SCHEMA,
            record: "26K-0457-7c1f0be2a94d".into(),
            issued: "2026-10-05T09:14:03+02:00".into(),
            supersedes: None,
            program: Program {
                name: "reelgate".into(),
                version: "0.1.0".into(),
            },
            site: None,
            approvals: vec![],
            lot: lot(parts),
            limits: limits(&kinds),
            station: station(),
            verdict: LotVerdict::Accept,
            reasons: vec![Note::new(
                "sampling_satisfied",
                format!(
                    "{parts} of {parts} parts measured; no class has more nonconforming parts than its acceptance number."
                ),
            )],
            warnings: vec![],
            explanation: vec![
                Step {
                    about: "code letter".into(),
                    rule: "from lot size and inspection level".into(),
                    source: "ISO 2859-1, table 1".into(),
                    numbers: "lot of 4000, level II".into(),
                    result: "L".into(),
                },
                Step {
                    about: "class A".into(),
                    rule: "reject where nonconforming parts reach Re".into(),
                    source: "ISO 2859-1, clause 11".into(),
                    numbers: format!("n {parts}, Ac 2, Re 3"),
                    result: "as above".into(),
                },
            ],
            sampling: sampling(parts as u64),
            statistics: IndexMap::new(),
            circuit: None,
            findings: Findings::default(),
            parts: records,
        },
        curves: vec![],
        limit_file: LIMIT_FILE.into(),
        station_file: STATION_FILE.into(),
    };
    case.refresh();
    case.curves = case.record.parts.iter().map(|p| curve(p, 501)).collect();
    case
}

/// Rejected on capacitance, with an undecided and an unmeasured part besides, and a second try.
pub fn rejected() -> Case {
    let mut case = accepted(125, 5);
    let record = &mut case.record;
    record.verdict = LotVerdict::Reject;
    for (index, value) in [
        (16usize, 3.981e-6),
        (30, 4.104e-6),
        (77, 4.159e-6),
        (101, 5.431e-6),
    ] {
        set(
            record,
            index,
            "capacitance@1kHz",
            value,
            PartVerdict::Nonconforming,
        );
        record.parts[index].class = Some("A".into());
    }
    set(
        record,
        44,
        "capacitance@1kHz",
        4.2361e-6,
        PartVerdict::Undecided,
    );
    unmeasured(&mut record.parts[88]);
    let again = &mut record.parts[52];
    again.attempts[0].verdict = PartVerdict::Unmeasured;
    again.attempts[0].counts = false;
    again.attempts[0].faults = vec![contact()];
    let mut second = again.attempts[0].clone();
    second.attempt = 2;
    second.file = "sweeps/053~2.csv".into();
    second.verdict = PartVerdict::Conforming;
    second.counts = true;
    second.faults = vec![];
    again.attempts.push(second);
    record.reasons = vec![
        Note::new(
            "nonconforming_over_ac",
            "Class A: 4 nonconforming parts, at most 2 are allowed. Parts 017, 031, 078 and 102 are outside their capacitance limits. Reject the lot and inform the supplier.",
        ),
        Note::new(
            "unmeasured_parts",
            "Part 089 has no valid sweep (contact fault): measure it again before the lot leaves the bench.",
        ),
    ];
    record.warnings = vec![Note::new(
        "capacitance_not_normal",
        "The capacitances do not follow a normal distribution; the capability index says less than it seems to.",
    )];
    record.sampling.nonconforming = 4;
    record.sampling.undecided = 1;
    record.sampling.unmeasured = 1;
    record.sampling.measured = 124;
    if let Some(class) = record.sampling.classes.get_mut("A") {
        class.nonconforming = 4;
        class.undecided = 1;
        class.verdict = LotVerdict::Reject;
    }
    if let Some(s) = record.statistics.get_mut("capacitance@1kHz") {
        s.outliers = vec!["017".into(), "102".into()];
    }
    case.refresh();
    case.recurve(501);
    case
}

/// Held: the jig check has expired and the sample is short; one part of one.
pub fn held_single() -> Case {
    let mut case = accepted(1, 3);
    let record = &mut case.record;
    record.verdict = LotVerdict::Hold;
    record.reasons = vec![
        Note::new(
            "condition_not_met",
            "The jig check expired at 19:50 on 2026-10-04, before the lot was measured. Check the jig and measure again.",
        ),
        Note::new(
            "sample_short",
            "The plan demands 200 parts, 1 was presented. Measure 199 more.",
        ),
    ];
    record.limits.conditions[2].met = false;
    record.limits.conditions[2].found = "expired 2026-10-04 19:50".into();
    record.sampling.required = 200;
    for class in record.sampling.classes.values_mut() {
        class.n = 200;
        class.verdict = LotVerdict::Hold;
    }
    case.refresh();
    case
}

/// Texts that no one should meet and someone will.
pub fn hostile() -> Case {
    let mut case = accepted(12, 4);
    let record = &mut case.record;
    record.verdict = LotVerdict::Hold;
    record.lot.lot = format!("LOT-{}", "26K/0457_".repeat(24));
    record.record = format!("{}-7c1f0be2a94d", record.lot.lot);
    record.lot.supplier = Some(
        "Sehr lange Lieferantenbezeichnung für elektrotechnische Bauelemente und Zubehör zweiter Zweigbetrieb — 株式会社未来電子部品 — شركة المكثفات — חברת הקבלים 😀🔋 Ünïcödé ΑΒΓ Ж".into(),
    );
    record.lot.order = Some("PO\u{0}\t\n\r\u{7f}\u{202e}88120\u{301}\u{200b}".into());
    record.lot.operator = Some("OP=17 (night\\shift) %PDF-1.7 endstream <b>&amp;".into());
    record.lot.label =
        Some("[)>\u{1e}06\u{1d}PRG-0475-X7R\u{1d}Q4000\u{1d}1T26K-0457\u{1e}\u{4}".into());
    record.limits.description = Some("W".repeat(300));
    record.parts[3].part = "part with a very long name and spaces / slashes 004 ".repeat(3);
    record.parts[4].part = "漢字部品".into();
    record.parts[5].part = "=HYPERLINK(1)".into();
    record.parts[2].drive = Some(0.98123);
    if let Some(class) = record.sampling.classes.get_mut("B") {
        class.by_variables = true;
        class.variables = vec![VariablesSection {
            key: "dissipation_factor@1kHz".into(),
            n: 12,
            form: Some("k".into()),
            k: 1.52,
            m: 0.0631,
            mean: Some(0.0208),
            standard_deviation: Some(0.0012),
            q_lower: None,
            q_upper: Some(24.3),
            estimated_share: Some(1e-9),
            share_lower: None,
            share_upper: Some(1e-9),
            accepted_one_step_tighter: Some(true),
            anderson_darling: Some(0.31),
            normality_p_value: Some(0.37),
            verdict: LotVerdict::Accept,
            why: "Q of the upper limit is 24.3, at least 1.52 is demanded".into(),
        }];
    }
    unmeasured(&mut record.parts[6]);
    record.parts[6].attempts[0].file = format!("sweeps/{}.csv", "x".repeat(200));
    record.parts[6].faults = vec![Note::new(
        "unreadable",
        "line 3\ncolumn 2: found \u{7}".repeat(30),
    )];
    record.reasons = (0..5)
        .map(|n| {
            Note::new(
                "a_reason",
                format!(
                    "Reason {n}: {}",
                    "the words of this sentence go on and on, ".repeat(1 + 12 * n)
                ),
            )
        })
        .collect();
    if let Some(r) = record.parts[7].readings.get_mut("srf") {
        r.value = None;
        r.above = Some(3.5e7);
        r.verdict = PartVerdict::Unmeasured;
    }
    set(
        record,
        8,
        "capacitance@1kHz",
        4.7e-12,
        PartVerdict::Nonconforming,
    );
    set(
        record,
        9,
        "capacitance@1kHz",
        9.9e3,
        PartVerdict::Nonconforming,
    );
    case.limit_file = format!(
        "{LIMIT_FILE}# {}\n\ttab: \u{1b}[31mred\u{1b}[0m 漢字\n# {}\n",
        "very long comment ".repeat(40),
        "unbroken".repeat(60)
    );
    case.refresh();
    case.recurve(64);
    case
}

/// A lot of which the rules found something, among others: two populations in it, parts unlike it,
/// nine lots before it, and all that its statistics can have. The numbers are set, not computed.
pub fn found() -> Case {
    let mut case = accepted(60, 5);
    let record = &mut case.record;
    let names: Vec<String> = record.parts.iter().map(|p| p.part.clone()).collect();
    for (index, part) in record.parts.iter_mut().enumerate() {
        if index % 3 == 0
            && let Some(r) = part.readings.get_mut("capacitance@1kHz")
        {
            r.value = r.value.map(|v| v - 2.6e-7);
        }
    }
    record.verdict = LotVerdict::Hold;
    record.reasons = vec![Note::new(
        "mixed_lot",
        "capacitance@1kHz: two populations in one lot: find out whether two reels were mixed",
    )];
    let group = |second: bool| -> Vec<String> {
        let of = names.iter().enumerate();
        of.filter(|(i, _)| (i % 3 != 0) == second)
            .map(|(_, n)| n.clone())
            .collect()
    };
    record.findings.mixed = vec![MixedSection {
        of: "capacitance@1kHz".into(),
        n: 60,
        alpha: 0.01,
        dip: Some(0.0917),
        dip_p_value: Some(0.0031),
        bic_one: Some(-1421.3),
        bic_two: Some(-1468.9),
        separation: Some(4.87),
        mixed: true,
        groups: serde_json::from_value(serde_json::json!([
            {"mean": 4.4312e-6, "standard_deviation": 4.81e-8, "share": 0.333, "parts": group(false)},
            {"mean": 4.6927e-6, "standard_deviation": 5.23e-8, "share": 0.667, "parts": group(true)},
        ]))
        .expect("groups"),
    }];
    record.findings.joint = vec![JointSection {
        of: vec![
            "capacitance@1kHz".into(),
            "esr_minimum".into(),
            "srf".into(),
        ],
        n: 60,
        alpha: 0.01,
        critical: Some(21.73),
        outliers: vec![
            JointOutlier {
                part: names[16].clone(),
                squared_distance: 38.14,
            },
            JointOutlier {
                part: names[41].clone(),
                squared_distance: 24.06,
            },
        ],
        centre: vec![4.6e-6, 4.1e-3, 2.32e6],
        covariance: vec![
            vec![1.69e-14, 0.0, -1.1e-3],
            vec![0.0, 4.84e-8, 0.0],
            vec![-1.1e-3, 0.0, 3.6e9],
        ],
    }];
    record.findings.trend = vec![TrendSection {
        of: "capacitance@1kHz".into(),
        action: "warn".into(),
        history: (1..=9)
            .map(|k| format!("26J-000{k}-aaaaaaaaaaaa"))
            .collect(),
        mean: Some(4.6048e-6),
        previous_mean: Some(4.6853e-6),
        previous_standard_deviation: Some(2.07e-8),
        shift_statistic: Some(-3.91),
        spread_statistic: Some(2.83),
        shift_p_value: Some(0.0042),
        spread_p_value: Some(0.00000017),
        ewma: Some([4.6612e-6, 4.6518e-6, 4.7188e-6]),
        signals: vec!["the mean has shifted (t −3.91, p 4.2e−3)".into()],
    }];
    let charted = |k: usize| ChartedLot {
        record: (k < 10).then(|| format!("26J-000{k}-aaaaaaaaaaaa")),
        lot: if k < 10 {
            format!("26J-000{k}")
        } else {
            "26K-0457".into()
        },
        n: 60,
        mean: if k < 10 {
            4.6853e-6 + 1.3e-8 * ((k * 7 % 5) as f64 - 2.0)
        } else {
            4.6048e-6
        },
        standard_deviation: Some(5.1e-8 + 1e-10 * k as f64),
        ewma: Some([4.6853e-6 - 2.4e-9 * k as f64, 4.6518e-6, 4.7188e-6]),
    };
    record.findings.lots = vec![LotChart {
        of: "capacitance@1kHz".into(),
        centre: Some(4.6853e-6),
        limits: Some([4.6231e-6, 4.7475e-6]),
        lots: (1..=10).map(charted).collect(),
    }];
    for class in record.sampling.classes.values_mut() {
        class.share_nonconforming = Some(0.01667);
        class.share_nonconforming_lower_95 = Some(0.000912);
        class.share_nonconforming_upper_95 = Some(0.04873);
    }
    record.sampling.switching = serde_json::from_value(serde_json::json!({
        "classes": {
            "A": {"severity": "normal", "discontinued": false, "score": 18, "lots": 9, "why": "inspection begins normal (ISO 2859-1:1999 9.1); 9 lots before this one count"},
            "B": {"severity": "tightened", "discontinued": true, "score": 0, "lots": 9, "why": "after lot 26J-0004, two of five not accepted"},
        },
        "history": ["26J-0001-aaaaaaaaaaaa", "26J-0002-aaaaaaaaaaaa"],
    }))
    .expect("switching");
    case.refresh();
    let record = &mut case.record;
    for (index, s) in record.statistics.values_mut().enumerate() {
        let k = index as f64;
        s.normality_p_value = Some(0.31 + 0.07 * k);
        s.tolerance_95_95 = s
            .mean
            .zip(s.standard_deviation)
            .map(|(m, sd)| [m - 2.3 * sd, m + 2.3 * sd]);
        s.consumers_risk = Some(0.00123 + 0.001 * k);
        s.producers_risk = Some(0.0456 - 0.001 * k);
    }
    if let Some(s) = record.statistics.get_mut("capacitance@1kHz") {
        s.normality_p_value = Some(0.0000041);
        s.pp_percentile = Some(1.87);
        s.ppk_percentile = Some(1.53);
        s.warnings = vec![Note::new(
            "not_normal",
            "not normally distributed (Anderson-Darling p < 0.001)",
        )];
    }
    case.recurve(201);
    case
}

/// Nothing measured at all, nothing known but names.
pub fn empty() -> Case {
    let mut case = accepted(0, 2);
    let record = &mut case.record;
    record.verdict = LotVerdict::Hold;
    record.reasons = vec![];
    record.issued = "not a date".into();
    record.lot.supplier = None;
    record.lot.temperature = None;
    record.statistics = IndexMap::new();
    record.limits.conditions = vec![];
    case.curves = vec![];
    case
}

impl Case {
    /// Statistics anew from the readings (plain formulas; the tests look at how they are shown).
    pub fn refresh(&mut self) {
        let record = &mut self.record;
        for bound in &record.limits.characteristics {
            let values: Vec<f64> = record
                .parts
                .iter()
                .filter_map(|p| p.readings.get(&bound.key)?.value)
                .collect();
            let count = |v| {
                record
                    .parts
                    .iter()
                    .filter(|p| p.readings.get(&bound.key).is_some_and(|r| r.verdict == v))
                    .count() as u64
            };
            let mut s = statistics(&values, bound);
            s.nonconforming = count(PartVerdict::Nonconforming);
            s.undecided = count(PartVerdict::Undecided);
            if let Some(old) = record.statistics.get(&bound.key) {
                s.outliers = old.outliers.clone();
            }
            record.statistics.insert(bound.key.clone(), s);
        }
    }

    pub fn recurve(&mut self, points: usize) {
        self.curves = self.record.parts.iter().map(|p| curve(p, points)).collect();
    }
}

fn statistics(values: &[f64], bound: &BoundSection) -> Statistics {
    let n = values.len();
    let mut sorted = values.to_vec();
    sorted.sort_by(f64::total_cmp);
    let mean = (n > 0).then(|| values.iter().sum::<f64>() / n as f64);
    let sd = mean
        .filter(|_| n > 1)
        .map(|m| (values.iter().map(|v| (v - m).powi(2)).sum::<f64>() / (n as f64 - 1.0)).sqrt());
    let ppk = mean.zip(sd).and_then(|(m, s)| {
        let sides = [
            bound.upper.map(|u| (u - m) / (3.0 * s)),
            bound.lower.map(|l| (m - l) / (3.0 * s)),
        ];
        sides.into_iter().flatten().reduce(f64::min)
    });
    Statistics {
        n: n as u64,
        mean,
        standard_deviation: sd,
        minimum: sorted.first().copied(),
        maximum: sorted.last().copied(),
        median: sorted.get(n / 2).copied(),
        sigma_within: sd.map(|s| s * 0.96),
        cp: bound.lower.and(bound.upper).and(ppk.map(|p| p * 1.05)),
        cpk: ppk.map(|p| p * 1.04),
        pp: bound.lower.and(bound.upper).and(ppk.map(|p| p * 1.01)),
        ppk,
        cpk_lower_95: ppk.map(|p| p * 0.93),
        ppk_lower_95: ppk.map(|p| p * 0.91),
        outliers: vec![],
        nonconforming: 0,
        undecided: 0,
        warnings: if n < 2 {
            vec![Note::new(
                "too_few_values",
                "A standard deviation needs two values.",
            )]
        } else {
            vec![]
        },
        ..Statistics::default()
    }
}

fn part(name: &str, kinds: &[Kind], dice: &mut Dice) -> PartRecord {
    let readings = kinds
        .iter()
        .map(|k| {
            let value = k.centre + k.spread * dice.normal();
            (k.key.to_owned(), reading(k, value))
        })
        .collect();
    PartRecord {
        part: name.into(),
        verdict: PartVerdict::Conforming,
        class: None,
        drive: None,
        series: None,
        attempts: vec![AttemptRecord {
            attempt: 1,
            file: format!("sweeps/{name}.csv"),
            sha256: format!("{:016x}", dice.0).repeat(4),
            verdict: PartVerdict::Conforming,
            counts: true,
            set_aside: None,
            notes: vec![Note::new(
                "delimiter_found",
                "Fields are separated by semicolons, decimals by a comma.",
            )],
            faults: vec![],
        }],
        readings,
        faults: vec![],
        warnings: vec![],
    }
}

fn reading(k: &Kind, value: f64) -> ReadingRecord {
    let margin = [k.upper.map(|u| u - value), k.lower.map(|l| value - l)];
    ReadingRecord {
        value: Some(value),
        standard_uncertainty: Some(k.uncertainty),
        unit: k.unit.into(),
        lower: k.lower,
        upper: k.upper,
        margin: margin.into_iter().flatten().reduce(f64::min),
        verdict: PartVerdict::Conforming,
        frequency: None,
        above: None,
        below: None,
        as_measured: None,
        conformance_probability: None,
        warnings: vec![],
    }
}

pub fn set(record: &mut LotRecord, index: usize, key: &str, value: f64, verdict: PartVerdict) {
    let part = &mut record.parts[index];
    part.verdict = verdict;
    part.attempts[0].verdict = verdict;
    if let Some(r) = part.readings.get_mut(key) {
        r.value = Some(value);
        r.verdict = verdict;
        let margin = [r.upper.map(|u| u - value), r.lower.map(|l| value - l)];
        r.margin = margin.into_iter().flatten().reduce(f64::min);
    }
}

fn contact() -> Note {
    Note::new(
        "contact_fault",
        "The sweep shows an open contact: clean the jig's contacts, seat the part again and measure it once more.",
    )
}

pub fn unmeasured(part: &mut PartRecord) {
    part.verdict = PartVerdict::Unmeasured;
    part.attempts[0].verdict = PartVerdict::Unmeasured;
    part.faults = vec![contact()];
    for r in part.readings.values_mut() {
        r.value = None;
        r.margin = None;
        r.standard_uncertainty = None;
        r.verdict = PartVerdict::Unmeasured;
    }
}

fn lot(parts: usize) -> LotSection {
    LotSection {
        lot: "26K-0457".into(),
        part: "RG-0475-X7R".into(),
        supplier: Some("SUP-041".into()),
        quantity: 4000.max(parts as u64),
        date_code: Some("2638".into()),
        order: Some("PO-88120".into()),
        label: Some("[)>\u{1e}06\u{1d}PRG-0475-X7R\u{1d}Q4000\u{1d}1T26K-0457\u{1e}\u{4}".into()),
        operator: Some("OP-17".into()),
        measured: "2026-10-05T09:12:00+02:00".into(),
        temperature: Some(22.8),
        humidity: Some(0.41),
        drive: Some(0.98),
        last_heat: Some("2026-07-01".into()),
        sweeps: "sweeps".into(),
        run: None,
        sha256: "a1".repeat(32),
    }
}

fn limits(kinds: &[Kind]) -> LimitsSection {
    let condition = |name: &str, demanded: &str, found: &str| ConditionSection {
        name: name.into(),
        demanded: demanded.into(),
        found: found.into(),
        met: true,
    };
    LimitsSection {
        part: "RG-0475-X7R".into(),
        revision: "3".into(),
        description: Some("4.7 µF ±10 % 25 V X7R 0805 multilayer ceramic".into()),
        sha256: "b2".repeat(32),
        decision_rule: "guarded_acceptance".into(),
        coverage_factor: 2.0,
        acceptance: "attributes, level II, AQL A 0.65, B 1.5".into(),
        characteristics: kinds
            .iter()
            .map(|k| BoundSection {
                key: k.key.into(),
                name: k.name.into(),
                unit: k.unit.into(),
                class: k.class.into(),
                lower: k.lower,
                upper: k.upper,
                nominal: k.nominal,
                at: k.at,
                between: k.between,
            })
            .collect(),
        conditions: vec![
            condition(
                "drive",
                "0.80 V to 1.20 V",
                "0.979 V to 0.982 V across the part",
            ),
            condition("temperature", "18 °C to 28 °C", "22.8 °C"),
            condition("jig check", "not older than 12 h", "1 h 22 min old"),
            condition("calibration", "valid", "due 2027-03-02"),
        ],
    }
}

fn station() -> StationSection {
    StationSection {
        station: "BENCH-2".into(),
        sha256: "c3".repeat(32),
        method: "series_reference".into(),
        reference: Some("1.000 Ω ± 0.1 %, 0.3 nH".into()),
        instrument: Some("FA-0112".into()),
        instrument_calibrated: Some("2026-03-02".into()),
        instrument_due: Some("2027-03-02".into()),
        jig: Some("JG-07".into()),
        jig_checked: Some("2026-10-05T07:50:00+02:00".into()),
        jig_valid_for: Some(43200.0),
        compensation: vec!["open".into(), "short".into(), "load".into()],
        uncertainty: vec!["magnitude 0.2 %".into(), "phase 0.05 °".into()],
    }
}

fn sampling(parts: u64) -> Sampling {
    let class = |aql: f64, ac: u64| ClassSection {
        aql: Some(aql),
        code_letter: Some("L".into()),
        severity: Some("normal".into()),
        n: parts,
        ac,
        re: ac + 1,
        nonconforming: 0,
        undecided: 0,
        verdict: LotVerdict::Accept,
        share_nonconforming: None,
        share_nonconforming_lower_95: None,
        share_nonconforming_upper_95: None,
        operating_characteristic: OperatingCharacteristic::binomial(parts, ac, 4000),
        variables: vec![],
        by_variables: false,
        no_variables: None,
    };
    Sampling {
        scheme: "attributes".into(),
        level: Some("II".into()),
        code_letter: Some("L".into()),
        severity: Some("normal".into()),
        source: "ISO 2859-1, table 2-A".into(),
        required: parts,
        presented: parts,
        measured: parts,
        nonconforming: 0,
        undecided: 0,
        unmeasured: 0,
        nonconforming_beyond_sample: 0,
        classes: [
            ("A".to_owned(), class(0.65, 2)),
            ("B".to_owned(), class(1.5, 5)),
        ]
        .into(),
        switching: None,
    }
}

/// A capacitor's sweep from the part's own readings: `R + 1/(jωC) + jωL` with losses rising
/// towards low frequency.
pub fn curve(part: &PartRecord, points: usize) -> Curve {
    let value = |key: &str, default: f64| {
        part.readings
            .get(key)
            .and_then(|r| r.value)
            .unwrap_or(default)
    };
    let c = value("capacitance@1kHz", 4.7e-6);
    let r = value("esr_minimum", 4.1e-3);
    let srf = value("srf", 2.32e6);
    let l = 1.0 / ((std::f64::consts::TAU * srf).powi(2) * c);
    let open = part.verdict == PartVerdict::Unmeasured;
    let frequency: Vec<f64> = (0..points)
        .map(|i| 10f64.powf(2.0 + 5.3 * i as f64 / (points as f64 - 1.0)))
        .collect();
    let impedance = frequency
        .iter()
        .map(|f| {
            let w = std::f64::consts::TAU * f;
            let c = if open { 3e-12 } else { c };
            Complex64::new(r + 0.021 / (w * c), w * l - 1.0 / (w * c))
        })
        .collect();
    Curve {
        part: part.part.clone(),
        verdict: part.verdict,
        frequency,
        impedance,
    }
}
